"""Properties of methods: against closed forms, and against independent evaluation."""

from __future__ import annotations

from fractions import Fraction
from math import factorial, sqrt
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from newel.methods.analysis.error_norms import HIGHEST, error_norm, error_terms, largest_error_term
from newel.methods.analysis.properties import PROPERTIES
from newel.methods.analysis.stability import stability_polynomial
from newel.methods.analysis.structure import (
    computed_stages,
    estimator,
    has_monotone_nodes,
    largest_coefficient,
    precision,
)
from newel.methods.exact import Exact
from newel.methods.families.step_doubling import doubled
from newel.methods.tableau import Tableau

pytestmark = pytest.mark.core

KUTTA = Tableau(
    "kutta-4", order=4, matrix=[[], ["1/2"], [0, "1/2"], [0, 0, 1]], weights=["1/6", "1/3", "1/3", "1/6"]
)
BOGACKI_SHAMPINE = Tableau(
    "bogacki-shampine-3-2",
    order=3,
    matrix=[[], ["1/2"], [0, "3/4"], ["2/9", "1/3", "4/9"]],
    weights=["2/9", "1/3", "4/9", 0],
    embedded_weights=["7/24", "1/4", "1/3", "1/8"],
    embedded_order=2,
)
GILL = Tableau(
    "gill-4",
    order=4,
    matrix=[[], ["1/2"], ["(sqrt(2) - 1)/2", "(2 - sqrt(2))/2"], [0, "-sqrt(2)/2", "(2 + sqrt(2))/2"]],
    weights=["1/6", "(2 - sqrt(2))/6", "(2 + sqrt(2))/6", "1/6"],
)


def values(tableau: Tableau) -> dict[str, Any]:
    return {each.name: each.function(tableau) for each in PROPERTIES}


def test_the_properties_of_a_pair_whose_last_stage_is_kept() -> None:
    found = values(BOGACKI_SHAMPINE)
    assert (found["stages"], found["computed_stages"], found["first_same_as_last"]) == (4, 3, True)
    assert (found["order"], found["embedded_order"], found["continuous_order"]) == (3, 2, None)
    assert (found["estimator"], found["precision"], found["monotone_nodes"]) == ("embedded", "exact", True)
    assert found["largest_coefficient"] == 1


def test_the_properties_of_a_method_without_estimate() -> None:
    found = values(KUTTA)
    assert (found["computed_stages"], found["estimator"]) == (4, "none")
    assert found["embedded_error_norm"] is None


def test_every_property_has_a_name_fit_for_json_and_a_title() -> None:
    names = [each.name for each in PROPERTIES]
    assert len(set(names)) == len(names)
    assert all(name.isidentifier() and name == name.lower() for name in names)
    assert all(each.title for each in PROPERTIES)


def test_a_doubled_method_says_how_it_estimates() -> None:
    assert estimator(doubled(KUTTA)) == "step doubling"
    assert computed_stages(doubled(KUTTA)) == 11
    assert not has_monotone_nodes(doubled(KUTTA))


def test_nodes_that_stand_still_are_monotone_and_one_step_back_is_not() -> None:
    def with_nodes(*nodes: str) -> Tableau:
        return Tableau("a", order=1, matrix=[[], [0], [0, 0]], weights=[1, 0, 0], nodes=nodes)

    assert has_monotone_nodes(with_nodes("0", "1/2", "1/2"))
    assert not has_monotone_nodes(with_nodes("0", "1/2", "499/1000"))


@pytest.mark.parametrize("place", ["matrix", "weights", "nodes", "embedded_weights"])
def test_the_largest_coefficient_is_looked_for_everywhere_with_either_sign(place: str) -> None:
    rows: dict[str, Any] = {
        "matrix": [[], ["1/2"]],
        "weights": ["1/4", "3/4"],
        "nodes": [0, "1/2"],
        "embedded_weights": [1, 0],
    }
    rows[place] = [[], ["-7/2"]] if place == "matrix" else [0, "-7/2"]
    assert largest_coefficient(Tableau("a", order=1, embedded_order=1, **rows)) == Fraction(7, 2)


def test_the_largest_coefficient_compares_two_square_roots_exactly() -> None:
    t = Tableau("a", order=1, matrix=[[], ["sqrt(3)"]], weights=["sqrt(2)", 1], nodes=[0, 1])
    assert largest_coefficient(t) == Exact.of("sqrt(3)")


def test_rounded_numbers_are_told_from_exact_ones() -> None:
    rounded = Tableau("a", order=1, matrix=[[], ["0.333"]], weights=["1/4", "3/4"], digits=3)
    assert (precision(rounded), precision(KUTTA)) == ("rounded", "exact")


