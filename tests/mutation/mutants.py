"""Moves carried out: the texts of the changed entries."""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass
from decimal import ROUND_CEILING, Context, Decimal
from fractions import Fraction
from functools import cached_property
from math import inf, isfinite

from tests.independent.documents import Document, Place
from tests.independent.judging import Visibility
from tests.independent.quadratic import Number, Quadratic, denominator, is_zero, read, written
from tests.mutation.moves import COMPENSATED, HALF_UNIT, Move

UNSEEN_UNITS = 1000
"""Units by which is changed what no bound sees."""
TINY = 1e-30
THREE_DIGITS = Context(prec=3, rounding=ROUND_CEILING)


@dataclass(frozen=True)
class Mutant:
    """A changed tableau.

    `units` is the least change that shows, in units of the last trusted digit of the entries touched; 0 where
    all of them are exact.
    """

    move: Move
    texts: dict[Place, str]
    document: Document
    units: float = 0.0

    def __str__(self) -> str:
        return "; ".join(f"{place} = {text}" for place, text in self.texts.items())


class Workshop:
    """Carries out the moves on one tableau."""

    def __init__(self, document: Document) -> None:
        self.document = document

    @cached_property
    def visibility(self) -> Visibility:
        return Visibility(self.document)

    def mutant(self, move: Move) -> Mutant | None:
        """The changed tableau, or None where the move leads nowhere (no digits to swap, say)."""
        place, sign = move.direction[0]
        if "swapped" in move.way:
            text = self._swapped(move, place)
            return self._made(move, {place: text}) if text else None
        if move.way == "twice the least that shows" or len(move.direction) > 1:
            size, units = self._size(move)
            return self._made(move, self._added(move, size), units)
        if move.kind == HALF_UNIT:
            return self._made(move, self._added(move, self.document.half_units[place]))
        return self._made(move, {place: self._altered(move.way, place, sign)})

    def _made(self, move: Move, texts: dict[Place, str], units: float = 0.0) -> Mutant:
        return Mutant(move, texts, self.document.changed(texts), units)

    def _added(self, move: Move, size: Number) -> dict[Place, str]:
        values, texts = self.document.values, self.document.texts
        return {
            place: written(values[place] + size * sign, "." in texts[place]) for place, sign in move.direction
        }

    def _altered(self, way: str, place: Place, sign: int) -> str:
        text, value = self.document.texts[place], self.document.values[place]
        if way == "sign":
            return written(-value, "." in text)
        if isinstance(value, Quadratic):
            if way == "sign of the root":
                return written(Quadratic(value.a, -value.b, value.d))
            if way == "factor of the root by one":
                return written(value + Quadratic(0, Fraction(sign, denominator(value)), value.d))
        return written(value + sign * self._one_in_the_numerator(place))

    def _one_in_the_numerator(self, place: Place) -> Fraction:
        """One in the numerator as printed; of a decimal, one in its last printed digit."""
        text = self.document.texts[place]
        if fraction := re.fullmatch(r"-?\d+/(\d+)", text):
            return Fraction(1, int(fraction[1]))
        return Fraction(1, denominator(self.document.values[place]))

    def _size(self, move: Move) -> tuple[Number, float]:
        """The size of a change, and the least that shows in units of the last trusted digit."""
        places = [place for place, _ in move.direction]
        if not self.document.rounded:
            printed = [place for place in places if not is_zero(self.document.values[place])]
            return self._one_in_the_numerator((printed or places)[0]), 0.0
        direction = dict(move.direction)
        least = self.visibility.least(direction, trees_only=move.kind == COMPENSATED)
        unit = 2 * float(max(self.document.half_units[place] for place in places))
        # Among exact entries the least is 0: whatever changes them shows.
        size = 2 * least or TINY if isfinite(least) else UNSEEN_UNITS * (unit or 1e-12)
        return Fraction(THREE_DIGITS.create_decimal(Decimal(size))), least / unit if unit else 0.0

    def _swapped(self, move: Move, place: Place) -> str | None:
        """The text with two neighbouring digits swapped: the change is the least that shows, or drawn."""
        value = float(self.document.values[place])
        least = self.visibility.least({place: 1}) if self.document.half_units[place] else 0.0
        sizes: dict[str, float] = {}
        for text in _swaps(self.document.texts[place]):
            size = abs(float(read(text)) - value)
            if size and 2 * least <= size < inf:
                sizes[text] = size
        if not sizes:
            return None
        ordered = sorted(sizes, key=sizes.__getitem__)
        return ordered[0] if move.way.endswith("least") else ordered[move.draw % len(ordered)]


def _swaps(text: str) -> Iterator[str]:
    for place in range(len(text) - 1):
        first, second = text[place], text[place + 1]
        if first.isdigit() and second.isdigit() and first != second:
            swapped = text[:place] + second + first + text[place + 2 :]
            try:
                read(swapped)
            except ZeroDivisionError:
                continue
            yield swapped
