"""A march that is wrong, fails or is stopped: the right words, nothing lost, outputs closed and in step."""

from __future__ import annotations

import csv
import math
import os
import signal
import subprocess
import sys
import textwrap
from pathlib import Path
from typing import Any

import numpy as np
import pytest

import newel
from newel.errors import BadModel, BadRequest, BadTableau, NewelError, UnknownMethod, UnknownName
from newel.protocols import Thinning
from newel.testing import FailingSink, RecordingSink

pytestmark = pytest.mark.core

FIXED: dict[str, Any] = {"step": 0.01}
ADAPTIVE: dict[str, Any] = {"rel_tol": 1e-6, "abs_tol": 1e-6}
RULES = {"fixed": ("kutta-4", FIXED), "adaptive": ("dormand-prince-5-4", ADAPTIVE)}


def nan_at_once(t: float, y: Any) -> Any:
    return np.array([math.nan])


def nan_later(t: float, y: Any) -> Any:
    return np.array([math.nan if t > 0.5 else -1.0])


def infinite_later(t: float, y: Any) -> Any:
    return np.array([-math.inf if t > 0.5 else -1.0])


def raises(t: float, y: Any) -> Any:
    raise OSError("table not found")


def raises_later(t: float, y: Any) -> Any:
    return -y if t < 0.5 else [][0]


def unwritten(t: float, y: Any, out: Any) -> None:
    pass


def swapped(y: Any, t: float) -> Any:
    return -y


def implicit() -> Any:
    return newel.Tableau(slug="mine", name="Mine", order=2, matrix=[["1/2"]], weights=["1"])


def good(**more: Any) -> newel.Model:
    return newel.Model(
        more.pop("rate", lambda t, y: -y), **{"start": 0.0, "stop": 1.0, "state": [1.0], **more}
    )


# What is wrong: what is done, the class, the first line, and more that the message holds.
BAD_INPUT: dict[str, tuple[Any, type[Exception], str, str]] = {
    "NaN at the start": (
        lambda: newel.march(good(rate=nan_at_once), "kutta-4", step=0.1),
        newel.MarchFailed,
        r"rate gave NaN at t = 0 in 'y\[0\]' \(entry 1 of 1\), at the start",
        "No step was made",
    ),
    "NaN later": (
        lambda: newel.march(good(rate=nan_later), "kutta-4", step=0.1),
        newel.MarchFailed,
        r"rate gave NaN at t = 0\.55 in 'y\[0\]'",
        r"Kept: 5 steps up to t = 0\.5 \(error\.run\)",
    ),
    "NaN later, adaptive": (
        lambda: newel.march(good(rate=nan_later), "dormand-prince-5-4", **ADAPTIVE),
        newel.MarchFailed,
        r"rate gave NaN at t = 0\.5",
        r"quartered (once|\d+ times)\.  test_march_faults\.py:\d+",
    ),
    "infinity": (
        lambda: newel.march(good(rate=infinite_later), "kutta-4", step=0.1),
        newel.MarchFailed,
        r"rate gave -infinity at t = 0\.55",
        "Kept: 5 steps",
    ),
    "wrong shape": (
        lambda: newel.march(good(rate=lambda t, y: [1.0, 2.0]), "kutta-4", step=0.1),
        BadModel,
        r"rate returned shape \(2,\), and the state has shape \(1,\)",
        "Return one rate for each entry",
    ),
    "wrong dtype": (
        lambda: newel.march(good(rate=lambda t, y: [1j]), "kutta-4", step=0.1),
        BadModel,
        "rate returned dtype complex128, and the state has dtype float64",
        "Give the model a state of dtype complex128",
    ),
    "None": (
        lambda: newel.march(good(rate=lambda t, y: None), "kutta-4", step=0.1),
        BadModel,
        "rate returned None",
        "in_place=True",
    ),
    "raises": (
        lambda: newel.march(good(rate=raises), "kutta-4", step=0.1),
        newel.MarchFailed,
        r"rate raised OSError: table not found \(test_march_faults\.py:\d+\)",
        "No step was made",
    ),
    "raises later": (
        lambda: newel.march(good(rate=raises_later), "kutta-4", step=0.1),
        newel.MarchFailed,
        "rate raised IndexError: list index out of range",
        "Kept: 4 steps",
    ),
    "out unwritten": (
        lambda: newel.march(good(rate=unwritten, in_place=True), "kutta-4", step=0.1),
        BadModel,
        "rate left 1 of 1 entries of out unwritten",
        "fills every entry at every call",
    ),
    "swapped arguments": (lambda: good(rate=swapped), BadModel, "rate", r"lambda t, y: rate\(y, t\)"),
    "stop equals start": (lambda: good(stop=0.0), BadModel, r"stop equals start \(0\.0\)", "later stop"),
    "no step rule": (
        lambda: newel.march(good(), "kutta-4"),
        BadRequest,
        "no step rule: give one of",
        r"steps=newel\.Given",
    ),
    "two step rules": (
        lambda: newel.march(good(), "kutta-4", step=0.1, **ADAPTIVE),
        BadRequest,
        "step and rel_tol and abs_tol together are more than one step rule",
        "step=0.01",
    ),
    "zero step": (
        lambda: newel.march(good(), "kutta-4", step=0.0),
        BadRequest,
        "step=0.0: must be positive",
        "direction",
    ),
    "negative step": (
        lambda: newel.march(good(), "kutta-4", step=-0.1),
        BadRequest,
        "step=-0.1: must be positive",
        "start and stop",
    ),
    "zero tolerance": (
        lambda: newel.march(good(), "dormand-prince-5-4", rel_tol=1e-6, abs_tol=0.0),
        BadRequest,
        "abs_tol=0.0: must be positive",
        "state units",
    ),
    "negative tolerance": (
        lambda: newel.march(good(), "dormand-prince-5-4", rel_tol=-1e-6, abs_tol=1e-6),
        BadRequest,
        "rel_tol=-1e-06: must be positive",
        "",
    ),
    "tolerance below the dtype": (
        lambda: newel.march(good(), "dormand-prince-5-4", rel_tol=1e-17, abs_tol=1e-17),
        BadRequest,
        "rel_tol=1e-17 is below what a state of dtype float64 carries",
        "at least",
    ),
    "unknown slug": (
        lambda: newel.march(good(), "kuta-4", step=0.1),
        UnknownMethod,
        "unknown method 'kuta-4'",
        "kutta-4",
    ),
    "unknown controller": (
        lambda: newel.march(
            good(), "dormand-prince-5-4", steps=newel.Adaptive(**ADAPTIVE, controller="gustafson-pi")
        ),
        UnknownName,
        "gustafson-pi",
        "gustafsson-pi",
    ),
    "implicit tableau": (implicit, BadTableau, "matrix.1..1.: .* implicit", "explicit"),
    "underflow": (
        lambda: newel.march(good(rate=lambda t, y: y * y, stop=2.0), "dormand-prince-5-4", **ADAPTIVE),
        newel.MarchFailed,
        r"the step at t = (0\.9+|1\.0)\d* would have to be",
        "singularity",
    ),
}


