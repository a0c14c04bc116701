"""One step of the engine equals a textbook's, whatever the method, dtype and shape."""

from __future__ import annotations

from collections.abc import Callable
from fractions import Fraction
from typing import Any

import numpy as np
import pytest

import newel
from newel.catalogue.registry import default_registry
from newel.marching.arithmetic import own_sums_are_quiet
from newel.stepping.numpy_step import NumpyStep, coefficient_array
from newel.stepping.rate_call import RateCall
from tests.stepping.textbook import textbook_step

pytestmark = pytest.mark.core

METHODS = (
    "euler-1",
    "midpoint-2",
    "kutta-4",
    "gill-4",
    "bogacki-shampine-3-2",
    "dormand-prince-5-4",
    "fehlberg-4-5",
    "prince-dormand-8-7",
    "verner-1978-9-8",
)
DTYPES = ("float32", "float64", "complex64", "complex128", "longdouble")


def coupled(t: Any, y: Any) -> Any:
    """Each entry depends on itself, on its neighbour and on t."""
    flat = y.reshape(-1)
    return (np.roll(flat, 1) * 0.5 - flat * flat * 0.25 + t).reshape(y.shape).astype(y.dtype)


def engine_for(
    method: str,
    rate: Callable[..., Any],
    state: Any,
    *,
    estimate: bool = False,
    compensated: bool = False,
    in_place: bool = False,
    params: Any = None,
) -> NumpyStep:
    model = newel.Model(rate, start=0.25, stop=2.0, state=state, in_place=in_place, params=params)
    tableau = default_registry().find(method)
    return NumpyStep(
        tableau, RateCall(model, params), model.state, estimate=estimate, compensated=compensated
    )


def expected(method: str, state: Any, h: float, rate: Callable[..., Any] = coupled) -> Any:
    """The textbook step in the state's own arithmetic, coefficients rounded once from the exact ones."""
    tableau = default_registry().find(method)
    array = np.asarray(state)
    rows = [*map(list, tableau.matrix), list(tableau.weights)]
    table = coefficient_array(rows, array.dtype)
    scalar = array.dtype.type

    def flat_rate(t: Any, y: list[Any]) -> list[Any]:
        return list(rate(t, np.array(y, dtype=array.dtype).reshape(array.shape)).reshape(-1))

    times = [0.25 + float(c) * h for c in tableau.nodes]
    new, _ = textbook_step(flat_rate, times, list(array.reshape(-1)), scalar(h), table[:-1], table[-1])
    return np.array(new, dtype=array.dtype).reshape(array.shape)


def agree(got: Any, want: Any, many: float = 24) -> None:
    """Equal within some units of rounding: the sums are taken in another order."""
    real = np.zeros(0, dtype=want.dtype).real.dtype
    np.testing.assert_allclose(got, want, rtol=many * float(np.finfo(real).eps), atol=0.0)
    assert got.dtype == want.dtype
    assert got.shape == want.shape


@pytest.mark.parametrize("dtype", DTYPES)
@pytest.mark.parametrize("method", METHODS)
def test_a_step_is_the_textbook_step(method: str, dtype: str) -> None:
    state = np.array([1.0, 0.5, 2.0]).astype(dtype)
    if state.dtype.kind == "c":
        state = (state * (1 + 0.5j)).astype(dtype)
    engine = engine_for(method, coupled, state)
    engine.attempt(0.25, 0.125)
    agree(engine.new, expected(method, state, 0.125))


@pytest.mark.parametrize("shape", [(), (1,), (3,), (2, 3), (2, 1, 2)])
@pytest.mark.parametrize("in_place", [False, True])
@pytest.mark.parametrize("compensated", [False, True])
def test_any_shape_returned_or_in_place(shape: tuple[int, ...], in_place: bool, compensated: bool) -> None:
    size = int(np.prod(shape))
    state = np.linspace(0.5, 1.5, size).reshape(shape)

    def fill(t: float, y: Any, out: Any) -> None:
        out[...] = coupled(t, y)

    rate = fill if in_place else coupled
    engine = engine_for("dormand-prince-5-4", rate, state, in_place=in_place, compensated=compensated)
    engine.attempt(0.25, 0.125)
    agree(engine.new, expected("dormand-prince-5-4", state, 0.125))
    assert engine.new.shape == shape


