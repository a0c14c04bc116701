"""A model checks and owns what it is given."""

from __future__ import annotations

import functools
from fractions import Fraction

import numpy as np
import pytest

from newel.errors import BadModel
from newel.models.events import StateEvent
from newel.models.layout import Layout
from newel.models.model import Model

pytestmark = pytest.mark.core


def decay(t, y):
    return -y


def make(**changes):
    given = {"rate": decay, "start": 0.0, "stop": 1.0, "state": [1.0, 2.0]} | changes
    return Model(given.pop("rate"), **given)


def refusal(**changes):
    with pytest.raises(BadModel) as caught:
        make(**changes)
    first, *rest = str(caught.value).split("\n")
    assert rest, "an error says what to do on a line of its own"
    return first, caught.value


def test_the_state_is_a_copy_that_nobody_can_write():
    given = np.array([1.0, 2.0])
    model = make(state=given)
    given[0] = 9.0
    assert model.state.tolist() == [1.0, 2.0]
    with pytest.raises(ValueError, match="read-only"):
        model.state[0] = 5.0


@pytest.mark.parametrize("dtype", ["f4", "f8", "g", "F", "D", "O"])
def test_dtypes_that_a_state_may_have_stay(dtype):
    assert make(state=np.ones(2, dtype=dtype)).state.dtype == np.dtype(dtype)


@pytest.mark.parametrize("dtype", ["i4", "u1", "?", ">f8"])
def test_integers_booleans_and_swapped_bytes_become_native_float64(dtype):
    state = make(state=np.ones(2, dtype=dtype)).state
    assert state.dtype == np.float64
    assert state.dtype.isnative
    assert state.tolist() == [1.0, 1.0]


def test_a_state_of_fractions_stays_exact():
    assert make(state=[Fraction(1, 3), Fraction(2, 3)]).state[0] == Fraction(1, 3)


@pytest.mark.parametrize(
    ("state", "words"),
    [
        (np.ones(2, dtype="f2"), "float16"),
        (["a", "b"], "<U1"),
        ([], "no entries"),
        ([[1.0], [1.0, 2.0]], "cannot be an array"),
        ([1.0, np.nan], "nan at entry 2 of 2"),
        (np.array([[1.0, 2.0], [np.inf, 3.0]]), "inf at entry [2, 1] of (2, 2)"),
        ([1.0, None], "None at entry 2 of 2"),
        (np.ma.masked_array([1.0, 2.0], mask=[False, True]), "masked"),
    ],
)
def test_a_state_that_cannot_be_marched_is_refused_by_its_value_and_place(state, words):
    first, error = refusal(state=state)
    assert words in first
    assert error.argument == "state"


def test_start_and_stop_are_finite_and_differ():
    assert "nothing to march" in refusal(stop=0)[0]
    assert "stop is inf" in refusal(stop=np.inf)[0]
    assert "start is '0'" in refusal(start="0")[0]
    assert "start is None" in refusal(start=None)[0]
    assert "stop is True" in refusal(stop=True)[0]
    assert (make(stop=np.float32(2)).stop, make(stop=Fraction(1, 2)).stop) == (2.0, 0.5)


def test_breaks_follow_the_march_each_once_and_those_outside_are_named():
    forward = make(breaks=[0.5, 0.25, 0.5, 1.0, 7.0])
    assert forward.breaks == (0.25, 0.5, 1.0, 7.0)
    assert len(forward.notes) == 1
    assert "7.0" in forward.notes[0]
    backward = forward.replace(stop=-1.0)
    assert backward.breaks == (7.0, 1.0, 0.5, 0.25)
    assert len(backward.notes) == 4
    assert make(breaks=0.5).breaks == (0.5,)
    assert make(breaks=np.array([0.5])).breaks == (0.5,)
    assert "breaks: entry 2 is 'x'" in refusal(breaks=[0.5, "x"])[0]
    assert "breaks: entry 1 is nan" in refusal(breaks=[np.nan])[0]


def test_labels_by_default_count_the_entries_in_c_order():
    assert make().labels == ("y[0]", "y[1]")
    assert make(state=np.ones((2, 2))).labels == ("y[0,0]", "y[0,1]", "y[1,0]", "y[1,1]")
    assert make(state=3.0).labels == ("y",)


@pytest.mark.parametrize(
    ("labels", "words"),
    [
        (("x",), "1 texts for a state of 2"),
        (("x", "x"), "entries 1 and 2 are both 'x'"),
        (("x", "t"), "entry 2 is 't'"),
        (("event", "x"), "entry 1 is 'event'"),
        (("x", " "), "entry 2 is ' '"),
        (("x", 3), "entry 2 is 3"),
        ("xv", "one text, 'xv'"),
        (7, "labels is 7"),
    ],
)
def test_labels_that_would_confuse_a_table_are_refused(labels, words):
    assert words in refusal(labels=labels)[0]


def test_units_are_one_for_each_entry_or_none():
    assert make(units=("m", "m/s")).units == ("m", "m/s")
    assert make().units == ()
    assert "1 texts for a state of 2" in refusal(units=("m",))[0]
    assert "'s' is no part" in refusal(units={"s": "m"})[0]


