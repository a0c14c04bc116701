"""The march in the caller's hands: it gives what `march` gives, and goes back to the bit."""

from __future__ import annotations

import math
from collections.abc import Callable
from fractions import Fraction
from typing import Any

import numpy as np
import pytest

import newel
from newel.errors import BadModel, BadRequest

pytestmark = pytest.mark.core


def swing(t: float, y: Any) -> Any:
    return np.array([y[1], -math.sin(y[0]) + 0.1 * math.cos(t)])


def model(rate: Callable[..., Any] = swing, **more: Any) -> newel.Model:
    return newel.Model(rate, **{"start": 0.0, "stop": 4.0, "state": [1.0, 0.0], **more})


RULES: dict[str, tuple[str, dict[str, Any]]] = {
    "fixed": ("kutta-4", {"step": 0.3}),
    "fixed, first same as last": ("dormand-prince-5-4", {"step": 0.3}),
    "given": ("kutta-4", {"steps": newel.Given([0.5, 1.0, 1.1, 1.5, 2.0, 2.4, 2.8, 3.2, 3.6, 4.0])}),
    "function": ("kutta-4", {"step": lambda t, y, *p: 0.2 + 0.1 * abs(y[0])}),
    "adaptive": ("dormand-prince-5-4", {"rel_tol": 1e-6, "abs_tol": 1e-6}),
    "high": ("prince-dormand-8-7", {"rel_tol": 1e-6, "abs_tol": 1e-6}),
    "doubled": ("kutta-4", {"rel_tol": 1e-6, "abs_tol": 1e-6}),
}


@pytest.mark.parametrize("how", RULES)
def test_advance_until_stop_is_march(how: str) -> None:
    method, rule = RULES[how]
    events = [newel.StateEvent("zero", lambda t, y: y[0])]
    run = newel.march(model(breaks=[1.7], events=events), method, **rule)
    stepper = newel.Stepper(model(breaks=[1.7], events=events), method, **rule)
    times, states = [stepper.time], [stepper.state]
    while stepper.time != 4.0:
        promised = stepper.next_step
        assert promised > 0.0
        assert stepper.advance() == stepper.time
        assert stepper.last_step == stepper.time - times[-1]
        times.append(stepper.time)
        states.append(stepper.state)
    assert times == run.times.tolist()
    assert np.array_equal(states, run.states)
    assert (stepper.accepted, stepper.rejected, stepper.calls) == (run.accepted, run.rejected, run.calls)
    assert [event.time for event in stepper.events] == [event.time for event in run.events]
    assert stepper.estimator == run.estimator
    with pytest.raises(BadRequest, match=r"stands at the model's stop, t = 4\.0"):
        stepper.advance()


@pytest.mark.parametrize("how", RULES)
@pytest.mark.parametrize("point", [0, 3, 7])
def test_restore_goes_back_to_the_bit(how: str, point: int) -> None:
    """State, params that after_step wrote to, controller, grid, compensation, events and counters."""

    def rate(t: float, y: Any, p: Any) -> Any:
        return swing(t, y) * p["gain"][0]

    def after(t: float, y: Any, p: Any) -> Any:
        p["gain"][0] *= 1.01
        return y * 0.999 if len(p["seen"]) % 3 == 2 else p["seen"].append(t)

    method, rule = RULES[how]
    stepper = newel.Stepper(
        model(
            rate,
            breaks=[1.7],
            events=[newel.StateEvent("zero", lambda t, y, p: y[0])],
            after_step=after,
            params={"gain": np.array([1.0]), "seen": []},
        ),
        method,
        **rule,
    )

    def finish() -> list[Any]:
        rows = []
        while stepper.time != 4.0:
            stepper.advance()
            rows.append(
                (stepper.time, stepper.state.tolist(), stepper.calls, stepper.accepted, stepper.rejected)
            )
        return [*rows, [(event.label, event.time) for event in stepper.events]]

    for _ in range(point):
        stepper.advance()
    saved = stepper.save()
    first = finish()
    stepper.restore(saved)
    assert finish() == first
    end = stepper.save()
    stepper.restore(saved)
    assert [event.time for event in stepper.events] == [
        t for t in [e[1] for e in first[-1]] if t <= stepper.time
    ]
    stepper.restore(end)
    assert [(event.label, event.time) for event in stepper.events] == first[-1]


