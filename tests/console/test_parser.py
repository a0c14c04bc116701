"""The command line: which subcommands there are, what help says, and words that fit nothing."""

import re
import shlex

import pytest

import newel
from newel.console.parser import SUBCOMMANDS, build
from newel.console.ranges import numbers, settings, whole_numbers
from newel.errors import BadRequest
from tests.console.driver import process, say

pytestmark = pytest.mark.core

FUNCTIONS = {"list": "names"}
"""Each subcommand calls the public function of its own name, but for these."""


def test_each_subcommand_calls_one_public_function():
    assert SUBCOMMANDS == (
        "list",
        "inspect",
        "check",
        "recover",
        "identify",
        "draft",
        "export",
        "march",
        "examine",
        "plugins",
        "guide",
    )
    assert set(build()[1]) == set(SUBCOMMANDS)
    for name in SUBCOMMANDS:
        function = FUNCTIONS.get(name, name)
        assert function in newel.__all__
        assert callable(getattr(newel, function))


@pytest.mark.parametrize("command", [(), *((name,) for name in SUBCOMMANDS)])
def test_help_ends_with_two_commands_that_run_as_they_stand(command):
    said = say(*command, "--help")
    assert said.status == 0
    assert said.err == ""
    body, _, pasted = said.out.partition("\ntry:\n")
    assert max(map(len, body.splitlines())) <= 80
    lines = pasted.splitlines()
    assert len(lines) == 2
    for line in lines:
        words = shlex.split(line)
        assert words[0] == "newel"
        ran = say(*words[1:])
        assert (ran.status, ran.err) == (0, "")
        assert ran.out


def test_version_is_one_line():
    assert say("--version").out == f"newel {newel.__version__}\n"


@pytest.mark.parametrize("name", SUBCOMMANDS)
def test_every_subcommand_has_a_json_twin_with_a_schema(name, tmp_path):
    (tmp_path / "decay.py").write_text(
        "import newel\nmodel = newel.Model(lambda t, y: -y, start=0, stop=1, state=[1.0])\n"
    )
    words = {
        "inspect": ["kutta-4"],
        "check": ["kutta-4"],
        "recover": ["newel.examples:midpoint_step"],
        "identify": ["kutta-4"],
        "draft": ["mine.toml", "--stages", "2"],
        "export": ["kutta-4", "--as", "c"],
        "march": ["decay.py", "--method", "kutta-4", "--step", "0.5"],
        "examine": ["decay.py"],
    }
    said = say(name, *words.get(name, []), "--json")
    assert said.status == 0
    assert re.fullmatch(r"newel-[a-z]+/1", said.data["schema"])


@pytest.mark.parametrize(
    ("words", "says"),
    [
        ((), "no command\n  Commands: list, inspect"),
        (("lisst",), "no command 'lisst'; the nearest is list\n"),
        (("qualify",), "no command 'qualify'"),
        (("list", "--ordr", "4"), "no option --ordr; the nearest is --order\n"),
        (("list", "--orde=4"), "no option --orde; the nearest is --order\n"),
        (("--jsn",), "no option --jsn"),
        (("list", "kutta"), "'kutta' is one word too many\n"),
        (("march", "example:lock", "--step", "1"), "the following arguments are required: --method\n"),
        (("march",), "the following arguments are required: MODEL, --method\n"),
        (("inspect",), "the following arguments are required: METHOD\n"),
        (("list", "--order"), "argument --order: expected one argument\n"),
        (("list", "--order", "four"), "--order four: no whole number\n"),
        (("list", "--order", "1..99999"), "--order 1..99999: too many values\n"),
        (
            ("list", "--sort", "yeer"),
            "sort='yeer' is none of order, stages, slug, year, floor\n  Near: year.",
        ),
        (("list", "--tableaux", "nowhere"), "nowhere: no folder of tableaux"),
        (("list\ud800",), "no command"),
    ],
)
def test_words_that_fit_nothing_are_answered_with_what_does(words, says):
    said = say(*words)
    assert said.status == 2
    assert said.out == ""
    assert says in said.err
    assert "Traceback" not in said.err


def test_a_value_that_begins_with_a_minus_is_explained():
    said = say("march", "example:lock", "--method", "kutta-4", "--step", "1", "--to", "a.csv", "--at", "-1,2")
    assert said.status == 2
    assert "--at=-1,2" in said.err


def test_the_process_gives_the_same_status_as_the_function():
    said = process("lisst")
    assert (said.status, said.out) == (2, "")
    assert said.err.startswith("no command 'lisst'; the nearest is list\n")


def test_ranges_have_both_ends_exactly():
    assert numbers("0.2..0.8/25", "--at")[::24] == [0.2, 0.8]
    assert len(numbers("0.2..0.8/25", "--at")) == 25
    assert numbers("1e-6..1e-2/9log", "--at")[4] == pytest.approx(1e-4)
    assert numbers("1,2,5", "--at") == [1.0, 2.0, 5.0]
    assert numbers("-1..1/3,7", "--at") == [-1.0, 0.0, 1.0, 7.0]
    assert whole_numbers("4..6,9", "--order") == [4, 5, 6, 9]


@pytest.mark.parametrize(
    "text",
    [
        "",
        "a",
        "1,,2",
        "0..1",
        "0..1/1",
        "0..1/2.5",
        "0..1/99999999",
        "-1..1/3log",
        "0..inf/3",
        "nan..1/3",
        "1/2",
    ],
)
def test_what_is_no_range_is_refused_with_the_forms(text):
    with pytest.raises(BadRequest) as caught:
        numbers(text, "--at")
    assert str(caught.value).startswith(f"--at {text}:")


def test_settings_are_read_in_the_grammar_of_toml():
    texts = ["a=0.6", "b=true", 'c="x=y"', "d=[1, 2]", "e=1_000", "f={g = 1}", "h = -inf"]
    assert settings(texts) == {
        "a": 0.6,
        "b": True,
        "c": "x=y",
        "d": [1, 2],
        "e": 1000,
        "f": {"g": 1},
        "h": float("-inf"),
    }


@pytest.mark.parametrize(
    "text",
    [
        "a",
        "=1",
        "a=",
        "a=x",
        "a=1\nb=2",
        "a b=1",
        "a.b=1",
        "a=[" + "[" * 5000,
        "a=" + "9" * 5000,
        "a=__import__('os')",
    ],
)
def test_what_sets_nothing_is_refused_by_name(text):
    with pytest.raises(BadRequest, match="--set"):
        settings([text])


def test_a_name_is_set_once():
    with pytest.raises(BadRequest, match="--set a is given twice"):
        settings(["a=1", "a=2"])
