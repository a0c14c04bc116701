"""Filling and emptying through an opening under a falling head.

Torricelli's law with a contraction coefficient, Q = C·a·√(2·g·h), and the time that two vessels with vertical
walls need to come from the head h1 to the head h2:

    t = 2·A1·A2·(√h1 − √h2) / ((A1 + A2)·C·a·√(2·g))

Textbook hydraulics, found in any book on the subject, for instance V. L. Streeter and E. B. Wylie, Fluid
Mechanics, in the chapter on flow measurement (unsteady flow from reservoirs). From memory.
"""

from __future__ import annotations

import math

import numpy as np
import pytest

import newel
from newel.examples.lock import (
    HEAD_AT_OPENING,
    Lock,
    closed_form,
    flow,
    gates_open_at,
    head,
    head_left,
    model,
    rate,
)
from newel.models.loading import load_model

pytestmark = pytest.mark.core

# Cases that open all at once at t = 0: the gate paddle alone, of 0.3 m2.
AT_ONCE = {"paddle": 0.0, "gate_at": 0.0}
CASES = [{}, AT_ONCE, {"paddle": 0.6}, {"gate_at": 50.0}, {"gate_at": 2000.0}, {"lift": 12.0}]


def textbook_time(lock: Lock, area: float, h1: float, h2: float) -> float:
    a1, a2 = lock.chamber_area, lock.pound_area
    return (
        2
        * a1
        * a2
        * (math.sqrt(h1) - math.sqrt(h2))
        / ((a1 + a2) * lock.coefficient * area * math.sqrt(2 * 9.81))
    )


@pytest.mark.parametrize("lift", [0.5, 2.8, 9.0])
def test_the_time_of_opening_is_the_textbook_time_where_the_area_is_constant(lift):
    lock = Lock(**AT_ONCE, lift=lift)
    assert gates_open_at(lock) == pytest.approx(textbook_time(lock, 0.3, lift, 0.02), rel=1e-13)


def test_a_worked_example_by_hand():
    """A chamber of 100 m2 off a lake, an opening of 0.5 m2, C = 0.6, from 4 m to 1 m of head.

    By hand: 2·100·(2 − 1) / (0.6·0.5·√19.62) = 200 / 1.328834… = 150.508 s.
    """
    lock = Lock(lift=4.0, coefficient=0.6, chamber_area=100.0, pound_area=1e9, gate_area=0.5, **AT_ONCE)
    assert head(closed_form(150.508, lock)[0]) == pytest.approx(1.0, abs=1e-5)


@pytest.mark.parametrize("settings", CASES)
def test_the_closed_form_obeys_the_law_of_the_flow(settings):
    """The derivative of the closed form, by a central difference, is the rate of the model."""
    lock = Lock(**settings)
    knots = (lock.wind_from, lock.wind_to, lock.gate_at)
    for t in np.arange(1.5, gates_open_at(lock), 7.0):
        if min(abs(t - knot) for knot in knots) > 0.01:
            before, here, after = closed_form([t - 1e-3, t, t + 1e-3], lock)
            assert (after - before) / 2e-3 == pytest.approx(np.array(rate(t, here, lock)), rel=1e-5, abs=1e-7)


@pytest.mark.parametrize("settings", CASES)
def test_water_is_neither_made_nor_lost(settings):
    lock = Lock(**settings)
    states = closed_form(np.linspace(0.0, 900.0, 50), lock)
    lost, gained = states[0, 0] - states[:, 0], states[:, 1] - states[0, 1]
    assert lost * lock.pound_area == pytest.approx(states[:, 2], abs=1e-8)
    assert gained * lock.chamber_area == pytest.approx(states[:, 2], abs=1e-8)
    assert np.all(np.diff(states[:, 2]) >= 0.0)
    assert np.all(states[:, 0] >= states[:, 1] - 1e-12)


