"""Properties that are read off a tableau at once."""

from __future__ import annotations

from collections.abc import Iterable
from fractions import Fraction
from typing import Literal

from newel.methods.exact import Exact
from newel.methods.tableau import Tableau

__all__ = [
    "computed_stages",
    "dominant_stage_order",
    "estimator",
    "has_monotone_nodes",
    "largest_coefficient",
    "precision",
    "stage_order",
]

_CLOSE = Fraction(1, 10**9)


def computed_stages(tableau: Tableau) -> int:
    """Return how often the rate is called in an accepted step: s, or s − 1 where the last call is kept.

    >>> computed_stages(Tableau("midpoint-2", order=2, matrix=[[], ["1/2"]], weights=[0, 1]))
    2
    """
    return tableau.stages - tableau.first_same_as_last


def has_monotone_nodes(tableau: Tableau) -> bool:
    """Return whether no stage goes back in time: c₁ ≤ c₂ ≤ … ≤ c_s.

    >>> has_monotone_nodes(Tableau("midpoint-2", order=2, matrix=[[], ["1/2"]], weights=[0, 1]))
    True
    """
    return all(x <= y for x, y in zip(tableau.nodes, tableau.nodes[1:], strict=False))


def largest_coefficient(tableau: Tableau) -> Exact:
    """Return the largest modulus of any entry of A, b, c and the embedded weights (unitless).

    Where it is far above 1, sums of stages cancel and rounding errors grow. Source: Kennedy, Carpenter and
    Lewis, Appl. Numer. Math. 35 (2000) 177-219, the figure D.

    >>> largest_coefficient(Tableau("a", order=1, matrix=[[], ["-3"]], weights=["1/2", "1/2"], nodes=[0, -3]))
    Exact.of('3')
    """
    rows = (*tableau.matrix, tableau.weights, tableau.nodes, tableau.embedded_weights or ())
    return max(abs(x) for row in rows for x in row)


def estimator(tableau: Tableau) -> Literal["embedded", "step doubling", "none"]:
    """Return what the tableau itself offers to estimate the error of a step.

    >>> estimator(Tableau("midpoint-2", order=2, matrix=[[], ["1/2"]], weights=[0, 1]))
    'none'
    """
    if tableau.embedded_weights is None:
        return "none"
    return "step doubling" if tableau.slug.startswith("doubled-") else "embedded"


def precision(tableau: Tableau) -> Literal["exact", "rounded"]:
    """Return whether the numbers are meant exactly as they stand, or were rounded by their source.

    >>> precision(Tableau("a", order=1, matrix=[[], ["0.333"]], weights=["1/4", "3/4"], digits=3))
    'rounded'
    """
    return "exact" if tableau.is_exact else "rounded"


def stage_order(tableau: Tableau) -> int:
    """Return the stage order: the largest q with Σ_j a_ij c_j^(k−1) = c_i^k/k for all stages i and k ≤ q.

    An explicit method whose second node is not 0 has stage order 1; `dominant_stage_order` tells more.
    Rounded numbers are compared to 9 digits. Source: E. Hairer and G. Wanner, Solving Ordinary Differential
    Equations II, section IV.5, the condition C(q).

    >>> stage_order(Tableau("midpoint-2", order=2, matrix=[[], ["1/2"]], weights=[0, 1]))
    1
    """
    return _common_stage_order(tableau, range(tableau.stages))


def dominant_stage_order(tableau: Tableau) -> int:
    """Return the stage order of the stages whose weights are not 0, as `stage_order`; at most the order.

    >>> dominant_stage_order(Tableau("heun-2", order=2, matrix=[[], [1]], weights=["1/2", "1/2"]))
    1
    """
    return _common_stage_order(tableau, (i for i, b in enumerate(tableau.weights) if b))


def _common_stage_order(tableau: Tableau, stages: Iterable[int]) -> int:
    near = Fraction(0) if tableau.is_exact else _CLOSE
    radicands = {x.radicand for row in (*tableau.matrix, tableau.nodes) for x in row} - {1}
    if len(radicands) > 1:
        near = _CLOSE
    held = tableau.order
    for i in stages:
        held = min(held, _order_of_stage(tableau, i, held, near, len(radicands) > 1))
    return held


def _order_of_stage(tableau: Tableau, stage: int, most: int, near: Fraction, mixed: bool) -> int:
    row, nodes, c = tableau.matrix[stage][:stage], tableau.nodes, tableau.nodes[stage]
    if mixed:
        row, nodes = tuple(map(_in_decimals, row)), tuple(map(_in_decimals, nodes))
        c = nodes[stage]
    terms = list(row)
    for k in range(1, most + 1):
        if abs(sum(terms, Exact(0)) - c**k / k) > near:
            return k - 1
        terms = [x * nodes[j] for j, x in enumerate(terms)]
    return most


def _in_decimals(x: Exact) -> Exact:
    return Exact(Fraction(x.scaled_floor(256), 1 << 256))
