"""`newel march`: a model from the command line, with what the run was and where it went."""

import csv
import inspect
import json
from pathlib import Path

import pytest

import newel
from tests.console.driver import DECAY, LOCK, own, say

pytestmark = pytest.mark.core


@pytest.fixture
def decay():
    Path("decay.py").write_text(DECAY)
    return "decay.py"


def test_the_lock_fills_and_its_rows_are_those_of_the_same_march_in_python():
    said = say(*LOCK, "--to", "lock.csv")
    assert (said.status, said.err) == (0, "")
    run = newel.march(newel.load_model("example:lock"), "dormand-prince-5-4", rel_tol=1e-6, abs_tol=1e-9)
    with open("lock.csv", newline="", encoding="utf-8") as file:
        rows = list(csv.reader(file))
    assert rows[0] == ["t", "upper level", "chamber level", "volume", "event"]
    assert [float(row[0]) for row in rows[1:]] == run.times.tolist()
    assert [float(row[3]) for row in rows[1:]] == run["volume"].tolist()
    assert rows[-1][4] == "gates may be opened"


def test_the_summary_says_what_ran_how_it_ended_and_what_it_cost():
    out = say(*LOCK, "--to", "lock.csv").out
    for text in (
        "example:lock by dormand-prince-5-4\n",
        "Dormand–Prince 5(4), order 5(4), proof: exact",
        "error\n            estimate: embedded",
        "  time      0 s to 252.642",
        "  ended     by the event 'gates may be opened'",
        " calls of rate",
        "  event     gates may be opened, t = 252.642",
        "  rows in   lock.csv",
        "    chamber level  34.5434211 m\n",
        "    volume         329.210526 m3\n",
    ):
        assert text in out
    assert max(map(len, out.splitlines())) <= 80


def test_json_says_the_same_with_all_digits():
    data = say(*LOCK, "--json").data
    assert data["schema"] == "newel-march/1"
    run = newel.march(newel.load_model("example:lock"), "dormand-prince-5-4", rel_tol=1e-6, abs_tol=1e-9)
    assert data["last_state"] == run.last_state.tolist()
    assert data["ended"] == {"reason": "event", "time": run.last_time, "label": "gates may be opened"}
    assert (data["accepted"], data["rejected"], data["calls"]) == (run.accepted, run.rejected, run.calls)
    assert data["events"][0]["label"] == "gates may be opened"
    assert data["settings"]["controller"] == "gustafsson-pi"


def test_step_doubling_is_named_where_a_method_has_no_estimate(decay):
    out = say("march", decay, "--method", "kutta-4", "--rel-tol", "1e-6", "--abs-tol", "1e-9").out
    assert "step doubling" in out


def test_labels_in_square_brackets_are_shown_as_they_are(decay):
    out = say("march", decay, "--method", "kutta-4", "--step", "0.1", color=True).out
    assert "    x[0]  0.36787" in out


def test_settings_reach_the_function_that_makes_the_model(decay):
    said = say(
        "march", "decay.py:build", "--set", "rate=2.0", "--method", "kutta-4", "--step", "0.01", "--json"
    )
    assert said.data["last_state"][0] == pytest.approx(0.1353352832, abs=1e-9)


def test_two_outputs_get_the_same_rows(decay):
    say("march", decay, "--method", "kutta-4", "--step", "0.25", "--to", "a.csv", "--to", "a.jsonl")
    lines = Path("a.csv").read_text().splitlines()[1:]
    rows = [json.loads(line) for line in Path("a.jsonl").read_text().splitlines()[1:]]
    assert [[float(cell) for cell in line.split(",")] for line in lines] == rows
    assert [row[0] for row in rows] == [0.0, 0.25, 0.5, 0.75, 1.0]


@pytest.mark.parametrize(
    ("thinning", "times"),
    [
        (("--at", "0..1/3"), [0.0, 0.5, 1.0]),
        (("--at", "0.25,1"), [0.25, 1.0]),
        (("--every-steps", "3"), [0.0, 0.75, 1.0]),
        (("--every-time", "0.5"), [0.0, 0.5, 1.0]),
    ],
)
def test_thinning_decides_which_rows_a_file_gets(decay, thinning, times):
    said = say("march", decay, "--method", "kutta-4", "--step", "0.25", "--to", "a.csv", *thinning)
    assert said.status == 0
    assert [float(line.split(",")[0]) for line in Path("a.csv").read_text().splitlines()[1:]] == times


def test_settings_of_adaptive_steps_reach_the_march(decay):
    words = ("--rel-tol", "1e-6", "--abs-tol", "1e-9", "--controller", "elementary", "--first", "1e-3")
    data = say("march", decay, "--method", "dormand-prince-5-4", *words, "--largest", "0.05", "--json").data
    settings = data["settings"]
    assert (settings["controller"], settings["first"], settings["largest"]) == ("elementary", 0.001, 0.05)
    assert data["accepted"] >= 20


