"""A program owns its loop: a logic controller samples a tank, and is rolled back when it is too late.

The tank fills at a constant rate while its valve is shut, and drains by k·h while it is open. The valve is an
entry of the state that does not change by itself. The controller wants to open the valve when the level is
within 1 mm above its limit, though it looks every 20 s only: where a sample is too high it rolls back and
looks again after half the time.
"""

import math

import numpy as np
import pytest

import newel

pytestmark = pytest.mark.core

FILL, DRAIN = 0.01, 0.02  # m/s, 1/s
LIMIT, CLOSE, LATEST = 2.0, 1.2, 1e-3  # m
SAMPLE, STOP = 20.0, 600.0  # s


def rate(t, y):
    level, valve = y
    return [FILL - valve * DRAIN * level, 0.0]


def tank():
    return newel.Model(rate, start=0.0, stop=STOP, state=[1.0, 0.0], labels=("level", "valve"))


def stepper():
    return newel.Stepper(tank(), "dormand-prince-5-4", rel_tol=1e-10, abs_tol=1e-12)


def run_controller(marcher):
    """The program: returns when the valve was moved, and how often a sample was taken back."""
    moved, taken_back = [], 0
    while marcher.time < STOP:
        saved, ahead = marcher.save(), SAMPLE
        while True:
            marcher.advance_to(min(marcher.time + ahead, STOP))
            level, valve = marcher.state
            late = level - LIMIT if valve == 0.0 else CLOSE - level
            if late <= LATEST:
                break
            marcher.restore(saved)
            taken_back += 1
            ahead /= 2.0
        if late >= 0.0:
            marcher.restart(state=[level, 1.0 - valve])
            moved.append(marcher.time)
    return moved, taken_back


def test_the_valve_moves_when_the_closed_form_says_so():
    moved, taken_back = run_controller(stepper())
    assert taken_back > 0
    # Filling is linear; draining decays from 2 m towards 0.5 m. Each move is late by 1 mm of level at most.
    filling = (LIMIT - 1.0) / FILL
    settled = FILL / DRAIN
    draining = math.log((LIMIT - settled) / (CLOSE - settled)) / DRAIN
    refilling = (LIMIT - CLOSE) / FILL
    expected = np.cumsum([filling, *[draining, refilling] * 10])
    expected = expected[expected < STOP]
    assert len(moved) == len(expected)
    worst_rate = min(FILL, DRAIN * CLOSE - FILL)  # m/s: a millimetre late is this many seconds late
    late = np.array(moved) - expected
    assert np.abs(late).max() < len(moved) * LATEST / worst_rate


def test_a_program_that_rolled_back_goes_on_as_if_it_never_had():
    straight, wandering = stepper(), stepper()
    straight.advance_to(50.0)
    wandering.advance_to(50.0)
    saved = wandering.save()
    wandering.advance_to(400.0)
    wandering.restore(saved)
    while straight.time < STOP:
        assert wandering.advance() == straight.advance()
        assert (wandering.state == straight.state).all()
    assert wandering.calls == straight.calls


def test_a_proposed_step_can_be_refused_without_a_trace():
    marcher = stepper()
    marcher.advance_to(50.0)
    before = marcher.state
    trial = marcher.propose(100.0)
    assert trial.time == 150.0
    assert trial.state[0] == pytest.approx(2.5, abs=1e-9)  # 1 m and 150 s of filling
    trial.reject()
    assert marcher.time == 50.0
    assert (marcher.state == before).all()


def test_the_program_is_told_when_it_asks_for_time_beyond_the_model():
    marcher = stepper()
    with pytest.raises(newel.errors.BadRequest, match=r"beyond the model's stop, 600"):
        marcher.advance_to(STOP + 1.0)
    assert marcher.time == 0.0
