"""Exact numbers a + b*sqrt(d) read from texts: code of its own, which never imports newel.

Parts are integers or Fractions; arithmetic between two roots of different d is an error.
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from math import gcd, isqrt, lcm
from typing import Any, TypeAlias

from tests.independent.tree_formulas import TOKEN

Number: TypeAlias = "Fraction | Quadratic"


@dataclass(frozen=True)
class Quadratic:
    """a + b*sqrt(d), with d square-free and above 1."""

    a: Any
    b: Any
    d: int

    def of(self, other: Any) -> Quadratic:
        if not isinstance(other, Quadratic):
            return Quadratic(other, 0, self.d)
        if other.d != self.d:
            raise ValueError(f"sqrt({self.d}) and sqrt({other.d}) in one sum or product")
        return other

    def __add__(self, other: Any) -> Quadratic:
        other = self.of(other)
        return Quadratic(self.a + other.a, self.b + other.b, self.d)

    def __mul__(self, other: Any) -> Quadratic:
        if not isinstance(other, Quadratic):
            return Quadratic(self.a * other, self.b * other, self.d)
        other = self.of(other)
        return Quadratic(
            self.a * other.a + self.d * self.b * other.b, self.a * other.b + self.b * other.a, self.d
        )

    def __neg__(self) -> Quadratic:
        return self * -1

    def __sub__(self, other: Any) -> Quadratic:
        return self + other * -1

    def __rsub__(self, other: Any) -> Quadratic:
        return -self + other

    def __truediv__(self, other: Any) -> Quadratic:
        if isinstance(other, Quadratic):
            other = self.of(other)
            norm = other.a**2 - other.d * other.b**2
            return self * Quadratic(Fraction(other.a) / norm, -Fraction(other.b) / norm, self.d)
        return Quadratic(Fraction(self.a) / other, Fraction(self.b) / other, self.d)

    def __rtruediv__(self, other: Any) -> Quadratic:
        return self.of(other) / self

    __radd__, __rmul__ = __add__, __mul__

    def __float__(self) -> float:
        # With 400 bits behind the point, for the two parts may cancel all but their last digits.
        below, bits = denominator(self), 400
        parts = scaled(self, below)
        size = isqrt(parts.b**2 * self.d << 2 * bits)
        return float(Fraction((parts.a << bits) + (size if parts.b > 0 else -size), below << bits))

    @property
    def zero(self) -> bool:
        return not self.a and not self.b


def is_zero(number: Any) -> bool:
    """Whether a number is exactly zero."""
    return number.zero if isinstance(number, Quadratic) else not number


def root(radicand: int) -> Number:
    """sqrt(radicand), the squares taken out."""
    outside = max(n for n in range(1, isqrt(radicand) + 1) if radicand % (n * n) == 0)
    inside = radicand // outside**2
    return Fraction(outside) if inside == 1 else Quadratic(Fraction(0), Fraction(outside), inside)


def denominator(number: Number) -> int:
    """The least n for which n*number has integer parts."""
    if isinstance(number, Quadratic):
        return lcm(Fraction(number.a).denominator, Fraction(number.b).denominator)
    return number.denominator


def scaled(number: Number, scale: int) -> Any:
    """scale*number with integer parts; scale is a multiple of the denominator."""
    if isinstance(number, Quadratic):
        return Quadratic(int(number.a * scale), int(number.b * scale), number.d)
    return int(number * scale)


def written(number: Number, decimal: bool = False) -> str:
    """A text of the number that reads back the same; a decimal point where that is asked for and possible."""
    if isinstance(number, Quadratic):
        below = denominator(number)
        parts = scaled(number, below)
        return f"({parts.a}{parts.b:+d}*sqrt({parts.d}))/{below}"
    if not decimal:
        return str(number)
    below, places = number.denominator, 0
    while below // gcd(below, 10**places) != 1:
        places += 1
        if places > 400:
            return str(number)
    digits = str(abs(int(number * 10**places))).rjust(places + 1, "0")
    sign = "-" if number < 0 else ""
    return f"{sign}{digits[: len(digits) - places]}.{digits[len(digits) - places :] or '0'}"


class _Reader:
    """Recursive descent over the tokens of one text."""

    def __init__(self, text: str) -> None:
        self.text, self.tokens = text, TOKEN.findall(text.replace("−", "-"))

    def take(self, *allowed: str) -> str | None:
        return self.tokens.pop(0) if self.tokens and self.tokens[0] in allowed else None

    def sum(self) -> Number:
        value = self.product()
        while sign := self.take("+", "-"):
            value = value + self.product() if sign == "+" else value - self.product()
        return value

    def product(self) -> Number:
        value = self.signed()
        while sign := self.take("*", "/"):
            value = value * self.signed() if sign == "*" else value / self.signed()
        return value

    def signed(self) -> Number:
        if sign := self.take("+", "-"):
            return self.signed() if sign == "+" else -self.signed()
        value = self.atom()
        if not self.take("^", "**"):
            return value
        power: Number = Fraction(1)
        for _ in range(int(float(self.signed()))):
            power = power * value
        return power

    def atom(self) -> Number:
        if self.take("sqrt"):
            return root(int(float(self.atom())))
        if self.take("("):
            value = self.sum()
            if not self.take(")"):
                raise ValueError(f"unclosed parenthesis in {self.text!r}")
            return value
        return Fraction(self.tokens.pop(0))


def read(text: str | int) -> Number:
    """The number that a text such as "35/384", "0.1" or "(5 - sqrt(5))/10" stands for, exactly."""
    reader = _Reader(str(text))
    value = reader.sum()
    if reader.tokens:
        raise ValueError(f"cannot read {text!r} from {reader.tokens[0]!r} on")
    return value.a if isinstance(value, Quadratic) and not value.b else value