@pytest.mark.parametrize("what", BAD_INPUT)
def test_bad_input_has_its_class_and_its_words(what: str) -> None:
    act, error, first, more = BAD_INPUT[what]
    with pytest.raises(error) as caught:
        act()
    assert isinstance(caught.value, NewelError)
    import re

    text = str(caught.value)
    assert re.search(first, text.splitlines()[0]), text
    assert re.search(more, text), text
    if isinstance(caught.value, newel.MarchFailed):
        run = caught.value.run
        assert run.ended.reason == "failed"
        assert run.last_time == run.ended.time
        assert len(run.times) in (run.accepted + 1, 0)


@pytest.mark.parametrize("how", RULES)
@pytest.mark.parametrize("call", [1, 2, 3, 40, 41, 42, 43, 44, 45, 46, 90])
def test_an_interruption_at_any_call_keeps_every_accepted_row_once(how: str, call: int) -> None:
    """Ctrl-C as the rate sees it, at a fixed call: sinks closed, rows whole, state and time together."""
    count = 0

    def rate(t: float, y: Any) -> Any:
        nonlocal count
        count += 1
        if count == call:
            raise KeyboardInterrupt
        return np.array([y[1], -y[0]])

    method, rule = RULES[how]
    rows, thinned = RecordingSink(), RecordingSink(Thinning(every_steps=5))
    model = newel.Model(rate, start=0.0, stop=20.0, state=[1.0, 0.0])
    with pytest.raises(newel.MarchInterrupted) as caught:
        newel.march(model, method, **rule, sinks=[rows, newel.sinks.Memory(), thinned])
    error, run = caught.value, caught.value.run
    assert isinstance(error, KeyboardInterrupt)
    assert run.ended.reason == "interrupted"
    assert run.last_time == run.ended.time
    assert [ended.reason for ended in (*rows.ended, *thinned.ended)] == ["interrupted"] * 2
    if call == 1 or (how == "adaptive" and call == 2):
        assert run.accepted == 0
        assert "No step was made" in str(error)
        return
    assert rows.times == run.times.tolist() == sorted(set(rows.times))
    assert len(rows.times) == run.accepted + 1
    assert rows.times[-1] == thinned.times[-1] == run.last_time
    assert rows.states[-1].tolist() == thinned.states[-1].tolist() == run.last_state.tolist()
    if run.accepted:
        assert f"Kept: {run.accepted} step" in str(error)
        assert f"t = {run.last_time:g}" in str(error)