def test_one_tolerance_for_each_entry():
    words = ("--method", "kutta-4", "--rel-tol", "1e-6", "--abs-tol", "1e-9,1e-9,1e-6")
    assert say("march", "example:lock", *words, "--json").data["settings"]["abs_tol"] == [1e-9, 1e-9, 1e-6]


def test_a_file_that_exists_is_replaced_only_by_force(decay):
    Path("a.csv").write_text("precious")
    words = ("march", decay, "--method", "kutta-4", "--step", "0.25", "--to", "a.csv")
    said = say(*words)
    assert (said.status, said.out) == (2, "")
    assert "a.csv exists already; nothing was written." in said.err
    assert "--force" in said.err
    assert Path("a.csv").read_text() == "precious"
    assert say(*words, "--force").status == 0
    assert Path("a.csv").read_text().startswith("t,x[0]")


def test_a_tableau_of_ones_own_by_path_or_from_a_folder(decay):
    Path("mine").mkdir()
    Path("mine/two-thirds-2.toml").write_text(own())
    by_path = say("march", decay, "--method", "mine/two-thirds-2.toml", "--step", "0.1", "--json").data
    by_slug = say(
        "march", decay, "--method", "two-thirds-2", "--step", "0.1", "--json", "--tableaux", "mine"
    ).data
    assert by_path["last_state"] == by_slug["last_state"]
    assert by_slug["method"]["name"] == "Two thirds"


def test_a_method_that_does_not_hold_is_not_marched_with(decay):
    Path("two-thirds-2.toml").write_text(own(node="2/5"))
    said = say("march", decay, "--method", "two-thirds-2.toml", "--step", "0.1", "--to", "a.csv")
    assert said.status == 1
    assert "a claim does not hold" in said.err
    assert not Path("a.csv").exists()


def test_a_march_that_cannot_go_on_is_status_1_and_keeps_its_rows():
    Path("blow.py").write_text(
        "import newel\nmodel = newel.Model(lambda t, y: y * y, start=0.0, stop=2.0, state=[1.0])\n"
    )
    words = ("march", "blow.py", "--method", "dormand-prince-5-4", "--rel-tol", "1e-6", "--abs-tol", "1e-9")
    said = say(*words, "--to", "blow.csv")
    assert said.status == 1
    assert "  ended     by a failure, before its stop at 2" in said.out
    assert "Kept: " in said.err
    assert len(Path("blow.csv").read_text().splitlines()) > 10
    data = say(*words, "--json").data
    assert data["ended"]["reason"] == "failed"
    assert "Kept: " in data["error"]


def test_what_is_not_a_number_is_a_text_in_json():
    Path("nan.py").write_text(
        "import newel\n"
        "def rate(t, y):\n"
        "    return [float('nan') if t > 0.5 else 0.0, 0.0]\n"
        "model = newel.Model(rate, start=0.0, stop=1.0, state=[1.0, float('inf')])\n"
    )
    said = say("march", "nan.py", "--method", "euler-1", "--step", "0.125", "--json")
    if said.out:
        assert said.data["last_state"] == [1.0, "inf"]
    else:
        assert said.err


def test_what_the_model_prints_does_not_mix_with_results():
    Path("loud.py").write_text(
        "print('loading')\n" + DECAY.replace("model = build()", "model = build(); print(1)")
    )
    said = say("march", "loud.py", "--method", "kutta-4", "--step", "0.25", "--json")
    assert said.data["accepted"] == 4
    assert "loading" in said.err


def test_only_the_first_entries_of_a_large_state_are_shown():
    Path("wide.py").write_text(
        "import newel\nmodel = newel.Model(lambda t, y: -y, start=0, stop=1, state=[1.0] * 1000)\n"
    )
    out = say("march", "wide.py", "--method", "kutta-4", "--step", "0.25").out
    assert "    y[11]  0." in out
    assert "    and 988 more" in out
    assert len(out.splitlines()) < 30


def test_every_argument_of_march_is_an_option_of_the_same_name():
    from newel.console.parser import build

    options = {action.dest for action in build()[1]["march"]._actions}
    elsewhere = {
        "steps": "the settings of Adaptive are options of their own",
        "sinks": "--to, with --at, --every-steps, --every-time and --force",
        "progress": "always, on a terminal",
        "registry": "--tableaux",
        "norm": "a function",
        "path": "--to",
        "overwrite": "--force",
    }
    arguments = [*inspect.signature(newel.march).parameters]
    arguments += inspect.signature(newel.Adaptive).parameters
    arguments += inspect.signature(newel.sinks.Csv).parameters
    assert {name for name in arguments if name not in elsewhere} <= options
    extra = options - set(arguments) - {"help", "json", "tableaux", "to", "force", "set"}
    assert extra == set()
