"""The fraction that a float was meant to be."""

from __future__ import annotations

from fractions import Fraction
from math import isfinite, ulp

from newel.errors import BadNumber

__all__ = ["near_fraction", "simplest_between"]

UNITS = 2
"""A fraction fits where it is within so many units in the last place of the float."""
MOST_CHANCE = 1e-3
LARGEST_DENOMINATOR = 10**8
SMALL_DENOMINATOR = 1000
NOTHING = 8 * 2.0**-53


def near_fraction(x: float) -> Fraction | None:
    """Return the fraction with the smallest denominator that a float stands for, or None where none does.

    It is within 2 units in the last place, and its denominator so small that a number drawn by chance would
    hardly ever have one. What was left over when terms of size 1 cancelled is allowed its rounding too.

    Raises:
        BadNumber: the float is not finite.

    >>> near_fraction(0.1 + 0.2), near_fraction(1 / 3), near_fraction(2 ** 0.5)
    (Fraction(3, 10), Fraction(1, 3), None)
    """
    if not isfinite(x):
        raise BadNumber(repr(x), "a coefficient is finite")
    if abs(x) <= NOTHING:
        return Fraction(0)
    # Half a unit more, as the float of the fraction itself is rounded.
    found = _within(x, (UNITS + 0.5) * ulp(x), LARGEST_DENOMINATOR)
    return found if found is not None else _within(x, NOTHING, SMALL_DENOMINATOR)


def _within(x: float, slack: float, largest: int) -> Fraction | None:
    fraction = simplest_between(Fraction(x) - Fraction(slack), Fraction(x) + Fraction(slack))
    below = fraction.denominator
    # About below²·slack fractions with denominators up to this one lie as near to a number drawn by chance.
    return fraction if below <= largest and below * below * slack <= MOST_CHANCE else None


def simplest_between(low: Fraction, high: Fraction) -> Fraction:
    """Return the fraction with the smallest denominator from `low` to `high`, both included.

    By the continued fraction that the two have in common.

    >>> simplest_between(Fraction(314, 100), Fraction(315, 100))
    Fraction(22, 7)
    """
    if low <= 0 <= high:
        return Fraction(0)
    if high < 0:
        return -simplest_between(-high, -low)
    whole = -(-low.numerator // low.denominator)
    if whole <= high:
        return Fraction(whole)
    whole -= 1
    return whole + 1 / simplest_between(1 / (high - whole), 1 / (low - whole))