@pytest.mark.parametrize("where", ["after_step", "indicator", "norm", "step function", "within"])
def test_an_interruption_in_any_of_the_users_functions_keeps_rows_and_state_together(where: str) -> None:
    count = 0

    def strike(value: Any) -> Any:
        nonlocal count
        count += 1
        if count == 17:
            raise KeyboardInterrupt
        return value

    more: dict[str, Any] = {
        "after_step": {"after_step": lambda t, y: strike(None)},
        "indicator": {"events": [newel.StateEvent("zero", lambda t, y: strike(y[0]))]},
        "within": {"within": lambda t, y: strike(True)},
    }.get(where, {})
    rule: dict[str, Any] = {
        "norm": {"steps": newel.Adaptive(**ADAPTIVE, norm=lambda e, s: strike(0.9))},
        "step function": {"step": lambda t, y: strike(0.05)},
    }.get(where, {"rel_tol": 1e-6, "abs_tol": 1e-6})
    sink = RecordingSink()
    with pytest.raises(newel.MarchInterrupted) as caught:
        newel.march(good(stop=50.0, **more), "dormand-prince-5-4", **rule, sinks=[sink, newel.sinks.Memory()])
    run = caught.value.run
    assert sink.times == run.times.tolist() == sorted(set(sink.times))
    assert run.last_time == sink.times[-1]
    assert run.last_state.tolist() == sink.states[-1].tolist()
    assert run.accepted == len(sink.times) - 1 > 0
    assert all(event.time <= run.last_time for event in run.events)


def test_an_interrupted_stepper_goes_on_as_if_nothing_had_been() -> None:
    broken = {"now": False}

    def rate(t: float, y: Any) -> Any:
        if broken["now"] and t > 0.3:
            raise KeyboardInterrupt
        return -y

    for method, rule in RULES.values():
        stepper, twin = (newel.Stepper(good(rate=rate), method, **rule) for _ in range(2))
        broken["now"] = True
        with pytest.raises(KeyboardInterrupt):
            stepper.advance_to(1.0)
        broken["now"] = False
        stepper.advance_to(1.0)
        twin.advance_to(1.0)
        assert stepper.state.tolist() == twin.state.tolist()


@pytest.mark.parametrize("how", RULES)
@pytest.mark.parametrize("failure", ["rate", "interrupt", "none"])
def test_a_file_holds_what_the_run_holds_whatever_ends_the_march(
    how: str, failure: str, tmp_path: Path
) -> None:
    method, rule = RULES[how]
    path = tmp_path / "rows.csv"

    def rate(t: float, y: Any) -> Any:
        if t > 7.77 and failure == "rate":
            raise RuntimeError("pump broken")
        if t > 7.77 and failure == "interrupt":
            raise KeyboardInterrupt
        return np.array([y[1], -y[0]])

    model = newel.Model(rate, start=0.0, stop=10.0, state=[1.0, 0.0])
    try:
        run = newel.march(model, method, **rule, sinks=[path, newel.sinks.Memory()])
    except (newel.MarchFailed, newel.MarchInterrupted) as error:
        run = error.run
    rows = list(csv.reader(path.read_text(encoding="utf-8").splitlines()))
    got = [[float(cell) for cell in row] for row in rows[1:]]
    assert got == [[t, *y] for t, y in zip(run.times.tolist(), run.states.tolist(), strict=True)]
    assert got[-1][0] == run.last_time
    assert (run.last_time == 10.0) == (failure == "none")


@pytest.mark.parametrize("point", ["open", "write", "close"])
def test_a_sink_that_fails_leaves_the_others_whole(point: str) -> None:
    other = RecordingSink()
    with pytest.raises(newel.errors.OutputFailed) as caught:
        newel.march(
            good(),
            "kutta-4",
            step=0.001,
            sinks=[other, FailingSink(point, OSError(28, "No space left on device")), newel.sinks.Memory()],
        )
    error = caught.value
    assert isinstance(error, OSError)
    if point == "open":
        assert error.run is None
        return
    assert len(other.ended) == 1
    assert error.run.times.tolist() == other.times
    assert other.times[-1] == error.run.last_time


def test_a_failure_that_is_newels_own_closes_the_sinks_and_shows_itself() -> None:
    """SystemExit in a rate is nobody's to catch; the sinks are closed on its way."""

    def rate(t: float, y: Any) -> Any:
        if t > 0.5:
            raise SystemExit(3)
        return -y

    sink = RecordingSink()
    with pytest.raises(SystemExit):
        newel.march(good(rate=rate), "kutta-4", step=0.1, sinks=sink)
    assert [ended.reason for ended in sink.ended] == ["failed"]
    assert sink.times[-1] == pytest.approx(0.5)


