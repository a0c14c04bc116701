"""Breaks split the line: stages stay on their own side, steps end on them, and order is kept."""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

import newel

pytestmark = pytest.mark.core

METHODS = {"kutta-4": 4, "dormand-prince-5-4": 5, "gill-4": 4, "verner-1978-9-8": 9}
Side = Callable[[float, float], bool]
SIDES: dict[str, Side] = {"<": lambda t, s: t < s, "<=": lambda t, s: t <= s}


def switched(side: Side, at: float) -> Callable[..., Any]:
    """Growth before, decay after: each piece is smooth and knows nothing of t."""
    return lambda t, y: 0.7 * y if side(t, at) else -1.3 * y


def exact(at: float, stop: float) -> float:
    return math.exp(0.7 * at - 1.3 * (stop - at))


@pytest.mark.parametrize("backwards", [False, True])
@pytest.mark.parametrize("side", SIDES)
@pytest.mark.parametrize("at", [0.5, 0.4375, 0.4], ids=["on the grid", "half a step", "off the grid"])
@pytest.mark.parametrize("method", METHODS)
def test_the_order_is_kept_across_a_break(method: str, at: float, side: str, backwards: bool) -> None:
    """Left limits before and right limits after, whichever side the rate gives to the break itself."""
    order, errors = METHODS[method], []
    for step in (0.25, 0.125):
        if backwards:
            forward = switched(SIDES[side], at)

            def rate(t: float, y: Any, forward: Any = forward) -> Any:
                return -forward(-t, y)

            model = newel.Model(rate, start=0.0, stop=-1.0, state=[1.0], breaks=[-at])
        else:
            model = newel.Model(switched(SIDES[side], at), start=0.0, stop=1.0, state=[1.0], breaks=[at])
        run = newel.march(model, method, step=step)
        assert (-at if backwards else at) in run.times
        errors.append(abs(run.last_state[0] / exact(at, 1.0) - 1.0))
    assert errors[1] < max(errors[0] * 2.0 ** -(order - 0.8), 3e-15)


def test_without_the_break_the_order_is_lost() -> None:
    """That the problem tells: the same march with the break kept secret is of order 1."""
    errors = []
    for step in (1 / 16, 1 / 32):
        model = newel.Model(switched(SIDES["<"], 0.5), start=0.0, stop=1.0, state=[1.0])
        errors.append(abs(newel.march(model, "kutta-4", step=step).last_state[0] - exact(0.5, 1.0)))
    assert errors[1] > 0.4 * errors[0] > 1e-4


@pytest.mark.parametrize("side", SIDES)
@pytest.mark.parametrize("method", METHODS)
def test_no_stage_lies_on_the_wrong_side(method: str, side: str) -> None:
    before, after = [], []
    current = before

    def rate(t: float, y: Any) -> Any:
        current.append(t)
        return -y

    def note(t: float, y: Any) -> None:
        nonlocal current
        if t == 0.5:
            current = after

    for rule in ({"step": 0.2}, {"rel_tol": 1e-6, "abs_tol": 1e-6}, {"steps": newel.Given([0.3, 0.9, 1.0])}):
        before.clear()
        after.clear()
        current = before
        model = newel.Model(rate, start=0.0, stop=1.0, state=[1.0], breaks=[0.5], after_step=note)
        newel.march(model, method, **rule)
        assert max(before) <= math.nextafter(0.5, 0.0)
        assert min(after) == math.nextafter(0.5, 1.0)


def test_a_break_at_the_start_is_stood_beyond() -> None:
    for start, stop in ((0.0, 1.0), (0.0, -1.0)):
        times: list[float] = []

        def rate(t: float, y: Any, times: list[float] = times) -> Any:
            times.append(t)
            return -y

        model = newel.Model(rate, start=start, stop=stop, state=[1.0], breaks=[start])
        newel.march(model, "kutta-4", step=0.25)
        assert start not in times
        assert times[0] == math.nextafter(start, stop)


@pytest.mark.parametrize("side", SIDES)
def test_a_break_at_stop_is_stood_before(side: str) -> None:
    """Without it the last stage takes the rate from beyond, and the step is of order 1."""
    model = newel.Model(
        lambda t, y: [1.0] if SIDES[side](t, 1.0) else [100.0], start=0.0, stop=1.0, state=[0.0], breaks=[1.0]
    )
    for method in ("kutta-4", "dormand-prince-5-4", "verner-1978-9-8"):
        for rule in ({"step": 0.25}, {"rel_tol": 1e-6, "abs_tol": 1e-6}):
            run = newel.march(model, method, **rule)
            assert run.last_state[0] == pytest.approx(1.0, abs=1e-13)
            assert run.last_time == 1.0


def test_stages_beyond_the_end_of_a_step_stay_before_the_break_too() -> None:
    """verner-1978-9-8 has a node at 4/3: a step that ends before the break would look behind it."""
    times: list[float] = []

    def rate(t: float, y: Any) -> Any:
        times.append(t)
        return -y

    for rule in ({"step": 0.25}, {"rel_tol": 1e-6, "abs_tol": 1e-6}):
        times.clear()
        model = newel.Model(rate, start=0.0, stop=1.0, state=[1.0], breaks=[0.55])
        stepper = newel.Stepper(model, "verner-1978-9-8", **rule)
        while stepper.time < 0.55:
            stepper.advance()
        assert max(times) < 0.55


