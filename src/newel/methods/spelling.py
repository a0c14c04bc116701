"""How far two printed numbers are apart as texts, and the spelling of a number that is nearest to a text.

A misprint changes the text, not the value: 1/12 printed as 1/21 is one slip, and so is a lost sign, however
large the change of the number. The distance counts keystrokes; a sign, a fraction turned over and two
neighbouring characters swapped count one each (the edit distance of F. J. Damerau, Communications of the
ACM 7 (1964) 171–176, with the first two added).
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from fractions import Fraction
from math import floor

from newel.errors import BadNumber
from newel.methods.digits import decimal_exponent
from newel.methods.exact import Exact

__all__ = ["decimal_text", "nearest_spelling", "text_distance"]

LARGEST_SMALL_DENOMINATOR = 1000
MOST_FACTORS = 12
LONGEST_TYPED = 80
DIGITS = "0123456789/"
_ODD = re.compile(r"-?0\d|[^/]*/(0|1$)")
"""What nobody prints: 03, 1/03, 2/1."""


def text_distance(printed: str, repaired: str) -> int:
    """Return the number of slips that part two printed numbers; spaces and the two minus signs do not count.

    >>> text_distance("-11/45", "-11/54"), text_distance("1/6", "-1/6"), text_distance("3/2", "2/3")
    (1, 1, 1)
    """
    a, b = _plain(printed), _plain(repaired)
    if a == b:
        return 0
    if a.lstrip("-") == b.lstrip("-") or _turned_over(a) == b:
        return 1
    return _keystrokes(a, b)


def nearest_spelling(printed: str, value: Exact, slack: Fraction, digits: int | None) -> str:
    """Return a text of `value` that is as near to a printed one as can be.

    Args:
        printed: the text that stands there now.
        value: the number to be written.
        slack: how far the number may be from `value`; 0 where it is known exactly.
        digits: significant digits to write where it is not.
    """
    if not value:
        return "0"
    typed = printed if len(printed) <= LONGEST_TYPED else ""
    best: tuple[int, Fraction, bool, str] | None = None
    for rank, text in _one_slip(_plain(typed)):
        miss = _miss(text, value, slack)
        if miss is not None:
            found = (rank, miss, text != value.canonical, text)
            best = found if best is None else min(best, found)
    if best is not None:
        reduced = not slack and text_distance(printed, value.canonical) <= 2
        return value.canonical if reduced else best[3]
    texts = _fractions(_plain(typed), value, slack)
    if slack:
        texts = [*texts, decimal_text(value, digits or 17)]
    else:
        texts = [value.canonical, *texts]
    return min(texts, key=lambda text: (text_distance(printed, text), text != value.canonical, len(text)))


def decimal_text(value: Exact, digits: int) -> str:
    """Return a number as a decimal of so many significant digits, correctly rounded.

    >>> decimal_text(Exact.of("2/3"), 5), decimal_text(Exact.of("-sqrt(2)"), 3)
    ('0.66667', '-1.41')
    """
    if not value:
        return "0"
    places = max(1, digits - 1 - decimal_exponent(value))
    size = abs(value)
    shifted = size * 10**places + Fraction(1, 2)
    whole = str(floor(shifted.rational) if not shifted.surd else shifted.scaled_floor(0)).rjust(
        places + 1, "0"
    )
    return f"{'-' if value < 0 else ''}{whole[:-places]}.{whole[-places:]}"


def _plain(text: str) -> str:
    return text.replace(" ", "").replace("−", "-").replace("⁄", "/").removeprefix("+")


def _turned_over(text: str) -> str:
    sign = "-" if text.startswith("-") else ""
    above, _, below = text.removeprefix("-").partition("/")
    if not (above.isdigit() and (below.isdigit() or not below)):
        return text
    return sign + (f"{below or 1}/{above}" if above != "1" else below or "1")


def _one_slip(text: str) -> Iterator[tuple[int, str]]:
    """Yield the texts one slip away, by kind: sign, fraction turned over, neighbours swapped, keys."""
    if not text:
        return
    yield 0, text[1:] if text.startswith("-") else f"-{text}"
    if (turned := _turned_over(text)) != text:
        yield 1, turned
    for at in range(len(text) - 1):
        if text[at] != text[at + 1]:
            yield 2, text[:at] + text[at + 1] + text[at] + text[at + 2 :]
    # A point is offered only where there was one: an exact entry is never turned into a decimal.
    keys = f"{DIGITS}." if "." in text else DIGITS
    for at in range(len(text)):
        for key in "+-" if text[at] in "+-" else keys:
            if key != text[at]:
                yield 3, text[:at] + key + text[at + 1 :]
    for at in range(len(text) + 1):
        for key in keys:
            yield 4, text[:at] + key + text[at:]
    for at in range(len(text)):
        yield 5, text[:at] + text[at + 1 :]


def _miss(text: str, value: Exact, slack: Fraction) -> Fraction | None:
    """Return how far the number of a text is from a value, or None where that is more than the slack."""
    read = _read(text)
    if read is None or abs(_rough(read) - _rough(value)) > 1e-6 * (1 + _rough(abs(value))) + float(slack):
        return None
    if not slack:
        return Fraction(0) if read == value else None
    try:
        off = abs(read - value)
    except BadNumber:  # two different roots
        return None
    return Fraction(float(off)) if off <= slack else None


def _read(text: str) -> Exact | None:
    """Read a text; the slow parser only where there is a root."""
    try:
        if "s" in text or "(" in text:
            return Exact.of(text)
        above, stroke, below = text.partition("/")
        if _ODD.match(text):
            return None
        if stroke and not (above.lstrip("-").isdigit() and below.isdigit()):
            return None
        return Exact(Fraction(int(above), int(below)) if stroke else Fraction(above))
    except (BadNumber, ValueError, ZeroDivisionError):
        return None


def _rough(value: Exact) -> float:
    return float(value.rational) if not value.surd else float(value)


def _fractions(printed: str, value: Exact, slack: Fraction) -> list[str]:
    """Return fractions of this value that a page might show: reduced, or with a printed part kept."""
    if value.surd or not value:
        return []
    exact = value.rational
    if slack:
        exact = exact.limit_denominator(LARGEST_SMALL_DENOMINATOR)
        return [str(exact)] if abs(exact - value.rational) <= slack else []
    found = [str(exact)]
    above, below = exact.numerator, exact.denominator
    printed_above, _, printed_below = printed.removeprefix("-").partition("/")
    factors = set(range(2, MOST_FACTORS + 1))
    if printed_below.isdigit() and int(printed_below) % below == 0:
        factors.add(int(printed_below) // below)
    if above and printed_above.isdigit() and int(printed_above) % abs(above) == 0:
        factors.add(int(printed_above) // abs(above))
    return [*found, *(f"{above * k}/{below * k}" for k in sorted(factors) if k > 1)]


def _keystrokes(a: str, b: str) -> int:
    """Return the edit distance with swaps of neighbours, by the usual table, three rows of which are kept."""
    before: list[int] = []
    last: list[int] = []
    row = list(range(len(b) + 1))
    for i, x in enumerate(a, 1):
        before, last, row = last, row, [i]
        for j, y in enumerate(b, 1):
            cost = min(last[j] + 1, row[j - 1] + 1, last[j - 1] + (x != y))
            if i > 1 and j > 1 and x == b[j - 2] and a[i - 2] == y:
                cost = min(cost, before[j - 2] + 1)
            row.append(cost)
    return row[-1]
