"""How far a step may reach along the real and the imaginary axis: by exact roots, never by sampling."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction
from math import isqrt, lcm

from newel.methods.analysis.polynomials import first_descent
from newel.methods.analysis.stability import growth_polynomial
from newel.methods.exact import Exact
from newel.methods.tableau import Tableau

__all__ = ["MOST_STAGES", "imaginary_limit", "real_limit"]

MOST_STAGES = 64
"""Beyond so many stages the roots of the exact polynomial are not isolated: it takes too long."""

_BITS = 512


def real_limit(tableau: Tableau, embedded: bool = False) -> float | None:
    """Return the largest x such that |R(−t)| ≤ 1 for all t from 0 to x: the real stability limit.

    A decay y' = −λy, λ > 0, does not grow as long as hλ ≤ x. It is the first root right of which
    1 − R(−t)² is negative, isolated exactly; a root that is touched only does not end the interval.
    Source: J. D. Lambert, Computational Methods in Ordinary Differential Equations (1973), chapter 4.

    Args:
        tableau: the method.
        embedded: whether the embedded weights are meant.

    Returns:
        A number (unitless), right to the last digit of float64; inf where R is constant; None above 64
        stages, or where there are no embedded weights to go by.

    >>> real_limit(Tableau("euler-1", order=1, matrix=[[]], weights=[1]))
    2.0
    """
    r = _coefficients(tableau, embedded)
    if r is None:
        return None
    mirrored = [-x if k % 2 else x for k, x in enumerate(r)]
    square = _product(mirrored, mirrored)
    return _first(_one_minus(square))


def imaginary_limit(tableau: Tableau, embedded: bool = False) -> float | None:
    """Return the largest y such that |R(it)| ≤ 1 for all t from 0 to y: the imaginary stability limit.

    An oscillation y' = iωy does not grow as long as hω ≤ y. It is 0 where oscillations grow at every step,
    however small: the lowest coefficient of |R(iy)|² − 1 as a polynomial in y² decides. Otherwise it is the
    root of that polynomial right of which it is positive, isolated exactly. Source: J. D. Lambert (1973),
    chapter 4; I. P. E. Kinnmark and W. G. Gray, Math. Comput. Simulation 26 (1984) 181-188.

    Args, returns: as for `real_limit`.

    >>> kutta = Tableau("kutta-4", order=4, matrix=[[], ["1/2"], [0, "1/2"], [0, 0, 1]],
    ...                 weights=["1/6", "1/3", "1/3", "1/6"])
    >>> imaginary_limit(kutta) == 8**0.5
    True
    """
    r = _coefficients(tableau, embedded)
    if r is None:
        return None
    even = [-x if k % 2 else x for k, x in enumerate(r[::2])]
    odd = [-x if k % 2 else x for k, x in enumerate(r[1::2])]
    square = _product(even, even)
    for k, x in enumerate(_product(odd, odd), 1):
        if k == len(square):
            square.append(Exact(0))
        square[k] = square[k] + x
    return _first(_one_minus(square), root=True)


def _coefficients(tableau: Tableau, embedded: bool) -> tuple[Exact, ...] | None:
    return None if tableau.stages > MOST_STAGES else growth_polynomial(tableau, embedded)


def _product(p: Sequence[Exact], q: Sequence[Exact]) -> list[Exact]:
    if not (p and q):
        return []
    result = [Exact(0)] * (len(p) + len(q) - 1)
    for i, x in enumerate(p):
        for j, y in enumerate(q):
            result[i + j] = result[i + j] + x * y
    return result


def _one_minus(p: Sequence[Exact]) -> list[Exact]:
    return [1 - p[0], *(-x for x in p[1:])]


def _first(p: Sequence[Exact], root: bool = False) -> float:
    """Return where a polynomial first turns negative, or the square root of that place.

    Numbers with a square root are taken to 512 bits once it is settled, exactly, which of them are zero.
    """
    if any(x.surd for x in p):
        integers = [x.scaled_floor(_BITS) if x else 0 for x in p]
    else:
        below = lcm(*(x.rational.denominator for x in p))
        integers = [int(x.rational * below) for x in p]
    place = first_descent(integers)
    if place is None:
        return float("inf")
    if not root:
        return float(place)
    return float(Fraction(isqrt((place.numerator << 2 * _BITS) // place.denominator), 1 << _BITS))
