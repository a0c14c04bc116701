"""State events: found, located to the rounding of time, and gone on from."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest

import newel
from newel.errors import BadModel
from newel.marching import switches

pytestmark = pytest.mark.core

RULES: dict[str, tuple[str, dict[str, Any]]] = {
    "fixed": ("kutta-4", {"step": 0.01}),
    "adaptive": ("dormand-prince-5-4", {"rel_tol": 1e-12, "abs_tol": 1e-12}),
    "doubled": ("kutta-4", {"rel_tol": 1e-11, "abs_tol": 1e-11}),
    "high": ("prince-dormand-8-7", {"rel_tol": 1e-12, "abs_tol": 1e-12}),
}


def oscillator(t: float, y: Any) -> Any:
    return np.array([y[1], -y[0]])


def model(*events: newel.StateEvent, rate: Any = oscillator, stop: float = 10.0, **more: Any) -> newel.Model:
    return newel.Model(rate, **{"start": 0.0, "stop": stop, "state": [1.0, 0.0], "events": events, **more})


def found(run: newel.Run, label: str) -> list[float]:
    return [event.time for event in run.events if event.label == label]


@pytest.mark.parametrize("how", RULES)
@pytest.mark.parametrize(
    ("crossing", "count"), [("rising", [1, 3, 5]), ("falling", [0, 2, 4]), ("both", [0, 1, 2, 3, 4, 5])]
)
def test_the_zeros_of_a_cosine_are_found(how: str, crossing: str, count: list[int]) -> None:
    """x'' = −x from (1, 0): x = cos t vanishes at π/2 + nπ, rising where n is odd."""
    method, rule = RULES[how]
    run = newel.march(
        model(newel.StateEvent("zero", lambda t, y: y[0], crossing=crossing), stop=18.0), method, **rule
    )
    want = [math.pi / 2 + n * math.pi for n in count]
    assert found(run, "zero") == pytest.approx(want, abs=2e-9)
    for event in run.events:
        assert abs(event.state[0]) < 1e-13
        assert event.time in run.times
        far = math.copysign(1.0, -math.sin(event.time))
        assert event.state[0] * far >= 0.0, "the state is that of the far side"


@pytest.mark.parametrize("how", RULES)
def test_backwards_directions_go_with_the_march(how: str) -> None:
    method, rule = RULES[how]
    events = [newel.StateEvent(c, lambda t, y: y[0], crossing=c) for c in ("rising", "falling")]
    run = newel.march(model(*events, stop=-6.0), method, **rule)
    assert found(run, "falling") == pytest.approx([-math.pi / 2], abs=2e-9)
    assert found(run, "rising") == pytest.approx([-3 * math.pi / 2], abs=2e-9)


@pytest.mark.parametrize("how", RULES)
@pytest.mark.parametrize("at", [0.3, 1.0 / 3.0, 0.7654321, 2.0 / 3.0 + 1e-14])
@pytest.mark.parametrize("sign", [1.0, -1.0])
def test_the_time_is_right_to_rounding_where_the_method_is_exact(how: str, at: float, sign: float) -> None:
    """y' = 1: the crossing of y = at lies at t = at, whatever the step."""
    method, rule = RULES[how]
    event = newel.StateEvent("at", lambda t, y: sign * y[0] - at, ends=True)
    run = newel.march(model(event, rate=lambda t, y: [1.0], state=[0.0], stop=sign * 5.0), method, **rule)
    assert run.ended.reason == "event"
    assert run.ended.label == "at"
    assert abs(run.last_time - sign * at) <= 40 * np.spacing(1.0)
    assert sign * run.last_state[0] >= at
    assert run.last_time == run.events[0].time == run.ended.time == run.times[-1]


def test_decay_reaches_a_level_at_its_closed_form() -> None:
    """y = exp(−t) is 1/2 at ln 2."""
    event = newel.StateEvent("half", lambda t, y: y[0] - 0.5, crossing="falling", ends=True)
    run = newel.march(
        model(event, rate=lambda t, y: -y, state=[1.0]), "prince-dormand-8-7", rel_tol=1e-13, abs_tol=1e-13
    )
    assert run.last_time == pytest.approx(math.log(2.0), abs=1e-12)


def test_the_time_found_is_as_good_as_the_method_and_not_only_as_the_interpolant() -> None:
    """Steps of 1/2: a cubic errs by some 1e-3, Prince and Dormand's eighth order by less than 1e-8."""
    run = newel.march(model(newel.StateEvent("zero", lambda t, y: y[0])), "prince-dormand-8-7", step=0.5)
    assert found(run, "zero")[0] == pytest.approx(math.pi / 2, abs=1e-8)


