"""The independent judgement is itself held to exact differences, to mpmath, and to values found by hand.

The rules of rounding are those that the tableau format states; the stage values are those of Kutta's fourth
order (W. Kutta, Z. Math. Phys. 46 (1901) 435-453), worked out by hand.
"""

from __future__ import annotations

from dataclasses import replace
from fractions import Fraction
from math import inf, sqrt
from pathlib import Path

import mpmath
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.independent.documents import Document, Place, open_document
from tests.independent.judging import Scaled, Visibility, formulas, judge, tree_conditions, unseen
from tests.independent.quadratic import Quadratic, is_zero, read, root, written
from tests.independent.tree_formulas import evaluate, rooted_trees

TABLEAUX = Path(__file__).parents[2] / "tableaux"
RADICANDS = [2, 3, 5, 6, 7, 21]


def built_in(file: str) -> Document:
    return open_document(TABLEAUX / f"{file}.toml")


def plain(stages: int, texts: dict[Place, str], order: int, digits: object = None) -> Document:
    return Document("made-up", stages, texts, {"weights": order}, 0, digits)  # type: ignore[arg-type]  # any digits


@pytest.mark.parametrize(
    "text",
    ["35/384", "-0.25", "(5 - sqrt(5))/10", "-2^2/3", "1/(2+sqrt(8))", "(927-347*sqrt(6))/1250", "1e-3", "7"],
)
def test_texts_read_as_the_same_numbers_as_in_mpmath(text: str) -> None:
    assert float(read(text)) == pytest.approx(float(evaluate(text)), rel=1e-15)


@pytest.mark.parametrize("text", ["1/2)", "(1/2", "x", "1/0"])
def test_a_text_that_is_no_number_is_not_read(text: str) -> None:
    with pytest.raises((ValueError, IndexError, ZeroDivisionError)):
        read(text)


@settings(deadline=None, derandomize=True)
@given(st.fractions(), st.fractions(), st.sampled_from(RADICANDS))
def test_what_is_written_reads_back_the_same(a: Fraction, b: Fraction, radicand: int) -> None:
    number = Quadratic(a, b, radicand) if b else a
    assert read(written(number)) == number
    assert read(written(Fraction(a.numerator, 10**9), decimal=True)) == Fraction(a.numerator, 10**9)


@settings(deadline=None, derandomize=True)
@given(*[st.integers(-50, 50)] * 4, st.sampled_from(RADICANDS))
def test_products_and_quotients_undo_each_other(a: int, b: int, c: int, d: int, radicand: int) -> None:
    x, y = Quadratic(Fraction(a), Fraction(b), radicand), Quadratic(Fraction(c), Fraction(d), radicand)
    if not y.zero:
        assert is_zero(x / y * y - x)
    assert float(x * y) == pytest.approx((a + b * sqrt(radicand)) * (c + d * sqrt(radicand)), abs=1e-6)


def test_a_difference_that_almost_cancels_keeps_its_digits() -> None:
    difference = read("1.41421356237309504880168872420969807856967187537694") - root(2)
    with mpmath.workdps(80):
        exact = mpmath.mpf("1.41421356237309504880168872420969807856967187537694") - mpmath.sqrt(2)
        assert float(difference) == pytest.approx(float(exact), rel=1e-12)


@pytest.mark.parametrize("file", ["order-4/gill-4", "order-3/bogacki-shampine-3-2", "order-5/cash-karp-5-4"])
def test_derivatives_agree_with_exact_differences(file: str) -> None:
    document, step = built_in(file), Fraction(1, 10**12)
    before = list(tree_conditions(document, slopes=True))
    for place in [place for place in document.texts if place.array != "nodes"][:12]:
        moved = document.changed({place: written(document.values[place] + step)})
        for old, new in zip(before, tree_conditions(moved, slopes=False), strict=True):
            slope = float((new.residual - old.residual) / step)
            assert slope == pytest.approx(old.slopes.get(place, 0.0), abs=1e-9)


def test_stage_values_of_kuttas_method_are_those_found_by_hand() -> None:
    exact = Scaled(built_in("order-4/kutta-4"))
    weights = next(formulas(exact.document))
    assert exact.phi(rooted_trees(2)[0]) == [0, 1, 1, 2]  # the nodes times the common denominator 2
    assert {exact.residual(weights, tree) for order in range(1, 5) for tree in rooted_trees(order)} == {0}
    assert exact.residual(weights, ((((((),),),),))) == Fraction(-1, 120)  # b A A A A 1 is 0


def test_half_units_follow_the_rules_of_the_format() -> None:
    texts = {
        Place("weights", 1): "0.0333",
        Place("weights", 2): "1/999999",
        Place("weights", 3): "1/1000000",
        Place("weights", 4): "0",
        Place("weights", 5): "0.1000",
        Place("weights", 6): "0.9999",
        Place("nodes", 1): "0.25",
    }
    digits = {"weights": 3, "weights[2]": 5, "weights[6]": "exact", "nodes": "exact"}
    found = plain(6, texts, 1, digits).half_units
    assert list(found.values()) == [
        Fraction(5, 10**5),
        Fraction(5, 10**11),
        Fraction(5, 10**9),
        0,
        Fraction(5, 10**4),
        0,
        0,
    ]


def test_a_miss_of_order_five_is_found_and_order_four_is_valid() -> None:
    kutta = built_in("order-4/kutta-4")
    assert judge(replace(kutta, claims={"weights": 4}, powers=0)).valid
    beyond = judge(replace(kutta, claims={"weights": 5}, powers=0))
    assert not beyond.valid
    assert "is off by" in beyond.finding


def test_claims_of_continuous_weights_beyond_their_degree_are_not_valid() -> None:
    document = built_in("order-3/bogacki-shampine-3-2")
    assert judge(document).valid
    assert not judge(replace(document, claims={**document.claims, "continuous": 4})).valid


def test_the_limit_is_told_apart_from_the_bound() -> None:
    document = built_in("order-4/berland-bogey-bailly-4")
    moved = document.changed(
        {Place("weights", 1): written(document.values[Place("weights", 1)] + Fraction(1, 10**11), True)}
    )
    assert judge(document).valid
    assert (judge(moved).valid, judge(moved).by_cap) == (False, True)


def test_entries_that_nothing_sees_are_found_and_no_others() -> None:
    assert unseen(built_in("order-2/jameson-schmidt-turkel-2")) == [
        "matrix[2][1]",
        "matrix[3][1]",
        "matrix[3][2]",
    ]
    assert unseen(built_in("order-4/kutta-4")) == []


@pytest.mark.parametrize("file", ["order-6/calvo-montijano-randez-6-5", "order-3/ssp-3-stages-5"])
def test_the_least_change_that_shows_is_about_the_least_that_is_judged_invalid(file: str) -> None:
    document = built_in(file)
    visibility = Visibility(document)
    place = Place("weights", 4)
    least = visibility.least({place: 1})
    assert 0 < least < inf
    for factor, valid in ((Fraction(1, 20), True), (Fraction(201, 100), False)):
        changed = written(document.values[place] + factor * Fraction(least), "." in document.texts[place])
        assert judge(document.changed({place: changed})).valid == valid


def test_a_change_that_no_bound_sees_has_no_least() -> None:
    visibility = Visibility(built_in("order-2/jameson-schmidt-turkel-2"))
    assert visibility.least({Place("matrix", 3, 1): 1, Place("nodes", 3): 1}) == inf
