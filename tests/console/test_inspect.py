"""`newel inspect`: a method in full."""

import re

import pytest

import newel
from newel.console.triangle import as_text, polynomial
from tests.console.driver import own, say

pytestmark = pytest.mark.core


def test_the_classical_method_stands_in_the_usual_triangle():
    said = say("inspect", "kutta-4")
    triangle = """
    0 │
  1/2 │ 1/2
  1/2 │   0  1/2
    1 │   0    0    1
──────┼───────────────────
      │ 1/6  1/3  1/3  1/6
"""
    assert triangle in said.out
    assert said.status == 0


def test_a_well_known_pair_fits_into_80_columns_as_a_triangle():
    lines = as_text(newel.find("dormand-prince-5-4"), 80).splitlines()
    assert lines[4] == " 8/9 │ 19372/6561 -25360/2187 64448/6561 -212/729"
    assert lines[9] == "     │ 5179/57600           0 7571/16695  393/640 -92097/339200 187/2100 1/40"


def test_a_wide_tableau_becomes_a_list_that_names_every_entry():
    tableau = newel.find("verner-1978-9-8")
    text = as_text(tableau, 80)
    assert "  stage 12   c = 4/3\n" in text
    assert "     9: (-340864+242816*sqrt(6))/405  10: (26304-15176*sqrt(6))/45\n" in text
    entries = sum(
        bool(x) for row in (*tableau.matrix, tableau.weights, tableau.embedded_weights) for x in row
    )
    assert len(re.findall(r"^ +\d+: |  +\d+: ", text, re.MULTILINE)) == entries


@pytest.mark.parametrize("slug", newel.names())
def test_no_line_is_wider_than_80_columns(slug):
    said = say("inspect", slug)
    assert max(map(len, said.out.splitlines())) <= 80


def test_properties_proof_source_and_notes_are_there():
    out = say("inspect", "heun-euler-2-1").out
    for text in (
        "heun-euler-2-1\n  Heun–Euler 2(1)\n",
        "  authors        K. Heun (1900)",
        "  comes from     built-in",
        "  rate calls a step                    2",
        "  stability polynomial                 1, 1, 1/2",
        "  proof  exact: order 2(1); in float64 to",
        "  weaknesses\n  - The estimate is that of Euler’s method",
    ):
        assert text in out


def test_coefficients_that_no_condition_sees_are_named():
    out = say("inspect", "jameson-schmidt-turkel-2").out
    assert "not determined by the claimed orders: matrix[2][1], matrix[3][1]," in out


def test_polynomials_read_as_they_are_written_by_hand():
    weights = newel.find("bogacki-shampine-3-2").continuous_weights
    assert [polynomial(row) for row in weights] == [
        "θ - 4/3·θ² + 5/9·θ³",
        "θ² - 2/3·θ³",
        "4/3·θ² - 8/9·θ³",
        "-θ² + θ³",
    ]


def test_a_method_that_fails_is_shown_with_what_fails_and_status_1(tmp_path):
    (tmp_path / "two-thirds-2.toml").write_text(own(node="2/5"))
    said = say("inspect", "two-thirds-2.toml")
    assert said.status == 1
    assert "  2/5 │ 2/5" in said.out
    assert "  proof  fails: order 1\n" in said.out
    assert "  ! weights: [τ] of order 2 should give 1/2 and is off by -1/5" in said.out
    assert say("inspect", "two-thirds-2.toml", "--json").status == 1


def test_a_trusted_method_is_shown_as_unproven():
    from newel.catalogue.inspection import inspect
    from newel.console.inspect import draw
    from newel.console.screen import Screen

    registry = newel.Registry(folders=[], plugins=False, cache=None)
    own = newel.Tableau("wrong-2", order=2, matrix=[[], ["1/3"]], weights=[0, 1])
    registry.register(own, trust=True)
    import io

    out = io.StringIO()
    (found,) = inspect("wrong-2", registry=registry)
    draw(Screen(out, out, width=80), found)
    assert "proof  unproven: taken on trust" in out.getvalue()
    assert found.to_data()["outcome"] == "unproven"


def test_json_keeps_every_number_as_it_is_printed():
    data = say("inspect", "dormand-prince-5-4", "gill-4", "--json").data
    assert data["schema"] == "newel-inspection/1"
    pair, gill = data["methods"]
    assert pair["matrix"][4] == ["19372/6561", "-25360/2187", "64448/6561", "-212/729"]
    assert pair["properties"]["computed_stages"] == 6
    assert gill["weights"] == ["1/6", "(2 - sqrt(2))/6", "(2 + sqrt(2))/6", "1/6"]
    assert gill["embedded_weights"] is None
    assert gill["verdict"]["outcome"] == "exact"


def test_json_holds_what_makes_the_same_tableau_again():
    data = say("inspect", "bogacki-shampine-3-2", "--json").data["methods"][0]
    again = newel.Tableau(
        data["slug"],
        order=data["order"],
        matrix=data["matrix"],
        weights=data["weights"],
        nodes=data["nodes"],
        embedded_weights=data["embedded_weights"],
        embedded_order=data["embedded_order"],
        continuous_weights=data["continuous_weights"],
        continuous_order=data["continuous_order"],
    )
    assert again.digest == data["digest"] == newel.find("bogacki-shampine-3-2").digest
