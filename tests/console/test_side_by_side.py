"""`newel inspect A B`, its pictures, and needs and columns in `newel list`."""

import pytest

import newel
from tests.console.driver import say

pytestmark = pytest.mark.core

THREE = ("kutta-4", "dormand-prince-5-4", "ssp-4-stages-10")


def test_several_methods_stand_in_one_table_at_equal_cost():
    said = say("inspect", *THREE)
    assert said.status == 0
    lines = said.out.splitlines()
    assert lines[:3] == ["  1  kutta-4", "  2  dormand-prince-5-4", "  3  ssp-4-stages-10"]
    row = next(line for line in lines if "strong-stability coefficient a call" in line)
    assert row.split()[-3:] == ["0", "0", "0.6*"]
    row = next(line for line in lines if "imaginary stability limit a call" in line)
    assert row.split()[-3:] == ["0.7071*", "0.1662", "0.4921"]
    assert max(map(len, lines)) <= 80


def test_more_methods_than_fit_get_a_further_table():
    said = say("inspect", *THREE, "gill-4", "heun-2", "euler-1")
    assert sum(line.split() == ["5", "6"] for line in said.out.splitlines()) == 1
    assert max(map(len, said.out.splitlines())) <= 80


def test_json_of_several_holds_the_table_and_each_method():
    data = say("inspect", *THREE, "--json").data
    assert [each["slug"] for each in data["methods"]] == list(THREE)
    rows = {row["name"]: row for row in data["side_by_side"]}
    assert rows["ssp_coefficient/computed_stages"]["values"] == [0.0, 0.0, 0.6]
    assert rows["ssp_coefficient/computed_stages"]["best"] == [2]
    assert rows["registers"]["values"][0] == 3
    assert "side_by_side" not in say("inspect", "kutta-4", "--json").data


def test_every_property_is_in_json_and_in_the_text_where_there_is_one():
    from newel.methods.analysis.properties import PROPERTIES

    found = say("inspect", "dormand-prince-5-4", "--json").data["methods"][0]["properties"]
    assert list(found) == [each.name for each in PROPERTIES]
    text = say("inspect", "dormand-prince-5-4").out
    for each in PROPERTIES:
        assert (f"  {each.title} " in text) == (found[each.name] is not None), each.name
    assert "  real stability limit                 3.306567892635\n" in text
    assert "  error ratio of the embedded solution 1.542\n" in text


def test_a_method_that_fails_stands_in_the_table_and_is_status_1(tmp_path):
    from tests.console.driver import own

    (tmp_path / "two-thirds-2.toml").write_text(own(node="2/5"))
    said = say("inspect", "heun-2", "two-thirds-2.toml")
    assert said.status == 1
    proof = next(line for line in said.out.splitlines() if line.startswith("  proof"))
    assert proof.split() == ["proof", "exact", "fails"]


def test_the_picture_follows_the_text_and_is_in_json():
    said = say("inspect", "kutta-4", "--picture")
    assert said.out.splitlines()[-1] == "kutta-4: |R(z)| ≤ 1, z = hλ"
    data = say("inspect", "kutta-4", "--picture", "--json").data
    assert data["picture"]["methods"][0]["slug"] == "kutta-4"
    overlaid = say("inspect", *THREE, "--picture", "--per-call").out
    assert "3 ssp-4-stages-10\n" in overlaid
    assert max(map(len, overlaid.splitlines())) <= 80


def test_a_picture_goes_to_a_file_that_is_not_overwritten(tmp_path):
    target = tmp_path / "region.svg"
    said = say("inspect", "kutta-4", "--picture-to", str(target))
    assert (said.status, said.err) == (0, f"written: {target}\n")
    assert target.read_text().startswith("<svg")
    again = say("inspect", "kutta-4", "--picture-to", str(target))
    assert again.status == 2
    assert "exists already" in again.err
    assert say("inspect", "kutta-4", "--picture-to", str(target), "--force").status == 0
    assert say("inspect", "kutta-4", "--picture-to", "a.bmp").status == 2


def test_options_that_would_be_ignored_are_refused():
    said = say("inspect", "kutta-4", "--per-call")
    assert said.status == 2
    assert "Add --picture or --picture-to FILE." in said.err


def test_a_list_shows_the_columns_that_are_asked_for():
    said = say("list", "--order", "4", "--needs", "ssp>0", "--columns", "ssp/calls, real, low_storage")
    lines = said.out.splitlines()
    assert lines[0].split() == ["slug", "ssp/calls", "real", "low_storage"]
    row = next(line for line in lines if line.startswith("ssp-4-stages-10 "))
    assert row.split() == ["ssp-4-stages-10", "0.6", "13.92"]
    data = say("list", "--order", "4", "--needs", "ssp>0", "--columns", "ssp/calls", "--json").data
    values = {each["slug"]: each["values"] for each in data["methods"]}
    assert values["ssp-4-stages-10"] == {"ssp/calls": 0.6}
    assert "values" not in say("list", "--order", "4", "--json").data["methods"][0]


def test_a_wrong_need_is_status_2_and_shows_its_column():
    said = say("list", "--needs", "order>=4, sspp>0")
    assert said.status == 2
    assert said.err.splitlines()[:3] == [
        "needs, column 11: 'sspp' is no property; the nearest is ssp",
        "  order>=4, sspp>0",
        "            ^",
    ]


def test_needs_on_the_command_line_are_those_of_names():
    needs = "order=3, not embedded, imag/stages>0.5"
    data = say("list", "--needs", needs, "--json").data
    assert sorted(each["slug"] for each in data["methods"]) == sorted(newel.names(needs=needs))
