"""Conditions decided modulo primes, and float views by differences: both against the slow exact ways."""

from __future__ import annotations

from fractions import Fraction
from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from newel.catalogue.shipped import tableau_files
from newel.methods import conditions, order_conditions, residues
from newel.methods.exact import Exact
from newel.methods.families.composition import richardson
from newel.methods.families.extrapolation import extrapolated_euler, extrapolated_midpoint
from newel.methods.float_views import largest_float_residual
from newel.methods.order_conditions import prove
from newel.methods.residues import Residues
from newel.methods.tableau import Tableau
from newel.methods.tableau_file import parse_tableau
from newel.methods.trees import grafts, trees, trees_up_to

pytestmark = pytest.mark.core


def built_in(slug: str) -> Tableau:
    return parse_tableau(tableau_files()[slug].read_text(encoding="utf-8"))


def by_definition(tableau: Tableau, weights: tuple[Exact, ...], order: int) -> list[bool]:
    """Each condition from its definition, in exact numbers."""
    s = tableau.stages
    known: list[list[Exact]] = []
    for tree in trees_up_to(order):
        vector = [Exact(1)] * s
        for child in tree.children:
            below = known[child.index]
            inner = [
                sum((a * x for a, x in zip(row, below, strict=True)), Exact(0)) for row in tableau.matrix
            ]
            vector = [x * y for x, y in zip(vector, inner, strict=True)]
        known.append(vector)
    return [
        sum((b * x for b, x in zip(weights, vector, strict=True)), Exact(0)) == Fraction(1, tree.density)
        for tree, vector in zip(trees_up_to(order), known, strict=True)
    ]


@pytest.mark.parametrize(
    "slug", ["kutta-4", "gill-4", "bogacki-shampine-5-4", "cassity-5", "butcher-lobatto-6"]
)
def test_primes_decide_as_exact_numbers_do(slug: str) -> None:
    tableau = built_in(slug)
    radicand = next((x.radicand for row in tableau.matrix for x in row if x.surd), 1)
    zeros = Residues(tableau.matrix, radicand).zeros([(tableau.weights, None)], 6)
    assert zeros[0].tolist() == by_definition(tableau, tableau.weights, 6)


@settings(deadline=None, derandomize=True, max_examples=25)
@given(st.lists(st.fractions(-3, 3, max_denominator=50), min_size=6, max_size=6), st.sampled_from([1, 5]))
def test_primes_decide_any_matrix(numbers: list[Fraction], radicand: int) -> None:
    a, b, c, x, y, z = (Exact(q, q if radicand > 1 else 0, radicand) for q in numbers)
    weights = (x, y, Exact(1) - x - y)
    tableau = Tableau("any", order=1, matrix=[[], [a], [b, c]], weights=weights, nodes=[0, a, z])
    zeros = Residues(tableau.matrix, radicand).zeros([(weights, None)], 4)
    assert zeros[0].tolist() == by_definition(tableau, weights, 4)


def test_an_error_far_below_the_size_of_a_prime_is_seen() -> None:
    """1e-60 is no zero: the product of the primes exceeds every numerator that is possible."""
    weights = (Exact(Fraction(1, 10**60)), Exact(1))
    zeros = Residues([[Exact(0)] * 2, [Exact.of("1/2"), Exact(0)]], 1).zeros([(weights, None)], 2)
    assert zeros.tolist() == [[False, True]]


