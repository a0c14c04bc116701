"""Order conditions as polynomials in one unknown, and the values of the unknown that meet them all.

Where entries of a tableau move along a line, A + x·D, the residual of each condition is a polynomial in x of
a degree below the order. What meets every condition is a common root: the greatest common divisor of the
polynomials, taken in exact arithmetic from the lowest order up, soon has degree 0 (nothing does it) or 1
(one exact value does).
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from fractions import Fraction
from typing import Any, TypeAlias

import attrs
import numpy as np

from newel.methods.elementary_weights import ElementaryWeights
from newel.methods.exact import Exact
from newel.methods.trees import trees

__all__ = ["Asked", "Found", "Polynomial", "common_values"]

Number: TypeAlias = Any
Polynomial: TypeAlias = list[Number]
"""Coefficients from the constant one up, without zeros at the end: Fractions, or Exacts of one field."""

MOST_TREES = 200
NEGLIGIBLE = 1e-10
FINE = 1 << 256


@attrs.frozen
class Asked:
    """One weight vector: s polynomials in x, the order that it claims, and its targets by tree."""

    weights: Sequence[Polynomial]
    claimed: int
    target: Any


@attrs.frozen
class Found:
    """The values of x that may do, those whose conditions were looked at; `free` if any value would do.

    `unsolved` tells that a common factor of degree two or more is left whose roots are not all rational.
    `slope` is the modulus of the derivative of the condition that gave the values, 0 where they are exact.
    """

    values: tuple[Exact, ...] = ()
    free: bool = False
    unsolved: bool = False
    slope: float = 0.0


class _Polynomials:
    """The arithmetic of `ElementaryWeights` with a polynomial for each stage."""

    def __init__(self, rows: Sequence[Sequence[Polynomial]]) -> None:
        self.rows = [[(j, p) for j, p in enumerate(row) if p] for row in rows]

    def ones(self) -> list[Polynomial]:
        return [[Fraction(1)] for _ in self.rows]

    def product(self, u: list[Polynomial], v: list[Polynomial]) -> list[Polynomial]:
        return [times(p, q) for p, q in zip(u, v, strict=True)]

    def apply(self, v: list[Polynomial]) -> list[Polynomial]:
        return [inner(((p, v[j]) for j, p in row)) for row in self.rows]


def common_values(matrix: Sequence[Sequence[Polynomial]], asked: Sequence[Asked], rounded: bool) -> Found:
    """Return the values of x with which the conditions up to the claimed orders hold.

    Args:
        matrix: s rows of s polynomials in x.
        asked: the weight vectors that make claims.
        rounded: whether coefficients carry a rounding; then the first condition that x enters decides.

    Returns:
        What was found; a value is still to be proved where there are more trees than are looked at here.

    >>> A = [[[], []], [[Fraction(0), Fraction(1)], []]]
    >>> midpoint = Asked([[], [Fraction(1)]], 2, lambda tree: Fraction(1, tree.density))
    >>> common_values(A, [midpoint], False).values
    (Exact.of('1/2'),)
    """
    elementary = ElementaryWeights(_Polynomials(matrix))
    divisor: Polynomial = []
    looked_at = 0
    for order in range(1, max(each.claimed for each in asked) + 1):
        for tree in trees(order):
            stages = elementary.stages(tree.index)
            looked_at += 1
            for each in (one for one in asked if one.claimed >= order):
                residual = inner(zip(each.weights, stages, strict=True))
                residual = plus(residual, [-each.target(tree)])
                if rounded:
                    decided = _decided_by(residual)
                    if decided is not None:
                        return decided
                    continue
                divisor = _common(divisor, residual)
                if len(divisor) == 1:
                    return Found()
            if len(divisor) == 2 or looked_at >= MOST_TREES:
                return _solved(divisor)
    return _solved(divisor)


def plus(p: Polynomial, q: Polynomial) -> Polynomial:
    """Return p + q."""
    if len(p) < len(q):
        p, q = q, p
    return _trimmed([x + y for x, y in zip(p, q, strict=False)] + p[len(q) :])


def times(p: Polynomial, q: Polynomial) -> Polynomial:
    """Return p·q."""
    if not p or not q:
        return []
    if len(p) == 1 == len(q):
        return [p[0] * q[0]]
    made: Polynomial = [Fraction(0)] * (len(p) + len(q) - 1)
    for i, x in enumerate(p):
        for j, y in enumerate(q):
            made[i + j] = made[i + j] + x * y
    return _trimmed(made)


def inner(pairs: Iterable[tuple[Polynomial, Polynomial]]) -> Polynomial:
    """Return the sum of the products."""
    total: Polynomial = []
    for p, q in pairs:
        if p and q:
            total = plus(total, times(p, q))
    return total


def _trimmed(p: Polynomial) -> Polynomial:
    while p and not p[-1]:
        p.pop()
    return p


def _common(p: Polynomial, q: Polynomial) -> Polynomial:
    """Return the greatest common divisor by Euclid's algorithm, with leading coefficient 1."""
    while q:
        p, q = q, _remainder(p, q)
    return [x / p[-1] for x in p] if p else []


