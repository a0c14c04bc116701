"""A loop from an old program is replaced by one line, and a reviewer is shown that nothing changed.

Two basins stand side by side. At t = 100 s a gate between them is opened, and from then on the difference of
their levels falls exponentially: closed form, so that the gain from declaring the break can be measured too.
"""

import math

import numpy as np
import pytest

import newel

pytestmark = pytest.mark.core

GATE_AT = 100.0  # s
CONDUCTANCE = 0.02  # 1/s
STEP, STEPS = 8.0, 50


def rate(t, y):
    upper, lower = y
    flow = CONDUCTANCE * (upper - lower) if t >= GATE_AT else 0.0
    return np.array([-flow, flow])


def old_loop():
    """The loop as it stood in the old program: Kutta's fourth-order method, written out."""
    t, y, h = 0.0, np.array([3.0, 1.0]), STEP
    times, states = [t], [y]
    for _ in range(STEPS):
        k1 = rate(t, y)
        k2 = rate(t + h / 2, y + h / 2 * k1)
        k3 = rate(t + h / 2, y + h / 2 * k2)
        k4 = rate(t + h, y + h * k3)
        y = y + h / 6 * (k1 + 2 * k2 + 2 * k3 + k4)
        t = t + h
        times.append(t)
        states.append(y)
    return np.array(times), np.array(states)


def model(**changes):
    return newel.Model(rate, start=0.0, stop=STEP * STEPS, state=[3.0, 1.0], **changes)


def units_apart(old, new):
    """The largest difference in units in the last place of each column's largest value."""
    assert old.shape == new.shape
    unit = np.spacing(np.abs(old).max(axis=0))
    return float((np.abs(new - old) / unit).max())


def error_at_the_end(run):
    """The distance from the closed form: the mean level stays, the difference decays from the gate on."""
    left = math.exp(-2.0 * CONDUCTANCE * (run.last_time - GATE_AT))
    return float(np.abs(run.last_state - [2.0 + left, 2.0 - left]).max())


def test_one_line_gives_the_numbers_of_the_loop():
    times, states = old_loop()
    run = newel.march(model(), "kutta-4", step=STEP)
    assert units_apart(times, run.times) == 0.0
    assert units_apart(states, run.states) <= 8.0
    assert run.calls == 4 * STEPS


def test_each_step_by_itself_gives_the_numbers_of_the_loop():
    times, states = old_loop()
    steps = [
        newel.one_step(rate, t, y, STEP, "kutta-4")[0] for t, y in zip(times[:-1], states[:-1], strict=True)
    ]
    assert units_apart(states[1:], np.array(steps)) <= 4.0


def test_the_same_comparison_finds_a_loop_that_holds_another_method():
    _, states = old_loop()
    run = newel.march(model(), "kutta-three-eighths-4", step=STEP)
    assert units_apart(states, run.states) > 1e6


def test_then_the_break_is_declared_and_the_result_comes_closer_to_the_closed_form():
    as_it_was = newel.march(model(), "kutta-4", step=STEP)
    with_break = newel.march(model(breaks=[GATE_AT]), "kutta-4", step=STEP)
    assert error_at_the_end(with_break) < 0.05 * error_at_the_end(as_it_was)
    assert GATE_AT in with_break.times
    assert len(with_break.times) == len(as_it_was.times) + 1