def test_a_layout_gives_labels_and_takes_units_by_part():
    layout = Layout(level=(), conc=(3,))
    state = layout.pack(level=1.0, conc=0.5)
    model = make(state=state, labels=layout, units={"conc": "g/m3"})
    assert model.layout is layout
    assert model.labels == ("level", "conc[0]", "conc[1]", "conc[2]")
    assert model.units == ("", "g/m3", "g/m3", "g/m3")
    assert model.replace(stop=3.0).layout is layout
    assert model.replace(stop=3.0).units == model.units
    assert "the layout has 4 entries, the state 2" in refusal(labels=layout)[0]
    misspelt = {"state": state, "labels": layout, "units": {"cnoc": "g/m3"}}
    assert "Did you mean conc?" in refusal(**misspelt)[0]


def test_a_rate_with_the_state_first_is_refused_with_the_cure():
    def swapped(y, t):
        return -y

    _, error = refusal(rate=swapped)
    assert "lambda t, y: rate(y, t)" in str(error)
    _, error = refusal(rate=lambda state, time, p: -state, params=[1])
    assert "lambda t, y, params: rate(y, t, params)" in str(error)
    assert make(rate=lambda time, y: -y)
    assert make(rate=lambda t, time: -time)


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"rate": lambda t, y, p: -y}, "params="),
        ({"rate": lambda t, y, out: -y}, "in_place=True"),
        ({"rate": lambda t: -t}, "rate(t, y)"),
        ({"params": 3.0}, "hands them over as the last argument"),
        ({"rate": lambda t, y, *, k: -y}, "rate(t, y)"),
        ({"in_place": True}, "rate(t, y, out)"),
        ({"rate": 3.0}, "cannot be called"),
        ({"after_step": lambda t: None}, "after_step(t, y)"),
        ({"after_stage": "no"}, "after_stage is 'no'"),
        ({"within": lambda y: True}, "within(t, y)"),
        ({"jacobian": 3.0}, "jacobian is 3.0"),
        ({"events": StateEvent("full", lambda y: 1.0)}, "indicator of 'full'"),
    ],
)
def test_a_function_that_the_march_could_not_call_is_refused_with_the_form(changes, words):
    _, error = refusal(**changes)
    assert words in str(error)


@pytest.mark.parametrize(
    "rate",
    [
        lambda *args: -args[1],
        lambda t, y, k=2.0: -k * y,
        np.add,
        functools.partial(lambda k, t, y: -k * y, 3.0),
    ],
)
def test_a_rate_that_can_be_called_with_t_and_y_is_taken(rate):
    assert make(rate=rate).rate is rate


def test_within_is_a_pair_around_the_start_state():
    low, high = make(within=(0.0, [5.0, 6.0])).within
    assert (low.tolist(), high.tolist()) == (0.0, [5.0, 6.0])
    assert make(within=(-np.inf, np.inf)).within[0] == -np.inf
    assert "entry 2 of 2, outside within" in refusal(within=(0.0, 1.5))[0]
    assert "not at or below" in refusal(within=(3.0, 0.0))[0]
    assert "not at or below" in refusal(within=(np.nan, 1.0))[0]
    assert "within is" in refusal(within=(0.0, [1.0, 2.0, 3.0]))[0]
    assert "within is" in refusal(within=5.0)[0]
    assert "complex" in refusal(state=[1j, 0j], within=(0.0, 1.0))[0]


def test_events_are_state_events_with_labels_of_their_own():
    full = StateEvent("full", lambda t, y: y[0] - 2.0)
    assert make(events=full).events == (full,)
    assert "two are labelled 'full'" in refusal(events=[full, full])[0]
    assert "events: entry 1 is 3" in refusal(events=3)[0]
    assert "events: entry 2 is <function" in refusal(events=[full, decay])[0]


def test_flags_are_true_or_false():
    assert "in_place is 1" in refusal(in_place=1)[0]
    assert "copies is 'yes'" in refusal(copies="yes")[0]
    assert "time_unit is 3" in refusal(time_unit=3)[0]


def test_replace_changes_one_thing_and_leaves_the_first_model_alone():
    model = make(labels=("x", "v"), units=("m", "m/s"), time_unit="s", breaks=[0.5])
    other = model.replace(stop=5.0, state=[3.0, 4.0])
    assert (model.stop, other.stop) == (1.0, 5.0)
    assert other.state.tolist() == [3.0, 4.0]
    assert (other.labels, other.units, other.time_unit, other.breaks) == (
        model.labels,
        model.units,
        "s",
        (0.5,),
    )
    assert make().replace(state=[1.0]).labels == ("y[0]",)
    with pytest.raises(BadModel, match="no 'stpo'  Did you mean stop"):
        model.replace(stpo=3.0)


def test_a_model_shows_itself_in_three_lines_and_escapes_html():
    event = StateEvent("a<b", lambda t, y: y[0], ends=True)
    model = make(events=[event], time_unit="s")
    assert repr(model) == (
        "Model of decay, t from 0 to 1 s\n  y[0], y[1]; shape (2,), float64\n  0 breaks; events: a<b (ends)"
    )
    assert "a&lt;b" in model._repr_html_()


def test_a_model_never_changes():
    model = make()
    with pytest.raises(AttributeError):
        model.stop = 3.0
