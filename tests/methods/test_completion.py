"""Completion: exact solutions of linear conditions, what they leave free, and the choice that is stated."""

from fractions import Fraction

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import newel
from newel.errors import BadRequest, BadTableau
from newel.methods.analysis.error_norms import error_norm
from newel.methods.completion import (
    complete_weights,
    continuous_weights,
    embedded_partner,
    with_end_stage,
    with_inner_stage,
)
from newel.methods.linear import System, inner
from newel.methods.order_conditions import prove
from newel.methods.tableau import Tableau

pytestmark = pytest.mark.core

numbers = st.fractions(min_value=-3, max_value=3, max_denominator=6)


@pytest.fixture(scope="module")
def registry():
    return newel.Registry(cache=None)


# ---------------------------------------------------------------- linear systems


@settings(deadline=None, derandomize=True, max_examples=40)
@given(st.data(), st.integers(1, 4), st.integers(1, 4))
def test_a_solution_and_its_directions_solve_every_equation_that_was_taken(data, unknowns, count):
    rows = [data.draw(st.lists(numbers, min_size=unknowns, max_size=unknowns)) for _ in range(count)]
    system, taken = System(unknowns), []
    for row in rows:
        target = data.draw(numbers)
        if system.add(row, target):
            taken.append((row, target))
    point, directions = system.particular(), system.directions()
    assert all(inner(row, point) == target for row, target in taken)
    assert all(inner(row, direction) == 0 for row, _ in taken for direction in directions)
    assert system.rank + len(directions) == unknowns


@settings(deadline=None, derandomize=True, max_examples=40)
@given(st.data(), st.integers(1, 3))
def test_the_closest_solution_is_closer_than_any_other(data, unknowns):
    def vectors(count):
        return [data.draw(st.lists(numbers, min_size=unknowns, max_size=unknowns)) for _ in range(count)]

    system = System(unknowns)
    system.add(*vectors(1), data.draw(numbers))
    rows, factors = vectors(3), [1, 3, 2]
    targets = [data.draw(numbers) for _ in rows]
    free = system.copy()
    system.closest(rows, targets, factors)

    def distance(x):
        return sum(f * (inner(r, x) - t) ** 2 for f, r, t in zip(factors, rows, targets, strict=True))

    best = system.particular()
    for direction in free.directions():
        for step in (Fraction(1, 7), Fraction(-2)):
            other = [x + step * d for x, d in zip(best, direction, strict=True)]
            assert distance(best) <= distance(other)


# ---------------------------------------------------------------- weights


@pytest.mark.parametrize(
    "slug", ["kutta-4", "gill-4", "butcher-6", "fehlberg-8-7", "dormand-prince-5-4", "ssp-3-stages-3"]
)
def test_published_weights_are_found_again_from_the_matrix(registry, slug):
    method = registry.find(slug)
    found = complete_weights(method.matrix, method.nodes)
    assert found.order == method.order
    assert (found.free, found.tableau.weights) == (0, method.weights)
    assert prove(found.tableau).outcome == "exact"


def test_what_is_free_is_reported_and_the_choice_has_the_smallest_error_norm():
    """Two equal nodes in the middle: order 2 leaves one parameter, with the matrix of a 3-stage method."""
    rows = [[], ["1/2"], ["1/2", "0"]]
    found = complete_weights(rows)
    assert (found.order, found.free) == (2, 1)
    assert found.directions == ((0, -1, 1),)
    assert [str(x) for x in found.tableau.weights] == ["0", "1/2", "1/2"]
    assert found.error_norm == pytest.approx(error_norm(found.tableau), rel=1e-14)
    for slide in (Fraction(1, 10), Fraction(-1)):
        other = Tableau(
            "o", order=2, matrix=rows, weights=[0, Fraction(1, 2) + slide, Fraction(1, 2) - slide]
        )
        assert error_norm(other) >= found.error_norm


def test_an_order_that_cannot_be_had_names_the_highest():
    with pytest.raises(BadRequest, match="no weights of order 3 on these 2 stages; the highest is 2"):
        complete_weights([[], ["1/2"]], order=3)
    assert complete_weights([[], ["1/2"]], order=1).free == 1


def test_a_node_that_is_not_its_rows_sum_is_named():
    with pytest.raises(BadTableau, match=r"nodes\[2\]: row 2 sums to 1/2, its node is 1/3"):
        complete_weights([[], ["1/2"]], nodes=["0", "1/3"])


def test_rounded_numbers_are_refused(registry):
    rounded = Tableau("r-1", order=1, matrix=[[], ["0.333"]], weights=["1/4", "3/4"], digits=3)
    with pytest.raises(BadTableau, match="rounded"):
        embedded_partner(rounded)


