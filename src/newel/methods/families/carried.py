"""Numbers that carry a rounding on, from the method that a rule starts from to the tableau that it makes.

A number is a pair: its value, and how far it may be from the one that was meant. Exact ones stay exact.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from fractions import Fraction
from typing import TypeAlias

from newel.errors import BadRequest
from newel.methods.digits import Trust, decimal_exponent
from newel.methods.exact import Exact
from newel.methods.tableau import Row, Tableau

__all__ = ["ZERO", "Rounded", "carried", "digits_of", "scaled", "stated_digits", "values"]

Rounded: TypeAlias = tuple[Exact, Fraction]
"""A number and how far it may be from the one that was meant."""

ZERO: Rounded = (Exact(0), Fraction(0))


def carried(row: Row, units: Sequence[Fraction]) -> list[Rounded]:
    """Return each number with its half unit."""
    return list(zip(row, units, strict=True))


def scaled(row: Iterable[Rounded], factor: Fraction) -> list[Rounded]:
    """Return a row times a factor, roundings and all."""
    return [(x * factor, unit * abs(factor)) for x, unit in row]


def values(row: Iterable[Rounded]) -> list[Exact]:
    """Return the numbers alone."""
    return [x for x, _ in row]


def digits_of(method: Tableau, arrays: Mapping[str, Sequence[Rounded]]) -> dict[str, Trust]:
    """Return what a tableau has to state as its digits, for rows by key such as `nodes` or `matrix[3]`.

    Raises:
        BadRequest: so few digits of `method` are trusted that none is left.
    """
    found: dict[str, Trust] = {}
    for key, row in arrays.items():
        found |= stated_digits(method, key, row)
    return found


def stated_digits(method: Tableau, key: str, row: Sequence[Rounded]) -> dict[str, int]:
    """Return the most digits of each rounded entry whose half unit still covers its rounding."""
    stated = {}
    for i, (x, unit) in enumerate(row, 1):
        if not unit or not x:
            continue
        digits = decimal_exponent(x) - decimal_exponent(Exact(2 * unit)) + 1
        while Fraction(10) ** (decimal_exponent(x) - digits + 1) < 2 * unit:
            digits -= 1
        if digits < 1:
            raise BadRequest(
                f"{method.slug}: too few of its digits are trusted to make another method from it",
                argument="method",
            )
        stated[f"{key}[{i}]"] = digits
    return stated
