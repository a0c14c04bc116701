"""A tableau file as texts in places, such as matrix[5][2]: code of its own, which never imports newel."""

from __future__ import annotations

import tomllib
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, replace
from fractions import Fraction
from functools import cached_property, lru_cache
from math import floor, log10
from pathlib import Path
from typing import Any, NamedTuple

from tests.independent.quadratic import Number, Quadratic, is_zero, read

ARRAYS = ("nodes", "matrix", "weights", "embedded", "continuous")
number = lru_cache(maxsize=100_000)(read)


class Place(NamedTuple):
    """One entry, counted from 1; `column` is 0 in an array of one dimension."""

    array: str
    row: int
    column: int = 0

    def __str__(self) -> str:
        return f"{self.array}[{self.row}]" + (f"[{self.column}]" if self.column else "")


@dataclass(frozen=True)
class Document:
    """The texts of a tableau by place (below the diagonal only), its claims and its stated digits."""

    slug: str
    stages: int
    texts: Mapping[Place, str]
    claims: Mapping[str, int]
    powers: int
    digits: int | Mapping[str, Any] | None

    @cached_property
    def values(self) -> dict[Place, Number]:
        return {place: number(text) for place, text in self.texts.items()}

    @cached_property
    def half_units(self) -> dict[Place, Fraction]:
        """By place, half a unit of the last trusted digit; 0 where the entry is exact."""
        return {place: self.half_unit(place, text) for place, text in self.texts.items()}

    @property
    def rounded(self) -> bool:
        return any(self.half_units.values())

    def half_unit(self, place: Place, text: str, as_rounded: bool = False) -> Fraction:
        """Half a unit of the last trusted digit of a text at a place; with `as_rounded` whatever its form."""
        value, digits = number(text), self.digits
        if digits is None or is_zero(value):
            return Fraction(0)
        by_entry = isinstance(digits, Mapping) and digits.get(str(place))
        by_array = digits.get(place.array) if isinstance(digits, Mapping) else digits
        decimal = "." in text or "e" in text.lower()
        long = not isinstance(value, Quadratic) and value.denominator > 999_999
        trusted = by_entry or (by_array if decimal or long or as_rounded else None)
        if not trusted or trusted == "exact":
            return Fraction(0)
        return Fraction(10) ** (_leading(value) + 1 - int(trusted)) / 2

    def changed(self, texts: Mapping[Place, str]) -> Document:
        return replace(self, texts={**self.texts, **texts})

    def nested(self, array: str) -> list[Any] | None:
        """The texts of an array, rows of the matrix left of the diagonal; None where there are none."""
        found: dict[int, list[str]] = {row: [] for row in range(1, self.stages + 1)}
        for place in self.places(array):
            found[place.row].append(self.texts[place])
        if array == "matrix":
            return list(found.values())
        rows = [row if array == "continuous" else row[0] for row in found.values() if row]
        return rows or None

    def places(self, array: str) -> Iterator[Place]:
        return (place for place in self.texts if place.array == array)


def _leading(value: Number) -> int:
    """The exponent of the leading decimal digit."""
    size = abs(float(value))
    exponent = floor(log10(size))
    if not isinstance(value, Quadratic):  # floats mistake what lies next to a power of ten
        exponent += abs(value) >= Fraction(10) ** (exponent + 1)
        exponent -= abs(value) < Fraction(10) ** exponent
    return exponent


def open_document(path: Path) -> Document:
    """Read a tableau file."""
    data = tomllib.loads(path.read_text(encoding="utf-8"))
    texts: dict[Place, str] = {}
    arrays = {
        "nodes": data["nodes"],
        "weights": data["weights"],
        "embedded": data.get("embedded", {}).get("weights", ()),
    }
    for row, entries in enumerate(data["matrix"], 1):
        for column in range(1, row):
            texts[Place("matrix", row, column)] = str(entries[column - 1]) if column <= len(entries) else "0"
    for array, entries in arrays.items():
        texts |= {Place(array, row): str(text) for row, text in enumerate(entries, 1)}
    dense = data.get("continuous", {}).get("weights", ())
    for row, entries in enumerate(dense, 1):
        texts |= {Place("continuous", row, power): str(text) for power, text in enumerate(entries, 1)}
    claims = {"weights": data["order"]}
    claims |= {part: data[part]["order"] for part in ("embedded", "continuous") if part in data}
    powers = max(map(len, dense), default=0)
    return Document(data["slug"], len(data["weights"]), texts, claims, powers, data.get("digits"))
