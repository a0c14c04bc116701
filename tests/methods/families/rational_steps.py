"""One step of a tableau in rational arithmetic, from the definition of a Runge–Kutta method."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction

from newel.methods.exact import Exact
from newel.methods.tableau import Tableau


def logistic(t: Fraction, y: Fraction) -> Fraction:
    """A rate that depends on both of its arguments, and not linearly."""
    return y * (1 - y) + t / 2


def step(tableau: Tableau, weights: Sequence[Exact], y: Fraction, h: Fraction) -> Fraction:
    """The state after a step from t = 0."""
    k: list[Fraction] = []
    for row, c in zip(tableau.matrix, tableau.nodes, strict=True):
        stage = y + h * sum((a.rational * x for a, x in zip(row, k, strict=False)), Fraction(0))
        k.append(logistic(c.rational * h, stage))
    return y + h * sum((b.rational * x for b, x in zip(weights, k, strict=True)), Fraction(0))
