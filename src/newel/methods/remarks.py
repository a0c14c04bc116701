"""What a reader of a proof would trip over: blind estimators, orders that hold on linear problems only,
stages outside the step, and coefficients that no condition sees."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from fractions import Fraction
from math import factorial
from typing import TYPE_CHECKING

import numpy as np

from newel.methods.conditions import LIMIT
from newel.methods.exact import Exact
from newel.methods.sensitivities import Sensitivities
from newel.methods.trees import trees

if TYPE_CHECKING:
    from newel.methods.coefficients import Coefficients, Floats
    from newel.methods.conditions import Conditions, Part
    from newel.methods.elementary_weights import Interval, Row

__all__ = ["remarks", "undetermined"]

NEAR = Fraction(1, 1000)
"""How near a coefficient of rounded numbers must come to 1/k! to count as it, where 1/k! is tiny."""


def remarks(
    coefficients: Coefficients, conditions: Conditions, parts: Sequence[Part], orders: Sequence[int]
) -> tuple[str, ...]:
    """Return the remarks on a proof, most telling first; `orders` are the proven orders of `parts`."""
    found: list[str] = []
    for part, order in zip(parts, orders, strict=True):
        if order > part.claimed:
            found.append(f"{_called(part.name)} of order {order}, claimed {part.claimed}")
    if coefficients.embedded is not None:
        found += _on_estimator(coefficients, conditions, orders[0], orders[1])
    for part, order in zip(parts, orders, strict=True):
        if part.name != "continuous":
            found += _on_linear_order(part, order, conditions, coefficients.rounded)
    found += _on_nodes(coefficients)
    return tuple(found)


def _on_estimator(
    coefficients: Coefficients, conditions: Conditions, order: int, embedded_order: int
) -> Iterator[str]:
    weights, embedded = coefficients.weights, coefficients.embedded or ()
    difference = [b - other for b, other in zip(weights, embedded, strict=True)]
    if not any(difference):
        yield "the embedded weights equal the weights: the error estimate is always zero"
        return
    if order == embedded_order:
        yield f"weights and embedded weights are of the same order, {order}"
    slack = coefficients.slack("weights") + coefficients.slack("embedded")
    if _blind(coefficients, difference, slack):
        yield (
            "the error estimate is blind to pure quadrature: where y' = f(t) does not depend on y it is zero "
            "whatever the error"
        )
        return
    # The first power on which formulas of these orders should differ, and so show the leading error.
    power = min(order, embedded_order)
    stages = conditions.fixed.stages(trees(power + 1)[0].index)
    seen = conditions.arithmetic.residual(conditions.arithmetic.vector(difference), stages, Fraction(0))
    if _is_zero(seen, coefficients.rounded):
        yield f"the error estimate is zero for the quadrature y' = t^{power}, where it should show the error"


def _blind(coefficients: Coefficients, difference: Row, slack: Floats) -> bool:
    """Tell whether the estimate of y' = f(t) is zero for every f: stages of equal nodes cancel."""
    nodes = coefficients.nodes or [sum(row[1:], row[0]) for row in coefficients.matrix]
    sums: dict[Exact, tuple[Exact, float]] = {}
    for node, weight, delta in zip(nodes, difference, slack.tolist(), strict=True):
        total, allowed = sums.get(node, (Exact(0), 0.0))
        sums[node] = (total + weight, allowed + 2 * delta)
    return all(abs(total) <= Fraction(allowed) for total, allowed in sums.values())


def _on_linear_order(part: Part, order: int, conditions: Conditions, rounded: bool) -> Iterator[str]:
    """Compare with the tall trees alone: b A^(k−1) 1 = 1/k! is all that y' = M y + constant asks for."""
    arithmetic = conditions.arithmetic
    vector = arithmetic.vector(part.formulas[0].weights)
    stages, linear = arithmetic.ones(), 0
    while linear <= len(conditions.matrix):
        wanted = Fraction(1, factorial(linear + 1))
        residual = arithmetic.residual(vector, stages, wanted)
        # From some k on 1/k! itself is below any fixed bound: what counts there is the share of it.
        if not _is_zero(residual, rounded) or (rounded and residual.magnitude > wanted * NEAR):
            break
        linear, stages = linear + 1, arithmetic.apply(stages)
    if linear > order:
        yield (
            f"{_called(part.name)} of order {order}, but of order {linear} on linear problems with constant "
            f"coefficients"
        )


def _on_nodes(coefficients: Coefficients) -> Iterator[str]:
    for stage, node in enumerate(coefficients.nodes or (), 1):
        if not 0 <= node <= 1:
            yield f"stage {stage} lies outside the step, at c = {node}"


def _is_zero(residual: Interval, rounded: bool) -> bool:
    return residual.magnitude <= LIMIT if rounded else not residual.excludes_zero


def _called(part: str) -> str:
    return "the weights are" if part == "weights" else f"the {part} weights are"


def undetermined(
    coefficients: Coefficients, sensitivities: Sensitivities, parts: Sequence[Part]
) -> tuple[str, ...]:
    """Return the entries of A that no tree condition of the claimed orders sees: only their row sum does.

    An entry is seen where the gradient of some condition with respect to it is not zero. Entries on and above
    the diagonal count only where they are not zero. Weights are always seen, by their sum.
    """
    matrix = sensitivities.matrix
    unseen = np.tril(np.ones(matrix.shape, dtype=bool), -1) | (matrix != 0)
    weights = [np.array([[float(x) for x in f.weights] for f in part.formulas]) for part in parts]
    claims = [part.claimed for part in parts]
    with np.errstate(all="ignore"):
        for order in range(2, max(claims) + 1):
            rows = np.concatenate([w for w, claim in zip(weights, claims, strict=True) if claim >= order])
            for piece in sensitivities.in_pieces(trees(order), len(rows)):
                if not unseen.any():
                    return ()
                gradients = np.abs(sensitivities.matrix_gradients(piece, rows)).max(axis=(0, 1))
                unseen &= gradients <= 1e-13 * max(1.0, gradients.max())
    places = np.argwhere(unseen).tolist()
    return tuple(f"matrix[{row + 1}][{column + 1}]" for row, column in places)
