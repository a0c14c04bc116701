"""`newel recover` and `newel identify`, and the repairs that `newel check` shows and writes."""

import pytest

import newel
from tests.console.driver import own, say

pytestmark = pytest.mark.core

LOOPS = """\
def right(rate, t, y, h):
    k1 = rate(t, y)
    k2 = rate(t + h, y + h * k1)
    return y + h / 2 * (k1 + k2)


def wrong(rate, t, y, h):
    k1 = rate(t, y)
    k2 = rate(t + h / 2, y + h / 2 * k1)
    k3 = rate(t + h / 2, y + h / 2 * k2)
    k4 = rate(t + h, y + h * k3)
    return y + h / 6 * (k1 + 2 * k2 + k3 + k4)


def loud(rate, t, y, h):
    print("once more")
    return y + h * rate(t, y)


def clipped(rate, t, y, h):
    return (y + h * rate(t, y)).clip(0.0)


number = 3
"""


@pytest.fixture(autouse=True)
def loop(apart):
    (apart / "loop.py").write_text(LOOPS)
    return apart


def test_a_loop_is_named_with_status_0():
    said = say("recover", "loop.py:right")
    assert (said.status, said.err) == (0, "")
    assert said.out == "loop.py:right: your loop is heun-2 (exact: order 2, 2 stages)\n"


def test_a_wrong_loop_is_status_1_and_names_the_coefficient():
    said = say("recover", "loop.py:wrong", width=120)
    assert said.status == 1
    assert "your loop is of order 0, not 4: weights[3] is 1/6, and 1/3 makes every condition hold" in said.out
    assert "it is kutta-4 then" in said.out
    assert "  > weights[3] is 1/6, and 1/3 makes every condition hold\n" in said.out


def test_what_is_no_such_step_is_status_1_with_what_to_do():
    said = say("recover", "loop.py:clipped")
    assert (said.status, said.out) == (1, "")
    assert said.err.startswith("clipped: the new state is not y + h·Σ b·k")
    assert "It is no explicit Runge–Kutta step" in said.err


def test_what_a_step_prints_does_not_mix_with_the_result():
    said = say("recover", "loop.py:loud", "--json")
    assert said.data["same_as"] == "euler-1"
    assert said.data["remarks"] == ["it prints; what it printed was kept off the screen"]


def test_json_has_coefficients_verdict_and_repairs():
    data = say("recover", "loop.py:wrong", "--json").data
    assert data["schema"] == "newel-recover/1"
    assert (data["same_as"], data["becomes"], data["order"]) == (None, "kutta-4", 4)
    assert data["weights"] == ["1/6", "1/3", "1/6", "1/6"]
    assert data["matrix"] == [[], ["1/2"], ["0", "1/2"], ["0", "0", "1"]]
    assert data["verdict"]["repairs"][0]["changes"] == [
        {"where": "weights[3]", "printed": "1/6", "value": "1/3"}
    ]


def test_the_tableau_is_written_once_and_reads_back(loop):
    said = say("recover", "loop.py:right", "--to", "mine.toml")
    assert (said.status, said.out.splitlines()[-1]) == (0, "  written to mine.toml")
    assert newel.read_tableau(loop / "mine.toml").digest == newel.find("heun-2").digest
    again = say("recover", "loop.py:wrong", "--to", "mine.toml")
    assert again.status == 2
    assert again.err.startswith("mine.toml exists already; nothing was written.")
    assert newel.read_tableau(loop / "mine.toml").digest == newel.find("heun-2").digest
    assert say("recover", "loop.py:loud", "--to", "mine.toml", "--force").status == 0
    assert newel.read_tableau(loop / "mine.toml").digest == newel.find("euler-1").digest


