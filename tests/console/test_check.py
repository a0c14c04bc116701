"""`newel check`: is a tableau what it claims to be?"""

import pytest

import newel
from newel.catalogue.shipped import FAMILY_SAMPLES
from tests.console.driver import own, say

pytestmark = pytest.mark.core


def test_a_method_that_holds_is_status_0():
    said = say("check", "kutta-4")
    assert said.status == 0
    assert said.out == "kutta-4\n  exact: order 4, continuous 3, in float64 to 5.6e-17\n"


def test_rounded_numbers_say_how_many_digits_are_trusted():
    out = say("check", "prince-dormand-8-7").out
    assert "  rounded: order 8(7), 17 digits are trusted, in float64 to" in out


def test_a_failure_names_tree_residual_and_claim_and_is_status_1(tmp_path):
    (tmp_path / "two-thirds-3.toml").write_text(own("two-thirds-3", order=3))
    said = say("check", "two-thirds-3.toml")
    assert said.status == 1
    assert "two-thirds-3\n  fails: order 2\n" in said.out
    assert "  ! weights: [[τ]] of order 3 should give 1/6 and is off by -1/6\n" in said.out
    assert "  ! weights: order 3 is claimed, order 2 is proved\n" in said.out


def test_json_has_the_residual_as_number_and_text(tmp_path):
    (tmp_path / "two-thirds-3.toml").write_text(own("two-thirds-3", order=3))
    (entry,) = say("check", "two-thirds-3.toml", "--json").data["methods"]
    failure = entry["verdict"]["failures"][0]
    assert (failure["condition"], failure["residual_text"]) == ("[[τ]]", "-1/6")
    assert failure["residual"] == pytest.approx(-1 / 6)
    assert entry["verdict"]["order"] == 2


def test_several_are_a_table_with_a_sum_and_the_worst_status(tmp_path):
    (tmp_path / "two-thirds-3.toml").write_text(own("two-thirds-3", order=3))
    said = say("check", "kutta-4", "two-thirds-3.toml", "prince-dormand-8-7")
    assert said.status == 1
    assert "prince-dormand-8-7  rounded   8(7)" in said.out
    assert "two-thirds-3  fails\n  ! weights:" in said.out
    assert said.out.endswith("3 methods: 1 exact, 1 rounded, 1 fails.\n")
    assert say("check", "kutta-4", "gill-4").status == 0


def test_one_that_is_unknown_does_not_keep_the_others_from_being_checked():
    said = say("check", "kutta-5", "rk4", "gill-4")
    assert said.status == 2
    assert "kutta-5  exact" in said.out
    assert "gill-4   exact" in said.out
    assert "1 cannot be read" in said.out
    assert "That usual name belongs to kutta-4." in said.err


def everything() -> set[str]:
    """Every single method, and the members that stand for the families."""
    return {*newel.names(), *FAMILY_SAMPLES}


def test_all_checks_everything_also_what_cannot_be_read(tmp_path):
    (tmp_path / "mine").mkdir()
    (tmp_path / "mine" / "two-thirds-3.toml").write_text(own("two-thirds-3", order=3))
    (tmp_path / "mine" / "broken-2.toml").write_text("schema = [")
    said = say("check", "--all", "--tableaux", "mine")
    assert said.status == 1
    assert f"{len(everything()) + 2} methods: " in said.out
    assert said.out.endswith("1 fails, 1 cannot be read.\n")
    assert "broken-2.toml" in said.err
    assert max(map(len, said.out.splitlines())) <= 80


def test_every_built_in_method_holds():
    said = say("check", "--all", "--json")
    assert said.status == 0
    methods = said.data["methods"]
    assert {each["slug"] for each in methods} == everything()
    assert {each["verdict"]["outcome"] for each in methods} == {"exact", "rounded"}


def test_what_contradicts_itself_is_a_wrong_request():
    assert say("check", "--all", "kutta-4").status == 2
    said = say("check")
    assert said.status == 2
    assert said.err.startswith("no method\n")
