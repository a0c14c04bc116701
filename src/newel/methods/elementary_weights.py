"""Elementary weights of rooted trees, by one formula over several arithmetics.

For a tree that is `last` grafted onto the root of `rest` the stage vector is Φ(tree) = Φ(rest) · (A Φ(last)),
entry by entry, and Φ(τ) = 1. A formula with weights b is of order p when bᵀΦ(t) = 1/γ(t) for every tree t of
at most p vertices (Butcher 1963; Hairer, Nørsett, Wanner I, section II.2). `ElementaryWeights` is that
formula; under it are three arithmetics: fixed point with a proven error bound, integers scaled by a common
denominator, and pairs of such integers for Q(√d). The matrix may be any square one.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from fractions import Fraction
from math import lcm
from operator import mul
from typing import Generic, Protocol, TypeAlias, TypeVar

import attrs

from newel.methods.exact import Exact
from newel.methods.trees import Tree, tree_at

__all__ = ["ElementaryWeights", "FixedPoint", "Interval", "Matrix", "Row", "ScaledIntegers", "ScaledSurds"]

Row = Sequence[Exact]
Matrix = Sequence[Row]
Pair: TypeAlias = tuple[list[int], list[int]]
V = TypeVar("V")
W = TypeVar("W")


class Arithmetic(Protocol[V]):
    """What the formula needs of numbers: vectors V over the stages, and three operations on them."""

    def ones(self) -> V:
        """Return Φ(τ)."""

    def product(self, u: V, v: V) -> V:
        """Return the product entry by entry."""

    def apply(self, v: V) -> V:
        """Return A v."""


class ElementaryWeights(Generic[V]):
    """The stage vectors Φ(t) of all trees, each computed when it is first asked for and then kept.

    >>> A = [[Exact.of(0), Exact.of(0)], [Exact.of("1/2"), Exact.of(0)]]
    >>> ElementaryWeights(ScaledIntegers(A)).stages(1)     # c times the common denominator 2
    [0, 1]
    """

    def __init__(self, arithmetic: Arithmetic[V]) -> None:
        self.arithmetic = arithmetic
        self._stages: dict[int, V] = {0: arithmetic.ones()}
        self._applied: dict[int, V] = {}

    def stages(self, index: int) -> V:
        """Return Φ of the tree with this index; only the trees that it is made of are computed too."""
        found = self._stages.get(index)
        if found is None:
            tree = tree_at(index)
            found = self.arithmetic.product(self.stages(tree.rest), self._apply(tree.last))
            self._stages[index] = found
        return found

    def _apply(self, index: int) -> V:
        found = self._applied.get(index)
        if found is None:
            found = self._applied[index] = self.arithmetic.apply(self.stages(index))
        return found


class ScaledIntegers:
    """Exact arithmetic for rational A: D·A is integer, and Φ(t) is held times D^(order − 1); unitless.

    A condition holds exactly when an integer is zero; no greatest common divisor is taken on the way.
    """

    def __init__(self, matrix: Matrix) -> None:
        self.denominator = _common_denominator(x for row in matrix for x in row)
        self.rows = [_trimmed(_scaled(row, self.denominator)) for row in matrix]

    def ones(self) -> list[int]:
        """Return Φ(τ)."""
        return [1] * len(self.rows)

    def product(self, u: list[int], v: list[int]) -> list[int]:
        """Return the product entry by entry."""
        return list(map(mul, u, v))

    def apply(self, v: list[int]) -> list[int]:
        """Return D·A v."""
        return [sum(map(mul, row, v)) for row in self.rows]

    def vector(self, weights: Row) -> tuple[list[int], int]:
        """Return weights as integers over their common denominator, for `residual`."""
        below = _common_denominator(weights)
        return _scaled(weights, below), below

    def residual(
        self, weights: tuple[list[int], int], tree: Tree, stages: list[int], target: Fraction
    ) -> Exact:
        """Return bᵀΦ(tree) − target, exactly."""
        values, below = weights
        above = sum(map(mul, values, stages))
        scale = below * self.denominator ** (tree.order - 1)
        if above * target.denominator == target.numerator * scale:
            return Exact(0)
        return Exact(Fraction(above, scale) - target)


class ScaledSurds:
    """The same for entries in Q(√d): every vector is a pair, its rational part and its part in √d."""

    def __init__(self, matrix: Matrix, radicand: int) -> None:
        self.radicand = radicand
        self.denominator = _common_denominator(x for row in matrix for x in row)
        pairs = [_scaled_pair(row, self.denominator) for row in matrix]
        self.rational_rows = [_trimmed(rational) for rational, _ in pairs]
        self.surd_rows = [_trimmed(surd) for _, surd in pairs]

    def ones(self) -> Pair:
        """Return Φ(τ)."""
        return [1] * len(self.rational_rows), [0] * len(self.rational_rows)

    def product(self, u: Pair, v: Pair) -> Pair:
        """Return the product entry by entry."""
        (a, b), (x, y), d = u, v, self.radicand
        rational = [p * r + d * q * s for p, q, r, s in zip(a, b, x, y, strict=True)]
        return rational, [p * s + q * r for p, q, r, s in zip(a, b, x, y, strict=True)]

    def apply(self, v: Pair) -> Pair:
        """Return D·A v."""
        (x, y), d = v, self.radicand
        pairs = list(zip(self.rational_rows, self.surd_rows, strict=True))
        rational = [sum(map(mul, a, x)) + d * sum(map(mul, b, y)) for a, b in pairs]
        return rational, [sum(map(mul, a, y)) + sum(map(mul, b, x)) for a, b in pairs]

    def vector(self, weights: Row) -> tuple[Pair, int]:
        """Return weights as pairs of integers over their common denominator, for `residual`."""
        below = _common_denominator(weights)
        return _scaled_pair(weights, below), below

    def residual(self, weights: tuple[Pair, int], tree: Tree, stages: Pair, target: Fraction) -> Exact:
        """Return bᵀΦ(tree) − target, exactly."""
        ((a, b), below), (x, y), d = weights, stages, self.radicand
        rational = sum(map(mul, a, x)) + d * sum(map(mul, b, y))
        surd = sum(map(mul, a, y)) + sum(map(mul, b, x))
        scale = below * self.denominator ** (tree.order - 1)
        if not surd and rational * target.denominator == target.numerator * scale:
            return Exact(0)
        return Exact(Fraction(rational, scale) - target, Fraction(surd, scale), d)


@attrs.frozen
class Interval:
    """A number known to lie within `middle` ± `radius`, both in units of 2^−bits."""

    middle: int
    radius: int
    bits: int

    @property
    def excludes_zero(self) -> bool:
        """Whether the number is proven not to be zero."""
        return abs(self.middle) > self.radius

    def __float__(self) -> float:
        return _ratio(self.middle, self.bits)

    @property
    def magnitude(self) -> float:
        """An upper bound of the absolute value."""
        return _ratio(abs(self.middle) + self.radius, self.bits) * (1 + 2**-50)

    @property
    def least(self) -> float:
        """A lower bound of the absolute value."""
        return _ratio(max(abs(self.middle) - self.radius, 0), self.bits) * (1 - 2**-50)


@attrs.frozen
class _Fixed:
    """A vector in fixed point: integers, the largest of them in modulus, and a bound of every error."""

    values: list[int]
    largest: int
    error: int


class FixedPoint:
    """Fixed point arithmetic with a proven bound of its error, carried along per vector.

    Entries are held as the floor of value·2^bits, wrong by less than one unit. With vectors of moduli up to U
    and V and errors up to e and f units, a product is wrong by at most (U·f + V·e + e·f)/2^bits + 1 units,
    the one for the floor; an inner product with a row whose moduli sum to at most R is wrong by at most
    (R·e + s·(U + e))/2^bits + 1 for s entries. All bounds are integers, rounded up.

    Args:
        matrix: s rows of s exact numbers.
        bits: the binary digits behind the point; any number is right, more of them make narrower intervals.
    """

    def __init__(self, matrix: Matrix, bits: int) -> None:
        self.bits = bits
        self.rows = [_trimmed([x.scaled_floor(bits) for x in row]) for row in matrix]
        self.size = len(self.rows)
        self.row_sum = max((_moduli(row) for row in self.rows), default=0)

    def ones(self) -> _Fixed:
        """Return Φ(τ)."""
        return _Fixed([1 << self.bits] * self.size, 1 << self.bits, 0)

    def product(self, u: _Fixed, v: _Fixed) -> _Fixed:
        """Return the product entry by entry."""
        bits = self.bits
        error = ((u.largest * v.error + v.largest * u.error + u.error * v.error) >> bits) + 2
        return _fixed([x * y >> bits for x, y in zip(u.values, v.values, strict=True)], error)

    def apply(self, v: _Fixed) -> _Fixed:
        """Return A v."""
        bits, values = self.bits, v.values
        error = self._inner_error(self.row_sum, v)
        return _fixed([sum(map(mul, row, values)) >> bits for row in self.rows], error)

    def vector(self, weights: Row) -> tuple[list[int], int]:
        """Return weights in fixed point, and a bound of the sum of their moduli, for `residual`."""
        values = [x.scaled_floor(self.bits) for x in weights]
        return values, _moduli(values)

    def residual(self, weights: tuple[list[int], int], stages: _Fixed, target: Fraction) -> Interval:
        """Return an interval that holds bᵀΦ − target."""
        values, moduli = weights
        middle = sum(map(mul, values, stages.values)) >> self.bits
        wanted = (target.numerator << self.bits) // target.denominator
        return Interval(middle - wanted, self._inner_error(moduli, stages) + 1, self.bits)

    def _inner_error(self, moduli: int, v: _Fixed) -> int:
        return ((moduli * v.error + self.size * (v.largest + v.error)) >> self.bits) + 2


def _fixed(values: list[int], error: int) -> _Fixed:
    return _Fixed(values, max(max(values), -min(values)), error)


def _moduli(values: list[int]) -> int:
    return sum(map(abs, values))


def _ratio(value: int, bits: int) -> float:
    try:
        return value / (1 << bits)
    except OverflowError:
        return float("inf") if value > 0 else float("-inf")


def _common_denominator(numbers: Iterable[Exact]) -> int:
    return lcm(*(lcm(x.rational.denominator, x.surd.denominator) for x in numbers))


def _scaled(row: Row, scale: int) -> list[int]:
    return [x.rational.numerator * (scale // x.rational.denominator) for x in row]


def _scaled_pair(row: Row, scale: int) -> Pair:
    return _scaled(row, scale), [x.surd.numerator * (scale // x.surd.denominator) for x in row]


def _trimmed(row: list[int]) -> list[int]:
    """Cut the zeros at the end of a row, half of all in an explicit method; `map` stops at the shorter."""
    while row and not row[-1]:
        row.pop()
    return row
