"""Steps without error control: where they end, and what they give."""

from __future__ import annotations

import math
from fractions import Fraction
from typing import Any

import numpy as np
import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st

import newel
from newel.errors import BadRequest

pytestmark = pytest.mark.core


def growth(t: float, y: Any) -> Any:
    return y * math.cos(t)


def still(t: float, y: Any) -> Any:
    return 0.0 * y


def march(rate: Any = growth, start: float = 0.0, stop: float = 1.0, **how: Any) -> newel.Run:
    state = how.pop("state", [1.0])
    return newel.march(newel.Model(rate, start=start, stop=stop, state=state), "kutta-4", **how)


@settings(deadline=None, derandomize=True, max_examples=60)
@given(
    start=st.floats(-100, 100),
    step=st.floats(1e-3, 10),
    count=st.integers(1, 40),
    sign=st.sampled_from([1.0, -1.0]),
)
@example(start=0.0, step=0.1, count=10, sign=1.0)
@example(start=1e6, step=0.1, count=30, sign=-1.0)
def test_the_times_are_start_plus_n_steps_with_one_rounding(
    start: float, step: float, count: int, sign: float
) -> None:
    stop = start + sign * count * step
    run = march(lambda t, y: y * 0.0, start, stop, step=step)
    want = [start + n * (sign * step) for n in range(count)]
    assert run.times.tolist() == [*want, stop]
    assert run.accepted == count
    assert run.notes == []


def test_a_count_is_whole_to_eight_units_of_rounding() -> None:
    ratio = 10.0
    unit = math.ulp(1.0 / 0.1)
    for off, whole in ((7.0, True), (-7.0, True), (10.0, False), (-10.0, False)):
        stop = 0.1 * (ratio + off * unit)
        run = march(stop=stop, step=0.1)
        assert (run.notes == []) is whole, off
        assert run.last_time == stop


def test_a_short_last_step_is_noted() -> None:
    run = march(stop=1.05, step=0.1)
    assert run.times[-2:].tolist() == [1.0, 1.05]
    assert run.accepted == 11
    assert "step 0.1 does not divide the span from 0.0 to 1.05; the last step is 0.05" in run.notes[0].text


def test_a_step_longer_than_the_span_ends_at_stop() -> None:
    run = march(step=5.0)
    assert run.times.tolist() == [0.0, 1.0]
    assert len(run.notes) == 1


@pytest.mark.parametrize(
    ("start", "stop", "step", "words"),
    [
        (1e16, 1e16 + 64, 0.5, "too small to move t"),
        (1.0, 2.0, 1e-16, "more steps than can be counted"),
        (0.0, 1e300, 1e-300, "more steps than can be counted"),
    ],
)
def test_steps_that_time_cannot_tell_apart_are_refused(
    start: float, stop: float, step: float, words: str
) -> None:
    with pytest.raises(BadRequest, match=words) as caught:
        march(start=start, stop=stop, step=step, sinks=[])
    assert caught.value.argument == "step"


def test_the_home_made_loop_gives_the_same_to_some_units_in_the_last_place() -> None:
    run = march(stop=2.0, step=0.01)
    t, y, h = 0.0, np.array([1.0]), 0.01
    for n in range(200):
        t = n * h
        k1 = growth(t, y)
        k2 = growth(t + h / 2, y + h / 2 * k1)
        k3 = growth(t + h / 2, y + h / 2 * k2)
        k4 = growth(t + h, y + h * k3)
        y = y + h / 6 * (k1 + 2 * k2 + 2 * k3 + k4)
    assert abs(run.last_state - y)[0] < 20 * np.spacing(y[0])
    assert run.last_state[0] == pytest.approx(math.exp(math.sin(2.0)), rel=1e-9)


