"""The contract tests for plugin authors accept what is right and name the rule that is broken."""

import subprocess
import sys

import numpy as np
import pytest
from hypothesis import given, settings

from newel.methods.tableau import Tableau
from newel.stepping import controllers
from newel.testing import (
    RecordingSink,
    blocks,
    check_controller_contract,
    check_sink_contract,
    check_tableau_contract,
    tableaux,
)

pytestmark = pytest.mark.core


def test_the_recording_double_keeps_the_sink_contract():
    check_sink_contract(RecordingSink, read_back=lambda sink: (np.array(sink.times), np.array(sink.states)))


class Keeping(RecordingSink):
    def write(self, times, states, events):
        self.kept = states[1:]


class Forgetful(RecordingSink):
    def write(self, times, states, events):
        super().write(times[:-1], states[:-1], events[:-1])


class Rounding(RecordingSink):
    def write(self, times, states, events):
        super().write(times, np.float32(states) if states.dtype == np.float64 else states, events)


class Writing(RecordingSink):
    def write(self, times, states, events):
        times[0] = 0.0


class WithoutClose:
    def open(self, head):
        pass

    def write(self, times, states, events):
        pass


class WrongEndings(RecordingSink):
    endings = ".csv"


class WrongThinning(RecordingSink):
    def __init__(self):
        super().__init__()
        self.thinning = 10


@pytest.mark.parametrize(
    ("sink", "rule"),
    [
        (Keeping, "write kept the driver's arrays"),
        (Forgetful, "the times read back differ"),
        (Rounding, "the states read back differ"),
        (WithoutClose, "WithoutClose has no method close"),
        (WrongEndings, "endings is '.csv'"),
        (WrongThinning, "thinning is 10"),
    ],
)
def test_a_sink_that_breaks_a_rule_is_told_which(sink, rule):
    read_back = (lambda kept: (np.array(kept.times), np.array(kept.states))) if sink is not Keeping else None
    with pytest.raises(AssertionError, match=rule):
        check_sink_contract(sink, read_back)


def test_a_sink_that_writes_into_the_drivers_arrays_meets_read_only_ones():
    with pytest.raises(ValueError, match="read-only"):
        check_sink_contract(Writing)


@pytest.mark.parametrize("name", sorted(controllers.NAMED))
def test_every_named_controller_keeps_the_controller_contract(name):
    made = controllers.NAMED[name]
    check_controller_contract(made() if callable(made) else made)


class Simple:
    """An elementary controller written as a user would: factor 0.9·error^(-1/k) between 0.2 and 5."""

    name = "simple"

    def start(self):
        return ()

    def decide(self, error, step, order, memory):
        factor = min(5.0, max(0.2, 0.9 * max(error, 1e-10) ** (-1 / order)))
        return error <= 1.0, factor, memory


class Nameless(Simple):
    name = ""


class Accepting(Simple):
    def decide(self, error, step, order, memory):
        return True, 0.5, memory


class Growing(Simple):
    def decide(self, error, step, order, memory):
        return error <= 1.0, 1.0, memory


class Endless(Simple):
    def decide(self, error, step, order, memory):
        return error <= 1.0, float("inf") if error == 0 else 0.5, memory


class Moody(Simple):
    def __init__(self):
        self.calls = 0

    def decide(self, error, step, order, memory):
        self.calls += 1
        return error <= 1.0, 0.5 / self.calls, memory


class Listing(Simple):
    def start(self):
        return [1.0]


class Shrinking(Simple):
    def decide(self, error, step, order, memory):
        return error <= 1.0, 0.9, memory


@pytest.mark.parametrize(
    ("controller", "rule"),
    [
        (Nameless, "name is ''"),
        (Accepting, "an error of twice the tolerance and more was accepted"),
        (Growing, "it is then below 1"),
        (Endless, "it is positive and finite"),
        (Moody, "the same call gave"),
        (Listing, "it is a tuple of floats"),
        (Shrinking, "where 1 is within tolerance"),
    ],
)
def test_a_controller_that_breaks_a_rule_is_told_which(controller, rule):
    check_controller_contract(Simple())
    with pytest.raises(AssertionError, match=rule):
        check_controller_contract(controller())


def midpoint(**changes):
    # The explicit midpoint rule; any textbook, from memory.
    given = {
        "name": "midpoint",
        "order": 2,
        "matrix": [[], ["1/2"]],
        "weights": ["0", "1"],
        "source": "textbooks",
    }
    return Tableau("my-midpoint", **(given | changes))


def test_a_right_tableau_passes_and_a_wrong_claim_fails_with_its_condition():
    check_tableau_contract(midpoint())
    with pytest.raises(AssertionError, match="my-midpoint: the proof fails"):
        check_tableau_contract(midpoint(weights=["1/3", "2/3"]))


def test_a_tableau_without_a_source_is_told_so():
    with pytest.raises(AssertionError, match="source is empty"):
        check_tableau_contract(midpoint(source=""))


@settings(deadline=None, derandomize=True, max_examples=25)
@given(tableau=tableaux())
def test_drawn_tableaux_are_right_to_first_order(tableau):
    check_tableau_contract(tableau)


@settings(deadline=None, derandomize=True, max_examples=50)
@given(rows=blocks((3,)))
def test_drawn_rows_go_with_growing_time(rows):
    times, states = rows
    assert np.all(np.diff(times) > 0)
    assert states.shape == (len(times), 3)


def test_without_hypothesis_the_checks_work_and_the_strategies_say_what_to_install():
    code = (
        "import sys; sys.modules['hypothesis'] = None\n"
        "import newel.testing as t\n"
        "t.check_sink_contract(t.RecordingSink)\n"
        "try:\n    t.blocks()\n"
        "except ImportError as error:\n    print(error)\n"
    )
    done = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, check=True, timeout=60
    )
    assert done.stdout == (
        "the strategies of newel.testing need Hypothesis, which is not installed\n"
        "  The checks and doubles work without it.\n"
        "  pip install 'newel[testing]'\n"
    )
