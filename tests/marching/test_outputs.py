"""What a march hands to its sinks, and what a run shows of it."""

from __future__ import annotations

import csv
import json
import math
from pathlib import Path
from typing import Any

import numpy as np
import pytest

import newel
from newel.errors import BadRequest, NotKept, UnknownName
from newel.protocols import Thinning
from newel.results.run import Ended
from newel.testing import RecordingSink

pytestmark = pytest.mark.core

ADAPTIVE: dict[str, Any] = {"rel_tol": 1e-6, "abs_tol": 1e-6}


def swing(t: float, y: Any) -> Any:
    return np.array([y[1], -y[0]])


def model(**more: Any) -> newel.Model:
    settings: dict[str, Any] = {"start": 0.0, "stop": 2.0, "state": [1.0, 0.0], "labels": ("x", "v")}
    return newel.Model(swing, **{**settings, **more})


def test_memory_is_the_default_and_row_0_is_the_start() -> None:
    run = newel.march(model(), "kutta-4", step=0.5)
    assert run.times.tolist() == [0.0, 0.5, 1.0, 1.5, 2.0]
    assert run.states.shape == (5, 2)
    assert run.states[0].tolist() == [1.0, 0.0]
    assert run.states[-1].tolist() == run.last_state.tolist()
    assert run["v"].tolist() == run.states[:, 1].tolist()
    with pytest.raises(UnknownName, match="no label 'w'\n  Its labels: x, v"):
        run["w"]


def test_columns_are_one_array_a_column() -> None:
    run = newel.march(model(), "kutta-4", step=0.5)
    columns = run.columns()
    assert list(columns) == ["t", "x", "v"]
    assert columns["x"].tolist() == run["x"].tolist()
    grid = newel.Model(lambda t, y: -y, start=0.0, stop=1.0, state=np.ones((2, 2)))
    assert list(newel.march(grid, "kutta-4", step=0.5).columns()) == [
        "t",
        "y[0,0]",
        "y[0,1]",
        "y[1,0]",
        "y[1,1]",
    ]


def test_without_a_memory_sink_states_are_not_kept_but_the_last_always_is() -> None:
    sink = RecordingSink()
    run = newel.march(model(), "kutta-4", step=0.5, sinks=sink)
    for asked in (lambda: run.times, lambda: run.states, lambda: run["x"], run.columns):
        with pytest.raises(NotKept, match="its sinks were RecordingSink"):
            asked()
    assert run.last_time == 2.0
    assert run.last_state.tolist() == sink.states[-1].tolist()
    with pytest.raises(NotKept, match="its sinks were none"):
        newel.march(model(), "kutta-4", step=0.5, sinks=[]).states  # noqa: B018 - the access is what raises


@pytest.mark.parametrize("stop", [2.0, -2.0])
@pytest.mark.parametrize("how", ["fixed", "adaptive", "function"])
def test_several_sinks_get_what_each_asked_for(stop: float, how: str) -> None:
    sign = math.copysign(1.0, stop)
    rule = {"fixed": {"step": 0.125}, "adaptive": ADAPTIVE, "function": {"step": lambda t, y: 0.3}}[how]
    at, every, steps, all_rows = (
        RecordingSink(Thinning(at=(sign * 0.25, sign * 1.5))),
        RecordingSink(Thinning(every_time=0.75)),
        RecordingSink(Thinning(every_steps=3)),
        RecordingSink(),
    )
    run = newel.march(model(stop=stop), "dormand-prince-5-4", **rule, sinks=[at, every, steps, all_rows])
    assert at.times == [sign * 0.25, sign * 1.5]
    assert every.times == [0.0, sign * 0.75, sign * 1.5, stop]
    assert all_rows.times[0] == 0.0
    assert all_rows.times[-1] == stop == run.last_time
    assert len(all_rows.times) == run.accepted + 1
    expected = all_rows.times[::3]
    assert steps.times == (expected if expected[-1] == stop else [*expected, stop])
    for t, y in zip(at.times, at.states, strict=True):
        assert y == pytest.approx([math.cos(t), -math.sin(t)], abs=1e-4)
    for sink in (at, every, steps, all_rows):
        assert [ended.reason for ended in sink.ended] == ["stop"]
        assert sink.heads[0].labels == ("x", "v")
        assert sink.heads[0].about["method"] == "dormand-prince-5-4"


