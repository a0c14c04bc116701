"""Exact numbers of the form a + b·√d.

Coefficients of published methods are integers, fractions, decimals, or numbers of a quadratic field such as
(5 − √5)/10. All of them are held here without rounding, together with the text they were printed as.
"""

from __future__ import annotations

from fractions import Fraction
from math import isqrt, lcm
from typing import Any, Literal, TypeAlias

import attrs

from newel.errors import BadNumber
from newel.methods.number_text import LARGEST_RADICAND, MOST_DIGITS, read_number

__all__ = ["Exact", "ExactLike", "parse_exact"]

Form = Literal["integer", "fraction", "decimal", "surd"]


@attrs.frozen(init=False, eq=False, repr=False)
class Exact:
    """The number rational + surd·√radicand (unitless), held exactly; immutable and hashable.

    The radicand is kept square-free: `Exact(0, 1, 8)` is 2·√2 and `Exact(1, 1, 4)` is 3. `+ - * / **`, the
    comparisons and `==` are exact, with `int` and `Fraction` on either side; `float()` is correctly rounded.

    Args:
        rational: the rational part, an int or a Fraction.
        surd: the factor of the square root.
        radicand: what stands under the root, an integer from 1 to 10¹².
        text: how the number was printed; it takes no part in `==` and `hash`.

    Raises:
        BadNumber: the radicand is out of range, or `text` reads as another number; also when one operation
            mixes the roots of two different radicands.

    >>> x = Exact.of("(5 - sqrt(5))/10")
    >>> x * 10 - 5
    Exact.of('-sqrt(5)')
    >>> float(x), x.form
    (0.276393202250021, 'surd')
    """

    rational: Fraction
    surd: Fraction
    radicand: int
    text: str | None

    def __init__(
        self, rational: Fraction | int, surd: Fraction | int = 0, radicand: int = 1, text: str | None = None
    ) -> None:
        if surd:
            rational, surd, radicand = _normalised(Fraction(rational), Fraction(surd), radicand)
        else:
            radicand = 1
        self.__attrs_init__(Fraction(rational), Fraction(surd), radicand, text)
        if text is not None and parse_exact(text) != self:
            raise BadNumber(text, f"this text is not the number {self.canonical}")

    @classmethod
    def of(cls, value: ExactLike) -> Exact:
        """Return `value` as an exact number.

        Args:
            value: an Exact (returned as it is), an int, a Fraction, a text for `parse_exact`, or a float,
                which becomes the decimal that Python prints for it: 0.1 is one tenth.

        Raises:
            BadNumber: the text is not a number, the float is not finite, or the type is another.

        >>> Exact.of(0.1) == Exact.of("1/10")
        True
        """
        if isinstance(value, Exact):
            return value
        if isinstance(value, str):
            return parse_exact(value)
        if isinstance(value, (int, Fraction)) and not isinstance(value, bool):
            return cls(Fraction(value))
        if isinstance(value, float):
            return parse_exact(repr(float(value)))
        if hasattr(value, "__index__") and not isinstance(value, bool):
            return cls(Fraction(value.__index__()))
        raise BadNumber(
            repr(value), f"a {type(value).__name__} is no exact number; give an int, a Fraction or a text"
        )

    @classmethod
    def of_decimal(cls, digits: int, places: int) -> Exact:
        """Return digits·10^−places with the text of that decimal, which is not read again.

        >>> Exact.of_decimal(-125, 2), Exact.of_decimal(5, 3)
        (Exact.of('-1.25'), Exact.of('0.005'))
        """
        padded = str(abs(digits)).rjust(places + 1, "0")
        text = f"{'-' if digits < 0 else ''}{padded[: len(padded) - places]}.{padded[len(padded) - places :]}"
        made = cls.__new__(cls)
        made.__attrs_init__(Fraction(digits, 10**places), _ZERO, 1, text)
        return made

    @property
    def form(self) -> Form:
        """How the number was printed: "decimal" where its text holds a decimal point or an exponent."""
        if self.text is not None and ("." in self.text or "e" in self.text.lower()):
            return "decimal"
        if self.surd:
            return "surd"
        if self.rational.denominator != 1 or (
            self.text is not None and ("/" in self.text or "⁄" in self.text)
        ):
            return "fraction"
        return "integer"

    @property
    def canonical(self) -> str:
        """The one text that equal numbers share: `-3/4`, `2*sqrt(5)/7`, `(5 - sqrt(5))/10`."""
        if not self.surd:
            return str(self.rational)
        below = lcm(self.rational.denominator, self.surd.denominator)
        above, factor = int(self.rational * below), int(self.surd * below)
        root = f"sqrt({self.radicand})" if abs(factor) == 1 else f"{abs(factor)}*sqrt({self.radicand})"
        sign = "-" if factor < 0 else ""
        if above:
            whole = f"{above} {sign or '+'} {root}"
            return whole if below == 1 else f"({whole})/{below}"
        return sign + root + ("" if below == 1 else f"/{below}")

    def scaled_floor(self, bits: int) -> int:
        """Return ⌊value·2^bits⌋, exactly. `bits` is a non-negative integer.

        >>> Exact.of("sqrt(2)").scaled_floor(8)      # 362.03…
        362
        """
        if not self.surd:
            return (self.rational.numerator << bits) // self.rational.denominator
        below = lcm(self.rational.denominator, self.surd.denominator)
        above, factor = int(self.rational * below) << bits, int(self.surd * below)
        root = isqrt((factor * factor * self.radicand) << (2 * bits))
        return (above + (root if factor > 0 else -root - 1)) // below

    def __str__(self) -> str:
        return self.canonical if self.text is None else self.text

    def __repr__(self) -> str:
        return f"Exact.of({str(self)!r})"

    def __hash__(self) -> int:
        return hash((self.rational, self.surd, self.radicand)) if self.surd else hash(self.rational)

    def __bool__(self) -> bool:
        return bool(self.rational) or bool(self.surd)

    def __float__(self) -> float:
        """Return the nearest float64, ties to even; OverflowError beyond its range."""
        if not self.surd:
            return float(self.rational)
        # An irrational number never lies on a float or halfway between two, so that one half behind 64 exact
        # bits rounds to the same side as the number itself.
        bits = 128
        while abs(floor := self.scaled_floor(bits)) >> 64 == 0:
            bits *= 2
        return float(Fraction(2 * floor + 1, 1 << (bits + 1)))

    def __neg__(self) -> Exact:
        return _made(-self.rational, -self.surd, self.radicand)

    def __pos__(self) -> Exact:
        return self

    def __abs__(self) -> Exact:
        return -self if self._sign() < 0 else self

    def __add__(self, other: Any) -> Exact:
        if (y := _coerced(other)) is None:
            return NotImplemented
        return _made(self.rational + y.rational, self.surd + y.surd, _shared_radicand(self, y))

    def __sub__(self, other: Any) -> Exact:
        if (y := _coerced(other)) is None:
            return NotImplemented
        return _made(self.rational - y.rational, self.surd - y.surd, _shared_radicand(self, y))

    def __mul__(self, other: Any) -> Exact:
        if (y := _coerced(other)) is None:
            return NotImplemented
        d = _shared_radicand(self, y)
        return _made(
            self.rational * y.rational + d * self.surd * y.surd,
            self.rational * y.surd + self.surd * y.rational,
            d,
        )

    def __truediv__(self, other: Any) -> Exact:
        if (y := _coerced(other)) is None:
            return NotImplemented
        if not y:
            raise ZeroDivisionError(f"{self} / 0")
        # The conjugate: (a + b√d)(a − b√d) = a² − d·b², which is zero for zero alone as √d is irrational.
        d = _shared_radicand(self, y)
        norm = y.rational * y.rational - d * y.surd * y.surd
        return self * _made(y.rational / norm, -y.surd / norm, y.radicand)

    def __pow__(self, power: int) -> Exact:
        if isinstance(power, bool) or not isinstance(power, int):
            return NotImplemented
        if abs(power) > MOST_DIGITS:
            raise BadNumber(f"{self} ** {power}", f"the power {power} is beyond ±{MOST_DIGITS}")
        base, result = (self if power >= 0 else ONE / self), ONE
        for _ in range(abs(power)):
            result = result * base
        return result

    def __radd__(self, other: Any) -> Exact:
        return NotImplemented if (x := _coerced(other)) is None else x + self

    def __rsub__(self, other: Any) -> Exact:
        return NotImplemented if (x := _coerced(other)) is None else x - self

    def __rmul__(self, other: Any) -> Exact:
        return NotImplemented if (x := _coerced(other)) is None else x * self

    def __rtruediv__(self, other: Any) -> Exact:
        return NotImplemented if (x := _coerced(other)) is None else x / self

    def __eq__(self, other: object) -> bool:
        if isinstance(other, Exact):
            return (self.rational, self.surd, self.radicand) == (other.rational, other.surd, other.radicand)
        if isinstance(other, (int, Fraction, float)):
            return not self.surd and self.rational == other
        return NotImplemented

    def __lt__(self, other: Any) -> bool:
        return NotImplemented if (y := _coerced(other)) is None else _compared(self, y) < 0

    def __le__(self, other: Any) -> bool:
        return NotImplemented if (y := _coerced(other)) is None else _compared(self, y) <= 0

    def __gt__(self, other: Any) -> bool:
        return NotImplemented if (y := _coerced(other)) is None else _compared(self, y) > 0

    def __ge__(self, other: Any) -> bool:
        return NotImplemented if (y := _coerced(other)) is None else _compared(self, y) >= 0

    def _sign(self) -> int:
        a, b = self.rational, self.surd
        rational_sign, surd_sign = (a > 0) - (a < 0), (b > 0) - (b < 0)
        if rational_sign * surd_sign >= 0:
            return rational_sign or surd_sign
        return rational_sign if a * a > b * b * self.radicand else surd_sign