def test_an_event_that_ends_stops_the_march_and_one_that_only_cuts_does_not() -> None:
    end = newel.StateEvent("end", lambda t, y: y[0], crossing="rising", ends=True)
    cut = newel.StateEvent("cut", lambda t, y: y[0] - 0.5)
    run = newel.march(model(end, cut), "dormand-prince-5-4", rel_tol=1e-10, abs_tol=1e-10)
    assert [event.label for event in run.events] == ["cut", "end"]
    assert run.events[0].time == pytest.approx(math.pi / 3, abs=1e-8)
    columns = run.columns()
    assert list(columns["event"][[0, -1]]) == ["", "end"]
    assert list(columns["event"]).count("cut") == 1


def test_no_event_is_found_twice() -> None:
    """The march goes on from the far side; a step of any length after it finds nothing there."""
    for method, rule in RULES.values():
        run = newel.march(model(newel.StateEvent("zero", lambda t, y: y[0])), method, **rule)
        assert len(run.events) == 3
        assert np.diff([event.time for event in run.events]).min() > 3.0


def test_simultaneous_events_come_in_order_of_declaration() -> None:
    events = [
        newel.StateEvent(name, lambda t, y, k=k: k * (y[0] - 0.3))
        for name, k in (("b", 1), ("a", -2), ("c", 3))
    ]
    run = newel.march(model(*events, rate=lambda t, y: [1.0], state=[0.0], stop=1.0), "kutta-4", step=0.25)
    assert [event.label for event in run.events] == ["b", "a", "c"]
    assert len({event.time for event in run.events}) == 1
    assert list(run.columns()["event"]).count("b; a; c") == 1


def test_several_events_in_one_step_come_in_order_of_time() -> None:
    levels = (0.61, 0.2, 0.47, 0.33)
    events = [newel.StateEvent(str(level), lambda t, y, level=level: y[0] - level) for level in levels]
    run = newel.march(model(*events, rate=lambda t, y: [1.0], state=[0.0], stop=1.0), "kutta-4", step=1.0)
    assert [event.label for event in run.events] == ["0.2", "0.33", "0.47", "0.61"]
    assert [event.time for event in run.events] == pytest.approx(sorted(levels))


def test_twenty_events_of_one_vector() -> None:
    events = [newel.StateEvent(f"e{i}", lambda t, y, i=i: y[i] - 1.0) for i in range(20)]
    speeds = np.linspace(1.0, 2.0, 20)
    run = newel.march(
        newel.Model(lambda t, y: speeds, start=0.0, stop=1.5, state=np.zeros(20), events=events),
        "kutta-4",
        step=0.5,
    )
    assert [event.label for event in run.events] == [f"e{i}" for i in reversed(range(20))]
    assert [event.time for event in run.events] == pytest.approx(1.0 / speeds[::-1])


@pytest.mark.parametrize("sign", [1.0, -1.0])
def test_an_indicator_that_is_zero_at_the_start_is_not_armed(sign: float) -> None:
    run = newel.march(
        model(newel.StateEvent("zero", lambda t, y: sign * y[1]), stop=4.0), "kutta-4", step=0.1
    )
    assert found(run, "zero") == pytest.approx([math.pi], abs=1e-5)


@pytest.mark.parametrize("crossing", ["rising", "both"])
def test_zero_exactly_at_the_end_of_a_step_is_the_event_itself(crossing: str) -> None:
    """No step beside it, found once, and at stop too."""
    event = newel.StateEvent("hit", lambda t, y: t - 0.5, crossing=crossing)
    run = newel.march(model(event, stop=1.0), "kutta-4", step=0.25)
    assert run.times.tolist() == [0.0, 0.25, 0.5, 0.75, 1.0]
    assert found(run, "hit") == [0.5]
    run = newel.march(model(event, stop=0.5), "kutta-4", step=0.25)
    assert found(run, "hit") == [0.5]
    assert run.ended.reason == "stop"


