"""What is missing from a method, solved for exactly: weights, an embedded partner, continuous weights.

With the matrix given the order conditions bᵀΦ(t) = 1/γ(t) are linear in the weights (Butcher 1963), and so
are those of continuous weights, Σ_k θ^k·b_kᵀΦ(t) = θ^|t|/γ(t) for all θ (Zennaro 1986; Hairer, Nørsett,
Wanner I, section II.6). What is left free is reported, and the choice follows a criterion that is stated.
"""

from __future__ import annotations

from collections.abc import Sequence
from math import sqrt

import attrs

from newel.errors import BadRequest
from newel.methods.continuous_completion import continuous_weights, with_inner_stage
from newel.methods.exact import ExactLike
from newel.methods.linear import Number, System, Vector
from newel.methods.linear_conditions import (
    HIGHEST,
    Completion,
    LinearConditions,
    as_exact,
    check_exact,
    no_order,
    with_end_stage,
)
from newel.methods.tableau import Tableau

__all__ = [
    "HIGHEST",
    "Completion",
    "complete_weights",
    "continuous_weights",
    "embedded_partner",
    "with_end_stage",
    "with_inner_stage",
]

_SMALLEST = "smallest principal error norm, then smallest sum of squares"


def complete_weights(
    matrix: Sequence[Sequence[ExactLike]],
    nodes: Sequence[ExactLike] | None = None,
    order: int | None = None,
    slug: str = "completed",
) -> Completion:
    """Solve for the weights of the highest order that a matrix allows.

    Args:
        matrix: rows of exact numbers left of the diagonal, or of all stages.
        nodes: held against the row sums where given.
        order: an order to be met in place of the highest one, up to 10.
        slug: the name of the tableau that is made.

    Raises:
        BadTableau: a node is not its row's sum, or the matrix is not that of an explicit method.
        BadRequest: no weights reach `order`, or there are more than 40 stages.

    >>> found = complete_weights([[], ["1/2"], ["0", "1/2"], ["0", "0", "1"]])
    >>> found.order, found.free, [str(x) for x in found.tableau.weights]
    (4, 0, ['1/6', '1/3', '1/3', '1/6'])
    """
    blank = Tableau(slug, order=1, matrix=matrix, weights=[0] * len(list(matrix)), nodes=nodes)
    check_exact(blank)
    conditions, system, reached = LinearConditions(blank.matrix), System(blank.stages), 0
    while reached < (HIGHEST if order is None else order):
        tried = system.copy()
        if not conditions.add(tried, reached + 1):
            break
        system, reached = tried, reached + 1
    if order is not None and reached < order:
        raise BadRequest(
            f"no weights of order {order} on these {blank.stages} stages; the highest is {reached}\n"
            f"  Ask for order {reached}, or hold the matrix against its source.",
            argument="order",
        )
    directions = system.directions()
    conditions.least_error(system, reached + 1)
    weights = system.particular()
    return Completion(
        tableau=attrs.evolve(blank, order=reached, weights=weights, numbers="derived: weights solved for"),
        part="weights",
        order=reached,
        free=len(directions),
        directions=as_exact(directions),
        criterion=_SMALLEST if directions else "determined",
        error_norm=sqrt(float(conditions.error(weights, reached + 1))),
    )


def embedded_partner(tableau: Tableau, order: int | None = None, end_stage: bool = False) -> Completion:
    """Find embedded weights for a method.

    All formulas of the lower order form a plane through the method's own weights, so that the choice keeps
    away from those: the partner leaves out one stage that the method uses. Among these it is the one of the
    smallest principal error norm.

    Args:
        tableau: the method, exact.
        order: the order of the partner, below that of the method; by default one below.
        end_stage: whether the rate at the end of the step may be used too, as a last stage that the next
            step has as its first (`with_end_stage`).

    Raises:
        BadRequest: there is no such formula on these stages. BadTableau: the numbers are rounded.

    >>> from newel.methods.tableau import Tableau
    >>> rows = [[], ["1/2"], ["0", "1/2"], ["0", "0", "1"]]
    >>> kutta = Tableau("kutta", order=4, matrix=rows, weights=["1/6", "1/3", "1/3", "1/6"])
    >>> [str(x) for x in embedded_partner(kutta, end_stage=True).tableau.embedded_weights]
    ['1/6', '1/3', '1/3', '0', '1/6']
    """
    method = with_end_stage(tableau) if end_stage else tableau
    check_exact(method)
    wanted = tableau.order - 1 if order is None else order
    if not 1 <= wanted < tableau.order:
        raise BadRequest(
            f"order={wanted}: a partner has an order from 1 to {tableau.order - 1}", argument="order"
        )
    conditions, base = LinearConditions(method.matrix), System(method.stages)
    for each in range(1, wanted + 1):
        if not conditions.add(base, each):
            raise no_order(method, each)
    best: tuple[Number, Vector] | None = None
    for stage in (i for i, weight in enumerate(method.weights) if weight):
        system = base.copy()
        if not system.add([int(i == stage) for i in range(method.stages)], 0):
            continue
        conditions.least_error(system, wanted + 1)
        error = conditions.error(system.particular(), wanted + 1)
        if error and (best is None or error < best[0]):
            best = (error, system.particular())
    if best is None:
        hint = "" if end_stage else "\n  The rate at the end of the step may help: end_stage=True."
        raise BadRequest(
            f"{tableau.slug}: no embedded formula of order {wanted} on these {method.stages} stages{hint}",
            argument="order",
        )
    directions = base.directions()
    return Completion(
        tableau=attrs.evolve(method, embedded_weights=best[1], embedded_order=wanted, proof=None),
        part="embedded",
        order=wanted,
        free=len(directions),
        directions=as_exact(directions),
        criterion=f"one stage of the method left out; {_SMALLEST}",
        error_norm=sqrt(float(best[0])),
    )
