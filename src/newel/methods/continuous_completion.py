"""Continuous weights, solved for exactly, and the stages that the next order of them needs."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction
from math import factorial, sqrt

import attrs

from newel.errors import BadRequest
from newel.methods.exact import Exact, ExactLike
from newel.methods.linear import Number, System, Vector, inner
from newel.methods.linear_conditions import (
    Completion,
    LinearConditions,
    as_exact,
    check_exact,
    least_squares,
    no_order,
    with_end_stage,
    with_stage,
)
from newel.methods.tableau import Tableau
from newel.methods.trees import trees, trees_up_to

__all__ = ["continuous_weights", "with_inner_stage"]


def continuous_weights(
    tableau: Tableau, order: int | None = None, end_stage: bool = False, smooth: bool = True
) -> Completion:
    """Find continuous weights for a method: polynomials in θ of the degree of their order.

    They end in the method's own weights at θ = 1. Where `smooth` is asked for and can be had, their slope at
    θ = 0 is the first rate, and at θ = 1 the rate there if that is a stage. Of what is then left the choice
    has the smallest mean square over the step of the leading error term (in Legendre polynomials, whose
    squares have rational integrals, so that the choice is exact).

    Args:
        tableau: the method, exact.
        order: an order to be met in place of the highest one.
        end_stage: add the rate at the end of the step as a last stage first (`with_end_stage`).
        smooth: look for slopes that fit at both ends.

    Raises:
        BadRequest: no such weights on these stages. BadTableau: the numbers are rounded.

    >>> euler = Tableau("euler", order=1, matrix=[[]], weights=[1])
    >>> continuous_weights(euler).tableau.continuous_weights
    ((Exact.of('1'),),)
    """
    method = with_end_stage(tableau) if end_stage else tableau
    check_exact(method)
    conditions, found = LinearConditions(method.matrix), None
    for each in range(1, tableau.order + 1) if order is None else [order]:
        system = _continuous_system(method, conditions, each)
        if system is None:
            break
        found = (each, system)
    if found is None:
        raise no_order(method, 1 if order is None else order)
    reached, system = found
    is_smooth = smooth and _add_slopes(method, system, reached)
    directions = system.directions()
    _least_mean_error(conditions, system, reached)
    values = system.particular()
    by_stage = [values[i * reached : (i + 1) * reached] for i in range(method.stages)]
    return Completion(
        tableau=attrs.evolve(method, continuous_weights=by_stage, continuous_order=reached, proof=None),
        part="continuous",
        order=reached,
        free=len(directions),
        directions=as_exact(directions),
        criterion="smallest mean square of the leading error over the step" if directions else "determined",
        error_norm=_mean_error(conditions, values, reached),
        smooth=is_smooth,
    )


def _continuous_system(method: Tableau, conditions: LinearConditions, order: int) -> System | None:
    """Return the conditions on the coefficients of θ^k, stage by stage, or None where they contradict."""
    s, system = method.stages, System(method.stages * order)
    for i, weight in enumerate(method.weights):
        end: Number = weight if weight.surd else weight.rational
        system.add([int(j // order == i) for j in range(s * order)], end)
    for tree in trees_up_to(order):
        phi = conditions.vector(tree.index)
        for power in range(1, order + 1):
            target = Fraction(1, tree.density) if power == tree.order else 0
            if not system.add(_spread(phi, power, order), target):
                return None
    return system


def _spread(phi: Sequence[Number], power: int, order: int) -> Vector:
    row: Vector = [Fraction(0)] * (len(phi) * order)
    row[power - 1 :: order] = phi
    return row


def _add_slopes(method: Tableau, system: System, order: int) -> bool:
    """Add the slopes at both ends where both can be had; else nothing."""
    tried, s = system.copy(), method.stages
    last = s - 1 if method.first_same_as_last else None
    for stage in range(s):
        start = [int(j == stage * order) for j in range(s * order)]
        if not tried.add(start, int(stage == 0)):
            return False
        end = [j % order + 1 if j // order == stage else 0 for j in range(s * order)]
        if last is not None and not tried.add(end, int(stage == last)):
            return False
    if last is None:
        return False
    system.rows = tried.rows
    return True


def _legendre(power: int, degree: int) -> Fraction:
    """Return ∫ θ^power·P(θ) dθ over [0, 1], P the Legendre polynomial shifted there."""
    if power < degree:
        return Fraction(0)
    return Fraction(factorial(power) ** 2, factorial(power - degree) * factorial(power + degree + 1))


def _mean_rows(conditions: LinearConditions, order: int) -> tuple[list[Vector], list[Fraction], list[int]]:
    """Return rows, targets and factors whose weighted squares add up to ∫ Σ_t τ_t(θ)² dθ."""
    rows, targets, factors = [], [], []
    for tree in trees(order + 1):
        phi = conditions.vector(tree.index)
        for degree in range(order + 2):
            means = [_legendre(power, degree) / tree.symmetry for power in range(1, order + 1)]
            rows.append([x * mean for x in phi for mean in means])
            targets.append(_legendre(order + 1, degree) / (tree.density * tree.symmetry))
            factors.append(2 * degree + 1)
    return rows, targets, factors


def _least_mean_error(conditions: LinearConditions, system: System, order: int) -> None:
    if system.rank < system.unknowns:
        system.closest(*_mean_rows(conditions, order))
        least_squares(system)


def _mean_error(conditions: LinearConditions, values: Vector, order: int) -> float:
    rows, targets, factors = _mean_rows(conditions, order)
    gaps = [inner(row, values) - target for row, target in zip(rows, targets, strict=True)]
    return sqrt(float(inner([f * gap for f, gap in zip(factors, gaps, strict=True)], gaps)))


def with_inner_stage(tableau: Tableau, at: ExactLike) -> Tableau:
    """Return a method with one more stage, the rate at the fraction `at` of its own continuous solution.

    This is how an interpolant of one order supplies the stage for the next (W. H. Enright, K. R. Jackson,
    S. P. Nørsett, P. G. Thomsen, ACM Trans. Math. Softw. 12 (1986) 193-218). The continuous weights, which
    belong to the stages before, are left out.

    Raises:
        BadRequest: the method has no continuous weights.

    >>> euler = continuous_weights(Tableau("euler", order=1, matrix=[[]], weights=[1])).tableau
    >>> [str(c) for c in with_inner_stage(euler, "1/2").nodes]
    ['0', '1/2']
    """
    if tableau.continuous_weights is None:
        raise BadRequest(
            f"{tableau.slug}: no continuous weights, from which the stage is taken\n"
            "  Find them first: continuous_weights.",
            argument="tableau",
        )
    theta = Exact.of(at)
    row = [
        sum((x * theta**k for k, x in enumerate(powers, 1) if x), Exact(0))
        for powers in tableau.continuous_weights
    ]
    return with_stage(tableau, row, theta)
