"""Misprints of the kinds that typesetting and typing make, drawn by digest and so the same for good.

A sign lost or gained, two neighbouring digits swapped, a fraction turned over, one digit another, or any
other number. One entry of one method each; a misprint that leaves every claim proved is passed over.
"""

from __future__ import annotations

import hashlib
from collections.abc import Iterator
from functools import lru_cache
from pathlib import Path
from typing import NamedTuple

from newel.errors import BadNumber, BadTableau
from newel.methods.exact import Exact
from newel.methods.misprint_bench import Place, changed
from newel.methods.misprints import Search, find_repairs
from newel.methods.order_conditions import prove
from newel.methods.tableau import ARRAYS, Tableau
from newel.methods.tableau_file import load_tableau

KINDS = ("sign", "digits swapped", "turned over", "another digit", "another number")
TABLEAUX = Path(__file__).parents[2] / "tableaux"
ROUNDS = 18


class Planted(NamedTuple):
    """One misprint: the method, the entry, the text that belongs there and the text put there."""

    slug: str
    kind: str
    place: Place
    right: str
    wrong: str

    def __str__(self) -> str:
        return f"{self.slug} {self.place} {self.kind}: {self.right} -> {self.wrong}"

    @property
    def draw(self) -> int:
        return number(str(self))


class Outcome(NamedTuple):
    """What the finder made of it: the rank of the right value from 1 (0: not in the list), and the list."""

    planted: Planted
    order: int
    rank: int
    equally_near: bool
    found: tuple[str, ...]


def number(text: str) -> int:
    """A number that a text fixes for good."""
    return int.from_bytes(hashlib.sha256(text.encode()).digest()[:8], "big")


def files() -> dict[str, Path]:
    """The built-in tableau files by slug."""
    return {file.stem: file for file in sorted(TABLEAUX.glob("order-*/*.toml"))}


@lru_cache(maxsize=4)
def tableau(slug: str) -> Tableau:
    """The method of a slug, as its file prints it."""
    return load_tableau(files()[slug])


def places(method: Tableau) -> dict[Place, str]:
    """Every entry that a file prints."""
    found: dict[Place, str] = {}
    for array in ARRAYS:
        name = array if array in ("nodes", "matrix", "weights") else f"{array}_weights"
        for i, x in enumerate(getattr(method, name) or ()):
            if isinstance(x, tuple):
                reach = x[:i] if array == "matrix" else x
                found |= {Place(array, i, j): str(entry) for j, entry in enumerate(reach)}
            else:
                found[Place(array, i)] = str(x)
    return found


def misprints(slug: str) -> Iterator[Planted]:
    """The misprints planted on one method: the first is the one with the least draw."""
    printed = places(tableau(slug))
    texts = list(printed.items())
    made = set()
    for turn in range(ROUNDS):
        seed = number(f"{slug} {turn}")
        place, right = texts[seed % len(texts)]
        kind = KINDS[(seed >> 20) % len(KINDS)]
        wrong = _misprinted(right, kind, seed >> 8)
        if wrong is not None and (place, wrong) not in made and _is_wrong(right, wrong):
            made.add((place, wrong))
            yield Planted(slug, kind, place, right, wrong)


def _is_wrong(right: str, wrong: str) -> bool:
    try:
        return Exact.of(right) != Exact.of(wrong)
    except BadNumber:
        return False


def _misprinted(text: str, kind: str, seed: int) -> str | None:
    digits = [i for i, key in enumerate(text) if key.isdigit()]
    if kind == "sign":
        return text[1:] if text.startswith("-") else f"-{text}"
    if kind == "digits swapped":
        pairs = [i for i in digits if i + 1 in digits and text[i] != text[i + 1]]
        if not pairs:
            return None
        at = pairs[seed % len(pairs)]
        return text[:at] + text[at + 1] + text[at] + text[at + 2 :]
    if kind == "turned over":
        sign = "-" if text.startswith("-") else ""
        above, stroke, below = text.removeprefix("-").partition("/")
        return f"{sign}{below}/{above}" if stroke and above.isdigit() and below.isdigit() else None
    if kind == "another digit":
        at = digits[seed % len(digits)]
        return text[:at] + str((int(text[at]) + 1 + (seed >> 9) % 9) % 10) + text[at + 1 :]
    return f"{seed % 47 + 1}/{(seed >> 7) % 45 + 2}"


def tried(planted: Planted) -> Outcome | None:
    """What the finder says to a misprint, or None where the misprint breaks no claim or is no tableau."""
    method = tableau(planted.slug)
    try:
        wrong = changed(method, {planted.place: planted.wrong})
        if prove(wrong):
            return None
    except (BadTableau, BadNumber):
        return None
    return judged(planted, method, find_repairs(wrong))


def judged(planted: Planted, method: Tableau, search: Search) -> Outcome:
    """Look for the right value in the list of repairs."""
    rank, distance = 0, None
    for position, repair in enumerate(search.repairs, 1):
        (change, *more) = repair.changes
        if not more and change.where == str(planted.place) and _agrees(planted, method, change.value):
            rank, distance = position, repair.distance
            break
    near = rank > 1 and distance == search.repairs[0].distance
    found = tuple(f"{each.distance}: {each.text}" for each in search.repairs[:4]) or search.undecided
    return Outcome(planted, method.order, rank, near, found)


def _agrees(planted: Planted, method: Tableau, text: str) -> bool:
    """Whether a repaired value is the right one: exactly, or to the digits that the conditions determine."""
    right, found = Exact.of(planted.right), Exact.of(text)
    if method.is_exact:
        return right == found
    slack = {array: method.half_units(array) for array in ARRAYS}
    row = slack[planted.place.array]
    halves = row[planted.place.row] if isinstance(row[0], tuple) else row
    # A sum of n entries, each known to half a unit of its last digit, leaves its remainder open by their sum.
    return abs(float(right) - float(found)) <= 4 * float(sum(halves)) + 1e-12
