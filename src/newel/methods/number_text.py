"""The small parser for numbers in text: decimals, fractions and roots, with nothing evaluated as code.

Texts come from files that anybody may have written, so that the length of the text, the depth of its
parentheses, its powers, and the size of every number on the way are bounded. The parser knows the numbers
only through their operators; `newel.methods.exact` hands it the maker of them.
"""

from __future__ import annotations

import unicodedata
from fractions import Fraction
from typing import TYPE_CHECKING, Any, Protocol, Self

from newel.errors import BadNumber

if TYPE_CHECKING:
    from collections.abc import Callable

__all__ = ["HIGHEST_POWER", "LARGEST_RADICAND", "LONGEST_TEXT", "MOST_DIGITS", "Quadratic", "read_number"]

LONGEST_TEXT = 4096
MOST_DIGITS = 1024
MOST_BITS = 3402
DEEPEST = 30
HIGHEST_POWER = 64
LARGEST_EXPONENT = 1000
LARGEST_RADICAND = 10**12


class Quadratic(Protocol):
    """A number rational + surd·√radicand with exact operators."""

    @property
    def rational(self) -> Fraction:
        """The rational part."""

    @property
    def surd(self) -> Fraction:
        """The factor of the root."""

    def __add__(self, other: Any) -> Self: ...
    def __sub__(self, other: Any) -> Self: ...
    def __mul__(self, other: Any) -> Self: ...
    def __truediv__(self, other: Any) -> Self: ...
    def __pow__(self, power: int) -> Self: ...
    def __neg__(self) -> Self: ...


def read_number(text: str, make: Callable[[Fraction, Fraction, int], Any]) -> Any:
    """Read a number from `text`; `make(rational, surd, radicand)` makes each number on the way.

    Raises:
        BadNumber: the text is no number, or is beyond the limits; it tells the column, counted from 1.

    >>> from newel.methods.exact import Exact
    >>> read_number("3/4 - sqrt(5)", Exact)
    Exact.of('(3 - 4*sqrt(5))/4')
    """
    if not isinstance(text, str):
        raise BadNumber(repr(text), f"a {type(text).__name__} is no text")
    if len(text) > LONGEST_TEXT:
        raise BadNumber(text[:60], f"{len(text)} characters; a number has at most {LONGEST_TEXT}")
    return _Parser(text, make).parse()