def test_breaks_outside_the_span_are_noted_and_not_used() -> None:
    model = newel.Model(lambda t, y: -y, start=0.0, stop=1.0, state=[1.0], breaks=[-0.5, 2.0])
    run = newel.march(model, "kutta-4", step=0.25)
    assert run.accepted == 4
    assert [note.text for note in run.notes] == [
        "the break at -0.5 lies outside 0.0 to 1.0 and is not used",
        "the break at 2.0 lies outside 0.0 to 1.0 and is not used",
    ]


def test_breaks_closer_together_than_a_step() -> None:
    breaks = [0.3, 0.31, 0.32, 0.7]
    model = newel.Model(lambda t, y: y, start=0.0, stop=1.0, state=[1.0], breaks=breaks)
    run = newel.march(model, "kutta-4", step=0.25)
    assert run.times.tolist() == [0.0, 0.25, 0.3, 0.31, 0.32, 0.5, 0.7, 0.75, 1.0]
    adaptive = newel.march(model, "dormand-prince-5-4", rel_tol=1e-3, abs_tol=1e-3)
    assert set(breaks) < set(adaptive.times.tolist())
    assert adaptive.last_state[0] == pytest.approx(math.e, abs=1e-3)


def test_two_breaks_one_spacing_apart() -> None:
    one = 0.5
    two = math.nextafter(one, 1.0)
    for start, stop in ((0.0, 1.0), (1.0, 0.0)):
        model = newel.Model(lambda t, y: y, start=start, stop=stop, state=[1.0], breaks=[one, two])
        for rule in ({"step": 0.25}, {"rel_tol": 1e-6, "abs_tol": 1e-6}):
            run = newel.march(model, "dormand-prince-5-4", **rule)
            assert {one, two} < set(run.times.tolist())
            assert run.last_state[0] == pytest.approx(math.exp(stop - start), rel=1e-4)


def test_a_break_that_rounding_sets_beside_a_grid_point_is_that_grid_point() -> None:
    """3·0.1 is 0.30000000000000004, and a schedule says 0.3: one step ends there, and none is a sliver."""
    model = newel.Model(lambda t, y: y, start=0.0, stop=1.0, state=[1.0], breaks=[0.3, 0.7])
    run = newel.march(model, "kutta-4", step=0.1)
    assert run.accepted == 10
    assert {0.3, 0.7} < set(run.times.tolist())
    back = newel.march(model.replace(start=1.0, stop=0.0), "kutta-4", step=0.1)
    assert back.accepted == 10


def test_a_march_leads_back_onto_its_grid() -> None:
    model = newel.Model(lambda t, y: y, start=0.0, stop=1.0, state=[1.0], breaks=[0.3])
    run = newel.march(model, "kutta-4", step=0.25)
    assert run.times.tolist() == [0.0, 0.25, 0.3, 0.5, 0.75, 1.0]


def test_an_event_before_a_break_beside_a_grid_point_leaves_the_grid_as_it_is() -> None:
    """The step to the break is cut by the event; the grid point there is still to come."""
    event = newel.StateEvent("it", lambda t, y: t - 0.25)
    model = newel.Model(lambda t, y: y, start=0.0, stop=0.9, state=[1.0], breaks=[0.3], events=[event])
    run = newel.march(model, "kutta-4", step=0.1)
    assert run.times == pytest.approx([0, 0.1, 0.2, 0.25, 0.3, 0.4, 0.5, 0.6, 0.7, 0.8, 0.9])


def test_the_memory_of_the_controller_ends_at_a_break() -> None:
    starts: list[int] = []

    class Counting:
        name = "counting"

        def start(self) -> tuple[float, ...]:
            starts.append(1)
            return ()

        def decide(self, error: float, step: float, order: int, memory: Any) -> Any:
            return True, 1.0, (*memory, 1.0)

    model = newel.Model(lambda t, y: 0 * y, start=0.0, stop=1.0, state=[1.0], breaks=[0.25, 0.5])
    newel.march(
        model, "dormand-prince-5-4", steps=newel.Adaptive(rel_tol=1e-3, abs_tol=1e-3, controller=Counting())
    )
    assert len(starts) == 3


def test_many_breaks_do_not_slow_the_end_nor_cost_rejections() -> None:
    breaks = [n / 100 for n in range(1, 100)]
    model = newel.Model(
        lambda t, y: np.array([np.searchsorted(breaks, t) % 2 - 0.5]),
        start=0.0,
        stop=1.0,
        state=[0.0],
        breaks=breaks,
    )
    run = newel.march(model, "dormand-prince-5-4", rel_tol=1e-9, abs_tol=1e-9)
    assert run.rejected == 0
    assert run.accepted <= 110
    assert run.last_state[0] == pytest.approx(0.0, abs=1e-12)