def test_an_end_by_an_event_is_saved_and_restored() -> None:
    event = newel.StateEvent("half", lambda t, y: y[0] - 0.5, ends=True)
    stepper = newel.Stepper(model(lambda t, y: -y, state=[1.0], events=[event]), "kutta-4", step=0.1)
    start = stepper.save()
    assert stepper.advance_to(4.0) == pytest.approx(math.log(2), abs=1e-6)
    end = stepper.save()
    stepper.restore(start)
    assert stepper.events == ()
    stepper.advance()
    stepper.restore(end)
    with pytest.raises(BadRequest, match="event 'half' ended this march at t = 0\\.69"):
        stepper.advance()
    with pytest.raises(BadRequest, match="event 'half'"):
        stepper.propose(0.1)


@pytest.mark.parametrize("other", [None, "text"])
def test_what_no_stepper_of_this_model_saved_is_refused(other: Any) -> None:
    stepper = newel.Stepper(model(), "kutta-4", step=0.5)
    foreign = newel.Stepper(model(lambda t, y: -y, state=[1.0]), "kutta-4", step=0.5).save()
    for saved in (other, foreign):
        with pytest.raises(BadRequest, match="not a place that a stepper of this model saved"):
            stepper.restore(saved)
    assert stepper.advance() == 0.5


@pytest.mark.parametrize("how", RULES)
def test_advance_to_lands_anywhere_and_finds_its_way_back(how: str) -> None:
    method, rule = RULES[how]
    stepper = newel.Stepper(model(), method, **rule)
    for t in (0.05, 0.9, 0.9, 1.0000001, 3.0):
        assert stepper.advance_to(t) == stepper.time == t
    if how == "fixed":
        assert [stepper.advance() for _ in range(2)] == pytest.approx([3.3, 3.6])
    stepper.advance_to(4.0)
    want = newel.march(model(), "prince-dormand-8-7", rel_tol=1e-10, abs_tol=1e-10).last_state
    assert stepper.state == pytest.approx(want, abs=2e-3)


@pytest.mark.parametrize(
    ("t", "words"),
    [(0.1, "lies behind the stepper"), (4.5, "beyond the model's stop, 4.0"), (math.nan, "lies behind")],
)
def test_advance_to_goes_only_forwards_and_not_past_stop(t: float, words: str) -> None:
    stepper = newel.Stepper(model(), "kutta-4", step=0.5)
    stepper.advance()
    with pytest.raises(BadRequest, match=words):
        stepper.advance_to(t)
    assert stepper.time == 0.5


def test_a_proposal_changes_nothing_until_it_is_accepted() -> None:
    stepper = newel.Stepper(model(), "dormand-prince-5-4", rel_tol=1e-6, abs_tol=1e-6)
    before = stepper.state
    trial = stepper.propose(0.25)
    assert stepper.time == 0.0
    assert stepper.state.tolist() == before.tolist() == stepper.view.tolist()
    want, error = newel.one_step(swing, 0.0, before, 0.25, "dormand-prince-5-4")
    assert trial.time == 0.25
    assert trial.state == pytest.approx(want, rel=1e-14)
    assert trial.error == pytest.approx(error, rel=1e-6)
    scale = 1e-6 + 1e-6 * np.maximum(abs(before), abs(want))
    assert trial.error_norm == pytest.approx(math.sqrt(np.mean((error / scale) ** 2)), rel=1e-6)
    trial.accept()
    assert (stepper.time, stepper.accepted, stepper.rejected) == (0.25, 1, 0)
    assert stepper.state.tolist() == trial.state.tolist()


def test_what_a_stepper_shows_is_its_own() -> None:
    stepper = newel.Stepper(model(), "kutta-4", step=0.5)
    stepper.state[:] = 99.0
    assert stepper.state[0] == 1.0
    with pytest.raises(ValueError, match="read-only"):
        stepper.view[0] = 99.0
    view, trial = stepper.view, stepper.propose(0.5)
    trial.state[:] = 7.0
    trial.accept()
    assert view[0] == stepper.state[0] != 7.0


def test_a_trial_is_judged_once() -> None:
    stepper = newel.Stepper(model(), "kutta-4", step=0.5)
    spend: list[Callable[[newel.Stepper], Any]] = [
        lambda s: s.advance(),
        lambda s: s.propose(0.1),
        lambda s: s.restart(time=0.0),
        lambda s: s.restore(s.save()),
        lambda s: s.advance_to(1.9),
    ]
    for action in spend:
        trial = stepper.propose(0.25)
        action(stepper)
        where = stepper.time
        for judge in (trial.accept, trial.reject):
            with pytest.raises(BadRequest, match="is spent"):
                judge()
        assert stepper.time == where
    trial = stepper.propose(0.1)
    trial.reject()
    assert stepper.rejected == 1
    with pytest.raises(BadRequest, match="is spent"):
        trial.accept()


