"""Bad input at the command line: a clear error with what to do, nothing lost, and never a traceback."""

import os
from pathlib import Path

import pytest

from tests.console.driver import DECAY, LOCK, own, process, say

pytestmark = pytest.mark.core

KUTTA = ("--method", "kutta-4")


@pytest.fixture(autouse=True)
def files(apart):
    Path("decay.py").write_text(DECAY)
    Path("folder").mkdir()
    Path("folder.toml").mkdir()
    Path("notes.txt").write_text("not a tableau")
    Path("malformed.toml").write_text('schema = "newel-tableau/1\n')
    Path("zero.toml").write_text(own("zero").replace('"1/4"', '"1/0"'))
    Path("implicit.toml").write_text(own("implicit").replace('["2/3"]]', '["1/3", "1/3"]]'))
    Path("short.toml").write_text(own("short").replace('"1/4", "3/4"', '"1"'))
    Path("thin.toml").write_text(own("thin").replace('"1/4"', '"1\u2009/4"'))
    Path("comma.toml").write_text(own("comma").replace('"1/4"', '"0,25"'))
    Path("key.toml").write_text(own("key").replace("weights", "wieghts"))
    Path("name.toml").write_text(own("another"))
    Path("bytes.toml").write_bytes(b"\xff\xfe\x00slug")
    Path("huge.toml").write_text(own("huge").replace('"1/4"', '"' + "7" * 10_000_000 + '"'))
    Path("long.toml").write_text(own("long").replace('"1/4"', '"' + "7" * 100_000 + '"'))
    Path("syntax.py").write_text("model = (\n")
    Path("raises.py").write_text("import newel\nmodel = 1 / 0\n")
    Path("exits.py").write_text("import sys\nsys.exit(5)\n")
    Path("number.py").write_text("model = 5\n")


@pytest.mark.parametrize("command", ["check", "inspect"])
@pytest.mark.parametrize(
    ("method", "status", "says"),
    [
        ("rk4", 2, "unknown method 'rk4'\n  That usual name belongs to kutta-4."),
        ("", 2, "unknown method ''"),
        ("x" * 5000, 2, "unknown method"),
        ("../../etc/passwd\0", 2, "unknown method"),
        ("missing.toml", 2, "missing.toml: there is no such file"),
        ("folder", 2, "folder is a folder, not a tableau."),
        ("folder.toml", 2, "folder.toml"),
        ("notes.txt", 2, "notes.txt is no tableau file.\n  The name of one ends in .toml."),
        ("decay.py", 2, "decay.py is a model, not a tableau. For a model: newel examine decay.py"),
        ("malformed.toml", 2, "malformed.toml: line 1"),
        ("zero.toml", 2, "zero.toml: weights[1]: '1/0'"),
        ("implicit.toml", 2, "explicit"),
        ("short.toml", 2, "short.toml"),
        ("thin.toml", 2, "THIN SPACE"),
        ("comma.toml", 2, "comma.toml: weights[1]"),
        ("key.toml", 2, "the nearest known key is weights"),
        ("name.toml", 2, "name.toml: slug"),
        ("bytes.toml", 2, "bytes.toml"),
        ("huge.toml", 2, "huge.toml"),
        ("long.toml", 2, "long.toml: weights[1]"),
        ("doubled-doubled-doubled-kutta-4", 2, "families stand"),
    ],
)
def test_methods_that_are_none(command, method, status, says):
    said = say(command, method)
    assert said.status == status
    assert says in said.err
    assert "Traceback" not in said.err
    assert "unexpected" not in said.err
    assert max(map(len, said.err.splitlines())) < 400


@pytest.mark.parametrize("command", ["march", "examine"])
@pytest.mark.parametrize(
    ("model", "says"),
    [
        ("two-thirds-2.toml", "two-thirds-2.toml is a tableau, not a model.\n  For a tableau: newel check"),
        ("missing.py", "there is no file missing.py"),
        ("folder", "folder is a folder, not a model."),
        ("example:loch", "no example 'loch'"),
        ("decay.py:nothing", "decay.py has no 'nothing'"),
        ("syntax.py", "syntax.py:1: "),
        ("raises.py", "raises.py:2: ZeroDivisionError"),
        ("exits.py", "exits.py:2: SystemExit"),
        ("number.py", "number.py:model is a int, not a model"),
        ("notes.txt", "notes.txt is no Python file"),
        ("", "names no model"),
    ],
)
def test_models_that_are_none(command, model, says):
    said = say(command, model, *((*KUTTA, "--step", "0.1") if command == "march" else ()))
    assert said.status == 2
    assert said.out == ""
    assert says in said.err
    assert "Traceback" not in said.err