@pytest.mark.parametrize(
    ("words", "says"),
    [
        (("loop.py",), "'loop.py' names no step function"),
        (("loop.py:",), "'loop.py:' names no step function"),
        (("lop.py:right",), "there is no file lop.py"),
        (("loop.py:rihgt",), "loop.py has no 'rihgt'\n  It has: right, wrong, loud, clipped."),
        (("loop.py:number",), "loop.py:number is a int, no function"),
        (("broken.py:step",), "broken.py:2: NameError: name 'nothing' is not defined"),
        (("syntax.py:step",), "syntax.py:1: SyntaxError"),
        (("no.such.module:step",), "no.such.module: ModuleNotFoundError"),
        (("loop.py:right", "--order", "40"), "order=40 is not between 1 and 16"),
        (("loop.py:right", "--to", "mine.csv"), "--to mine.csv: a tableau file ends in .toml"),
    ],
)
def test_a_wrong_request_is_status_2_and_says_what_is_wrong(loop, words, says):
    (loop / "broken.py").write_text("import math\nnothing\n")
    (loop / "syntax.py").write_text("def step(:\n")
    said = say("recover", *words)
    assert (said.status, said.out) == (2, "")
    assert said.err.startswith(says)


def test_identify_knows_a_method_under_another_name(tmp_path):
    (tmp_path / "two-thirds-2.toml").write_text(own())
    said = say("identify", "two-thirds-2.toml")
    assert (said.status, said.out) == (0, "two-thirds-2.toml: the same method as ralston-2\n")
    (tmp_path / "half-1.toml").write_text(own("half-1", 1, "3/5"))
    said = say("identify", "half-1.toml")
    assert (said.status, said.out) == (1, "half-1.toml: no known method is the same\n")
    assert say("identify", "half-1.toml", "--json").data["same_as"] == []
    assert say("identify", "rk4").status == 2


TYPED = own("typed-2").replace('matrix = [[], ["2/3"]]', 'matrix = [[], ["3/2"]]  # blurred')


def test_check_shows_the_repair_and_does_not_touch_the_file(tmp_path):
    (tmp_path / "typed-2.toml").write_text(TYPED)
    said = say("check", "typed-2.toml")
    assert said.status == 1
    assert "  > matrix[2][1] is 3/2, and 2/3 makes every condition hold\n" in said.out
    assert (tmp_path / "typed-2.toml").read_text() == TYPED
    (entry,) = say("check", "typed-2.toml", "--json").data["methods"]
    assert entry["verdict"]["repairs"][0]["distance"] == 1


def test_check_writes_the_repair_when_it_is_told_to(tmp_path):
    (tmp_path / "typed-2.toml").write_text(TYPED)
    said = say("check", "typed-2.toml", "--write")
    assert said.status == 0
    assert said.err == "typed-2.toml: matrix[2][1]: 3/2 → 2/3: written\n"
    assert (tmp_path / "typed-2.toml").read_text() == TYPED.replace('["3/2"]', '["2/3"]')
    assert "exact: order 2" in said.out
    assert say("check", "typed-2.toml", "--write").err == ""


def test_check_writes_nothing_where_there_is_no_repair_or_more_than_one(tmp_path):
    text = own("high-3", 3)
    (tmp_path / "high-3.toml").write_text(text)
    said = say("check", "high-3.toml", "--write")
    assert said.status == 1
    assert said.err.startswith("high-3.toml: no repair was found; nothing was written")
    assert (
        "  ? no change of a single coefficient makes every condition of the claims"
        in say("check", "high-3.toml").out
    )
    equal = own("equal-1", 1).replace('"1/4", "3/4"', '"1/4", "1/4"')
    (tmp_path / "equal-1.toml").write_text(equal)
    said = say("check", "equal-1.toml", "--write")
    assert said.status == 2
    assert said.err.startswith("equal-1.toml: 2 repairs are equally near; nothing was written")
    assert (tmp_path / "high-3.toml").read_text() == text
    assert (tmp_path / "equal-1.toml").read_text() == equal
    assert say("check", "kutta-4", "--write").status == 2
    assert say("check", "--all", "--write").status == 2