@pytest.mark.parametrize("asked", [{"at": [0.3]}, {"every_time": 0.3}])
def test_a_fixed_march_refuses_times_off_its_grid_and_names_the_nearest(asked: dict[str, Any]) -> None:
    calls: list[float] = []

    def rate(t: float, y: Any) -> Any:
        calls.append(t)
        return -y

    off = newel.Model(rate, start=0.0, stop=1.0, state=[1.0])
    for rule in ({"step": 0.25}, {"steps": newel.Given([0.25, 0.5, 0.75, 1.0])}):
        with pytest.raises(
            BadRequest, match=r"t = 0\.3, which is no time of this march; the nearest is 0\.25"
        ):
            newel.march(off, "kutta-4", **rule, sinks=newel.sinks.Memory(**asked))
    assert calls == []


@pytest.mark.parametrize("step", [0.1, 0.01])
def test_times_of_the_grid_are_known_whatever_they_round_to(step: float) -> None:
    """3·0.1 is 0.30000000000000004; the row carries the time that was asked for."""
    memory = newel.sinks.Memory(at=[0.3, 0.7, 0.9, 2.0])
    run = newel.march(model(), "kutta-4", step=step, sinks=memory)
    assert run.times.tolist() == [0.3, 0.7, 0.9, 2.0]
    run = newel.march(model(), "kutta-4", step=step, sinks=newel.sinks.Memory(every_time=0.1))
    assert run.times == pytest.approx(np.linspace(0, 2, 21), abs=1e-15)


def test_many_asked_times_among_many_given_ones_are_checked_at_once() -> None:
    """Not each against each: 10⁴ times in 10⁴."""
    times = np.linspace(0.0, 1.0, 10_001)[1:].tolist()
    still = newel.Model(lambda t, y: 0 * y, start=0.0, stop=1.0, state=[1.0])
    run = newel.march(still, "euler-1", steps=newel.Given(times), sinks=newel.sinks.Memory(at=times))
    assert run.times.tolist() == times


def test_a_fixed_march_that_cannot_fit_is_refused_before_the_first_call() -> None:
    calls: list[float] = []

    def rate(t: float, y: Any) -> Any:
        calls.append(t)
        return -y

    wide = newel.Model(rate, start=0.0, stop=1.0, state=np.ones(1000))
    with pytest.raises(BadRequest, match=r"1,001 rows of 1,000 float64 need 7\.6 MiB; .*Nothing was run"):
        newel.march(wide, "kutta-4", step=0.001, sinks=newel.sinks.Memory(limit=1_000_000))
    assert calls == []
    run = newel.march(wide, "kutta-4", step=0.001, sinks=newel.sinks.Memory(limit=1_000_000, every_steps=100))
    assert len(run.times) == 11


def test_an_adaptive_march_that_fills_its_memory_ends_with_all_it_had() -> None:
    other = RecordingSink()
    run = newel.march(
        model(stop=200.0), "dormand-prince-5-4", **ADAPTIVE, sinks=[newel.sinks.Memory(limit=240), other]
    )
    assert run.ended.reason == "memory"
    assert len(run.times) == 10
    assert run.last_time == run.ended.time == run.times[-1] == other.times[-1]
    assert run.last_state.tolist() == run.states[-1].tolist()
    assert run.accepted == 9
    assert any("240 bytes" in note.text for note in run.notes)
    assert other.ended[0].reason == "memory"


def test_a_march_that_ends_with_the_row_that_fills_the_memory_has_ended_by_stop() -> None:
    run = newel.march(model(), "kutta-4", step=0.5, sinks=newel.sinks.Memory(limit=5 * 24))
    assert run.ended.reason == "stop"
    assert len(run.times) == 5