@pytest.mark.parametrize(
    ("words", "status", "says"),
    [
        ((), 2, "no step rule: give one of"),
        ((), 2, "On the command line: --step 0.01, or --rel-tol 1e-6 --abs-tol 1e-9"),
        (("--step", "0.1", "--rel-tol", "1e-6", "--abs-tol", "1e-9"), 2, "more than one step rule"),
        (("--rel-tol", "1e-6"), 2, "abs_tol is missing"),
        (("--rel-tol", "1e-6"), 2, "On the command line:"),
        (("--step", "0"), 2, "step=0.0: must be positive"),
        (("--step", "-0.5"), 2, "step=-0.5: must be positive"),
        (("--step", "nan"), 2, "step=nan"),
        (("--step", "fast"), 2, "--step fast: no number"),
        (("--rel-tol", "0", "--abs-tol", "1"), 2, "rel_tol=0.0"),
        (("--rel-tol", "1e-20", "--abs-tol", "1"), 2, "rel_tol=1e-20 is below what"),
        (("--rel-tol", "1e-6", "--abs-tol", "-1"), 2, "abs_tol=-1.0"),
        (
            ("--rel-tol", "1e-6", "--abs-tol", "1,2,3"),
            2,
            "abs_tol has shape (3,), and the state has shape (1,)",
        ),
        (("--step", "0.1", "--controller", "elementary"), 2, "--controller belongs to adaptive steps"),
        (("--rel-tol", "1e-6", "--abs-tol", "1", "--controller", "pi"), 2, "unknown controller 'pi'"),
        (
            ("--rel-tol", "1e-6", "--abs-tol", "1", "--smallest", "2", "--largest", "1"),
            2,
            "smallest=2.0 is above",
        ),
        (("--step", "0.1", "--to", "a.xyz"), 2, "unknown file ending '.xyz'"),
        (("--step", "0.1", "--to", "nowhere/a.csv"), 1, "nowhere/a.csv: "),
        (("--step", "0.1", "--to", "a.csv", "--to", "a.csv"), 2, "a.csv"),
        (("--step", "0.1", "--every-steps", "2"), 2, "--every-steps without an output"),
        (("--step", "0.1", "--force"), 2, "--force without an output"),
        (("--step", "0.1", "--to", "a.csv", "--every-steps", "0"), 2, "every_steps=0"),
        (("--step", "0.1", "--to", "a.csv", "--every-steps", "1", "--every-time", "1"), 2, "given together"),
        (("--step", "0.1", "--to", "a.csv", "--at", "0.25"), 2, "the nearest is"),
        (("--step", "0.1", "--to", "a.csv", "--at", "7"), 2, "at holds 7.0"),
        (("--step", "0.1", "--set", "rate=1"), 2, "decay.py:model is a Model and takes no settings"),
        (("--step", "0.1", "--set", "rate"), 2, "--set rate: not of the form name=value"),
        (("--step", "1e-300"), 2, ""),
    ],
)
def test_marches_that_cannot_be(words, status, says):
    said = say("march", "decay.py", *KUTTA, *words)
    assert said.status == status
    assert said.out == ""
    assert says in said.err
    assert said.err
    assert "Traceback" not in said.err
    assert "unexpected" not in said.err
    assert not Path("a.csv").exists()


@pytest.mark.skipif(os.geteuid() == 0, reason="root may write everywhere")
def test_an_output_that_may_not_be_written_is_named():
    Path("locked.csv").write_text("old")
    Path("locked.csv").chmod(0o400)
    said = say("march", "decay.py", *KUTTA, "--step", "0.1", "--to", "locked.csv", "--force")
    assert said.status == 1
    assert said.err.startswith("locked.csv: ")
    assert Path("locked.csv").read_text() == "old"


@pytest.mark.parametrize(
    ("rate", "says"),
    [
        ("None", "None"),
        ("[1.0, 2.0]", "shape"),
        ("'text'", ""),
        ("1j * y", "complex"),
        ("[float('nan')]", "rate gave NaN at t = 0"),
        ("[1 / 0]", "ZeroDivisionError"),
        ("undefined", "NameError"),
    ],
)
def test_rates_that_are_wrong_are_named_with_their_place(rate, says):
    Path("bad.py").write_text(DECAY.replace("-rate * y", rate))
    said = say("march", "bad.py", *KUTTA, "--step", "0.1", "--to", "a.csv")
    assert said.status in (1, 2)
    assert says in said.err
    assert "Traceback" not in said.err
    assert "unexpected" not in said.err


def test_a_rate_that_takes_the_state_first_is_told_how_to_be_wrapped():
    Path("swapped.py").write_text(DECAY.replace("lambda t, y: -rate * y", "lambda y, t: -rate * y"))
    said = say("march", "swapped.py", *KUTTA, "--step", "0.1")
    assert said.status == 2
    assert "lambda t, y: rate(y, t)" in said.err


def test_a_stop_at_the_start_is_refused():
    Path("none.py").write_text(DECAY.replace("stop=1.0", "stop=0.0"))
    said = say("march", "none.py", *KUTTA, "--step", "0.1")
    assert said.status == 2
    assert "stop" in said.err


def test_a_model_that_calls_exit_does_not_end_the_command_in_silence():
    Path("quits.py").write_text("import sys\n" + DECAY.replace("-rate * y", "sys.exit(7)"))
    said = say("march", "quits.py", *KUTTA, "--step", "0.1")
    assert said.status == 1
    assert said.err
    assert "Traceback" not in said.err


def test_what_nobody_foresaw_is_one_line_and_a_traceback_only_when_asked(monkeypatch):
    import newel.console.list as module

    def fail(options, screen):
        raise RuntimeError("the\nmoon")

    monkeypatch.setattr(module, "run", fail)
    said = say("list")
    assert said.status == 1
    assert said.err.startswith("unexpected RuntimeError: the moon (test_bad_requests.py:")
    assert "NEWEL_TRACEBACK=1" in said.err
    assert "Traceback" not in said.err
    monkeypatch.setenv("NEWEL_TRACEBACK", "1")
    assert "Traceback (most recent call last)" in say("list").err


def test_the_process_says_it_on_stderr_alone():
    for words, status in (
        ((*LOCK, "--set", "padle=1"), 2),
        (("check", "zero.toml"), 2),
        (("check", "rk4"), 2),
    ):
        said = process(*words)
        assert said.status == status
        assert "Traceback" not in said.err
        assert said.err
        if words[0] == "march":
            assert said.out == ""