def test_a_step_in_fractions_is_exact() -> None:
    state = np.array([Fraction(1, 3), Fraction(2, 7)], dtype=object)

    def rate(t: Any, y: Any) -> list[Fraction]:
        return [y[1] * y[1] + t, -y[0] / 3]

    tableau = default_registry().find("kutta-three-eighths-4")
    rows = [[entry.rational for entry in row] for row in tableau.matrix]
    weights = [entry.rational for entry in tableau.weights]
    times = [Fraction(1, 4) + entry.rational / 10 for entry in tableau.nodes]
    want, _ = textbook_step(rate, times, list(state), Fraction(1, 10), rows, weights)
    engine = engine_for("kutta-three-eighths-4", rate, state)
    engine.attempt(Fraction(1, 4), Fraction(1, 10))
    assert list(engine.new) == want
    assert all(type(entry) is Fraction for entry in engine.new)


def test_a_method_with_square_roots_is_refused_for_object_states() -> None:
    state = np.array([Fraction(1)], dtype=object)
    with pytest.raises(newel.errors.BadRequest, match="square roots"):
        engine_for("gill-4", lambda t, y: y, state)


@pytest.mark.parametrize("dtype", ["float64", "float32", "complex128"])
@pytest.mark.parametrize("compensated", [False, True])
def test_a_wide_state_gives_the_bits_of_its_entries_alone(dtype: str, compensated: bool) -> None:
    """20,011 entries are worked on in several pieces; each must do what it does by itself."""
    wide = np.linspace(0.5, 2.5, 20_011).astype(dtype)

    def rate(t: Any, y: Any) -> Any:
        return (-y * y).astype(dtype)

    engine = engine_for("bogacki-shampine-3-2", rate, wide, estimate=True, compensated=compensated)
    assert len(engine.cuts) > 1
    engine.attempt(0.25, 0.125)
    for i in (0, 1, 4_095, 4_096, 8_191, 16_384, 20_010):
        small = engine_for("bogacki-shampine-3-2", rate, wide[i : i + 1], compensated=compensated)
        small.attempt(0.25, 0.125)
        agree(engine.new[i : i + 1], np.asarray(small.new), many=4)


@pytest.mark.parametrize("dtype", ["float32", "float64", "complex64", "complex128", "longdouble"])
@pytest.mark.parametrize("size", [3, 20_011])
@pytest.mark.parametrize("spread", [False, True])
def test_the_error_norm_is_the_weighted_root_mean_square(dtype: str, size: int, spread: bool) -> None:
    """The scale is abs_tol_i + rel_tol·max(|y_n|, |y_n+1|), the modulus for complex numbers."""
    state = np.linspace(0.5, 2.5, size).astype(dtype)
    if state.dtype.kind == "c":
        state = (state * (1 - 2j)).astype(dtype)
    tableau = default_registry().find("fehlberg-4-5")

    def rate(t: Any, y: Any) -> Any:
        return (-y * y).astype(dtype)

    engine = engine_for("fehlberg-4-5", rate, state, estimate=True)
    engine.attempt(0.25, 0.125)
    rates = engine.slab[1:].astype(np.clongdouble if state.dtype.kind == "c" else np.longdouble)
    difference = np.array(
        [float(w) - float(e) for w, e in zip(tableau.weights, tableau.embedded_weights, strict=True)]
    )
    error = 0.125 * difference @ rates
    rel_tol, abs_tol = 1e-3, np.linspace(1e-4, 1e-2, size) if spread else np.full(1, 1e-3)
    scale = abs_tol + rel_tol * np.maximum(np.abs(state), np.abs(engine.new))
    want = float(np.sqrt(np.mean(np.abs(error / scale) ** 2)))
    real = np.zeros(0, dtype=dtype).real.dtype
    got = engine.error_norm(rel_tol, (abs_tol / rel_tol).astype(real), None)
    assert got == pytest.approx(want, rel=2e-3 if real == np.float32 else 1e-9)
    seen: list[Any] = []

    def norm(e: Any, s: Any) -> float:
        seen.append((e.shape, s.shape))
        return float(np.max(np.abs(e) / s))

    own = engine.error_norm(rel_tol, (abs_tol / rel_tol).astype(real), norm)
    assert own == pytest.approx(
        float(np.max(np.abs(error) / scale)), rel=2e-3 if real == np.float32 else 1e-9
    )
    assert seen == [(state.shape, state.shape)]


