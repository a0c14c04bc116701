"""The arguments by which a sink asks for fewer rows, and what they mean along a march."""

import math

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from newel.errors import BadRequest
from newel.protocols import Thinning
from newel.results.picking import AtTimes, EverySpan, EverySteps, Line
from newel.results.sinks import Call, Csv, JsonLines, Memory
from newel.results.sinks.thinning import thinning

pytestmark = pytest.mark.core

FORWARD = Line(0.0, 10.0, True)
BACKWARD = Line(10.0, 0.0, False)


def sure(check):
    return settings(deadline=None, derandomize=True, max_examples=100)(check)


@pytest.mark.parametrize(
    "make", [Memory, lambda **k: Csv("a", **k), lambda **k: JsonLines("a", **k), lambda **k: Call(print, **k)]
)
def test_every_sink_has_the_three_ways_of_thinning(make):
    assert make().thinning == Thinning()
    assert make(at=[2, 1]).thinning == Thinning(at=(2.0, 1.0))
    assert make(every_steps=3).thinning == Thinning(every_steps=3)
    assert make(every_time=0.5).thinning == Thinning(every_time=0.5)


@pytest.mark.parametrize(
    "at", [3, np.float64(3), np.array(3.0), [3], (3.0,), np.array([3]), iter([3.0]), {3}]
)
def test_times_may_come_as_one_number_or_as_anything_that_can_be_gone_through(at):
    assert thinning(at=at) == Thinning(at=(3.0,))


@pytest.mark.parametrize(
    ("argument", "value"),
    [
        ("at", []),
        ("at", [1.0, math.nan]),
        ("at", [math.inf]),
        ("at", "12"),
        ("at", ["1"]),
        ("at", [None]),
        ("every_steps", 0),
        ("every_steps", 2.5),
        ("every_steps", True),
        ("every_steps", "2"),
        ("every_time", 0.0),
        ("every_time", -1.0),
        ("every_time", math.nan),
        ("every_time", math.inf),
        ("every_time", "x"),
    ],
)
def test_values_out_of_range_are_refused_with_argument_and_value(argument, value):
    with pytest.raises(BadRequest) as caught:
        Memory(**{argument: value})
    assert caught.value.argument == argument
    assert f"{argument}={value!r}" in str(caught.value) or "asks for no row" in str(caught.value)


def test_two_ways_at_once_are_refused_and_both_are_named():
    with pytest.raises(BadRequest, match="at and every_time are given together"):
        Memory(at=[1.0], every_time=2.0)


def test_asked_times_are_sorted_along_the_march_and_given_once():
    assert list(AtTimes((5.0, 1.0, 5.0, 3.0), FORWARD).landings()) == [1.0, 3.0, 5.0]
    assert list(AtTimes((5.0, 1.0, 5.0, 3.0), BACKWARD).landings()) == [5.0, 3.0, 1.0]


@pytest.mark.parametrize("line", [FORWARD, BACKWARD])
@pytest.mark.parametrize("time", [-1e-9, 10.001])
def test_a_time_outside_the_march_is_refused_with_the_march_named(line, time):
    with pytest.raises(BadRequest) as caught:
        AtTimes((3.0, time), line)
    assert f"at holds {time!r}; this march goes from {line.start!r} to {line.stop!r}" in str(caught.value)


def test_a_time_that_is_an_end_but_for_rounding_is_that_end():
    # 3 × 0.1 = 0.30000000000000004 in binary floating point (IEEE 754 double).
    line = Line(0.0, 0.3, True)
    assert list(AtTimes((3 * 0.1,), line).landings()) == [0.3]


def test_an_asked_time_is_met_by_a_grid_that_rounds_and_goes_out_as_asked():
    pick = AtTimes((0.3, 0.7), FORWARD)
    got = [asked for n in range(11) if (asked := pick.wants(n * 0.1, "", False)) is not None]
    assert got == [0.3, 0.7]


def test_outputs_that_lie_dense_near_a_start_at_zero_stay_apart():
    times = tuple(10.0 ** np.arange(-12, 11))
    line = Line(0.0, 1e10, True)
    pick = AtTimes(times, line)
    assert tuple(pick.landings()) == times
    t = 0.0
    for time in times:
        t = pick.next_after(t)
        assert t == time
        assert pick.wants(t, "", False) == time