def test_a_numerator_that_the_first_prime_divides_is_no_zero(monkeypatch: pytest.MonkeyPatch) -> None:
    first = residues._primes_below(2 * int((2**53 // 4) ** 0.5) - 8)[0]
    weights = (Exact(1 + first),)
    assert Residues([[Exact(0)]], 1).zeros([(weights, None)], 1).tolist() == [[False]]


def test_the_primes_are_primes_and_products_stay_exact() -> None:
    limit = 2 * int((2**53 // 50) ** 0.5) - 8
    primes = residues._primes_below(limit)
    assert all(a > b for a, b in pairwise(primes))
    assert all(all(p % q for q in range(2, 200)) for p in primes[:50])
    assert 50 * (primes[0] // 2 + 2) ** 2 < 2**53


def test_powers_of_theta_ask_for_their_own_order() -> None:
    """θ² of Euler's continuous weights has to vanish for all trees but those of order 2."""
    zeros = Residues([[Exact(0)]], 1).zeros([((Exact(1),), 1), ((Exact(0),), 2)], 2)
    assert zeros.tolist() == [[True, True], [True, False]]


@pytest.mark.parametrize(
    "tableau",
    [extrapolated_midpoint(6), extrapolated_euler(5), built_in("cassity-5"), built_in("butcher-7")],
    ids=str,
)
def test_the_fast_proof_says_what_the_slow_one_says(
    tableau: Tableau, monkeypatch: pytest.MonkeyPatch
) -> None:
    slow = prove(tableau)
    monkeypatch.setattr(conditions, "MANY_TREES", 0)
    monkeypatch.setattr(order_conditions, "MANY_TREES", 0)
    fast = prove(tableau)
    assert fast.working_floor == pytest.approx(slow.working_floor, rel=1e-9)
    assert (fast.outcome, fast.order, fast.embedded_order) == (slow.outcome, slow.order, slow.embedded_order)
    assert (fast.remarks, fast.undetermined) == (slow.remarks, slow.undetermined)


def test_the_fast_proof_names_the_failures_that_the_slow_one_names(monkeypatch: pytest.MonkeyPatch) -> None:
    wrong = Tableau(
        "wrong-4", order=4, matrix=[[], ["1/2"], [0, "1/2"], [0, 0, 1]], weights=["1/6", "1/2", "1/6", "1/6"]
    )
    slow = prove(wrong)
    monkeypatch.setattr(conditions, "MANY_TREES", 0)
    assert prove(wrong).failures == slow.failures
    assert slow.failures


def test_the_residual_of_float_views_is_bounded_from_above() -> None:
    """Against exact arithmetic on the float64 numbers themselves."""
    tableau = extrapolated_midpoint(6)
    bound = largest_float_residual(tableau.matrix, tableau.weights, tableau.A, tableau.b, 6)
    A = [[Fraction(x) for x in row] for row in tableau.A.tolist()]
    b = [Fraction(x) for x in tableau.b.tolist()]
    known: list[list[Fraction]] = []
    largest = Fraction(0)
    for tree in trees_up_to(6):
        vector = [Fraction(1)] * len(b)
        for child in tree.children:
            inner = [sum(map(lambda p, q: p * q, row, known[child.index]), Fraction(0)) for row in A]
            vector = [x * y for x, y in zip(vector, inner, strict=True)]
        known.append(vector)
        residual = sum(map(lambda p, q: p * q, b, vector), Fraction(0)) - Fraction(1, tree.density)
        largest = max(largest, abs(residual))
    assert largest <= Fraction(bound) <= largest * (1 + Fraction(1, 10**9))


def test_grafts_are_the_trees_as_arrays() -> None:
    rest, last, density = grafts(6)
    assert rest.tolist() == [tree.rest for tree in trees(6)]
    assert last.tolist() == [tree.last for tree in trees(6)]
    assert density.tolist() == [tree.density for tree in trees(6)]
    with pytest.raises(ValueError, match="read-only"):
        rest[0] = 1
    assert density.dtype == np.int64


def test_order_12_with_37_stages_is_proved() -> None:
    """Beyond order 10 all trees are decided at once; the neighbour in the table is of order 10."""
    verdict = prove(extrapolated_midpoint(12))
    assert (verdict.outcome, verdict.order, verdict.embedded_order) == ("exact", 12, 10)
    assert 0 < verdict.working_floor < 1e-14


def test_a_claim_of_order_12_that_is_too_high_fails_by_the_conditions_of_order_11() -> None:
    right = extrapolated_midpoint(10)
    wrong = Tableau("wrong-12", order=12, matrix=right.matrix, weights=right.weights)
    verdict = prove(wrong)
    assert (verdict.outcome, verdict.order) == ("fails", 10)
    assert all(" of order 11 " in f.message for f in verdict.failures if f.part == "weights")


def test_tiny_coefficients_of_rounded_numbers_are_no_high_linear_order() -> None:
    """1/15! is below 1e-12: a coefficient far from it is not taken for it, whatever the stages."""
    method = parse_tableau(tableau_files()["prince-dormand-8-7"].read_text(encoding="utf-8"))
    said = [remark for remark in prove(richardson(2, method)).remarks if "on linear problems" in remark]
    assert said == []
