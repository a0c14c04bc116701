"""Methods made for a stability polynomial: each stage hangs on the one before alone."""

from __future__ import annotations

from fractions import Fraction

from newel.methods.tableau import Tableau


def chain(*higher: str | Fraction, order: int = 1) -> Tableau:
    """Return the method with R(z) = 1 + z + r₂z² + …; none of the coefficients may be 0."""
    r = [Fraction(1), Fraction(1), *map(Fraction, higher)]
    s = len(r) - 1
    matrix: list[list[Fraction | int]] = [[]]
    for i in range(2, s + 1):
        k = s - i + 2
        matrix.append([0] * (i - 2) + [r[k] / r[k - 1]])
    return Tableau("chain", order=order, matrix=matrix, weights=[0] * (s - 1) + [1])
