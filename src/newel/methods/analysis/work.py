"""What accuracy costs: methods of different orders and stages at one price, the rate call."""

from __future__ import annotations

from newel.methods.analysis.error_norms import error_norm
from newel.methods.analysis.structure import computed_stages
from newel.methods.tableau import Tableau

__all__ = ["calls_for_digits"]


def calls_for_digits(tableau: Tableau, digits: int) -> float | None:
    """Return the rate calls a unit of time that keep the leading local error a unit of time at 10^−digits.

    With steps of length h the leading error a unit of time is A·h^p, A the principal error norm and p the
    order, where all elementary differentials are of size 1; s calls a step make (s·(A·10^digits)^(1/p)) calls
    a unit of time. A figure to compare methods of all orders by, at equal cost; a model decides its own.

    Args:
        tableau: the method.
        digits: the accuracy, as a power of ten.

    Returns:
        A number in calls a unit of time, smaller is better; None where there is no error norm, or it is 0.

    >>> calls_for_digits(Tableau("euler-1", order=1, matrix=[[]], weights=[1]), 3)
    500.0
    """
    norm = error_norm(tableau)
    if norm is None or norm < 1e-16:
        return None
    return computed_stages(tableau) * float((norm * 10.0**digits) ** (1.0 / tableau.order))
