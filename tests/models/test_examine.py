"""An examination finds what would spoil a march, and says so only then."""

from __future__ import annotations

import itertools
import json

import numpy as np
import pytest

from newel.models.events import StateEvent
from newel.models.examine import examine
from newel.models.model import Model

pytestmark = pytest.mark.core


def decay(t, y):
    return -y


def fill(t, y, out):
    out[...] = -y


def look(rate=decay, state=(1.0, 2.0, 3.0), **changes):
    return examine(Model(rate, start=0.0, stop=1.0, state=state, **changes))


def texts(examination, severity):
    return [f"{f.subject}: {f.text}" for f in examination.findings if f.severity == severity]


def the_error(*arguments, **changes):
    examination = look(*arguments, **changes)
    errors = texts(examination, "error")
    assert not examination.ok
    assert len(errors) == 1, errors
    return errors[0]


@pytest.mark.parametrize(
    ("rate", "changes"),
    [
        (decay, {}),
        (fill, {"in_place": True}),
        (lambda t, y, p: -p["k"] * y, {"params": {"k": 2.0}}),
        (lambda t, y: [-1, 0, 2], {}),
        (decay, {"state": np.ones((2, 2), dtype="F")}),
        (decay, {"state": np.ones(2, dtype=object)}),
        (decay, {"within": (0.0, 5.0), "after_step": lambda t, y: None, "breaks": [0.5]}),
        (decay, {"events": [StateEvent("low", lambda t, y: y[0] - 0.5)]}),
    ],
)
def test_a_sound_model_draws_no_finding(rate, changes):
    examination = look(rate, **changes)
    assert examination.findings == ()
    assert examination.ok
    assert examination.microseconds > 0
    assert examination.calls >= 5


def none(t, y):
    y * 2


def writes(t, y):
    y[0] = 1.0
    return -y


def forces_a_write(t, y):
    y.setflags(write=True)
    y[0] = 7.0
    return -y


def first_only(t, y, out):
    out[0] = -y[0]


def adds(t, y, out):
    out -= y


def returns_instead(t, y, out):
    return -y


def half_nan(t, y):
    return np.array([0.0, np.nan, 0.0])


def fails(t, y):
    raise KeyError("flow")


def state_first(state, seconds):
    return [state[0] * seconds, 0.0, 0.0]


@pytest.mark.parametrize(
    ("rate", "changes", "words"),
    [
        (none, {}, "rate: returned None"),
        (writes, {}, "rate: writes to y (ValueError: assignment destination is read-only (test_examine.py"),
        (forces_a_write, {}, "rate: writes to y, though"),
        (lambda t, y: y[:2], {}, "rate: gives shape (2,), the state has (3,)"),
        (lambda t, y: y * 1j, {}, "rate: gives dtype complex128"),
        (lambda t, y: ["a", "b", "c"], {}, "rate: gives dtype <U1"),
        (lambda t, y: [[1.0], [1.0, 2.0], 3.0], {}, "rate: returned what is no array"),
        (half_nan, {"labels": ("a", "b", "c")}, "rate: gives nan in 'b' (entry 2 of 3)"),
        (fails, {}, "rate: raised KeyError: 'flow' (test_examine.py"),
        (state_first, {}, "lambda t, y: rate(y, t)"),
        (first_only, {"in_place": True}, "leaves 2 of 3 entries of out unwritten, first 'y[1]'"),
        (returns_instead, {"in_place": True}, "leave out in_place"),
        (adds, {"in_place": True}, "reads out before it writes it"),
    ],
)
def test_what_a_rate_does_wrong_is_named(rate, changes, words):
    assert words in the_error(rate, **changes)


def test_nan_that_an_in_place_rate_computes_is_not_taken_for_unwritten():
    def computes(t, y, out):
        out[...] = -y
        out[2] = np.nan

    assert "gives nan in 'y[2]'" in the_error(computes, in_place=True)