def test_forwards_and_backwards_mirror_each_other_to_the_bit() -> None:
    for method, rule in (
        ("kutta-4", {"step": 0.1}),
        ("dormand-prince-5-4", {"step": 0.3}),
        ("prince-dormand-8-7", {"rel_tol": 1e-9, "abs_tol": 1e-9}),
        ("bogacki-shampine-3-2", {"rel_tol": 1e-5, "abs_tol": 1e-7}),
        ("kutta-4", {"rel_tol": 1e-5, "abs_tol": 1e-7}),
    ):
        there = newel.march(newel.Model(growth, start=0.0, stop=7.0, state=[1.0]), method, **rule)
        back = newel.march(
            newel.Model(lambda t, y: -growth(-t, y), start=0.0, stop=-7.0, state=[1.0]), method, **rule
        )
        assert (there.times == -back.times).all()
        assert (there.states == back.states).all()


@settings(deadline=None, derandomize=True, max_examples=25)
@given(a=st.floats(-3, 3), b=st.floats(-3, 3))
def test_a_fixed_march_is_linear_for_a_linear_model(a: float, b: float) -> None:
    matrix = np.array([[0.0, 1.0], [-4.0, -0.3]])

    def end(state: Any) -> Any:
        return march(lambda t, y: matrix @ y, stop=2.0, step=0.125, state=state).last_state

    one, two = np.array([1.0, 0.5]), np.array([-0.25, 2.0])
    np.testing.assert_allclose(end(a * one + b * two), a * end(one) + b * end(two), rtol=0, atol=1e-13)


def test_a_function_gives_each_step() -> None:
    asked: list[tuple[float, float]] = []

    def length(t: float, y: Any) -> float:
        asked.append((t, float(y[0])))
        return 0.1 if t < 0.5 else 0.25

    run = march(stop=1.2, step=length)
    assert run.times == pytest.approx([0, 0.1, 0.2, 0.3, 0.4, 0.5, 0.75, 1.0, 1.2])
    assert run.last_time == 1.2
    assert asked == list(zip(run.times[:-1].tolist(), run.states[:-1, 0].tolist(), strict=True))
    back = march(lambda t, y: -growth(-t, y), 0.0, -1.2, step=lambda t, y: length(-t, y))
    assert back.times.tolist() == (-run.times).tolist()


def test_a_running_sum_of_equal_steps_leaves_no_sliver() -> None:
    """0.1 ten times over is 0.9999999999999999."""
    run = march(step=lambda t, y: 0.1)
    assert run.accepted == 10
    assert run.last_time == 1.0
    # A thousand of them are 99.9999999999986.
    run = march(still, stop=100.0, step=lambda t, y: 0.1)
    assert run.accepted == 1000
    assert run.last_time == 100.0


def test_a_step_function_gets_the_params() -> None:
    model = newel.Model(lambda t, y, p: y * p, start=0.0, stop=1.0, state=[1.0], params=2.0)
    run = newel.march(model, "kutta-4", step=lambda t, y, p: p / 8)
    assert run.accepted == 4


@pytest.mark.parametrize("bad", [0.0, -1.0, math.nan, math.inf, None, "far", 1e-20])
def test_a_step_function_that_gives_no_step_is_named(bad: Any) -> None:
    with pytest.raises(newel.MarchFailed, match=r"the step function gave .* at t = 0\.5") as caught:
        march(step=lambda t, y: bad if t else 0.5)
    assert caught.value.run.times.tolist() == [0.0, 0.5]


def test_given_times_are_reached_to_the_bit() -> None:
    times = [0.1, 0.15, 0.7, 1.0]
    for first in ([], [0.0]):
        run = march(steps=newel.Given([*first, *times]))
        assert run.times.tolist() == [0.0, *times]
    back = march(stop=-1.0, steps=newel.Given([-t for t in times]))
    assert back.times.tolist() == [0.0, *(-t for t in times)]


@pytest.mark.parametrize(
    ("times", "words"),
    [
        ([0.5], "ends at 0.5, and the model stops at 1.0"),
        ([0.5, 2.0], "time 2, 2.0, lies outside the march"),
        ([-0.5, 1.0], "time 1, -0.5, lies outside"),
        ([0.0], "ends at 0.0, and the model stops at 1.0"),
    ],
)
def test_given_times_that_do_not_fit_the_model_are_refused(times: list[float], words: str) -> None:
    with pytest.raises(BadRequest, match=words):
        march(steps=newel.Given(times))