# ---------------------------------------------------------------- embedded partners


@pytest.mark.parametrize(
    "slug", ["dormand-prince-5-4", "verner-1978-6-5", "fehlberg-8-7", "bogacki-shampine-3-2"]
)
def test_a_partner_is_proved_and_differs_from_the_method(registry, slug):
    method = registry.find(slug)
    found = embedded_partner(method)
    verdict = prove(found.tableau)
    assert (verdict.outcome, verdict.order, verdict.embedded_order) == (
        "exact",
        method.order,
        method.order - 1,
    )
    assert found.tableau.embedded_weights != method.weights
    assert error_norm(found.tableau, embedded=True) == pytest.approx(found.error_norm, rel=1e-12)
    assert found.error_norm > 0


def test_fehlbergs_and_verners_partners_are_found_again(registry):
    """Where one parameter is free and one stage is left out, the published partner is the choice."""
    for slug in ("fehlberg-8-7", "verner-1978-6-5"):
        method = registry.find(slug)
        assert embedded_partner(method).tableau.embedded_weights == method.embedded_weights


def test_four_stages_of_order_4_have_no_partner_without_the_rate_at_the_end(registry):
    with pytest.raises(
        BadRequest, match=r"no embedded formula of order 3 on these 4 stages\n.*end_stage=True"
    ):
        embedded_partner(registry.find("kutta-4"))
    found = embedded_partner(registry.find("kutta-4"), end_stage=True)
    assert found.tableau.first_same_as_last
    assert [str(x) for x in found.tableau.embedded_weights] == ["1/6", "1/3", "1/3", "0", "1/6"]


@pytest.mark.parametrize("order", [0, 4, 5])
def test_a_partner_is_of_a_lower_order(registry, order):
    with pytest.raises(BadRequest, match=f"order={order}: a partner has an order from 1 to 3"):
        embedded_partner(registry.find("kutta-4"), order=order)


# ---------------------------------------------------------------- continuous weights


@pytest.mark.parametrize("slug", ["kutta-4", "gill-4", "cash-karp-5-4", "heun-2", "euler-1"])
def test_continuous_weights_are_proved(registry, slug):
    for end_stage in (False, True):
        found = continuous_weights(registry.find(slug), end_stage=end_stage)
        verdict = prove(found.tableau)
        assert (verdict.outcome, verdict.continuous_order) == ("exact", found.order)


def test_slopes_at_both_ends_are_the_rates_there(registry):
    found = continuous_weights(registry.find("cash-karp-5-4"), end_stage=True)
    assert found.smooth
    rows = found.tableau.continuous_weights
    assert [row[0] for row in rows] == [1, 0, 0, 0, 0, 0, 0]
    assert [sum(k * x for k, x in enumerate(row, 1)) for row in rows] == [0, 0, 0, 0, 0, 0, 1]
    loose = continuous_weights(registry.find("cash-karp-5-4"), end_stage=True, smooth=False)
    assert not loose.smooth
    assert loose.free > found.free
    assert loose.error_norm < found.error_norm


def test_the_mean_error_is_the_integral_of_the_error_norm(registry):
    """Against Gauss quadrature of the squared error coefficients at single points."""
    import numpy as np

    found = continuous_weights(registry.find("kutta-4"))
    points, factors = np.polynomial.legendre.leggauss(8)
    total = 0.0
    for x, factor in zip((points + 1) / 2, factors / 2, strict=True):
        theta = Fraction(x)
        weights = [
            sum(c * theta**k for k, c in enumerate(row, 1)) for row in found.tableau.continuous_weights
        ]
        # The solution at θ as the end of a step of length θ·h: rows and weights over θ.
        scaled = Tableau(
            "s",
            order=1,
            matrix=[[a / theta for a in row[:i]] for i, row in enumerate(found.tableau.matrix)],
            weights=[w / theta for w in weights],
        )
        total += factor * (error_norm(scaled, 4) * float(theta) ** 4) ** 2
    assert total**0.5 == pytest.approx(found.error_norm, rel=1e-9)


def test_an_inner_stage_needs_continuous_weights(registry):
    with pytest.raises(BadRequest, match="no continuous weights"):
        with_inner_stage(registry.find("kutta-3"), "1/2")


def test_an_end_stage_is_added_once(registry):
    once = with_end_stage(registry.find("kutta-4"))
    assert once.stages == 5
    assert with_end_stage(once) is once


def test_more_stages_than_can_be_solved_for_are_refused():
    many = Tableau("m-1", order=1, matrix=[[0] * i for i in range(41)], weights=[1] + [0] * 40)
    with pytest.raises(BadRequest, match="41 stages; completion takes up to 40"):
        continuous_weights(many)