def _remainder(p: Polynomial, q: Polynomial) -> Polynomial:
    p = list(p)
    while len(p) >= len(q):
        factor, shift = p[-1] / q[-1], len(p) - len(q)
        for i, y in enumerate(q[:-1]):
            p[shift + i] = p[shift + i] - factor * y
        p.pop()
        _trimmed(p)
    return p


def _solved(divisor: Polynomial) -> Found:
    if not divisor:
        return Found(free=True)
    if len(divisor) == 2:
        return Found(values=(_exact(-divisor[0] / divisor[1]),))
    roots = _rational_roots(divisor)
    rest = divisor
    for root in roots:
        while rest and not _value(rest, root):
            rest = _quotient(rest, root)
    return Found(values=tuple(map(Exact, roots)), unsolved=len(rest) > 1)


def _rational_roots(p: Polynomial) -> list[Fraction]:
    """Return the rational roots: float roots made precise by Newton's steps, then fractions near them."""
    found = []
    for start in _real_roots(p):
        precise = _polished(p, start)
        for most in (10**4, 10**8, 10**16, 10**32):
            guess = precise.limit_denominator(most)
            if not _value(p, guess):
                found.append(guess)
                break
    return sorted(set(found))


def _real_roots(p: Polynomial) -> list[Fraction]:
    roots = np.roots([float(x) for x in reversed(p)])
    near_real = np.abs(roots.imag) <= 1e-5 * (1 + np.abs(roots))
    return [Fraction(x) for x in np.unique(roots.real[near_real]).tolist()]


def _polished(p: Polynomial, start: Fraction) -> Fraction:
    derivative = [k * x for k, x in enumerate(p)][1:]
    x = start
    for _ in range(8):
        slope = _value(derivative, x)
        if not slope:
            break
        step = _value(p, x) / slope
        x = Fraction(round((x - _rational(step)) * FINE), FINE)
    return x


def _decided_by(residual: Polynomial) -> Found | None:
    """Decide by one condition of rounded coefficients; None where x hardly enters it and it holds."""
    sizes = [abs(float(x)) for x in residual]
    if max(sizes[1:], default=0.0) <= NEGLIGIBLE:
        return Found() if max(sizes, default=0.0) > NEGLIGIBLE else None
    if len(residual) == 2:
        return Found(values=(_exact(-residual[0] / residual[1]),), slope=sizes[1])
    derivative = [k * x for k, x in enumerate(residual)][1:]
    values = [_polished(residual, start) for start in _real_roots(residual)]
    slope = min((abs(float(_value(derivative, x))) for x in values), default=0.0)
    return Found(values=tuple(map(Exact, values)), slope=slope or NEGLIGIBLE)


def _value(p: Polynomial, x: Fraction) -> Number:
    total: Number = Fraction(0)
    for coefficient in reversed(p):
        total = total * x + coefficient
    return total


def _quotient(p: Polynomial, root: Fraction) -> Polynomial:
    made: Polynomial = []
    carried: Number = Fraction(0)
    for coefficient in reversed(p):
        carried = carried * root + coefficient
        made.append(carried)
    return made[:-1][::-1]


def _exact(x: Number) -> Exact:
    return x if isinstance(x, Exact) else Exact(x)


def _rational(x: Number) -> Fraction:
    return (
        Fraction(float(x)) if isinstance(x, Exact) and x.surd else x.rational if isinstance(x, Exact) else x
    )
