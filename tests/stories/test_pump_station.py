"""A pump station through a storm: inflow and pump follow a schedule, and the alarm level ends the march.

The flows are constant or proportional to the level between the switching times, so that the level is known in
closed form piece by piece: A dh/dt = q − k h has the solution q/k + (h₀ − q/k) exp(−k (t − t₀)/A).
"""

import csv
import math

import numpy as np
import pytest

import newel

pytestmark = pytest.mark.core

AREA = 120.0  # m2
ALARM = 3.2  # m
SEEPAGE = 0.02  # m2/s: outflow per metre of level
HOUR = 3600.0
SWITCHES = [1.0 * HOUR, 2.5 * HOUR, 4.0 * HOUR, 6.0 * HOUR]
INFLOW = [0.010, 0.060, 0.060, 0.110, 0.010]  # m3/s, between the switches
PUMPED = [0.000, 0.000, 0.028, 0.028, 0.028]  # m3/s


def piece(t):
    return sum(t >= switch for switch in SWITCHES)


def rate(t, y):
    i = piece(t)
    return [(INFLOW[i] - PUMPED[i] - SEEPAGE * y[0]) / AREA]


def station(**changes):
    alarm = newel.StateEvent("alarm", lambda t, y: y[0] - ALARM, crossing="rising", ends=True)
    given = {
        "start": 0.0,
        "stop": 24 * HOUR,
        "state": [0.5],
        "breaks": SWITCHES,
        "events": [alarm],
        "labels": ["level"],
        "units": ["m"],
        "time_unit": "s",
    }
    return newel.Model(rate, **(given | changes))


def level_from(level, t, until, i):
    settled = (INFLOW[i] - PUMPED[i]) / SEEPAGE
    return settled + (level - settled) * math.exp(-SEEPAGE * (until - t) / AREA)


def closed_form(t):
    level, before = 0.5, 0.0
    for i, switch in enumerate([*SWITCHES, math.inf]):
        level, before = level_from(level, before, min(switch, t), i), switch
        if t <= switch:
            return level
    raise AssertionError


def alarm_time():
    """From the piece in which the level passes 3.2 m: exp(−k (t − t₀)/A) = (3.2 − q/k)/(h₀ − q/k)."""
    for i, begin in enumerate([0.0, *SWITCHES]):
        end = [*SWITCHES, 24 * HOUR][i]
        level = closed_form(begin)
        if level_from(level, begin, end, i) > ALARM:
            settled = (INFLOW[i] - PUMPED[i]) / SEEPAGE
            return begin - AREA / SEEPAGE * math.log((ALARM - settled) / (level - settled))
    raise AssertionError


def test_the_alarm_comes_when_the_closed_form_says_so():
    run = newel.march(station(), "dormand-prince-5-4", rel_tol=1e-9, abs_tol=1e-9)
    assert (run.ended.reason, run.ended.label) == ("event", "alarm")
    assert run.last_time == pytest.approx(alarm_time(), abs=1e-3)  # of 24 h
    assert run.last_state[0] == pytest.approx(ALARM, abs=1e-9)
    assert run.last_state[0] >= ALARM
    assert [event.label for event in run.events] == ["alarm"]
    exact = [closed_form(t) for t in run.times]
    assert np.abs(run["level"] - exact).max() < 1e-7


def test_every_switch_before_the_alarm_is_a_row_and_costs_no_rejections():
    run = newel.march(station(), "dormand-prince-5-4", rel_tol=1e-9, abs_tol=1e-9)
    passed = [switch for switch in SWITCHES if switch < run.last_time]
    assert len(passed) >= 2, "the story needs an alarm after some switches"
    assert set(passed) <= set(run.times.tolist())
    blind = newel.march(station(breaks=[]), "dormand-prince-5-4", rel_tol=1e-9, abs_tol=1e-9)
    assert blind.rejected > run.rejected


def test_fixed_steps_keep_their_order_across_switches_that_are_off_the_grid():
    long_before = {"stop": 4.5 * HOUR, "events": []}
    errors = [
        abs(newel.march(station(**long_before), "kutta-4", step=step).last_state[0] - closed_form(4.5 * HOUR))
        for step in (1080.0, 540.0)
    ]
    assert 3.5 < math.log2(errors[0] / errors[1]) < 4.8


def test_the_report_for_the_operator_is_a_file_with_quarter_hours_and_the_alarm(tmp_path):
    report = newel.sinks.Csv(tmp_path / "station.csv", every_time=0.25 * HOUR)
    run = newel.march(station(), "dormand-prince-5-4", rel_tol=1e-8, abs_tol=1e-8, sinks=report)
    with open(tmp_path / "station.csv", newline="", encoding="utf-8") as file:
        rows = list(csv.DictReader(file))
    assert list(rows[0]) == ["t", "level", "event"]
    times = [float(row["t"]) for row in rows]
    assert times[:-1] == [k * 0.25 * HOUR for k in range(len(rows) - 1)]
    assert times[-1] == run.last_time
    assert [row["event"] for row in rows if row["event"]] == ["alarm"]
    assert rows[-1]["event"] == "alarm"
    worst = max(abs(float(row["level"]) - closed_form(float(row["t"]))) for row in rows)
    assert worst < 1e-6