@pytest.mark.parametrize("how", ["step", "given", "function"])
def test_object_states_keep_exact_time_and_state(how: str) -> None:
    """y' = y by Kutta's fourth order is the Taylor polynomial; a float anywhere would show."""
    h = Fraction(1, 4)
    rules = {
        "step": {"step": h},
        "given": {"steps": newel.Given([0.25, 0.5])},
        "function": {"step": lambda t, y: h},
    }
    seen: list[Any] = []

    def rate(t: Any, y: Any) -> Any:
        seen.append(t)
        return y

    state = np.array([Fraction(1)], dtype=object)
    run = march(rate, stop=0.5, state=state, **rules[how])
    growth_of_step = 1 + h + h**2 / 2 + h**3 / 6 + h**4 / 24
    assert run.last_state[0] == growth_of_step**2
    assert type(run.last_state[0]) is Fraction
    assert {type(t) for t in seen} == {Fraction}
    assert run.last_time == Fraction(1, 2)
    assert run.times.tolist() == [0, Fraction(1, 4), Fraction(1, 2)]


def test_object_states_with_a_short_last_step_and_asked_times() -> None:
    state = np.array([Fraction(1)], dtype=object)
    run = march(lambda t, y: y * 0 + 1, state=state, step=Fraction(3, 10))
    assert run.last_state[0] == 2
    assert [float(t) for t in run.times] == [0, 0.3, 0.6, 0.9, 1.0]
    memory = newel.sinks.Memory(at=[0.25, 0.75])
    run = march(lambda t, y: y * 0 + t, state=state, step=lambda t, y: 0.5, sinks=memory)
    assert run.times.tolist() == [Fraction(1, 4), Fraction(3, 4)]
    assert run.states[:, 0].tolist() == [1 + Fraction(1, 32), 1 + Fraction(9, 32)]


@pytest.mark.parametrize("what", ["adaptive", "breaks", "events"])
def test_what_needs_floats_is_refused_for_object_states(what: str) -> None:
    state = np.array([Fraction(1)], dtype=object)
    more: dict[str, Any] = {
        "adaptive": {},
        "breaks": {"breaks": [0.5]},
        "events": {"events": [newel.StateEvent("it", lambda t, y: 1.0)]},
    }[what]
    model = newel.Model(lambda t, y: y, start=0.0, stop=1.0, state=state, **more)
    rule: dict[str, Any] = {"rel_tol": 1e-6, "abs_tol": 1e-6} if what == "adaptive" else {"step": 0.5}
    with pytest.raises(BadRequest, match="dtype object cannot be marched with"):
        newel.march(model, "dormand-prince-5-4", **rule)


@pytest.mark.parametrize("dtype", ["float32", "complex64", "complex128", "longdouble"])
def test_a_dtype_stays_what_it_is(dtype: str) -> None:
    def rate(t: float, y: Any) -> Any:
        assert type(t) is float
        assert y.dtype == dtype
        return -y

    for rule in ({"step": 0.1}, {"rel_tol": 1e-4, "abs_tol": 1e-4}, {"step": lambda t, y: 0.1}):
        run = newel.march(
            newel.Model(rate, start=0.0, stop=1.0, state=np.ones(2, dtype)), "dormand-prince-5-4", **rule
        )
        assert run.states.dtype == run.last_state.dtype == dtype
        assert run.times.dtype == np.float64
        assert abs(complex(run.last_state[1]) - math.exp(-1)) < 1e-4


def test_integers_and_booleans_become_float64() -> None:
    for state in ([1, 2], [True, False], 3):
        assert march(lambda t, y: y, state=state, step=0.5).last_state.dtype == np.float64


def test_compensation_keeps_what_many_small_steps_would_lose() -> None:
    """y' = 1 from 1: n·h exact to rounding, where a plain running sum of 30,000 steps drifts."""
    run = march(lambda t, y: y * 0 + 0.1, stop=30.0, step=0.001, sinks=[])
    assert abs(run.last_state[0] - 4.0) <= 2 * np.spacing(4.0)
    plain = 1.0
    for _ in range(30_000):
        plain += 0.001 * 0.1
    assert abs(plain - 4.0) > 100 * np.spacing(4.0)
