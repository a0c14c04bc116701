"""Numbers enclosed between two decimals, for rules whose numbers are irrational or too long to write out.

An enclosure is a pair of integers, low ≤ x·10^240 ≤ high, and each operation rounds outwards; so what comes
out holds the true number, whatever was rounded on the way (R. E. Moore, Interval Analysis, 1966, chapter 3).
`decimal` prints it to 44 digits, and refuses where the enclosure is too wide for that to be right to 40.
"""

from __future__ import annotations

from collections.abc import Callable
from fractions import Fraction
from typing import TypeAlias

import attrs

from newel.methods.exact import Exact

__all__ = ["DIGITS", "Enclosure", "decimal", "root_between"]

DIGITS = 40
"""Significant digits that a rounded member of a family states."""

PLACES = 240
ROOT_PLACES = 90
PRINTED = 44
SCALE = 10**PLACES
EnclosureLike: TypeAlias = "Enclosure | Fraction | int"


@attrs.frozen(eq=False)
class Enclosure:
    """A real number x with low ≤ x·10^240 ≤ high.

    >>> third = Enclosure.of(Fraction(1, 3))
    >>> (third * 3).holds(1), third.high - third.low
    (True, 1)
    """

    low: int
    high: int

    @classmethod
    def of(cls, value: EnclosureLike) -> Enclosure:
        """Return the narrowest enclosure of an exact number."""
        if isinstance(value, Enclosure):
            return value
        scaled = Fraction(value) * SCALE
        return cls(scaled.numerator // scaled.denominator, -(-scaled.numerator // scaled.denominator))

    def holds(self, value: Fraction | int) -> bool:
        """Whether a number lies within."""
        return bool(self.low <= value * SCALE <= self.high)

    def __neg__(self) -> Enclosure:
        return Enclosure(-self.high, -self.low)

    def __add__(self, other: EnclosureLike) -> Enclosure:
        y = Enclosure.of(other)
        return Enclosure(self.low + y.low, self.high + y.high)

    def __sub__(self, other: EnclosureLike) -> Enclosure:
        y = Enclosure.of(other)
        return Enclosure(self.low - y.high, self.high - y.low)

    def __mul__(self, other: EnclosureLike) -> Enclosure:
        if isinstance(other, int):
            ends = self.low * other, self.high * other
            return Enclosure(min(ends), max(ends))
        y = Enclosure.of(other)
        products = (self.low * y.low, self.low * y.high, self.high * y.low, self.high * y.high)
        return Enclosure(min(products) // SCALE, -(-max(products) // SCALE))

    def __truediv__(self, other: EnclosureLike) -> Enclosure:
        y = Enclosure.of(other)
        if y.low <= 0 <= y.high:
            raise ZeroDivisionError("the divisor may be zero")
        ends = [(x * SCALE, d) for x in (self.low, self.high) for d in (y.low, y.high)]
        return Enclosure(min(x // d for x, d in ends), max(-(-x // d) for x, d in ends))

    def __radd__(self, other: Fraction | int) -> Enclosure:
        return self + other

    def __rsub__(self, other: Fraction | int) -> Enclosure:
        return Enclosure.of(other) - self

    def __rmul__(self, other: Fraction | int) -> Enclosure:
        return self * other

    def __rtruediv__(self, other: Fraction | int) -> Enclosure:
        return Enclosure.of(other) / self


def decimal(value: Enclosure) -> Exact:
    """Return a decimal of at most 44 significant digits that is right to 40: off by under half a unit there.

    Raises:
        ArithmeticError: the enclosure is too wide for that.

    >>> str(decimal(Enclosure.of(Fraction(2, 3))))
    '0.66666666666666666666666666666666666666666667'
    """
    if value.low == value.high == 0:
        return Exact(0)
    middle = (value.low + value.high) // 2
    places = PRINTED - (len(str(abs(middle))) - PLACES)
    unit = 10 ** max(PLACES - places, 0)
    rounded = (middle + unit // 2) // unit
    off = max(abs(value.high - rounded * unit), abs(value.low - rounded * unit))
    # The 40th digit of the decimal is worth 10^4 of its last ones, and half of that is what 40 digits excuse.
    if not middle or places > PLACES or off * 10 >= unit * 10 ** (PRINTED - DIGITS):
        raise ArithmeticError("an enclosure too wide for its digits")
    return Exact.of_decimal(rounded, places)


def root_between(function: Callable[[Fraction], Fraction], low: Fraction, high: Fraction) -> Enclosure:
    """Return the one root of a continuous function that changes its sign between two numbers.

    >>> root_between(lambda x: x * x - 2, Fraction(1), Fraction(2)).holds(Fraction(141421356, 10**8))
    False
    """
    grid = 10**ROOT_PLACES
    below, above = int(low * grid), int(high * grid)
    sign = function(Fraction(below, grid)) > 0
    while above - below > 1:
        middle = (below + above) // 2
        if (function(Fraction(middle, grid)) > 0) == sign:
            below = middle
        else:
            above = middle
    return Enclosure(below * SCALE // grid, above * SCALE // grid)