@pytest.mark.parametrize("step", [0.0, -0.1, math.nan, math.inf])
def test_a_proposal_has_a_positive_length(step: float) -> None:
    with pytest.raises(BadRequest, match=r"step=.*must be positive and finite"):
        newel.Stepper(model(), "kutta-4", step=0.5).propose(step)


def test_a_proposal_past_stop_is_refused_and_one_that_rounding_sets_there_is_not() -> None:
    stepper = newel.Stepper(model(stop=0.3), "kutta-4", step=0.1)
    with pytest.raises(BadRequest, match="beyond the model's stop"):
        stepper.propose(0.4)
    for _ in range(3):
        stepper.advance(step=0.1)
    assert stepper.time == 0.3


@pytest.mark.parametrize("how", ["fixed", "given", "function"])
def test_steps_of_ones_own_and_the_rules_go_together(how: str) -> None:
    """A proposal that passes grid points leaves the rule at the next one ahead."""
    method, rule = RULES[how]
    stepper = newel.Stepper(model(), method, **rule)
    stepper.advance(step=0.7)
    assert stepper.time == 0.7
    after = {"fixed": 0.9, "given": 1.0}.get(how)
    assert stepper.advance() > 0.7
    assert after is None or stepper.time == pytest.approx(after)
    stepper.advance_to(4.0)
    assert stepper.state == pytest.approx(newel.march(model(), "kutta-4", step=0.01).last_state, abs=5e-3)


def test_backwards_lengths_are_positive_too() -> None:
    stepper = newel.Stepper(model(stop=-4.0), "kutta-4", step=0.25)
    assert stepper.advance() == -0.25
    assert stepper.advance(step=0.5) == -0.75
    assert stepper.last_step == -0.5
    assert stepper.next_step == 0.25
    assert stepper.advance_to(-2.1) == -2.1


def test_an_exact_stepper_stays_exact() -> None:
    state = np.array([Fraction(1)], dtype=object)
    stepper = newel.Stepper(model(lambda t, y: y, state=state), "euler-1", step=Fraction(1, 3))
    stepper.advance()
    assert stepper.time == Fraction(1, 3)
    stepper.advance(step=Fraction(1, 7))
    assert stepper.time == Fraction(10, 21)
    stepper.advance_to(0.5)
    assert stepper.time == Fraction(1, 2)
    assert stepper.state[0] == Fraction(4, 3) * Fraction(8, 7) * Fraction(43, 42)
    stepper.restart(time=0)
    assert stepper.time == 0
    assert type(stepper.time) is Fraction


def test_a_restart_takes_another_state_and_time() -> None:
    event = newel.StateEvent("low", lambda t, y: y[0] - 0.5)
    decay = model(lambda t, y: -y, state=[1.0], events=[event], breaks=[1.0])
    for method, rule in RULES.values():
        stepper = newel.Stepper(decay, method, **rule)
        stepper.advance_to(2.0)
        found = len(stepper.events)
        stepper.restart(state=[8.0], time=0.25)
        assert (stepper.time, stepper.state[0]) == (0.25, 8.0)
        stepper.advance_to(4.0)
        assert stepper.state[0] == pytest.approx(8.0 * math.exp(-3.75), rel=1e-2)
        assert len(stepper.events) == found + 1


@pytest.mark.parametrize(
    ("arguments", "error", "words"),
    [
        ({"time": 5.0}, BadRequest, "outside the model's span, 0.0 to 4.0"),
        ({"time": math.nan}, BadRequest, "outside the model's span"),
        ({"state": [1.0]}, BadModel, r"state has shape \(1,\)"),
        ({"state": [math.nan, 0.0]}, BadModel, "not finite"),
        ({"state": [1j, 0.0]}, BadModel, "dtype complex128"),
    ],
)
def test_a_restart_with_what_does_not_fit_leaves_all_as_it_was(
    arguments: dict[str, Any], error: type[Exception], words: str
) -> None:
    stepper = newel.Stepper(model(), "kutta-4", step=0.5)
    stepper.advance()
    before = stepper.state
    with pytest.raises(error, match=words):
        stepper.restart(**arguments)
    assert stepper.time == 0.5
    assert stepper.state.tolist() == before.tolist()
    assert stepper.advance() == 1.0