class _Parser:
    """Recursive descent over sum, product, signed, power and atom; every result is held to MOST_BITS."""

    def __init__(self, text: str, make: Callable[[Fraction, Fraction, int], Any]) -> None:
        self.text, self.make = text, make
        self.plain = text.replace("−", "-").replace("⁄", "/")
        self.at, self.depth = 0, 0

    def parse(self) -> Quadratic:
        for column, character in enumerate(self.plain):
            if character not in "0123456789.+-*/^() eEsqrt":
                raise self._odd(character, column)
        if not self.plain.strip():
            raise BadNumber(self.text, "an empty text; write a number such as 1/3 or 0.25")
        value = self._sum()
        if self.at < len(self.plain):
            digit = self.plain[self.at] in "0123456789."
            raise self._refused(
                f"unexpected {self.plain[self.at]!r}",
                "write the digits without spaces" if digit else "write an operator between two numbers",
            )
        return value

    def _sum(self) -> Quadratic:
        value = self._product()
        while (sign := self._next()) in ("+", "-"):
            column = self._take(1)
            other = self._product()
            value = self._bounded(column, lambda a, b: a + b if sign == "+" else a - b, value, other)
        return value

    def _product(self) -> Quadratic:
        value = self._signed()
        while (sign := self._next()) in ("*", "/"):
            column = self._take(1)
            other = self._signed()
            if sign == "/" and not _nonzero(other):
                raise self._refused("division by zero", "a denominator is never zero", column)
            value = self._bounded(column, lambda a, b: a * b if sign == "*" else a / b, value, other)
        return value

    def _signed(self) -> Quadratic:
        negative = False
        while (sign := self._next()) in ("+", "-"):
            negative ^= sign == "-"
            self._take(1)
        value = self._power()
        return -value if negative else value

    def _power(self) -> Quadratic:
        value = self._atom()
        if self._next() != "^" and not self.plain.startswith("**", self.at):
            return value
        column = self._take(1 if self._next() == "^" else 2)
        self._deeper()
        power = self._signed()
        self.depth -= 1
        if power.surd or power.rational.denominator != 1 or abs(power.rational) > HIGHEST_POWER:
            raise self._refused(
                "a power", f"powers are integers from -{HIGHEST_POWER} to {HIGHEST_POWER}", column
            )
        if not _nonzero(value) and power.rational < 0:
            raise self._refused("division by zero", "zero has no negative power", column)
        if _bits(value) * abs(int(power.rational)) > 2 * MOST_BITS:
            raise self._refused("a number too large", f"numbers have at most {MOST_DIGITS} digits", column)
        return self._bounded(column, lambda a, b: a ** int(b.rational), value, power)

    def _atom(self) -> Quadratic:
        character = self._next()
        if character == "(":
            self._take(1)
            return self._closed()
        if self.plain.startswith("sqrt", self.at):
            column = self._take(4)
            if self._next() != "(":
                raise self._refused("sqrt without parentheses", "write sqrt(5)", column)
            self._take(1)
            return self._root(self._closed(), column)
        if character and character in "0123456789.":
            return self._number()
        if not character:
            raise self._refused("the number ends", "something is missing after the last sign")
        raise self._refused(f"unexpected {character!r}", "a number, sqrt(…) or ( belongs here")

    def _closed(self) -> Quadratic:
        self._deeper()
        value = self._sum()
        if self._next() != ")":
            raise self._refused(
                "a parenthesis is left open" if not self._next() else f"unexpected {self._next()!r}",
                "close each ( with a )",
            )
        self._take(1)
        self.depth -= 1
        return value

    def _root(self, value: Quadratic, column: int) -> Quadratic:
        if value.surd:
            raise self._refused("a root of a root", "only numbers a + b*sqrt(d) are allowed", column)
        radicand = value.rational.numerator * value.rational.denominator
        if not 0 <= radicand <= LARGEST_RADICAND:
            raise self._refused(
                "sqrt of a number out of range",
                f"what stands under it lies between 0 and {LARGEST_RADICAND}",
                column,
            )
        return (
            self.make(Fraction(0), Fraction(1, value.rational.denominator), radicand) if radicand else value
        )

    def _number(self) -> Quadratic:
        column = self.at
        whole = self._digits()
        part = ""
        if self.plain.startswith(".", self.at):
            self.at += 1
            part = self._digits()
        if not whole + part:
            raise self._refused("a point without digits", "write 0.5", column)
        exponent = 0
        if self.plain[self.at : self.at + 1] in ("e", "E"):
            exponent = self._exponent()
        if self.plain[self.at : self.at + 1] == ".":
            raise self._refused("a second decimal point", "write one point in a number")
        if len(whole + part) > MOST_DIGITS:
            raise self._refused(f"{len(whole + part)} digits", f"a number has at most {MOST_DIGITS}", column)
        power = exponent - len(part)
        value = int(whole + part)
        number = Fraction(value * 10 ** max(power, 0), 10 ** max(-power, 0))
        return self._bounded(column, lambda a, b: a, self.make(number, Fraction(0), 1), None)

    def _exponent(self) -> int:
        column = self.at
        self.at += 1
        sign = self.plain[self.at] if self.plain[self.at : self.at + 1] in ("+", "-") else ""
        self.at += len(sign)
        digits = self._digits()
        if not digits:
            raise self._refused("an exponent without digits", "write 2.5e-3", column)
        if len(digits) > 6 or int(digits) > LARGEST_EXPONENT:
            raise self._refused(
                "an exponent too large",
                f"exponents reach from -{LARGEST_EXPONENT} to {LARGEST_EXPONENT}",
                column,
            )
        return int(sign + digits)

    def _digits(self) -> str:
        start = self.at
        while self.at < len(self.plain) and self.plain[self.at] in "0123456789":
            self.at += 1
        return self.plain[start : self.at]

    def _next(self) -> str:
        while self.plain[self.at : self.at + 1] == " ":
            self.at += 1
        return self.plain[self.at : self.at + 1]

    def _take(self, length: int) -> int:
        self.at += length
        return self.at - length

    def _deeper(self) -> None:
        self.depth += 1
        if self.depth > DEEPEST:
            raise self._refused("nested too deeply", f"at most {DEEPEST} levels are read")

    def _bounded(self, column: int, operation: Callable[[Any, Any], Any], a: Any, b: Any) -> Quadratic:
        try:
            value: Quadratic = operation(a, b)
        except BadNumber as error:
            raise self._refused("two square roots", error.reason, column) from None
        if _bits(value) > MOST_BITS:
            raise self._refused("a number too large", f"numbers have at most {MOST_DIGITS} digits", column)
        return value

    def _refused(self, what: str, remedy: str, column: int | None = None) -> BadNumber:
        place = (self.at if column is None else column) + 1
        error = BadNumber(self.text, f"{what} at column {place}; {remedy}")
        error.column = place
        return error

    def _odd(self, character: str, column: int) -> BadNumber:
        name = unicodedata.name(character, f"the character U+{ord(character):04X}")
        kind = unicodedata.category(character)
        if character == ",":
            return self._refused(
                "a decimal comma", "write a point, as in 0.5, and nothing between thousands", column
            )
        if kind in ("Zs", "Cf", "Cc"):
            return self._refused(name, "write the digits without spaces", column)
        if kind == "Nd":
            return self._refused(name, "write the plain digits 0 to 9", column)
        if character.isascii():
            name = repr(character)
        return self._refused(name, "allowed are digits . + - * / ^ ( ) and sqrt(n)", column)


def _bits(value: Quadratic) -> int:
    parts = (
        value.rational.numerator,
        value.rational.denominator,
        value.surd.numerator,
        value.surd.denominator,
    )
    return max(part.bit_length() for part in parts)


def _nonzero(value: Quadratic) -> bool:
    return bool(value.rational or value.surd)