def test_an_error_whose_square_overflows_is_measured_all_the_same() -> None:
    engine = engine_for("fehlberg-4-5", lambda t, y: 1e200 * np.sin(1e3 * t) + 0.0 * y, [1.0], estimate=True)
    with own_sums_are_quiet():
        engine.attempt(0.25, 0.125)
        assert 1e3 < engine.error_norm(1e-6, np.full(1, 1.0), None) < 1e7


def test_a_state_that_overflows_is_no_small_error() -> None:
    """An infinite state makes its own scale infinite, and so any error small."""
    engine = engine_for("dormand-prince-5-4", lambda t, y: np.array([1e308]), [1.7e308], estimate=True)
    with np.errstate(all="ignore"):
        engine.attempt(0.25, 1.0)
        assert np.isinf(engine.new[0])
        assert not engine.error_norm(1e-6, np.full(1, 1.0), None) < np.inf
        assert not engine.error_norm(1e-6, np.full(1, 1.0), lambda e, s: 0.0) < np.inf


@pytest.mark.parametrize("method", ["kutta-4", "dormand-prince-5-4", "prince-dormand-8-7"])
def test_an_attempt_after_a_nan_shows_no_trace_of_it(method: str) -> None:
    broken = {"now": True}

    def rate(t: float, y: Any) -> Any:
        return np.full_like(y, np.nan) if broken["now"] else coupled(t, y)

    state = np.array([1.0, 0.5])
    engine = engine_for(method, rate, state, estimate=method != "kutta-4")
    with np.errstate(all="ignore"):
        engine.attempt(0.25, 0.125)
    assert not engine.new_is_finite()
    broken["now"] = False
    engine.load(state)
    engine.attempt(0.25, 0.125)
    agree(engine.new, expected(method, state, 0.125))


def test_a_nan_in_the_last_stages_alone_leaves_the_next_attempt_clean() -> None:
    """The first stage stays; every other row is written before it is read."""

    def rate(t: float, y: Any) -> Any:
        return np.full_like(y, np.nan) if t > 0.5 else coupled(t, y)

    engine = engine_for("dormand-prince-5-4", rate, [1.0, 0.5])
    with np.errstate(all="ignore"):
        engine.attempt(0.25, 0.5)
    assert not engine.new_is_finite()
    engine.attempt(0.25, 0.125)
    agree(engine.new, expected("dormand-prince-5-4", np.array([1.0, 0.5]), 0.125))


def test_a_compensated_sum_lowers_the_floor() -> None:
    """10⁵ steps of a method whose own error is far below rounding: the plain sum loses ten times more."""

    def worst(compensated: bool) -> float:
        engine = engine_for("prince-dormand-8-7", lambda t, y: -0.1 * y, [1.0], compensated=compensated)
        for _ in range(20_000):
            engine.attempt(0.0, 0.001)
            engine.accept()
        exact = np.exp(np.longdouble(-20_000 * 0.001) * np.longdouble(0.1))
        return abs(float((engine.state[0] - exact) / exact))

    assert worst(True) < 3e-15
    assert worst(False) > 10 * worst(True)


def test_first_same_as_last_saves_a_call_a_step() -> None:
    for method, a_step in (("dormand-prince-5-4", 6), ("bogacki-shampine-3-2", 3), ("kutta-4", 4)):
        calls: list[float] = []

        def rate(t: float, y: Any, calls: list[float] = calls) -> Any:
            calls.append(t)
            return -y

        engine = engine_for(method, rate, [1.0])
        engine.attempt(0.0, 0.1)
        engine.accept()
        first = len(calls)
        for n in range(1, 5):
            engine.attempt(0.1 * n, 0.1)
            engine.accept()
        assert len(calls) - first == 4 * a_step
        assert engine.calls == len(calls)


def test_a_rejected_attempt_keeps_the_first_stage() -> None:
    engine = engine_for("kutta-4", lambda t, y: -y, [1.0])
    engine.attempt(0.0, 0.1)
    engine.attempt(0.0, 0.05)
    assert engine.calls == 4 + 3


def test_what_the_rate_returns_is_copied_at_once() -> None:
    kept = np.zeros(2)

    def same_array(t: float, y: Any) -> Any:
        kept[:] = coupled(t, y)
        return kept

    def the_state_itself(t: float, y: Any) -> Any:
        return y

    state = np.array([1.0, 0.5])
    engine = engine_for("kutta-4", same_array, state)
    engine.attempt(0.25, 0.125)
    agree(engine.new, expected("kutta-4", state, 0.125))
    engine = engine_for("kutta-4", the_state_itself, state)
    engine.attempt(0.25, 0.125)
    agree(engine.new, expected("kutta-4", state, 0.125, the_state_itself))