@pytest.mark.parametrize("tableau", [KUTTA, GILL], ids=lambda t: t.slug)
def test_four_stages_of_order_four_leave_the_exponential_series(tableau: Tableau) -> None:
    assert stability_polynomial(tableau) == tuple(Fraction(1, factorial(k)) for k in range(5))


def test_the_embedded_polynomial_of_bogacki_and_shampine() -> None:
    # z³: 3/16, z⁴: 1/48, recomputed with independent code.
    assert stability_polynomial(BOGACKI_SHAMPINE, embedded=True) == (
        *(Fraction(1, factorial(k)) for k in range(3)),
        Fraction(3, 16),
        Fraction(1, 48),
    )
    assert stability_polynomial(KUTTA, embedded=True) is None


def test_a_polynomial_over_two_square_roots_is_left_out() -> None:
    t = Tableau("a", order=1, matrix=[[], ["sqrt(3)"]], weights=["sqrt(2)", 1])
    assert stability_polynomial(t) is None


small = st.fractions(-2, 2, max_denominator=9)


@st.composite
def methods(draw: st.DrawFn) -> Tableau:
    s = draw(st.integers(1, 5))
    matrix = [draw(st.lists(small, min_size=i, max_size=i)) for i in range(s)]
    return Tableau("any", order=1, matrix=matrix, weights=draw(st.lists(small, min_size=s, max_size=s)))


@settings(deadline=None, derandomize=True, max_examples=60)
@given(methods(), small)
def test_a_step_on_the_linear_problem_is_the_polynomial(method: Tableau, z: Fraction) -> None:
    k: list[Fraction] = []
    for row in method.matrix:
        k.append(z * (1 + sum((a.rational * x for a, x in zip(row, k, strict=False)), Fraction(0))))
    y = 1 + sum((b.rational * x for b, x in zip(method.weights, k, strict=True)), Fraction(0))
    polynomial = stability_polynomial(method)
    assert polynomial is not None
    assert sum(r.rational * z**i for i, r in enumerate(polynomial)) == y
    assert polynomial[-1] != 0


@settings(deadline=None, derandomize=True, max_examples=30)
@given(methods())
def test_error_terms_up_to_order_four_are_the_textbook_conditions(method: Tableau) -> None:
    # The conditions written out: Hairer, Nørsett and Wanner, Solving Ordinary Differential Equations I,
    # table II.2.1; from memory. Row sums stand for the nodes.
    A = [[x.rational for x in row] for row in method.matrix]
    b, n = [x.rational for x in method.weights], range(method.stages)
    c = [sum(row) for row in A]

    def total(values: Any) -> Fraction:
        return sum(values, Fraction(0))

    Ac = [total(A[i][j] * c[j] for j in n) for i in n]
    Ac2 = [total(A[i][j] * c[j] ** 2 for j in n) for i in n]
    AAc = [total(A[i][j] * Ac[j] for j in n) for i in n]
    wanted = {
        1: [total(b) - 1],
        2: [total(b[i] * c[i] for i in n) - Fraction(1, 2)],
        3: [
            (total(b[i] * c[i] ** 2 for i in n) - Fraction(1, 3)) / 2,
            total(b[i] * Ac[i] for i in n) - Fraction(1, 6),
        ],
        4: [
            (total(b[i] * c[i] ** 3 for i in n) - Fraction(1, 4)) / 6,
            total(b[i] * c[i] * Ac[i] for i in n) - Fraction(1, 8),
            (total(b[i] * Ac2[i] for i in n) - Fraction(1, 12)) / 2,
            total(b[i] * AAc[i] for i in n) - Fraction(1, 24),
        ],
    }
    for order, terms in wanted.items():
        found = error_terms(method, order)
        assert found is not None
        assert all(
            abs(x - y) < Fraction(1, 10**100) for x, y in zip(sorted(found), sorted(terms), strict=True)
        )
        assert error_norm(method, order) == pytest.approx(
            sqrt(sum(x * x for x in terms)), rel=1e-14, abs=1e-60
        )
        assert largest_error_term(method, order) == pytest.approx(float(max(map(abs, terms))), abs=1e-60)


def test_the_norm_is_that_of_the_next_order_where_none_is_asked_for() -> None:
    assert error_norm(BOGACKI_SHAMPINE) == error_norm(BOGACKI_SHAMPINE, 4)
    assert error_norm(BOGACKI_SHAMPINE, embedded=True) == error_norm(BOGACKI_SHAMPINE, 3, embedded=True)
    assert error_norm(BOGACKI_SHAMPINE, 3) == pytest.approx(0, abs=1e-60)


def test_beyond_the_highest_order_there_is_no_norm() -> None:
    t = Tableau("a", order=HIGHEST, matrix=[[]], weights=[1])
    assert error_norm(t) is None
    assert largest_error_term(t) is None
