"""What a method does to a wave: how it damps it and how it delays it."""

from __future__ import annotations

from cmath import exp, phase
from collections.abc import Iterator, Sequence
from fractions import Fraction

from newel.methods.analysis.stability import growth_polynomial
from newel.methods.exact import Exact
from newel.methods.tableau import Tableau

__all__ = [
    "dispersion_coefficient",
    "dispersion_order",
    "dissipation_coefficient",
    "dissipation_order",
    "resolved_wave_number",
]

_SPARE = 12
_ZERO = Fraction(1, 10**10)
_GRID = 1 / 128


def dissipation_order(tableau: Tableau) -> int | None:
    """Return the dissipation order r: 1 − |R(iν)| = a·ν^(r+1) + …; see `dissipation_coefficient`.

    >>> dissipation_order(Tableau("euler-1", order=1, matrix=[[]], weights=[1]))
    1
    """
    found = _leading(tableau, 0)
    return None if found is None else found[0] - 1


def dissipation_coefficient(tableau: Tableau) -> float | None:
    """Return the leading coefficient a of 1 − |R(iν)|, where ν = hω is the phase that a step advances.

    Above 0 a wave is damped, below 0 it grows. From the exact logarithm of the stability polynomial.
    Source: P. J. van der Houwen and B. P. Sommeijer, SIAM J. Numer. Anal. 24 (1987) 595-617.

    Returns:
        A number (unitless); None where nothing is left over up to ν^(order+12).

    >>> dissipation_coefficient(Tableau("euler-1", order=1, matrix=[[]], weights=[1]))
    -0.5
    """
    found = _leading(tableau, 0)
    return None if found is None else float(-found[1] * (-1) ** (found[0] // 2))


def dispersion_order(tableau: Tableau) -> int | None:
    """Return the dispersion order q: ν − arg R(iν) = φ·ν^(q+1) + …; see `dispersion_coefficient`.

    >>> dispersion_order(Tableau("euler-1", order=1, matrix=[[]], weights=[1]))
    2
    """
    found = _leading(tableau, 1)
    return None if found is None else found[0] - 1


def dispersion_coefficient(tableau: Tableau) -> float | None:
    """Return the leading coefficient φ of ν − arg R(iν): above 0 a wave lags behind, below 0 it runs ahead.

    Source and None: as for `dissipation_coefficient`. A number (unitless).

    >>> round(dispersion_coefficient(Tableau("euler-1", order=1, matrix=[[]], weights=[1])), 12)
    0.333333333333
    """
    found = _leading(tableau, 1)
    return None if found is None else float(-found[1] * (-1) ** (found[0] // 2))


def resolved_wave_number(tableau: Tableau, accuracy: float = 1e-3) -> float | None:
    """Return the phase ν up to which a step changes a wave by no more than an accuracy.

    Up to ν both | |R(iν)| − 1 | and |ν − arg R(iν)| are at most `accuracy`. Looked for at every 1/128, then
    bisected. Source: F. Q. Hu, M. Y. Hussaini and J. L. Manthey, J. Comput. Phys. 124 (1996) 177-191, where
    the accuracy is 0.001.

    Args:
        tableau: the method.
        accuracy: above 0; the phase is in radians.

    Returns:
        A number in radians a step; divided by the rate calls of a step it compares methods at equal cost.

    >>> kutta = Tableau("kutta-4", order=4, matrix=[[], ["1/2"], [0, "1/2"], [0, 0, 1]],
    ...                 weights=["1/6", "1/3", "1/3", "1/6"])
    >>> round(resolved_wave_number(kutta), 4)
    0.6774
    """
    r = growth_polynomial(tableau)
    if r is None:
        return None
    factors = [float(x) for x in reversed(r)]
    low, high = 0.0, 2.0 * tableau.stages + 1.0
    steps = 1
    while steps * _GRID < high:
        if not _is_resolved(factors, steps * _GRID, accuracy):
            high = steps * _GRID
            break
        low, steps = steps * _GRID, steps + 1
    for _ in range(48):
        middle = (low + high) / 2
        low, high = (middle, high) if _is_resolved(factors, middle, accuracy) else (low, middle)
    return (low + high) / 2


def _is_resolved(factors: Sequence[float], wave_number: float, accuracy: float) -> bool:
    z, value = 1j * wave_number, 0j
    for factor in factors:
        value = value * z + factor
    kept = value * exp(-z)
    return abs(abs(kept) - 1.0) <= accuracy and abs(phase(kept)) <= accuracy


def _leading(tableau: Tableau, parity: int) -> tuple[int, Exact] | None:
    """Return the first power of this parity, and its coefficient, in log R(z) − z."""
    r = growth_polynomial(tableau)
    if r is None:
        return None
    zero = 0 if tableau.is_exact else _ZERO
    for k, left in enumerate(_logarithm(r, tableau.order + _SPARE), 1):
        left = left - 1 if k == 1 else left
        if k % 2 == parity and abs(left) > zero:
            return k, left
    return None


def _logarithm(r: Sequence[Exact], terms: int) -> Iterator[Exact]:
    """Yield the coefficients of log R from z on, out of R·(log R)′ = R′ with R(0) = 1."""
    known: list[Exact] = []
    for k in range(1, terms + 1):
        slope = (r[k] if k < len(r) else Exact(0)) * k
        for j, x in enumerate(known, 1):
            if k - j < len(r):
                slope = slope - x * r[k - j]
        known.append(slope)
        yield slope / k