def test_lists_tuples_and_integers_are_rates_too() -> None:
    engine = engine_for("kutta-4", lambda t, y: [1, 2], [0.0, 0.0])
    engine.attempt(0.0, 0.5)
    assert engine.new == pytest.approx([0.5, 1.0])
    engine = engine_for("kutta-4", lambda t, y: (1.0, 2.0), [0.0, 0.0])
    engine.attempt(0.0, 0.5)
    assert engine.new == pytest.approx([0.5, 1.0])
    engine = engine_for("kutta-4", lambda t, y: 3.0, 1.0)
    engine.attempt(0.0, 0.5)
    assert float(engine.new) == pytest.approx(2.5)


def test_params_come_last_returned_and_in_place() -> None:
    engine = engine_for("kutta-4", lambda t, y, p: y * p["k"], [1.0], params={"k": 0.0})
    engine.attempt(0.0, 0.5)
    assert engine.new[0] == 1.0

    def fill(t: float, y: Any, out: Any, p: Any) -> None:
        out[:] = p["k"]

    engine = engine_for("kutta-4", fill, [1.0], params={"k": 4.0}, in_place=True)
    engine.attempt(0.0, 0.5)
    assert engine.new[0] == pytest.approx(3.0)


def test_states_that_users_see_are_read_only() -> None:
    seen: list[Any] = []

    def rate(t: float, y: Any) -> Any:
        seen.append(y)
        return -y

    engine = engine_for("dormand-prince-5-4", rate, [1.0])
    engine.attempt(0.0, 0.1)
    assert len(seen) == 7
    assert not any(y.flags.writeable for y in [*seen, engine.state, engine.new])


def test_stages_keep_off_both_sides_of_breaks() -> None:
    times: list[float] = []

    def rate(t: float, y: Any) -> Any:
        times.append(t)
        return -y

    engine = engine_for("dormand-prince-5-4", rate, [1.0])
    before, after = np.nextafter(1.0, 0.0), np.nextafter(0.5, 1.0)
    engine.floor = after
    engine.attempt(0.5, 0.5, before)
    assert min(times) == after
    assert max(times) == before
    times.clear()
    engine = engine_for("dormand-prince-5-4", rate, [1.0])
    engine.floor = before
    engine.attempt(1.0, -0.5, after)
    assert max(times) == before
    assert min(times) == after


def test_a_last_longdouble_coefficient_has_all_its_digits() -> None:
    """1/3 in longdouble is not the float64 1/3 widened."""
    exact = default_registry().find("bogacki-shampine-3-2").weights[1]
    wide = coefficient_array([[exact]], np.dtype(np.longdouble))[0, 0]
    assert wide * 3 == 1
    if np.finfo(np.longdouble).eps < np.finfo(np.float64).eps:
        assert wide != np.longdouble(float(exact))


def test_the_textbook_step_is_right_itself() -> None:
    """Kutta's fourth-order step of y' = y is the Taylor polynomial of degree 4; W. Kutta, 1901."""
    matrix = [[], [Fraction(1, 2)], [0, Fraction(1, 2)], [0, 0, 1]]
    weights = [Fraction(1, 6), Fraction(1, 3), Fraction(1, 3), Fraction(1, 6)]
    h = Fraction(1, 5)
    new, _ = textbook_step(lambda t, y: y, [0, h / 2, h / 2, h], [Fraction(1)], h, matrix, weights)
    assert new[0] == 1 + h + h**2 / 2 + h**3 / 6 + h**4 / 24


@pytest.mark.parametrize("sign", [1.0, -1.0])
def test_a_later_stage_with_node_zero_keeps_off_the_break_behind_it_too(sign: float) -> None:
    times: list[float] = []

    def rate(t: float, y: Any) -> Any:
        times.append(t)
        return -y

    twice = newel.Tableau(
        slug="twice-1", name="Twice", order=1, matrix=[[], [0], [0, "1/2"]], weights=["1/3", "1/3", "1/3"]
    )
    model = newel.Model(rate, start=0.5, stop=0.5 + sign, state=[1.0])
    engine = NumpyStep(twice, RateCall(model, None), model.state, estimate=False, compensated=False)
    engine.floor = np.nextafter(0.5, 0.5 + sign)
    engine.attempt(0.5, sign * 0.25)
    assert times == [engine.floor, engine.floor, 0.5 + sign * 0.125]
