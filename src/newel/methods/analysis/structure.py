"""Properties that are read off a tableau at once."""

from __future__ import annotations

from typing import Literal

from newel.methods.exact import Exact
from newel.methods.tableau import Tableau

__all__ = ["computed_stages", "estimator", "has_monotone_nodes", "largest_coefficient", "precision"]


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
