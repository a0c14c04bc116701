"""The changes that are tried: which entries are touched, and in what way.

Three kinds. Single: the numerator up or down by one, the sign, two neighbouring digits swapped; where an
entry is rounded, twice the least change that shows, and half a unit, which must not show. Compensated: two or
four entries changed so that row sums and the sum of the weights stay, which only the trees can catch. The
same for embedded and for continuous weights.
"""

from __future__ import annotations

import hashlib
from collections.abc import Iterator
from dataclasses import dataclass
from itertools import combinations, permutations

from tests.independent.documents import Document, Place
from tests.independent.quadratic import Quadratic, is_zero

SINGLE = "single"
COMPENSATED = "compensated"
HALF_UNIT = "half unit"


@dataclass(frozen=True)
class Move:
    """A change that is named but not carried out; `direction` holds +1 or −1 by place."""

    slug: str
    kind: str
    way: str
    direction: tuple[tuple[Place, int], ...]

    def __str__(self) -> str:
        touched = ", ".join(f"{'+' if sign > 0 else '-'} {place}" for place, sign in self.direction)
        return f"{self.slug}: {self.kind}, {self.way}: {touched}"

    @property
    def draw(self) -> int:
        """A number that the name of the move fixes for good, by which samples are drawn."""
        return int.from_bytes(hashlib.sha256(str(self).encode()).digest()[:8], "big")


def moves(document: Document) -> Iterator[Move]:
    """Every change that is tried on a tableau."""
    rounded = document.rounded
    for place in document.texts:
        yield from _single(document, place, rounded)
    for direction, way in _compensated(document, rounded):
        yield Move(document.slug, COMPENSATED, way, direction)


def _single(document: Document, place: Place, rounded: bool) -> Iterator[Move]:
    value, slug = document.values[place], document.slug
    own_rounding = bool(document.half_units[place])
    for sign in (1, -1):
        if rounded:
            yield Move(slug, SINGLE, "twice the least that shows", ((place, sign),))
        if own_rounding:
            yield Move(slug, HALF_UNIT, "half a unit", ((place, sign),))
        else:
            yield Move(slug, SINGLE, "numerator by one", ((place, sign),))
        if isinstance(value, Quadratic):
            yield Move(slug, SINGLE, "factor of the root by one", ((place, sign),))
    if is_zero(value):
        return
    ways = ["sign", "digits swapped, least", "digits swapped, drawn"]
    if isinstance(value, Quadratic) and value.a:
        ways.append("sign of the root")
    for way in ways:
        yield Move(slug, SINGLE, way, ((place, 1),))


def _compensated(document: Document, rounded: bool) -> Iterator[tuple[tuple[tuple[Place, int], ...], str]]:
    # The size of an exact change is one in the numerator of the first entry, so both orders differ; the size
    # of a change in a rounded tableau does not depend on the order.
    pairs = combinations if rounded else permutations
    groups: dict[tuple[str, int], list[Place]] = {}
    for place in document.texts:
        if place.array == "matrix":
            groups.setdefault(("within a row", place.row), []).append(place)
            for sign in (1, -1):
                yield ((place, sign), (Place("nodes", place.row), sign)), "with the node"
        elif place.array == "continuous":
            groups.setdefault(("between stages", place.column), []).append(place)
            groups.setdefault(("between powers", place.row), []).append(place)
        elif place.array != "nodes":
            groups.setdefault((f"between {place.array}", 0), []).append(place)
    for (way, _), places in groups.items():
        yield from ((((first, 1), (second, -1)), way) for first, second in pairs(places, 2))
    for power in range(1, document.powers):
        for first, second in combinations(range(1, document.stages + 1), 2):
            corners = [(first, power, 1), (second, power, -1), (first, power + 1, -1), (second, power + 1, 1)]
            direction = tuple((Place("continuous", row, column), sign) for row, column, sign in corners)
            yield direction, "between stages and powers"