ExactLike: TypeAlias = Exact | Fraction | int | float | str


def _made(rational: Fraction, surd: Fraction, radicand: int) -> Exact:
    """Build a result of arithmetic whose radicand is square-free already."""
    made = Exact.__new__(Exact)
    made.__attrs_init__(rational, surd, radicand if surd else 1, None)
    return made


def _coerced(value: Any) -> Exact | None:
    if isinstance(value, Exact):
        return value
    if isinstance(value, (int, Fraction)):
        return _made(Fraction(value), _ZERO, 1)
    return None


def _shared_radicand(x: Exact, y: Exact) -> int:
    if x.surd and y.surd and x.radicand != y.radicand:
        raise BadNumber(
            f"{x} and {y}",
            f"sqrt({x.radicand}) and sqrt({y.radicand}) in one operation; keep to one square root",
        )
    return x.radicand if x.surd else y.radicand


def _compared(x: Exact, y: Exact) -> int:
    if not (x.surd and y.surd) or x.radicand == y.radicand:
        return (x - y)._sign()
    # Numbers of two different quadratic fields are never equal, so that finer and finer floors part them.
    bits = 64
    while (a := x.scaled_floor(bits)) == (b := y.scaled_floor(bits)):
        bits *= 2
    return 1 if a > b else -1


