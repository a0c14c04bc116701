"""What makes a pair a good one: figures that hold its error estimate against the error."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction

from newel.methods.analysis.error_norms import HIGHEST, error_terms, norm_of
from newel.methods.tableau import Tableau

__all__ = ["embedded_error_ratio", "estimate_error_ratio", "solution_error_ratio"]


def embedded_error_ratio(tableau: Tableau) -> float | None:
    """Return the error ratio of the embedded solution: its second error norm over its first.

    With p its order, |τ̂⁽ᵖ⁺²⁾|₂ / |τ̂⁽ᵖ⁺¹⁾|₂: where it is large, the leading term of the estimate is not the
    estimate. Source: the figure B of J. R. Dormand and P. J. Prince, J. Comput. Appl. Math. 6 (1980) 19-26.

    Returns:
        A number (unitless), best near 1; None for what is no pair, and for a pair whose embedded solution is
        not the one of lower order.

    >>> pair = Tableau("a-2-1", order=2, embedded_order=1, matrix=[[], [1]], weights=["1/2", "1/2"],
    ...                embedded_weights=[1, 0])
    >>> round(embedded_error_ratio(pair), 6)
    0.471405
    """
    p = _lower_order(tableau)
    if p is None:
        return None
    return _ratio(error_terms(tableau, p + 2, embedded=True), error_terms(tableau, p + 1, embedded=True))


def estimate_error_ratio(tableau: Tableau) -> float | None:
    """Return the error ratio of the estimate: the second term of the estimate over its first.

    With p the order of the embedded solution, |τ⁽ᵖ⁺²⁾ − τ̂⁽ᵖ⁺²⁾|₂ / |τ̂⁽ᵖ⁺¹⁾|₂: where it is large, the estimate
    does not follow its asymptotic law. Source: the figure C, as in `embedded_error_ratio`.

    Returns:
        A number (unitless), best near 1; None as in `embedded_error_ratio`.

    >>> pair = Tableau("a-2-1", order=2, embedded_order=1, matrix=[[], [1]], weights=["1/2", "1/2"],
    ...                embedded_weights=[1, 0])
    >>> round(estimate_error_ratio(pair), 6)
    0.5
    """
    p = _lower_order(tableau)
    if p is None:
        return None
    high, low = error_terms(tableau, p + 2), error_terms(tableau, p + 2, embedded=True)
    if high is None or low is None:
        return None
    estimate = [x - y for x, y in zip(high, low, strict=True)]
    return _ratio(estimate, error_terms(tableau, p + 1, embedded=True))


def solution_error_ratio(tableau: Tableau) -> float | None:
    """Return the error norm of the solution that is carried on over that of the embedded one.

    |τ⁽q⁺¹⁾|₂ / |τ̂⁽ᵖ⁺¹⁾|₂ for orders q and p: small where the solution is much better than what is estimated.
    Source: the figure E of C. A. Kennedy, M. H. Carpenter and R. M. Lewis, Appl. Numer. Math. 35 (2000)
    177-219; the figure D there is the largest coefficient.

    Returns:
        A number (unitless); None as in `embedded_error_ratio`.

    >>> pair = Tableau("a-2-1", order=2, embedded_order=1, matrix=[[], [1]], weights=["1/2", "1/2"],
    ...                embedded_weights=[1, 0])
    >>> round(solution_error_ratio(pair), 6)
    0.372678
    """
    p = _lower_order(tableau)
    if p is None:
        return None
    return _ratio(error_terms(tableau, tableau.order + 1), error_terms(tableau, p + 1, embedded=True))


def _lower_order(tableau: Tableau) -> int | None:
    p = tableau.embedded_order
    return None if p is None or p >= tableau.order or p + 2 > HIGHEST else p


def _ratio(above: Sequence[Fraction] | None, below: Sequence[Fraction] | None) -> float | None:
    if above is None or below is None:
        return None
    size = norm_of(below)
    return None if size < 1e-12 else norm_of(above) / size  # else the order is higher than claimed