SCRIPT = """
    import os, signal, sys
    import numpy as np
    import newel

    calls, path, at = 0, sys.argv[1], int(sys.argv[2])

    def rate(t, y):
        global calls
        calls += 1
        if calls == at:
            os.kill(os.getpid(), signal.SIGINT)
        return np.array([y[1], -y[0]])

    model = newel.Model(rate, start=0.0, stop=1000.0, state=[1.0, 0.0])
    try:
        newel.march(model, "kutta-4", step=0.01, sinks=[path, newel.sinks.Memory()])
    except newel.MarchInterrupted as error:
        run = error.run
        print(run.accepted, repr(float(run.last_time)), run.ended.reason, calls)
        print(*map(repr, run.last_state.tolist()))
        sys.exit(error.exit_status)
"""


@pytest.mark.skipif(os.name != "posix", reason="real signals are POSIX's")
@pytest.mark.parametrize("at", [1, 2, 1023, 4096])
def test_a_real_ctrl_c_ends_a_real_process_in_order(at: int, tmp_path: Path) -> None:
    path = tmp_path / "rows.csv"
    done = subprocess.run(
        [sys.executable, "-c", textwrap.dedent(SCRIPT), str(path), str(at)],
        capture_output=True,
        text=True,
        timeout=120,
        preexec_fn=lambda: signal.signal(signal.SIGINT, signal.default_int_handler),
        check=False,
    )
    assert done.returncode == 3, done.stderr
    facts, state = done.stdout.splitlines()
    accepted, time, reason, calls = facts.split()
    assert reason == "interrupted"
    assert int(calls) <= at + 1
    assert int(accepted) == max(0, (at - 1) // 4)
    assert float(time) == int(accepted) * 0.01
    rows = list(csv.reader(path.read_text(encoding="utf-8").splitlines()))
    if at > 1:
        assert [float(cell) for cell in rows[-1]] == [float(time), *map(float, state.split())]
        assert len(rows) == int(accepted) + 2


class Striking(RecordingSink):
    """A sink whose n-th block is struck by a real Ctrl-C, before or after it is taken."""

    def __init__(self, block: int, after: bool) -> None:
        super().__init__()
        self.left, self.after = block, after

    def write(self, times: Any, states: Any, events: tuple[str, ...]) -> None:
        self.left -= 1
        if self.left == 0 and not self.after:
            os.kill(os.getpid(), signal.SIGINT)
        super().write(times, states, events)
        if self.left == 0 and self.after:
            os.kill(os.getpid(), signal.SIGINT)


@pytest.mark.skipif(os.name != "posix", reason="real signals are POSIX's")
@pytest.mark.parametrize("after", [False, True])
@pytest.mark.parametrize("block", [1, 2, 4])
def test_a_ctrl_c_while_rows_are_written_loses_and_repeats_none(block: int, after: bool) -> None:
    before = signal.signal(signal.SIGINT, signal.default_int_handler)
    try:
        struck, other = Striking(block, after), RecordingSink()
        with pytest.raises(newel.MarchInterrupted) as caught:
            newel.march(good(), "kutta-4", step=0.001, sinks=[struck, other, newel.sinks.Memory()])
    finally:
        signal.signal(signal.SIGINT, before)
    run = caught.value.run
    assert struck.times == other.times == run.times.tolist() == sorted(set(struck.times))
    assert run.last_time == struck.times[-1]
    assert len(struck.ended) == len(other.ended) == 1


@pytest.mark.parametrize("how", RULES)
@pytest.mark.parametrize("done", [False, True])
def test_a_ctrl_c_within_the_change_of_state_leaves_time_state_and_events_together(
    how: str, done: bool, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Named point: before, and after, the engine takes the new state of the step that ends on the event."""
    from newel.stepping.numpy_step import NumpyStep

    plain = NumpyStep.accept

    def struck(self: NumpyStep) -> None:
        strikes = bool(self.new[0] <= 0.5)
        if done or not strikes:
            plain(self)
        if strikes:
            raise KeyboardInterrupt

    monkeypatch.setattr(NumpyStep, "accept", struck)
    method, rule = RULES[how]
    event = newel.StateEvent("half", lambda t, y: y[0] - 0.5)
    sink = RecordingSink()
    with pytest.raises(newel.MarchInterrupted) as caught:
        newel.march(good(events=[event]), method, **rule, sinks=[sink, newel.sinks.Memory()])
    run = caught.value.run
    assert sink.times == run.times.tolist() == sorted(set(sink.times))
    assert run.last_time == sink.times[-1] == run.events[-1].time == pytest.approx(math.log(2.0), abs=1e-5)
    assert run.last_state.tolist() == sink.states[-1].tolist() == run.events[-1].state.tolist()
    assert run.accepted == len(sink.times) - 1
    assert len(run.events) == 1