@pytest.mark.parametrize(("pick", "due"), [(AtTimes((5.0,), FORWARD), 5.0), (EverySpan(5.0, FORWARD), 5.0)])
def test_a_march_that_steps_over_an_asked_time_is_told_so(pick, due):
    pick.wants(0.0, "", False)
    with pytest.raises(BadRequest, match=r"the march went on to t = 6\.0 without landing on 5\.0"):
        pick.wants(6.0, "", False)


def test_a_span_counts_from_the_start_with_one_rounding():
    assert list(EverySpan(0.1, Line(1.0, 2.0, True)).landings()) == [1.0 + k * 0.1 for k in range(11)]
    assert list(EverySpan(4.0, BACKWARD).landings()) == [10.0, 6.0, 2.0]


def test_a_span_longer_than_the_march_asks_for_the_start_alone():
    pick = EverySpan(100.0, FORWARD)
    assert list(pick.landings()) == [0.0]
    assert pick.next_after(0.0) is None


def test_a_span_below_what_floats_tell_apart_is_refused():
    with pytest.raises(BadRequest, match="every_time=1e-15 is below what floats can tell apart from"):
        EverySpan(1e-15, FORWARD)


def test_a_span_gives_events_and_the_last_row_too_but_no_others():
    pick = EverySpan(4.0, FORWARD)
    rows = [(0.0, "", False), (1.0, "", False), (2.0, "full", False), (4.0, "", False), (5.0, "", True)]
    assert [pick.wants(*row) for row in rows] == [0.0, None, 2.0, 4.0, 5.0]


def test_counted_steps_give_the_first_each_nth_events_and_the_last():
    pick = EverySteps(3)
    rows = [(float(n), "full" if n == 4 else "", n == 7) for n in range(8)]
    assert [pick.wants(*row) for row in rows] == [0.0, None, None, 3.0, 4.0, None, 6.0, 7.0]


def test_asked_times_take_no_events():
    pick = AtTimes((5.0,), FORWARD)
    assert pick.wants(2.0, "full", False) is None
    assert pick.wants(5.0, "full", False) == 5.0


@sure
@given(
    start=st.floats(-1e6, 1e6),
    length=st.floats(1e-3, 1e6),
    forward=st.booleans(),
    parts=st.floats(0.5, 40.0),
)
def test_landing_from_one_to_the_next_visits_all_multiples_and_nothing_else(start, length, forward, parts):
    stop = start + (length if forward else -length)
    line = Line(start, stop, forward)
    span = abs(stop - start) / parts
    assume(span > 100 * line.blur(stop))
    pick = EverySpan(span, line)
    visited, t = [start], start
    while (t := pick.next_after(t)) is not None:
        visited.append(t)
    assert visited == list(pick.landings())
    assert abs(len(visited) - 1 - parts) < 1 + 1e-6
    assert all(line.key(start) <= line.key(time) <= line.key(stop) for time in visited)
    assert all(pick.wants(time, "", False) == time for time in visited)


@sure
@given(times=st.lists(st.integers(0, 1000), min_size=1, max_size=30), forward=st.booleans())
def test_landing_from_one_to_the_next_visits_all_asked_times(times, forward):
    line = Line(0.0, 1000.0, True) if forward else Line(1000.0, 0.0, False)
    pick = AtTimes(tuple(map(float, times)), line)
    visited, t = [], line.start
    while (t := pick.next_after(t)) is not None:
        visited.append(t)
    assert visited == sorted(set(map(float, times)) - {line.start}, reverse=not forward)


@pytest.mark.parametrize(
    ("pick", "steps", "rows"),
    [
        (EverySteps(3), 10, 5),
        (EverySteps(5), 10, 3),
        (AtTimes((1.0, 2.0), FORWARD), 10, 2),
        (EverySpan(4.0, FORWARD), 100, 4),
        (EverySpan(0.001, FORWARD), 10, 11),
    ],
)
def test_the_number_of_rows_is_known_before_the_march(pick, steps, rows):
    assert pick.rows(steps) == rows