def test_chance_a_memory_and_changed_params_are_found():
    counter = itertools.count()
    assert "two results" in the_error(lambda t, y: y * next(counter))

    seen = []

    def remembers_the_last_state(t, y):
        seen.append(y[0])
        return y * sum(seen[-1:]) * max(seen)

    assert "has a memory" in the_error(remembers_the_last_state)

    def counts_in_params(t, y, p):
        p["calls"] += 1
        return -y

    params = {"calls": 0}
    assert "changes the params" in the_error(counts_in_params, params=params)
    assert params == {"calls": 0}


def test_returned_memory_that_is_used_again_is_noted_but_spoils_nothing():
    buffer = np.zeros(3)

    def same(t, y):
        np.negative(y, out=buffer)
        return buffer

    for rate, words in ((same, "same array each time"), (lambda t, y: y, "memory of y itself")):
        examination = look(rate)
        assert examination.ok
        assert len(texts(examination, "note")) == 1
        assert words in texts(examination, "note")[0]


def test_a_rate_that_needs_a_writable_array_gets_one_and_a_note():
    def compiled(t, y):
        if not y.flags.writeable:
            raise ValueError("buffer source array is read-only")
        return -y

    examination = look(compiled)
    assert examination.ok
    assert "copies=True" in texts(examination, "note")[0]
    assert look(compiled, copies=True).findings == ()


def test_a_wider_result_is_noted():
    examination = look(lambda t, y: -y.astype(float), state=np.ones(3, dtype="f4"))
    assert texts(examination, "note") == ["rate: gives float64, rounded to the state's float32 at each call"]


def test_a_table_that_ends_before_the_span_is_a_warning():
    def table(t, y):
        if t > 0.9:
            raise IndexError("beyond the table")
        return -y

    warnings = texts(look(table), "warning")
    assert len(warnings) == 1
    assert "raised IndexError: beyond the table" in warnings[0]
    assert "t = 1" in warnings[0]
    assert "not finite" in texts(look(lambda t, y: y * (np.nan if t == 0.5 else 1.0)), "warning")[0]


@pytest.mark.parametrize(
    ("indicator", "words"),
    [
        (lambda t, y: y, "not a number"),
        (lambda t, y: np.nan, "gives nan"),
        (lambda t, y: y[0] > 2.0, "crosses zero"),
        (lambda t, y: y[9], "raised IndexError"),
    ],
)
def test_an_indicator_that_gives_no_number_is_an_error(indicator, words):
    error = the_error(events=[StateEvent("full", indicator)])
    assert error.startswith("event 'full'")
    assert words in error


def test_an_indicator_that_starts_at_zero_is_noted():
    examination = look(events=[StateEvent("full", lambda t, y: y[0] - 1.0)])
    assert examination.ok
    assert "zero at the start" in texts(examination, "note")[0]


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"within": lambda t, y: False}, "within: the start state is outside"),
        ({"within": lambda t, y: None}, "within: gives None"),
        ({"after_step": lambda t, y: y[:1]}, "after_step: gives shape (1,)"),
        ({"after_stage": fails}, "after_stage: raised KeyError"),
        ({"files": "no-such-file.csv"}, "files: there is no file no-such-file.csv"),
    ],
)
def test_the_other_functions_and_files_are_looked_at_too(changes, words):
    assert words in the_error(**changes)


def test_what_the_model_itself_noted_is_passed_on():
    assert texts(look(breaks=[7.0]), "note")[0].startswith("model: the break at 7.0")


def test_errors_come_first_and_the_whole_is_fit_for_json():
    examination = look(half_nan, breaks=[7.0])
    assert [f.severity for f in examination.findings] == ["error", "note"]
    data = json.loads(json.dumps(examination.to_data()))
    assert data["schema"] == "newel-examination/1"
    assert data["ok"] is False
    assert data["findings"][0]["subject"] == "rate"
    assert "error: rate: gives nan" in repr(examination)
    assert "<td>error</td>" in examination._repr_html_()


def test_a_model_examines_itself():
    assert Model(decay, start=0, stop=1, state=[1.0]).examine().ok