def _normalised(rational: Fraction, surd: Fraction, radicand: int) -> tuple[Fraction, Fraction, int]:
    if not 1 <= radicand <= LARGEST_RADICAND:
        raise BadNumber(
            f"sqrt({radicand})", f"the radicand {radicand} is not between 1 and {LARGEST_RADICAND}"
        )
    square = 1
    rest, prime, free = radicand, 2, 1
    while prime * prime * prime <= rest:
        while rest % (prime * prime) == 0:
            rest //= prime * prime
            square *= prime
        if rest % prime == 0:
            rest //= prime
            free *= prime
        prime += 1
    # What is left has at most two prime factors: it is square-free or the square of a prime.
    if isqrt(rest) ** 2 == rest:
        square, rest = square * isqrt(rest), 1
    free *= rest
    surd = surd * square
    return (rational + surd, _ZERO, 1) if free == 1 else (rational, surd, free)


_ZERO = Fraction(0)
ONE = _made(Fraction(1), _ZERO, 1)


def parse_exact(text: str) -> Exact:
    """Read an exact number from a text.

    Integers, fractions, decimals (also `2.5e-3`), `sqrt(n)` of a non-negative rational, `+ - * /`, `^` or
    `**` with a small integer, parentheses, signs; − (U+2212) and ⁄ (U+2044) for `-` and `/`. A power binds
    closer than a sign: `-2^2` is −4.

    Raises:
        BadNumber: the text is none of these, divides by zero, mixes two square roots, or is beyond the
            limits on length, depth, digits and powers. It tells the column, counted from 1.

    >>> parse_exact("-(3 − 2*sqrt(6))/10").canonical
    '(-3 + 2*sqrt(6))/10'
    """
    value = read_number(text, Exact)
    made = Exact.__new__(Exact)
    made.__attrs_init__(value.rational, value.surd, value.radicand, text.strip(" "))
    return made
