"""Coefficients as the numbers of another language: exact, or rounded to so many significant digits."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator
from fractions import Fraction
from math import lcm
from typing import Any

import attrs

from newel.errors import BadRequest
from newel.methods.digits import decimal_exponent
from newel.methods.exact import Exact
from newel.methods.tableau import Tableau

__all__ = ["MOST_DIGITS", "Numerals", "check_digits", "plain_decimal", "radicands", "rounded_decimal"]

MOST_DIGITS = 100
"""No more digits than this can be asked for: beyond any arithmetic that a step is run in."""

_LARGEST_FLOAT_DIGITS = 300
_PLAIN_DECIMAL = re.compile(r"[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?")


def check_digits(digits: int | None) -> None:
    """Raise BadRequest unless `digits` is None or a whole number from 1 to MOST_DIGITS."""
    if digits is None or (
        isinstance(digits, int) and not isinstance(digits, bool) and 1 <= digits <= MOST_DIGITS
    ):
        return
    raise BadRequest(
        f"digits={digits!r}: no number of significant digits from 1 to {MOST_DIGITS}\n"
        "  Leave it out for exact numbers; 17 give the nearest double.",
        argument="digits",
    )


def rounded_decimal(value: Exact, digits: int) -> str:
    """Return a number to so many significant digits, correctly rounded, halves to even.

    Zeros at the end are left out; zero itself is `0.0`.

    >>> rounded_decimal(Exact.of("2/3"), 5), rounded_decimal(Exact.of("-sqrt(2)/1000000"), 3)
    ('0.66667', '-1.41e-6')
    """
    if not value:
        return "0.0"
    exponent = decimal_exponent(value)
    scale = digits - 1 - exponent
    whole = _nearest(abs(value) * (Fraction(10) ** scale))
    if whole == 10**digits:
        whole, exponent = whole // 10, exponent + 1
    return ("-" if value < 0 else "") + _placed(str(whole).rstrip("0"), exponent)


def _nearest(value: Exact) -> int:
    """Return the nearest integer; a surd never lies halfway."""
    if not value.surd:
        return round(value.rational)
    return value.scaled_floor(0) + (value - value.scaled_floor(0) > Fraction(1, 2))


def _placed(figures: str, exponent: int) -> str:
    if -5 <= exponent < 0:
        return "0." + "0" * (-exponent - 1) + figures
    if 0 <= exponent < 16:
        figures = figures.ljust(exponent + 1, "0")
        return f"{figures[: exponent + 1]}.{figures[exponent + 1 :] or '0'}"
    return f"{figures[0]}.{figures[1:] or '0'}e{exponent}"


def plain_decimal(value: Exact) -> str | None:
    """Return the text of a number that was printed as a plain decimal, with the point in it, else None.

    >>> plain_decimal(Exact.of("−.5")), plain_decimal(Exact.of("1/2"))
    ('-0.5', None)
    """
    text = str(value).replace("−", "-").replace(" ", "").removeprefix("+")
    if value.form != "decimal" or not _PLAIN_DECIMAL.fullmatch(text):
        return None
    mantissa, mark, power = text.lower().partition("e")
    sign, mantissa = ("-", mantissa[1:]) if mantissa.startswith("-") else ("", mantissa)
    before, _, after = mantissa.partition(".")
    return f"{sign}{before or '0'}.{after or '0'}{mark}{power}"


def radicands(tableau: Tableau) -> list[int]:
    """Return the d of every √d that the numbers of a tableau hold, in increasing order."""
    return sorted({x.radicand for _, x in _entries(tableau)} - {1})


def _entries(tableau: Tableau) -> Iterator[tuple[str, Exact]]:
    rows = {"nodes": tableau.nodes, "weights": tableau.weights, "embedded": tableau.embedded_weights}
    for name, row in rows.items():
        yield from ((f"{name}[{i}]", x) for i, x in enumerate(row or (), 1))
    for name, table in {"matrix": tableau.matrix, "continuous": tableau.continuous_weights}.items():
        for i, row in enumerate(table or (), 1):
            yield from ((f"{name}[{i}][{j}]", x) for j, x in enumerate(row, 1))


@attrs.frozen
class Numerals:
    """How one language writes numbers of floating point.

    Args:
        integer: makes the literal of an integer that is part of an expression, such as `35.0`.
        decimal: makes the literal of a decimal, given with its point.
        root: makes the text of √d.
        digits: significant digits; None for exact numbers.
    """

    integer: Callable[[int], str]
    decimal: Callable[[str], str]
    root: Callable[[int], str]
    digits: int | None = None

    def text(self, value: Exact) -> str:
        """Return the text of one number: `35.0/384.0`, or a decimal where digits are asked for.

        >>> Numerals(lambda n: f"{n}.0", str, lambda d: f"sqrt({d})").text(Exact.of("(5 - sqrt(5))/10"))
        '(5.0 - sqrt(5))/10.0'
        """
        if self.digits is not None:
            whole = not value.surd and value.rational.denominator == 1 and abs(value) < 10**15
            return (
                self.integer(int(value.rational))
                if whole
                else self.decimal(rounded_decimal(value, self.digits))
            )
        printed = plain_decimal(value)
        return self._exact(value) if printed is None else self.decimal(printed)

    def _exact(self, value: Exact) -> str:
        below = lcm(value.rational.denominator, value.surd.denominator)
        above, factor = int(value.rational * below), int(value.surd * below)
        over = "" if below == 1 else f"/{self.integer(below)}"
        if not factor:
            return self.integer(above) + over
        root = self.root(value.radicand)
        root = root if abs(factor) == 1 else f"{self.integer(abs(factor))}*{root}"
        if not above:
            return ("-" if factor < 0 else "") + root + over
        whole = f"{self.integer(above)} {'-' if factor < 0 else '+'} {root}"
        return f"({whole}){over}" if over else whole

    def check(self, tableau: Tableau) -> None:
        """Raise BadRequest for a number whose numerator or denominator overflows floating point."""
        if self.digits is not None:
            return
        for place, x in _entries(tableau):
            parts: tuple[Any, ...] = (x.rational.numerator, x.rational.denominator)
            parts += (x.surd.numerator, x.surd.denominator)
            longest = max(len(str(abs(part))) for part in parts)
            if longest > _LARGEST_FLOAT_DIGITS:
                raise BadRequest(
                    f"{place} of {tableau.slug} holds an integer of {longest} digits: no double holds it\n"
                    "  Give a number of digits: digits=17 (--digits 17).",
                    argument="digits",
                )