@pytest.mark.parametrize("how", ["fixed", "adaptive"])
def test_a_failure_leaves_the_stepper_at_its_last_accepted_step(how: str) -> None:
    broken = {"now": False}

    def rate(t: float, y: Any) -> Any:
        if broken["now"]:
            raise RuntimeError("sensor lost")
        return -y

    method, rule = RULES[how]
    stepper = newel.Stepper(model(rate), method, **rule)
    stepper.advance()
    t, state = stepper.time, stepper.state
    broken["now"] = True
    for act in (stepper.advance, lambda: stepper.propose(0.1), lambda: stepper.advance_to(4.0)):
        with pytest.raises(newel.MarchFailed, match="rate raised RuntimeError: sensor lost") as caught:
            act()
        assert caught.value.run.last_time == caught.value.time == t
        assert (stepper.time, stepper.state.tolist()) == (t, state.tolist())
    broken["now"] = False
    assert stepper.advance_to(4.0) == 4.0
    assert stepper.state == pytest.approx(np.array([1.0, 0.0]) * math.exp(-4.0), abs=1e-3)


def test_a_proposal_that_is_not_finite_or_not_within_fails() -> None:
    stepper = newel.Stepper(model(lambda t, y: y / (t < 0.5), within=(-5.0, 5.0)), "kutta-4", step=0.25)
    with np.errstate(all="ignore"), pytest.raises(newel.MarchFailed, match="rate gave"):
        stepper.propose(2.0)
    stepper = newel.Stepper(model(lambda t, y: 10.0 * y, within=(-5.0, 5.0)), "kutta-4", step=0.01)
    with pytest.raises(newel.MarchFailed, match=r"'y\[0\]' = .* leaves within at t = 1 "):
        stepper.propose(1.0)
    assert stepper.time == 0.0


def test_a_proposal_accepted_across_an_ending_event_ends_the_march_there() -> None:
    event = newel.StateEvent("half", lambda t, y: y[0] - 0.5, ends=True)
    stepper = newel.Stepper(model(lambda t, y: -y, state=[1.0], events=[event]), "kutta-4", step=0.1)
    stepper.advance(step=1.0)
    assert [(e.label, e.time) for e in stepper.events] == [("half", 1.0)]
    with pytest.raises(BadRequest, match="event 'half' ended"):
        stepper.advance()


def test_the_sum_of_a_fixed_stepper_is_compensated_through_save_and_restore() -> None:
    def end(pauses: range) -> float:
        stepper = newel.Stepper(model(lambda t, y: y * 0 + 0.1, state=[1.0]), "kutta-4", step=1 / 1024)
        for n in range(2000):
            if n in pauses:
                stepper.restore(stepper.save())
            stepper.advance()
        return float(stepper.state[0])

    assert end(range(0)) == end(range(1, 2000))


def test_a_bad_request_is_refused_as_by_march() -> None:
    with pytest.raises(BadRequest, match="no step rule"):
        newel.Stepper(model(), "kutta-4")
    with pytest.raises(newel.errors.UnknownMethod):
        newel.Stepper(model(), "no-such-method", step=0.1)
    with pytest.raises(BadModel, match="rate returned None"):
        newel.Stepper(model(lambda t, y: None), "kutta-4", step=0.1)


@pytest.mark.parametrize("how", ["fixed", "adaptive"])
def test_a_place_saved_on_a_break_is_restored_beyond_it(how: str) -> None:
    times: list[float] = []

    def rate(t: float, y: Any) -> Any:
        times.append(t)
        return -y

    method, rule = RULES[how]
    stepper = newel.Stepper(model(rate, breaks=[1.7]), method, **rule)
    stepper.advance_to(1.7)
    saved = stepper.save()
    first = stepper.advance_to(2.0), stepper.state.tolist()
    stepper.restore(saved)
    times.clear()
    assert (stepper.advance_to(2.0), stepper.state.tolist()) == first
    assert min(times) == math.nextafter(1.7, 2.0)


def test_an_interruption_within_the_change_of_state_is_made_good() -> None:
    """Ctrl-C after the state is changed and before its time is: both are of the new step."""
    times: list[float] = []

    def rate(t: float, y: Any) -> Any:
        times.append(t)
        return -y

    for method, rule in (RULES["fixed"], RULES["adaptive"]):
        stepper, twin = (newel.Stepper(model(rate, breaks=[0.25]), method, **rule) for _ in range(2))
        engine = stepper._loop.step
        accept = engine.accept

        def struck(accept: Callable[[], None] = accept) -> None:
            accept()
            raise KeyboardInterrupt

        while stepper.time < 0.25:
            engine.accept = struck
            before = stepper.accepted
            with pytest.raises(KeyboardInterrupt):
                stepper.advance()
            engine.accept = accept
            assert stepper.accepted == before + 1
        assert stepper.time == 0.25
        assert stepper.state == pytest.approx(np.array([math.exp(-0.25), 0.0]), abs=1e-5)
        times.clear()
        stepper.advance()
        assert min(times) == math.nextafter(0.25, 1.0)
        twin.advance_to(4.0)
        stepper.advance_to(4.0)
        assert stepper.state == pytest.approx(twin.state, rel=1e-5)