@pytest.mark.parametrize("settings", CASES)
def test_at_the_time_of_opening_the_head_is_two_centimetres_and_falling(settings):
    lock = Lock(**settings)
    t = gates_open_at(lock)
    state = closed_form(t, lock)[0]
    assert head(state) == pytest.approx(HEAD_AT_OPENING, abs=1e-12)
    assert head_left(t, state, lock) == pytest.approx(0.0, abs=1e-12)
    assert rate(t, state, lock)[0] - rate(t, state, lock)[1] < -1e-4  # a crossing, not a touch


def test_the_opening_integrates_to_what_was_opened():
    lock = Lock(paddle=0.7)
    times = np.linspace(0.0, 400.0, 400_001)
    areas = np.array([lock.opening(t) for t in times[:-1] + 0.0005])
    assert areas.sum() * 0.001 == pytest.approx(lock.opened(400.0), rel=1e-9)


def test_water_flows_down_the_head_whichever_way_that_is():
    lock = Lock()
    assert flow(200.0, np.array([3.0, 1.0, 0.0]), lock) > 0.0
    assert flow(200.0, np.array([1.0, 3.0, 0.0]), lock) == -flow(200.0, np.array([3.0, 1.0, 0.0]), lock)
    assert flow(200.0, np.array([1.0, 1.0, 0.0]), lock) == 0.0
    assert flow(0.0, np.array([3.0, 1.0, 0.0]), lock) == 0.0


def test_gates_that_never_open_are_said_to_open_at_infinity():
    assert gates_open_at(Lock(paddle=0.0, gate_area=0.0)) == math.inf


def test_the_model_has_units_breaks_and_one_event_that_ends():
    lock = load_model("example:lock", gate_at=100.0)
    assert lock.breaks == (20.0, 80.0, 100.0)
    assert lock.units == ("m", "m", "m3")
    assert [(e.label, e.crossing, e.ends) for e in lock.events] == [("gates may be opened", "falling", True)]
    assert lock.state.tolist() == closed_form(0.0)[0].tolist()
    assert lock.examine().findings == ()


@pytest.mark.parametrize(
    ("settings", "words"),
    [
        ({"paddle": 1.5}, "paddle is 1.5\n  Give a number from 0 to 1."),
        ({"lift": 0.0}, "lift is 0.0"),
        ({"coefficient": "high"}, "coefficient is 'high'"),
        ({"gate_at": float("nan")}, "gate_at is nan"),
    ],
)
def test_settings_out_of_range_are_refused(settings, words):
    with pytest.raises(ValueError, match=words):
        model(**settings)


@pytest.mark.parametrize("settings", [{}, {"paddle": 0.6}, {"gate_at": 143.3}, {"lift": 12.0}])
def test_an_adaptive_march_finds_the_levels_and_the_time_of_opening(settings):
    """The errors of levels, volume and time of opening stay near the tolerance."""
    lock = Lock(**settings)
    for tolerance, allowed in ((1e-6, 1e-3), (1e-9, 5e-6), (1e-12, 5e-9)):
        run = newel.march(model(**settings), "dormand-prince-5-4", rel_tol=tolerance, abs_tol=tolerance)
        assert (run.ended.reason, run.ended.label) == ("event", "gates may be opened")
        assert run.last_time == pytest.approx(gates_open_at(lock), abs=allowed)
        assert np.abs(run.states - closed_form(run.times, lock)).max() < allowed
        assert head(run.last_state) == pytest.approx(HEAD_AT_OPENING, abs=1e-9)
        assert [event.label for event in run.events] == ["gates may be opened"]


@pytest.mark.parametrize("gate_at", [150.0, 143.3])
def test_breaks_keep_the_order_of_fixed_steps_across_a_paddle_that_drops_open(gate_at):
    """Halving the step divides the error by 16 with breaks, on the grid and off it, and by 2 without them."""
    lock = Lock(gate_at=gate_at)
    split = model(gate_at=gate_at, stop=200.0)

    def worst(marched, step):
        run = newel.march(marched, "kutta-4", step=step)
        return np.abs(run.states - closed_form(run.times, lock)).max()

    assert worst(split, 10.0) / worst(split, 1.25) == pytest.approx(16.0**3, rel=0.15)
    blind = split.replace(breaks=())
    assert worst(blind, 1.25) > 1e6 * worst(split, 1.25)
