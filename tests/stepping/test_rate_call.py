"""What may be wrong with a rate is said at its first call, and what compiled rates need is given."""

from __future__ import annotations

import ctypes
from typing import Any

import numpy as np
import pytest

import newel
from newel.errors import BadModel
from newel.stepping.rate_call import RateCall, where_defined

pytestmark = pytest.mark.core


def march(rate: Any, state: Any = (1.0, 2.0), **model: Any) -> newel.Run:
    return newel.march(newel.Model(rate, start=0.0, stop=1.0, state=state, **model), "kutta-4", step=0.25)


def writes(t: float, y: Any) -> Any:
    y *= 2.0
    return y


def assigns(t: float, y: Any) -> Any:
    y[0] = 0.0
    return -y


BAD_RATES = {
    "None": (lambda t, y: None, "rate returned None", "in_place=True"),
    "shape": (lambda t, y: np.zeros(3), r"rate returned shape \(3,\)", r"state has shape \(2,\)"),
    "column": (lambda t, y: np.zeros((2, 1)), r"rate returned shape \(2, 1\)", "state has shape"),
    "scalar": (lambda t, y: 1.0, r"rate returned shape \(\)", "state has shape"),
    "complex": (lambda t, y: y * 1j, "dtype complex128", "state has dtype float64"),
    "text": (lambda t, y: ["a", "b"], "dtype <U1", "state has dtype float64"),
    "ragged": (lambda t, y: [[1.0], [1.0, 2.0]], "rows of unequal length", "rate"),
    "writes": (writes, "rate writes to the state it is given", "y.copy()"),
    "assigns": (assigns, "rate writes to the state it is given", r"test_rate_call\.py:\d+"),
}


@pytest.mark.parametrize("name", BAD_RATES)
def test_a_bad_rate_is_named_at_its_first_call(name: str) -> None:
    rate, what, more = BAD_RATES[name]
    with pytest.raises(BadModel, match=what) as caught:
        march(rate)
    assert __import__("re").search(more, str(caught.value))
    assert caught.value.argument == "rate"


def test_a_shape_that_goes_wrong_later_ends_the_march_with_what_was_kept() -> None:
    def rate(t: float, y: Any) -> Any:
        return np.zeros(2 if t < 0.6 else 3)

    with pytest.raises(newel.MarchFailed, match=r"rate returned shape \(3,\)") as caught:
        march(rate)
    assert "Kept: 2 steps up to t = 0.5" in str(caught.value)
    assert caught.value.run.times.tolist() == [0.0, 0.25, 0.5]


def test_a_complex_rate_that_comes_later_is_refused_and_not_cut_to_its_real_part() -> None:
    with pytest.raises(newel.MarchFailed, match="dtype complex128"):
        march(lambda t, y: y if t < 0.6 else y * 1j)


def test_entries_of_out_left_unwritten_are_named() -> None:
    def rate(t: float, y: Any, out: Any) -> None:
        out[0] = 1.0

    with pytest.raises(BadModel, match=r"left 1 of 2 entries of out unwritten: v "):
        march(rate, in_place=True, labels=("x", "v"))


def test_an_in_place_rate_that_makes_a_new_array_is_told_so() -> None:
    with pytest.raises(BadModel, match="left 2 of 2 entries of out unwritten"):
        march(lambda t, y, out: -y, in_place=True)


def test_a_nan_that_the_rate_wrote_itself_is_not_called_unwritten() -> None:
    def rate(t: float, y: Any, out: Any) -> None:
        out[:] = np.nan, 1.0

    with pytest.raises(newel.MarchFailed, match="rate gave NaN at t = 0 in 'y") as caught:
        march(rate, in_place=True)
    assert "entry 1 of 2" in str(caught.value)
    assert caught.value.run.accepted == 0


def ctypes_rate(t: float, y: Any) -> Any:
    pair = (ctypes.c_double * 2).from_buffer(y)
    return np.array([-pair[0], -pair[1]])


def memory_view_rate(t: float, y: Any) -> Any:
    """As a rate compiled with typed, writable memory views answers."""
    if not y.flags.writeable:
        raise ValueError("buffer source array is read-only")
    return -y


def signature_rate(t: float, y: Any) -> Any:
    """As a rate compiled for explicit argument types answers."""
    if not y.flags.writeable:
        raise TypeError("No matching definition for argument type(s) float64, readonly array(float64, 1d, C)")
    return -y


def in_place_memory_view_rate(t: float, y: Any, out: Any) -> None:
    out[:] = memory_view_rate(t, y)


@pytest.mark.parametrize("rate", [ctypes_rate, memory_view_rate, signature_rate, in_place_memory_view_rate])
@pytest.mark.parametrize("asked", [False, True])
def test_a_compiled_rate_gets_private_copies_and_the_run_says_so(rate: Any, asked: bool) -> None:
    run = march(rate, copies=asked, in_place=rate is in_place_memory_view_rate)
    plain = march(lambda t, y: -y)
    assert run.last_state.tolist() == plain.last_state.tolist()
    assert run.calls == plain.calls
    notes = [note.text for note in run.notes]
    assert bool(notes) is not asked
    assert all("private copy of 16 bytes" in text for text in notes)


def test_a_private_copy_may_be_written_to_without_harm() -> None:
    run = march(writes, copies=True)
    plain = march(lambda t, y: 2.0 * y)
    assert run.last_state.tolist() == plain.last_state.tolist()


def test_a_type_error_of_another_kind_is_the_rates_own() -> None:
    def rate(t: float, y: Any) -> Any:
        raise TypeError("unsupported operand")

    with pytest.raises(
        newel.MarchFailed, match=r"rate raised TypeError: unsupported operand \(test_rate_call"
    ):
        march(rate)


def test_swapped_arguments_are_refused_before_any_call() -> None:
    with pytest.raises(BadModel, match="lambda t, y: rate\\(y, t\\)"):
        march(lambda y, t: -y)


def test_other_params_are_handed_over_from_then_on() -> None:
    model = newel.Model(lambda t, y, p: y * p, start=0.0, stop=1.0, state=[1.0], params=2.0)
    call = RateCall(model, 2.0)
    out = np.zeros(1)
    call.evaluate(0.0, model.state, out)
    call.take_params((5.0,))
    call.evaluate(0.0, model.state, out)
    assert out[0] == 5.0


def test_a_rate_without_a_file_is_named_by_its_name() -> None:
    assert where_defined(len) == "len"
    assert where_defined(writes).startswith("test_rate_call.py:")
