"""Search by need: the grammar, its errors, and what is found."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import newel
from newel.catalogue.needs import FACTS, parse_columns, parse_needs
from newel.catalogue.values import Values
from newel.errors import BadRequest
from newel.methods.analysis.properties import PROPERTIES
from newel.methods.order_conditions import proof_key
from tests.catalogue.tiny import two_stages

pytestmark = pytest.mark.core


def fits(text: str, **facts: Any) -> bool:
    return all(need.fits(lambda name: facts[name]) for need in parse_needs(text))


def test_the_example_of_the_documentation_means_what_it_says() -> None:
    text = "order>=4, ssp>0, imag/stages>0.7, embedded, exact"
    good = {
        "order": 4,
        "ssp_coefficient": 0.5,
        "imaginary_limit": 3.0,
        "stages": 4,
        "embedded_order": 3,
        "outcome": "exact",
    }
    assert fits(text, **good)
    for name, worse in {
        "order": 3,
        "ssp_coefficient": 0.0,
        "imaginary_limit": 2.8,
        "embedded_order": None,
        "outcome": "rounded",
    }.items():
        assert not fits(text, **{**good, name: worse})


@settings(deadline=None, derandomize=True, max_examples=80)
@given(st.integers(-5, 5), st.integers(-5, 5), st.sampled_from([">=", "<=", ">", "<", "=", "!="]))
def test_comparisons_are_those_of_numbers(x: int, y: int, sign: str) -> None:
    wanted = {">=": x >= y, "<=": x <= y, ">": x > y, "<": x < y, "=": x == y, "!=": x != y}[sign]
    assert fits(f" year {sign} {y} ", year=x) == wanted
    assert fits(f"not year{sign}{y}", year=x) != wanted


def test_signs_as_they_are_set_in_print_are_read() -> None:
    assert fits("order≥4, order ≤ 4, order≠5, order==4", order=4)
    assert fits("dispersion_coefficient > −1e-3", dispersion_coefficient=0.0)


def test_what_a_method_lacks_never_fits_a_comparison() -> None:
    assert not fits("embedded_order<9", embedded_order=None)
    assert not fits("not embedded_order<9", embedded_order=None)
    assert not fits("embedded", embedded_order=None)
    assert fits("not embedded", embedded_order=None)
    assert not fits("order/stages>0", order=4, stages=0)
    assert fits("low_storage, low_storage=williamson", low_storage_form="williamson")
    assert fits("first-same-as-last=no", first_same_as_last=False)


@pytest.mark.parametrize(
    ("text", "column", "said"),
    [
        ("ordr>3", 1, "'ordr' is no property; the nearest is order"),
        ("order>=4, sspp", 11, "'sspp' is no property; the nearest is ssp"),
        ("order>=4 ssp>0", 10, "'ssp' has no place here; a comma joins two of them"),
        ("order>", 7, "order is compared with a number, not with nothing"),
        ("order>=x", 8, "order is compared with a number, not with 'x'"),
        ("order 4", 7, "a comparison is missing before '4'"),
        ("outcome>exact", 8, "outcome is a word; it is compared by = or !="),
        ("monotone_nodes=1", 16, "monotone_nodes is compared with yes or no, not with '1'"),
        ("imag//stages", 6, "a property belongs here, not '/'"),
        ("estimator/stages>1", 10, "estimator is a word; only numbers are divided"),
        ("stages/estimator>1", 8, "estimator is a word; only numbers are divided"),
        ("stability_polynomial=1", 21, "stability_polynomial is a polynomial; it is not compared"),
        ("order>=4, ", 11, "it ends too early"),
        ("order>=4; ssp", 9, "';' has no place here"),
        ("", 1, "it ends too early"),
        ("x" * 1001, 1, "the text has 1001 characters; 1000 are enough"),
    ],
)
def test_a_mistake_is_shown_with_its_column(text: str, column: int, said: str) -> None:
    with pytest.raises(BadRequest) as caught:
        parse_needs(text)
    lines = str(caught.value).splitlines()
    assert lines[0].startswith(f"needs, column {column}: {said}")
    assert caught.value.argument == "needs"
    if 0 < len(text) <= 200:
        assert lines[1:3] == [f"  {text}", f"  {' ' * (column - 1)}^"]


@settings(deadline=None, derandomize=True, max_examples=300)
@given(st.text("order imag/><=!,.47-_ssp?", max_size=30) | st.text(max_size=20))
def test_any_text_is_read_or_refused_in_words(text: str) -> None:
    try:
        found: object = parse_needs(text)
    except BadRequest as error:
        found = str(error)
    assert found
    assert not isinstance(found, str) or found.startswith("needs, column ")


def test_columns_are_quantities_and_know_what_is_cheap() -> None:
    first, second, third = parse_columns("imag / stages, ssp,year")
    assert (first.text, first.names, first.is_fact) == ("imag/stages", ("imaginary_limit", "stages"), False)
    assert (second.text, second.names, third.is_fact) == ("ssp", ("ssp_coefficient",), True)
    assert parse_columns(["ssp", "year"]) == parse_columns("ssp, year")
    with pytest.raises(BadRequest, match="columns, column 1: 'sp' is no property"):
        parse_columns("sp")


def test_every_property_can_be_asked_for() -> None:
    for each in PROPERTIES:
        assert parse_columns(each.name)[0].names == (each.name,)
        if each.short:
            assert parse_columns(each.short)[0].names == (each.name,)
    assert {column.kind for column in parse_columns(list(FACTS))} == {"word", "number"}


def test_names_finds_by_need_together_with_the_other_filters() -> None:
    registry = newel.Registry(folders=[], plugins=False, cache=None)
    found = newel.names(order=4, needs="ssp/stages>=0.6", registry=registry)
    assert "ssp-4-stages-10" in found
    assert "kutta-4" not in found
    strong = newel.names(order=[3, 4], needs="imag/stages>0.7, not embedded, exact", registry=registry)
    assert "kutta-4" in strong
    assert not {"ssp-4-stages-10", "dormand-prince-5-4", "carpenter-kennedy-4"} & set(strong)


def test_details_hold_the_columns() -> None:
    registry = newel.Registry(folders=[], plugins=False, cache=None)
    (kutta,) = newel.names(
        text="three eighths", details=True, columns="real, imag/calls, embedded", registry=registry
    )
    assert kutta.values["real"] == pytest.approx(2.785293563405)
    assert kutta.values["imag/calls"] == pytest.approx(0.5**0.5)
    assert kutta.values["embedded"] is None
    (plain,) = newel.names(text="three eighths", details=True, registry=registry)
    assert plain.values == {}


def test_own_methods_are_searched_too() -> None:
    registry = newel.Registry(folders=[], plugins=False, cache=None)
    registry.register(two_stages("mine-2"))
    assert newel.names(text="mine", needs="real=2, stages=2", registry=registry) == ("mine-2",)


def test_values_are_remembered_by_key_and_a_damaged_file_is_made_anew(tmp_path: Path) -> None:
    method, loads = two_stages("mine-2"), []
    key = proof_key(method)

    def load() -> newel.Tableau:
        loads.append(1)
        return method

    assert Values(tmp_path).of(key, load, ["real_limit"]) == {"real_limit": 2.0}
    assert Values(tmp_path).of(key, load, ["real_limit"]) == {"real_limit": 2.0}
    assert len(loads) == 1
    assert Values(tmp_path).of(key + "0", load, ["real_limit"]) == {"real_limit": 2.0}
    assert len(loads) == 2
    file = tmp_path / "values" / f"{key}.json"
    kept = json.loads(file.read_text())
    kept["values"]["real_limit"] = 9.0
    file.write_text(json.dumps(kept))
    assert Values(tmp_path).of(key, load, ["real_limit"]) == {"real_limit": 2.0}
    file.write_text("half a fi")
    assert Values(tmp_path).of(key, load, ["real_limit"]) == {"real_limit": 2.0}
    assert len(loads) == 4


def test_a_cache_that_cannot_be_written_costs_no_answer(tmp_path: Path) -> None:
    blocked = tmp_path / "file"
    blocked.write_text("")
    method = two_stages("mine-2")
    assert Values(blocked).of(proof_key(method), lambda: method, ["registers"]) == {"registers": 2}
