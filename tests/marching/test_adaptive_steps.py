"""Steps under error control: landings, bounds, rejections, and what they depend on."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import newel
from newel.errors import BadRequest

pytestmark = pytest.mark.core

PAIRS = ("bogacki-shampine-3-2", "dormand-prince-5-4", "fehlberg-4-5", "prince-dormand-8-7")


def pendulum(t: float, y: Any) -> Any:
    return np.array([y[1], -math.sin(y[0])])


def march(rate: Any = pendulum, stop: float = 10.0, state: Any = (1.0, 0.0), **how: Any) -> newel.Run:
    method = how.pop("method", "dormand-prince-5-4")
    start = how.pop("start", 0.0)
    sinks = how.pop("sinks", None)
    model = newel.Model(rate, start=start, stop=stop, state=state, **how.pop("model", {}))
    if "steps" in how:
        return newel.march(model, method, sinks=sinks, **how)
    rule = newel.Adaptive(**{"rel_tol": 1e-6, "abs_tol": 1e-6, **how})
    return newel.march(model, method, steps=rule, sinks=sinks)


def still(t: float, y: Any) -> Any:
    return 0.0 * y


class Steady:
    """A controller that accepts every step and keeps its length."""

    name = "steady"

    def start(self) -> tuple[float, ...]:
        return ()

    def decide(self, error: float, step: float, order: int, memory: Any) -> Any:
        return True, 1.0, memory


@pytest.mark.parametrize(
    ("stop", "lengths"),
    [
        (3.0, [1, 1, 1]),
        (3.01, [1, 1, 1.01]),
        (3.02, [1, 1, 0.51, 0.51]),
        (2.9, [1, 0.95, 0.95]),
        (2.0, [1, 1]),
        (1.5, [0.75, 0.75]),
        (1.009, [1.009]),
        (0.4, [0.4]),
    ],
)
@pytest.mark.parametrize("sign", [1.0, -1.0])
def test_the_end_is_stretched_or_split_and_leaves_no_sliver(
    stop: float, lengths: list[float], sign: float
) -> None:
    run = march(still, sign * stop, controller=Steady(), first=1.0)
    assert np.diff(run.times) == pytest.approx([sign * length for length in lengths])
    assert run.last_time == sign * stop


def test_each_asked_time_is_landed_on_and_the_step_recovers_at_once() -> None:
    memory = newel.sinks.Memory(at=[2.5, 7.0])
    every = newel.testing.RecordingSink()
    run = march(still, 10.0, controller=Steady(), first=1.0, sinks=[memory, every])
    assert run.times.tolist() == [2.5, 7.0]
    assert np.diff(every.times) == pytest.approx([1, 0.75, 0.75, 1, 1, 1, 0.75, 0.75, 1, 1, 1])


def test_a_step_cut_to_land_is_not_held_against_the_next() -> None:
    """Landing on 40 times costs little more than the landings themselves."""
    free = march(stop=20.0)
    landed = march(stop=20.0, sinks=newel.sinks.Memory(every_time=0.5))
    assert len(landed.times) == 41
    assert landed.accepted <= max(free.accepted, 40) * 2
    assert landed.rejected <= free.rejected + 8


@pytest.mark.parametrize(("error", "following"), [(0.5, 0.62029), (0.039, 1.03319), (1e-9, 3.0)])
def test_the_proposal_outlives_a_landing_only_where_the_error_of_the_cut_step_allows(
    error: float, following: float
) -> None:
    """k = 5, 1 proposed, a landing at 0.6: its error, scaled up to 1, is 1.45, 0.87, 0.03."""
    errors = iter([error])
    rule = {"controller": "elementary", "first": 1.0, "norm": lambda e, s: next(errors, 0.9**5)}
    every = newel.testing.RecordingSink()
    march(still, 50.0, **rule, sinks=[newel.sinks.Memory(at=[0.6]), every])
    assert every.times[1] == 0.6
    assert every.times[2] - 0.6 == pytest.approx(following, rel=1e-4)


@pytest.mark.parametrize("method", PAIRS)
@pytest.mark.parametrize("stop", [10.0, -10.0])
def test_stop_is_reached_to_the_bit(method: str, stop: float) -> None:
    run = march(stop=stop / 3, method=method)
    assert run.last_time == run.times[-1] == stop / 3
    assert (np.diff(run.times) * stop > 0).all()


def test_the_bounds_of_the_step_hold() -> None:
    run = march(largest=0.05)
    assert np.diff(run.times).max() <= 0.05 * 1.01
    run = march(first=0.001)
    assert run.times[1] == 0.001
    run = march(first=0.5, largest=0.25, stop=3.0)
    assert run.times[1] == 0.25


def test_a_step_below_smallest_ends_the_march_and_says_so() -> None:
    with pytest.raises(newel.MarchFailed, match=r"below smallest \(0\.5\)") as caught:
        march(smallest=0.5, rel_tol=1e-10, abs_tol=1e-10)
    error = caught.value
    assert error.reason == "underflow"
    assert error.run.ended is not None
    assert error.run.ended.reason == "failed"


def test_splitting_the_end_in_two_is_no_reason_to_fail() -> None:
    run = march(still, 0.25, first=0.1, smallest=0.1, largest=0.1)
    assert np.diff(run.times) == pytest.approx([0.1, 0.075, 0.075])


def test_a_singularity_underflows_with_all_that_was_kept() -> None:
    with pytest.raises(newel.MarchFailed, match="below four spacings of t") as caught:
        march(lambda t, y: y * y, 2.0, [1.0])
    run = caught.value.run
    assert run.accepted == len(run.times) - 1
    assert run.last_time == run.times[-1] == pytest.approx(1.0, abs=1e-5)
    assert np.isfinite(run.states).all()


def test_tolerances_may_be_arrays_of_the_states_shape() -> None:
    """A loose second entry costs less; a shape that does not fit is named."""

    def rate(t: float, y: Any) -> Any:
        return np.array([-y[0], 30.0 * math.cos(30.0 * t)])

    tight, loose = (march(rate, abs_tol=tol, rel_tol=1e-12) for tol in ([1e-7, 1e-7], [1e-7, 1e3]))
    assert loose.calls < tight.calls / 4
    wide = march(lambda t, y: -y, state=np.ones((2, 3)), abs_tol=[1e-6, 1e-3, 1e-6])
    assert wide.accepted
    with pytest.raises(BadRequest, match=r"abs_tol has shape \(3,\), and the state has shape \(2,\)"):
        march(abs_tol=[1e-6] * 3)


@pytest.mark.parametrize(
    ("dtype", "rel_tol", "works"),
    [("float32", 1e-7, False), ("float32", 1e-6, True), ("float64", 1e-16, False), ("float64", 1e-14, True)],
)
def test_tolerances_below_what_the_dtype_carries_are_refused(dtype: str, rel_tol: float, works: bool) -> None:
    state = np.ones(1, dtype)
    if works:
        assert march(lambda t, y: -y, 0.5, state, rel_tol=rel_tol).accepted
        return
    with pytest.raises(BadRequest, match=f"below what a state of dtype {dtype} carries") as caught:
        march(lambda t, y: -y, 0.5, state, rel_tol=rel_tol)
    assert caught.value.argument == "rel_tol"


def test_an_absolute_tolerance_that_the_dtype_rounds_to_zero_is_refused() -> None:
    with pytest.raises(BadRequest, match="zero in a state of dtype float32"):
        march(lambda t, y: -y, 0.5, np.ones(1, "float32"), abs_tol=1e-60)


def test_a_norm_of_ones_own_replaces_the_weighted_root_mean_square() -> None:
    seen: list[tuple[Any, ...]] = []

    def largest(error: Any, scale: Any) -> float:
        seen.append((error.shape, scale.shape))
        return float(np.max(np.abs(error) / scale))

    run = march(state=np.ones((2,)), norm=largest)
    assert run.calls > march(state=np.ones((2,))).calls
    assert set(seen) == {((2,), (2,))}
    assert run.settings["norm"].endswith("largest")


def test_a_controller_by_name_by_object_and_a_custom_one() -> None:
    by_name = march(controller="soderlind-h211b")
    by_object = march(controller=newel.controllers.soderlind_h211b())
    assert by_name.times.tolist() == by_object.times.tolist()
    assert by_name.settings["controller"] == "soderlind-h211b"
    run = march(still, controller=Steady(), first=2.5)
    assert run.times.tolist() == [0.0, 2.5, 5.0, 7.5, 10.0]
    assert run.settings["controller"] == "steady"


@pytest.mark.parametrize(
    ("accepted", "factor"),
    [(False, 1.0), (False, 2.0), (False, 0.0), (True, math.nan), (True, -1.0), (True, 0.0)],
)
def test_a_controller_that_breaks_its_rules_ends_the_march_at_once(accepted: bool, factor: float) -> None:
    class Broken(Steady):
        name = "broken"

        def decide(self, error: float, step: float, order: int, memory: Any) -> Any:
            return accepted, factor, memory

    with pytest.raises(
        newel.MarchFailed, match=r"controller 'broken' (accepted|rejected) the step at t = 0"
    ) as caught:
        march(controller=Broken())
    assert caught.value.reason == "controller"


@pytest.mark.parametrize("name", ["elementary", "gustafsson-pi", "soderlind-h211b", "soderlind-h321"])
@pytest.mark.parametrize("method", PAIRS)
def test_every_kind_of_controller_keeps_the_tolerance(name: str, method: str) -> None:
    """Half a period of x'' = −x, closed form cos t; a rule of thumb: error within 100 tolerances."""
    run = march(lambda t, y: np.array([y[1], -y[0]]), 3.0, method=method, controller=name)
    np.testing.assert_allclose(run.last_state, [math.cos(3.0), -math.sin(3.0)], atol=1e-4)


@pytest.mark.parametrize("method", PAIRS)
def test_a_tighter_tolerance_gives_a_smaller_error(method: str) -> None:
    errors = []
    for tolerance in (1e-4, 1e-6, 1e-8):
        run = march(
            lambda t, y: -2.0 * t * y, 2.0, [1.0], method=method, rel_tol=tolerance, abs_tol=tolerance
        )
        errors.append(abs(run.last_state[0] - math.exp(-4.0)))
    assert errors[0] > errors[1] > errors[2]
    assert errors[2] < 1e-7


@pytest.mark.parametrize("method", [*PAIRS, "kutta-4"])
@settings(deadline=None, derandomize=True, max_examples=8)
@given(time=st.integers(-20, 20), size=st.integers(-20, 20))
def test_units_of_time_and_state_change_no_bit_where_they_are_powers_of_two(
    method: str, time: int, size: int
) -> None:
    """Time by 2^a, the state and abs_tol by 2^b: every step is 2^a, every state 2^b times what it was."""
    a, b = 2.0**time, 2.0**size

    def scaled(t: float, y: Any) -> Any:
        x, v = y[0] / b, y[1] / b
        return np.array([v, -x * x * x]) * (b / a)

    def plain(t: float, y: Any) -> Any:
        return np.array([y[1], -y[0] * y[0] * y[0]])

    one = march(plain, 8.0, [1.0, 0.25], method=method)
    other = march(scaled, 8.0 * a, [b, 0.25 * b], method=method, abs_tol=1e-6 * b)
    assert (other.times == one.times * a).all()
    assert (other.states == one.states * b).all()
    assert other.rejected == one.rejected


@pytest.mark.parametrize("method", PAIRS)
@pytest.mark.parametrize("scale", [2.0**-30, 2.0**30])
def test_the_first_step_has_no_scale_of_its_own_where_state_and_rate_are_zero(
    method: str, scale: float
) -> None:
    one = march(lambda t, y: [t * math.cos(t)], 8.0, [0.0], method=method)
    other = march(lambda t, y: [t / scale * math.cos(t / scale) / scale], 8.0 * scale, [0.0], method=method)
    assert (other.times == one.times * scale).all()
    assert (other.states == one.states).all()


def test_a_shift_of_time_leaves_the_steps_equal_to_rounding() -> None:
    def rate(t: float, y: Any) -> Any:
        return np.array([y[1], -y[0]])

    one, other = march(rate), march(rate, start=64.0, stop=74.0)
    assert len(one.times) == len(other.times)
    np.testing.assert_allclose(other.times - 64.0, one.times, atol=1e-11)
    np.testing.assert_allclose(other.states, one.states, atol=1e-11)


def test_an_adaptive_march_is_linear_where_abs_tol_is_scaled_along() -> None:
    def rate(t: float, y: Any) -> Any:
        return np.array([y[1], -9.0 * y[0]])

    one, other = march(rate), march(rate, state=[4.0, 0.0], abs_tol=4e-6)
    assert (other.states == 4.0 * one.states).all()


def test_a_stage_that_is_no_number_shortens_the_step_and_the_march_goes_on() -> None:
    """The square root of what a long step makes negative."""

    def rate(t: float, y: Any) -> Any:
        with np.errstate(invalid="ignore"):
            return -np.sqrt(y)

    run = march(rate, 1.9, [1.0], first=1.9)
    assert run.rejected >= 1
    assert run.last_state[0] == pytest.approx((1.0 - 0.95) ** 2, abs=1e-5)


def test_a_state_outside_within_shortens_the_step() -> None:
    def rate(t: float, y: Any) -> Any:
        return -50.0 * y

    seen: list[float] = []

    def allowed(t: float, y: Any) -> bool:
        seen.append(t)
        return bool((y >= 0).all())

    how: dict[str, Any] = {"method": "bogacki-shampine-3-2", "controller": Steady(), "first": 0.05}
    free = march(rate, 1.0, [1.0], **how)
    assert (free.states < 0).any()
    for within in ((0.0, 2.0), allowed):
        run = march(rate, 1.0, [1.0], **how, model={"within": within})
        assert (run.states >= 0).all()
        assert run.rejected > free.rejected
    assert seen[0] == 0.0
    assert set(run.times.tolist()) <= set(seen), "within is asked at the time of the state that it judges"


def test_ten_quarterings_in_a_row_are_an_error() -> None:
    with pytest.raises(
        newel.MarchFailed, match=r"rate gave NaN at t = 0\.\d+ in 'y\[0\]' \(entry 1 of 2\)"
    ) as caught:
        march(lambda t, y: np.array([math.nan if t > 0.4 else 1.0, 1.0]), first=0.2, largest=0.2)
    error = caught.value
    assert "The step was quartered 10 times." in str(error)
    assert error.run.rejected == 10
    assert 0.0 < error.run.last_time <= 0.4 == pytest.approx(error.time, abs=0.2)
    assert error.reason == "not finite"


def test_a_state_that_overflows_is_a_rejection_too() -> None:
    with pytest.raises(newel.MarchFailed, match=r"the state overflows .* 'y\[0\]'") as caught:
        march(lambda t, y: np.array([1e308]), 10.0, [1e308])
    assert np.isfinite(caught.value.run.states).all()


def test_the_order_of_the_error_is_one_more_than_the_lower_of_the_pair() -> None:
    """Seen by the controller: fehlberg-4-5 and dormand-prince-5-4 both have k = 5, the 3(2) pair 3."""
    seen: list[int] = []

    class Watching(Steady):
        def decide(self, error: float, step: float, order: int, memory: Any) -> Any:
            seen.append(order)
            return True, 1.0, memory

    for method in (
        "fehlberg-4-5",
        "dormand-prince-5-4",
        "bogacki-shampine-3-2",
        "prince-dormand-8-7",
        "kutta-4",
    ):
        march(still, controller=Watching(), first=10.0, method=method)
    assert seen == [5, 5, 3, 8, 5]
