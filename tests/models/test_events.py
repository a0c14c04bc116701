"""A state event is checked when it is made."""

from __future__ import annotations

import pytest

from newel.errors import BadModel
from newel.models.events import StateEvent

pytestmark = pytest.mark.core


def indicator(t, y):
    return y[0]


def test_an_event_cuts_and_goes_on_unless_told_otherwise():
    event = StateEvent("full", indicator)
    assert (event.crossing, event.ends, event.cuts) == ("both", False, True)


@pytest.mark.parametrize("crossing", ["rising", "falling", "both"])
def test_the_three_crossings_are_taken(crossing):
    assert StateEvent("full", indicator, crossing=crossing).crossing == crossing


@pytest.mark.parametrize(
    ("arguments", "changes", "words"),
    [
        (("full", indicator), {"crossing": "up"}, "crossing is 'up'\n  Give one of: rising, falling, both."),
        (("full", indicator), {"ends": 1}, "ends is 1"),
        (("full", indicator), {"cuts": None}, "cuts is None"),
        (("full", indicator), {"ends": True, "cuts": False}, "'full' has ends=True and cuts=False"),
        (("", indicator), {}, "label is ''"),
        ((" full", indicator), {}, "label is ' full'"),
        (("a\nb", indicator), {}, r"label is 'a\\nb'"),
        ((3, indicator), {}, "label is 3"),
        (("full", 3.0), {}, "indicator is 3.0"),
    ],
)
def test_what_is_no_event_is_refused_by_argument_and_value(arguments, changes, words):
    with pytest.raises(BadModel, match=words):
        StateEvent(*arguments, **changes)
