"""Strong stability preservation: how long a step may be and still never raise what Euler's step does not."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from fractions import Fraction

from newel.methods.analysis.stability import growth_polynomial
from newel.methods.tableau import Tableau

__all__ = ["linear_threshold", "ssp_coefficient"]

_BITS = 384
_ONE = 1 << _BITS
_SLACK = 1 << (_BITS - 250)
_STEPS = 84


def ssp_coefficient(tableau: Tableau) -> float:
    """Return the coefficient C: a step of up to C Euler steps keeps every convex bound that Euler's keeps.

    It is the radius of absolute monotonicity: the largest r with K(I + rK)⁻¹ ≥ 0 and rK(I + rK)⁻¹1 ≤ 1, for
    K the matrix with the weights below it; 0 where there is none. Stages that the weights do not need are
    left out. Bisected in integers of 384 bits; whether it is 0 is decided by the pattern of zeros of K and
    K². Source: J. F. B. M. Kraaijevanger, BIT 31 (1991) 482-528.

    Returns:
        A number (unitless), right to 13 digits of the tableau's own numbers.

    >>> ssp_coefficient(Tableau("heun-2", order=2, matrix=[[], [1]], weights=["1/2", "1/2"]))
    1.0
    """
    K = _needed(tableau)
    if not _is_monotone_near_zero(K):
        return 0.0
    return _largest(lambda r: _is_absolutely_monotone(K, r), len(K))


def linear_threshold(tableau: Tableau) -> float:
    """Return the radius R of absolute monotonicity of the stability polynomial: C for linear problems.

    The largest r such that the polynomial and all its derivatives are ≥ 0 at −r; 0 where there is none.
    Bisected in integers of 384 bits. Source: J. F. B. M. Kraaijevanger, BIT 31 (1991) 482-528;
    M. N. Spijker, Math. Comp. 45 (1985) 377-392.

    Returns:
        A number (unitless), right to 13 digits.

    >>> linear_threshold(Tableau("midpoint-2", order=2, matrix=[[], ["1/2"]], weights=[0, 1]))
    1.0
    """
    r = growth_polynomial(tableau) or ()
    # In units of s², which no radius passes, the coefficients of long polynomials keep their bits.
    unit = tableau.stages**2
    p = [(x * unit**k).scaled_floor(_BITS) for k, x in enumerate(r)]
    if len(p) < 2 or any(x <= 0 for x in p):
        return 0.0
    return _largest(lambda radius: _derivatives_hold(p, radius), 1, unit)


def _largest(holds: Callable[[int], bool], most: int, unit: int = 1) -> float:
    """Return the largest r, in a unit, for which something holds as it does below; `most` is a first guess.

    A consistent method never passes the number of its stages; one that is not may, and is let go at 2⁴⁰.
    """
    low, high = 0, most << _BITS
    while holds(high) and high < 1 << (_BITS + 40):
        high *= 2
    for _ in range(_STEPS):
        middle = (low + high) >> 1
        low, high = (middle, high) if holds(middle) else (low, middle)
    found = float(Fraction((low + high) * unit, 2 << _BITS))
    return 0.0 if found < 1e-15 else found


def _needed(tableau: Tableau) -> list[list[int]]:
    """Return K in units of 2^−bits, without the stages that no weight hangs on."""
    rows = (*tableau.matrix, tableau.weights)
    used, todo = set(), [tableau.stages]
    while todo:
        for j, x in enumerate(rows[todo.pop()]):
            if x and j not in used:
                used.add(j)
                todo.append(j)
    kept = sorted(used)
    return [[rows[i][j].scaled_floor(_BITS) for j in kept] for i in (*kept, tableau.stages)]


def _is_monotone_near_zero(K: Sequence[Sequence[int]]) -> bool:
    """Return whether K ≥ 0, and K² is zero wherever K is."""
    if any(x < 0 for row in K for x in row):
        return False
    return all(
        row[j] or not any(row[m] and K[m][j] for m in range(j + 1, len(row)))
        for row in K
        for j in range(len(row))
    )


def _is_absolutely_monotone(K: Sequence[Sequence[int]], r: int) -> bool:
    """Return whether M = K(I + rK)⁻¹ has no negative entry and no row sum above 1/r.

    Row by row from the right: M = K − r·M·K, and K has nothing on or above its diagonal.
    """
    s = len(K[0])
    below = [[(m, K[m][j]) for m in range(j + 1, s) if K[m][j]] for j in range(s)]
    for row in K:
        M = [0] * s
        for j in range(s - 1, -1, -1):
            product = sum(M[m] * x for m, x in below[j]) >> _BITS
            M[j] = row[j] - (r * product >> _BITS)
            if M[j] < -_SLACK:
                return False
        if r * sum(M) >> _BITS > _ONE + _SLACK:
            return False
    return True


def _derivatives_hold(p: Sequence[int], r: int) -> bool:
    """Return whether no coefficient of p(x − r) is negative, by repeated synthetic division."""
    q = list(p)
    for first in range(len(q)):
        for k in range(len(q) - 2, first - 1, -1):
            q[k] -= r * q[k + 1] >> _BITS
        if q[first] < -_SLACK:
            return False
    return True