def test_an_event_on_a_break_keeps_the_state_of_the_step_that_ends_there() -> None:
    """The rate jumps from 1 to 100 at the break; the event is there, and no stage looks behind it."""
    event = newel.StateEvent("on", lambda t, y: t - 0.5)
    for method in ("kutta-4", "dormand-prince-5-4", "bogacki-shampine-3-2"):
        at_break = model(
            event, rate=lambda t, y: [1.0 if t < 0.5 else 100.0], state=[0.0], stop=1.0, breaks=[0.5]
        )
        run = newel.march(at_break, method, step=0.25)
        assert found(run, "on") == [0.5]
        assert run.events[0].state[0] == pytest.approx(0.5, abs=1e-14)
        assert run.last_state[0] == pytest.approx(50.5, rel=1e-13)


def test_a_jump_of_an_indicator_just_before_a_break_is_landed_without_looking_behind_the_break() -> None:
    times: list[float] = []

    def rate(t: float, y: Any) -> Any:
        times.append(t)
        return [1.0]

    last = math.nextafter(0.5, 0.0)
    event = newel.StateEvent("late", lambda t, y: 1.0 if t >= last else -1.0, ends=True)
    newel.march(model(event, rate=rate, state=[0.0], stop=1.0, breaks=[0.5]), "kutta-4", step=0.25)
    assert max(times) < 0.5


@pytest.mark.parametrize("how", RULES)
def test_an_observed_event_changes_no_step(how: str) -> None:
    """cuts=False: recorded from the cubic between the steps, and the march is what it was."""
    method, rule = RULES[how]
    watching = newel.StateEvent("seen", lambda t, y: y[0], cuts=False)
    run, plain = newel.march(model(watching), method, **rule), newel.march(model(), method, **rule)
    assert run.times.tolist() == plain.times.tolist()
    assert (run.states == plain.states).all()
    assert found(run, "seen") == pytest.approx([math.pi / 2 + n * math.pi for n in range(3)], abs=1e-5)
    assert all(abs(event.state[0]) < 1e-12 for event in run.events)
    assert set(run.columns()["event"]) == {""}


def test_observed_and_cutting_events_of_one_step_are_recorded_in_order_of_time() -> None:
    seen = newel.StateEvent("seen", lambda t, y: y[0] - 0.3, cuts=False)
    later = newel.StateEvent("later", lambda t, y: y[0] - 0.8, cuts=False)
    cut = newel.StateEvent("cut", lambda t, y: y[0] - 0.6, ends=True)
    run = newel.march(
        model(later, cut, seen, rate=lambda t, y: [1.0], state=[0.0], stop=1.0), "kutta-4", step=1.0
    )
    assert [event.label for event in run.events] == ["seen", "cut"]
    both = model(later, seen, rate=lambda t, y: [1.0], state=[0.0], stop=1.0)
    run = newel.march(both, "kutta-4", step=1.0)
    assert [event.label for event in run.events] == ["seen", "later"]
    back = both.replace(rate=lambda t, y: [-1.0], stop=-1.0)
    assert [event.label for event in newel.march(back, "kutta-4", step=1.0).events] == ["seen", "later"]


def test_a_rate_that_branches_on_the_state_is_switched_at_the_event() -> None:
    """y' = −1 above zero, −1/2 below, from 1: zero at t = 1, y(2) = −1/2.

    The stages of the step that lands look over the edge, so that the time is as good as the tolerance only.
    """
    event = newel.StateEvent("floor", lambda t, y: y[0])

    def rate(t: float, y: Any) -> Any:
        return [-1.0 if y[0] > 0 else -0.5]

    for method in ("dormand-prince-5-4", "prince-dormand-8-7", "bogacki-shampine-3-2"):
        run = newel.march(
            model(event, rate=rate, state=[1.0], stop=2.0), method, rel_tol=1e-10, abs_tol=1e-10
        )
        assert found(run, "floor") == pytest.approx([1.0], abs=1e-8)
        assert run.last_state[0] == pytest.approx(-0.5, abs=1e-8)


@pytest.mark.parametrize("start", [0.0, -1.0, 1000.0])
@pytest.mark.parametrize("how", ["fixed", "adaptive"])
def test_events_that_follow_each_other_without_end_are_an_error(start: float, how: str) -> None:
    """y' = −sign(y) slides along zero from start + 1 on; time 0 is no exception."""
    method, rule = {"fixed": ("euler-1", {"step": 0.01}), "adaptive": RULES["adaptive"]}[how]
    event = newel.StateEvent("slides", lambda t, y: y[0])

    def rate(t: float, y: Any) -> Any:
        return [-math.copysign(1.0, y[0])]

    sliding = newel.Model(rate, start=start, stop=start + 5.0, state=[1.0], events=[event])
    with pytest.raises(newel.MarchFailed, match=r"event 'slides' happened 20 times in a row") as caught:
        newel.march(sliding, method, **rule)
    error = caught.value
    assert error.reason == "events"
    assert error.time == pytest.approx(start + 1.0, abs=1e-9)
    assert "ends=True" in str(error)
    assert (
        len(error.run.events) == switches._MOST_AT_ONE_PLACE - 1
        or error.run.events[-1].time <= error.run.last_time
    )


