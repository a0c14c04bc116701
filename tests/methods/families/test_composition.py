"""Methods made from others: one step is what the parts do in turn, roundings and all."""

from __future__ import annotations

from fractions import Fraction

import pytest

from newel.catalogue.registry import Registry
from newel.catalogue.shipped import tableau_files
from newel.errors import BadRequest
from newel.methods.exact import Exact
from newel.methods.families.composition import composed, repeated, richardson
from newel.methods.families.step_doubling import doubled
from newel.methods.order_conditions import prove
from newel.methods.tableau import Tableau
from newel.methods.tableau_file import parse_tableau
from tests.methods.families.rational_steps import logistic, step

pytestmark = pytest.mark.core

Y, H = Fraction(2, 7), Fraction(3, 5)


def built_in(slug: str) -> Tableau:
    return parse_tableau(tableau_files()[slug].read_text(encoding="utf-8"))


def from_time(method: Tableau, t: Fraction, y: Fraction, h: Fraction) -> Fraction:
    """A step of a method from another time than 0."""
    k: list[Fraction] = []
    for row, c in zip(method.matrix, method.nodes, strict=True):
        stage = y + h * sum((a.rational * x for a, x in zip(row, k, strict=False)), Fraction(0))
        k.append(logistic(t + c.rational * h, stage))
    return y + h * sum((b.rational * x for b, x in zip(method.weights, k, strict=True)), Fraction(0))


def in_steps(method: Tableau, n: int, y: Fraction, h: Fraction) -> Fraction:
    for k in range(n):
        y = from_time(method, h * k / n, y, h / n)
    return y


@pytest.mark.parametrize("times", [2, 3])
def test_repeated_is_so_many_steps(times: int) -> None:
    kutta = built_in("kutta-3")
    made = repeated(times, kutta)
    assert step(made, made.weights, Y, H) == in_steps(kutta, times, Y, H)
    assert prove(made).order == 3


def test_composed_takes_the_parts_in_turn_over_their_fractions() -> None:
    heun, kutta = built_in("heun-2"), built_in("kutta-3")
    made = composed([(heun, "1/4"), (kutta, Fraction(3, 4))], "heun-then-kutta-2")
    middle = step(heun, heun.weights, Y, H / 4)
    assert step(made, made.weights, Y, H) == from_time(kutta, H / 4, middle, 3 * H / 4)
    assert (made.order, prove(made).outcome) == (2, "exact")


def test_the_estimate_of_a_composed_pair_is_the_sum_of_its_parts() -> None:
    pair = built_in("bogacki-shampine-3-2")
    made = repeated(2, pair)
    assert made.embedded_order == 2
    assert made.embedded_weights == tuple(x / 2 for x in (pair.embedded_weights or ()) * 2)
    assert prove(made).embedded_order == 2


def test_a_part_without_embedded_weights_leaves_none() -> None:
    made = composed(
        [(built_in("kutta-3"), Fraction(1, 2)), (built_in("bogacki-shampine-3-2"), Fraction(1, 2))], "mixed-3"
    )
    assert made.embedded_weights is None


def test_richardson_of_two_levels_is_step_doubling() -> None:
    """The numbers are those of the doubled pair, with the stages of the full step first."""
    kutta = built_in("kutta-4")
    table, pair = richardson(2, kutta), doubled(kutta)
    assert (table.order, table.embedded_order, table.stages) == (5, 4, 11)
    assert sorted(table.weights) == sorted(pair.weights)
    assert table.embedded_weights is not None
    assert pair.embedded_weights is not None
    for ours, theirs in ((table.weights, pair.weights), (table.embedded_weights, pair.embedded_weights)):
        assert step(table, ours, Y, H) == step(pair, theirs, Y, H)


def test_richardson_of_three_levels_solves_for_two_powers() -> None:
    """Order p + 2: T = Σ w_j T_j with Σ w_j = 1 and Σ w_j/j² = Σ w_j/j³ = 0."""
    heun = built_in("heun-2")
    made = richardson(3, heun)
    total = sum(w * in_steps(heun, j, Y, H) for j, w in enumerate(solved(2), 1))
    assert step(made, made.weights, Y, H) == total
    assert prove(made).order == 4


def solved(order: int) -> list[Fraction]:
    """Cramer's rule for three levels."""
    rows = [[Fraction(1, j**q) for j in (1, 2, 3)] for q in (0, order, order + 1)]

    def det(m: list[list[Fraction]]) -> Fraction:
        (a, b, c), (d, e, f), (g, h, i) = m
        return a * (e * i - f * h) - b * (d * i - f * g) + c * (d * h - e * g)

    return [
        det(
            [
                [Fraction(int(q == 0)) if k == j else x for k, x in enumerate(row)]
                for q, row in enumerate(rows)
            ]
        )
        / det(rows)
        for j in range(3)
    ]


def test_a_rounded_method_hands_its_rounding_on() -> None:
    method = built_in("carpenter-kennedy-4")
    made = repeated(2, method)
    verdict = prove(made)
    assert (verdict.outcome, verdict.order) == ("rounded", 4)
    assert made.half_units("matrix")[1][0] >= method.half_units("matrix")[1][0] / 2
    assert prove(richardson(2, built_in("ssp-3-stages-5"))).outcome == "rounded"


@pytest.mark.parametrize(
    "slug", ["repeated-1-kutta-4", "repeated-999-kutta-4", "richardson-1-kutta-4", "richardson-40-kutta-4"]
)
def test_an_absurd_number_is_refused(slug: str) -> None:
    with pytest.raises(BadRequest, match="From 2 "):
        Registry(folders=[], plugins=False, cache=None).find(slug)


@pytest.mark.parametrize("fractions", [(), ("1/2", "1/3"), (0, 1)])
def test_fractions_that_do_not_make_one_step_are_refused(fractions: tuple[str | int, ...]) -> None:
    euler = Tableau("euler", order=1, matrix=[[]], weights=[Exact(1)])
    with pytest.raises(BadRequest, match="do not sum to 1, or one is 0"):
        composed([(euler, fraction) for fraction in fractions], "none-1")