def test_events_get_a_row_and_a_label() -> None:
    event = newel.StateEvent("half", lambda t, y: y[0] - 0.5)
    sinks = [RecordingSink(), RecordingSink(Thinning(every_steps=1000)), RecordingSink(Thinning(at=(2.0,)))]
    run = newel.march(model(events=[event]), "dormand-prince-5-4", **ADAPTIVE, sinks=sinks)
    time = run.events[0].time
    assert sinks[0].events[sinks[0].times.index(time)] == "half"
    assert sinks[1].times == [0.0, time, 2.0]
    assert sinks[1].events == ["", "half", ""]
    assert sinks[2].times == [2.0]
    assert sinks[0].heads[0].has_events


@pytest.mark.parametrize("ending", [".csv", ".jsonl"])
def test_a_files_ending_chooses_the_sink(ending: str, tmp_path: Path) -> None:
    path = tmp_path / f"rows{ending}"
    run = newel.march(model(), "kutta-4", step=0.5, sinks=[path, newel.sinks.Memory()])
    assert str(path) in run.sinks
    text = path.read_text(encoding="utf-8")
    if ending == ".csv":
        rows = list(csv.reader(text.splitlines()))
        assert rows[0] == ["t", "x", "v"]
        got = [[float(cell) for cell in row] for row in rows[1:]]
    else:
        head, *got = map(json.loads, text.splitlines())
        assert head["columns"] == ["t", "x", "v"]
        assert head["digest"] == run.digest
    assert got == [[t, *y] for t, y in zip(run.times.tolist(), run.states.tolist(), strict=True)]


@pytest.mark.parametrize("sinks", [3, [object()], ["rows.unknown"], [None]])
def test_what_is_no_sink_is_refused_before_anything_runs(sinks: Any) -> None:
    with pytest.raises((BadRequest, UnknownName)):
        newel.march(model(), "kutta-4", step=0.5, sinks=sinks)


def test_what_is_no_model_is_refused() -> None:
    with pytest.raises(BadRequest, match=r"march takes a newel\.Model first and the method second"):
        newel.march("kutta-4", model(), step=0.5)


def test_a_run_knows_what_was_asked_and_what_it_took() -> None:
    run = newel.march(model(), "bogacki-shampine-3-2", **ADAPTIVE)
    assert run.method == "bogacki-shampine-3-2"
    assert run.digest == newel.Registry(plugins=False).find("bogacki-shampine-3-2").digest
    assert json.loads(json.dumps(run.settings))["rel_tol"] == 1e-6
    assert run.accepted + 1 == len(run.times)
    assert run.ended == Ended("stop", 2.0)
    assert run.machine
    # first same as last: 3 calls an attempt, 1 at the start, 1 for the first step's length
    assert run.calls == 3 * (run.accepted + run.rejected) + 2


def test_one_line_of_log_a_march_and_one_for_each_rejection(caplog: pytest.LogCaptureFixture) -> None:
    with caplog.at_level("DEBUG", logger="newel"):
        run = newel.march(
            model(),
            "dormand-prince-5-4",
            steps=newel.Adaptive(rel_tol=1e-9, abs_tol=1e-9, first=2.0),
        )
    lines = [record for record in caplog.records if record.levelname == "INFO"]
    assert len(lines) == 1
    assert lines[0].getMessage() == (
        f"dormand-prince-5-4: t = 0.0 to 2.0, adaptive, {run.accepted} steps, {run.rejected} rejected, "
        f"{run.calls} calls, ended by stop"
    )
    assert run.rejected >= 1
    assert len([record for record in caplog.records if record.levelname == "DEBUG"]) == run.rejected
    caplog.clear()
    with caplog.at_level("INFO", logger="newel"), pytest.raises(newel.MarchFailed):
        newel.march(model(within=(-2.0, 0.5 * 2)).replace(within=lambda t, y: t < 1.0), "kutta-4", step=0.25)
    assert [record.getMessage().rsplit(", ", 1)[1] for record in caplog.records] == ["ended by failed"]


def test_progress_changes_no_bit() -> None:
    plain, shown = (newel.march(model(), "kutta-4", step=0.01, progress=p) for p in (False, True))
    assert (plain.states == shown.states).all()