def test_a_sliding_start_next_to_zero_time_is_an_error_too() -> None:
    event = newel.StateEvent("slides", lambda t, y: y[0])
    sliding = newel.Model(
        lambda t, y: [-math.copysign(1.0, y[0])], start=0.0, stop=5.0, state=[1e-17], events=[event]
    )
    with pytest.raises(newel.MarchFailed, match="without moving"):
        newel.march(sliding, "euler-1", step=0.01)


@pytest.mark.parametrize("value", [math.nan, None, "high", 1j])
def test_an_indicator_that_gives_no_number_is_named(value: Any) -> None:
    always = newel.StateEvent("odd", lambda t, y: value)
    with pytest.raises(BadModel, match="indicator of event 'odd'"):
        newel.march(model(always), "kutta-4", step=0.1)
    later = newel.StateEvent("odd", lambda t, y: 1.0 if t < 0.45 else value)
    with pytest.raises(newel.MarchFailed, match="indicator of event 'odd'") as caught:
        newel.march(model(later), "kutta-4", step=0.1)
    assert caught.value.run.last_time == pytest.approx(0.4)
    assert len(caught.value.run.times) == 5


def test_an_indicator_that_raises_is_named_with_its_line() -> None:
    def indicator(t: float, y: Any) -> float:
        return 1.0 / (y[1] + 1.0 if t < 0.2 else 0)

    with pytest.raises(
        newel.MarchFailed, match=r"the indicator of 'odd' raised ZeroDivisionError.*test_events\.py"
    ):
        newel.march(model(newel.StateEvent("odd", indicator)), "kutta-4", step=0.1)


def test_an_indicator_sees_read_only_states_and_the_params() -> None:
    def indicator(t: float, y: Any, p: Any) -> float:
        assert not y.flags.writeable or y.base is None
        return float(y[0] - p)

    event = newel.StateEvent("level", indicator)
    run = newel.march(
        newel.Model(lambda t, y, p: [1.0], start=0.0, stop=1.0, state=[0.0], params=0.625, events=[event]),
        "kutta-4",
        step=0.25,
    )
    assert found(run, "level") == pytest.approx([0.625])


def test_a_fixed_march_leads_back_onto_its_grid_after_an_event() -> None:
    event = newel.StateEvent("at", lambda t, y: t - 0.3)
    run = newel.march(model(event, stop=1.0), "kutta-4", step=0.25)
    assert run.times == pytest.approx([0.0, 0.25, 0.3, 0.5, 0.75, 1.0])
    assert run.times[[1, 3, 4, 5]].tolist() == [0.25, 0.5, 0.75, 1.0]


def test_a_state_changed_after_the_step_takes_the_signs_anew() -> None:
    """A ball that after_step throws back up: each bounce is one event."""

    def bounce(t: float, y: Any) -> Any:
        return np.array([abs(y[0]), -0.5 * y[1]]) if y[0] <= 0.0 and y[1] < 0.0 else None

    event = newel.StateEvent("floor", lambda t, y: y[0], crossing="falling")
    ball = newel.Model(
        lambda t, y: [y[1], -1.0], start=0.0, stop=2.8, state=[0.5, 0.0], events=[event], after_step=bounce
    )
    run = newel.march(ball, "kutta-4", step=0.1)
    # From 1/2 it falls for 1, then flies for 2·(1/2)^n: t = 1, 2, 2.5, 2.75, …
    assert found(run, "floor") == pytest.approx([1.0, 2.0, 2.5, 2.75], abs=1e-9)


@pytest.mark.parametrize("method", ["kutta-4", "dormand-prince-5-4"])
def test_every_call_that_finding_an_event_takes_is_counted(method: str) -> None:
    calls: list[float] = []

    def rate(t: float, y: Any) -> Any:
        calls.append(t)
        return oscillator(t, y)

    run = newel.march(model(newel.StateEvent("zero", lambda t, y: y[0]), rate=rate), method, step=0.1)
    assert run.calls == len(calls)
