"""A failing tableau on the bench: entries are changed here, and each change is put to the full proof."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from fractions import Fraction
from functools import cached_property
from typing import Any, NamedTuple

import attrs

from newel.errors import BadNumber, BadTableau
from newel.methods.coefficients import Coefficients
from newel.methods.conditions import LIMIT
from newel.methods.digits import Digits, decimal_exponent
from newel.methods.exact import Exact
from newel.methods.order_conditions import prove
from newel.methods.repairs import Change, Repair
from newel.methods.spelling import nearest_spelling, text_distance
from newel.methods.tableau import ARRAYS, Tableau

__all__ = ["Bench", "Place", "Proposal", "changed", "repaired"]

_FIELDS = {"embedded": "embedded_weights", "continuous": "continuous_weights"}


class Place(NamedTuple):
    """One entry, counted from 0; `column` is −1 in an array of one dimension.

    >>> print(Place("matrix", 4, 0), Place("weights", 2))
    matrix[5][1] weights[3]
    """

    array: str
    row: int
    column: int = -1

    def __str__(self) -> str:
        return f"{self.array}[{self.row + 1}]" + ("" if self.column < 0 else f"[{self.column + 1}]")


@attrs.frozen
class Proposal:
    """A number for a place; `slack` tells how far what was meant may be from it, 0 if it is exact."""

    place: Place
    value: Exact
    slack: Fraction = Fraction(0)


class Bench:
    """One tableau whose proof fails, and what a search for repairs asks of it again and again.

    Args:
        tableau: what fails.
    """

    def __init__(self, tableau: Tableau) -> None:
        self.tableau = tableau
        self.rounded = not tableau.is_exact
        self.coefficients = Coefficients.of(tableau)
        self.nodes_printed = any(
            c.text is not None or c != total for c, total in zip(tableau.nodes, self.row_totals, strict=True)
        )

    @cached_property
    def row_totals(self) -> tuple[Exact, ...]:
        """The row sums of the matrix."""
        return tuple(sum((x for x in row if x), Exact(0)) for row in self.tableau.matrix)

    @cached_property
    def half(self) -> dict[str, Any]:
        """Half a unit of the last trusted digit, by array, in its shape."""
        return {array: self.tableau.half_units(array) for array in ARRAYS}

    @cached_property
    def longest(self) -> dict[str, int]:
        """By array, the digits of its longest decimal: what is put beside it is written no shorter."""
        return {
            array: max(
                (len(str(x)) for x in _flat(self.coefficients.array(array)) if x.form == "decimal"), default=1
            )
            for array in ARRAYS
        }

    @cached_property
    def row_defects(self) -> dict[int, tuple[Exact, Fraction]]:
        """Rows whose sum is not the node: what is missing in them, and how well that is known."""
        found = {}
        for i, (node, total) in enumerate(zip(self.tableau.nodes, self.row_totals, strict=True)):
            slack = self.half["nodes"][i] + sum(self.half["matrix"][i], Fraction(0))
            if _beyond(node - total, slack):
                found[i] = (node - total, slack)
        return found

    def sum_defect(self, array: str, column: int = 0) -> tuple[Exact, Fraction] | None:
        """Return what the weights lack to their sum, and how well that is known; None where they have it."""
        missing, slack = self.lack_of_sum(array, column)
        return (missing, slack) if _beyond(missing, slack) else None

    def lack_of_sum(self, array: str, column: int = 0) -> tuple[Exact, Fraction]:
        """Return what the weights lack to their sum, and how well that is known."""
        values, half = self._line(array, column)
        wanted = 1 if array != "continuous" or column == 0 else 0
        return wanted - sum((x for x in values if x), Exact(0)), sum(half, Fraction(0))

    def end_defects(self) -> Iterator[tuple[int, Exact, Fraction]]:
        """Yield each stage whose continuous weights do not end in its weight: stage, lack, slack."""
        rows = self.tableau.continuous_weights or ()
        for i, (row, weight) in enumerate(zip(rows, self.tableau.weights, strict=bool(rows))):
            slack = self.half["weights"][i] + sum(self.half["continuous"][i], Fraction(0))
            missing = weight - sum((x for x in row if x), Exact(0))
            if _beyond(missing, slack):
                yield i, missing, slack

    def _line(self, array: str, column: int) -> tuple[Sequence[Exact], Sequence[Fraction]]:
        values, half = getattr(self.tableau, _FIELDS.get(array, array)), self.half[array]
        if array == "continuous":
            return [row[column] for row in values], [row[column] for row in half]
        return values, half

    def entry(self, place: Place) -> Exact:
        """Return what stands in a place."""
        found: Exact = _at(getattr(self.tableau, _FIELDS.get(place.array, place.array)), place)
        return found

    def half_at(self, place: Place) -> Fraction:
        """Return half a unit of what stands in a place."""
        found: Fraction = _at(self.half[place.array], place)
        return found

    def unit(self, place: Place, value: Exact) -> Fraction:
        """Return half a unit of the last digit that is trusted in a place, were this value to stand there."""
        digits = stated(self.tableau, place)
        if digits is None or not value:
            return Fraction(0)
        return Fraction(10) ** (decimal_exponent(value) - digits + 1) / 2

    def added(self, place: Place, lack: Exact, slack: Fraction) -> Proposal | None:
        """Return the proposal that adds what a sum lacks to one entry; `slack` is that of the whole sum."""
        try:
            return Proposal(place, self.entry(place) + lack, slack)
        except BadNumber:  # another square root than that of the rest
            return None

    def spelled(self, proposal: Proposal) -> str:
        """Return the text for a proposal that is nearest to what is printed."""
        place = proposal.place
        digits = max(stated(self.tableau, place) or 1, self.longest.get(place.array, 1))
        printed = str(self.entry(place))
        return nearest_spelling(printed, proposal.value, proposal.slack, digits)

    def tried(self, proposals: Sequence[Proposal | None], what: str = "") -> Repair | None:
        """Return the repair that these proposals are together, or None where the proof still fails."""
        if None in proposals or not proposals:
            return None
        given = [each for each in proposals if each is not None]
        if not any(each.slack for each in given):
            # Most proposals fail: an exact one is spelled only after it has been proved.
            plain = {each.place: each.value.canonical for each in given}
            if all(each.value == self.entry(each.place) for each in given) or not self.holds(plain):
                return None
            texts = {each.place: self.spelled(each) for each in given}
            return self.repair(texts, what)
        texts = {each.place: self.spelled(each) for each in given}
        if all(text == str(self.entry(place)) for place, text in texts.items()):
            return None
        if not self.holds(texts):
            return None
        return self.repair(texts, what or determined(given))

    def holds(self, texts: Mapping[Place, str]) -> bool:
        """Whether every claim is proved with these texts in their places."""
        try:
            return bool(prove(changed(self.tableau, texts, self.nodes_printed)))
        except (BadTableau, BadNumber):
            return False

    def repair(self, texts: Mapping[Place, str], what: str = "") -> Repair:
        """Return the repair that puts these texts in their places."""
        changes = tuple(
            Change(str(place), str(self.entry(place)), text)
            for place, text in texts.items()
            if text != str(self.entry(place))
        )
        distance = sum(text_distance(each.printed, each.value) for each in changes)
        return Repair(changes=changes, distance=distance, text=_told(changes) + what)


def changed(tableau: Tableau, texts: Mapping[Place, str], nodes_printed: bool = True) -> Tableau:
    """Return a tableau with other texts in some places; nodes that are not printed follow the row sums."""
    arrays: dict[str, Any] = {
        array: [list(x) if isinstance(x, tuple) else x for x in values]
        for array in ARRAYS
        if (values := getattr(tableau, _FIELDS.get(array, array))) is not None
    }
    for place, text in texts.items():
        if place.column < 0:
            arrays[place.array][place.row] = text
        else:
            arrays[place.array][place.row][place.column] = text
    if not nodes_printed:
        arrays["nodes"] = None
    fields = {_FIELDS.get(array, array): values for array, values in arrays.items()}
    return attrs.evolve(tableau, proof=None, **fields)


def repaired(tableau: Tableau, repair: Repair) -> Tableau:
    """Return the tableau with a repair carried out; its proof is still to be made.

    Raises:
        BadTableau: the repair belongs to another tableau.
    """
    texts = {}
    for change in repair.changes:
        array, *indices = change.where.replace("]", "").split("[")
        place = Place(array, *(int(index) - 1 for index in indices))
        try:
            there = str(_at(getattr(tableau, _FIELDS.get(array, array)), place))
        except (AttributeError, IndexError, TypeError):
            there = "nothing"
        if there != change.printed:
            raise BadTableau(f"{there} stands there, not {change.printed}", file=tableau.slug, key=str(place))
        texts[place] = change.value
    return changed(tableau, texts, Bench(tableau).nodes_printed)


def stated(tableau: Tableau, place: Place) -> int | None:
    """Return the significant digits that are stated for a place, or None."""
    digits = tableau.digits
    if isinstance(digits, Digits):
        found = digits.get(str(place), digits.get(place.array))
        return found if isinstance(found, int) else None
    return digits


def determined(proposals: Sequence[Proposal]) -> str:
    """Return words on how many digits of a rounded value the conditions determine."""
    fewest = [
        decimal_exponent(each.value) - decimal_exponent(Exact(each.slack))
        for each in proposals
        if each.slack and each.value
    ]
    return f" (determined to {max(1, min(fewest))} digits)" if fewest else ""


def _beyond(defect: Exact, slack: Fraction) -> bool:
    return abs(defect) > (min(2 * slack, Fraction(LIMIT)) if slack else 0)


def _at(values: Any, place: Place) -> Any:
    return values[place.row] if place.column < 0 else values[place.row][place.column]


def _flat(values: Any) -> Iterator[Exact]:
    for each in values or ():
        yield from each if isinstance(each, tuple) else (each,)


def _told(changes: Sequence[Change]) -> str:
    if len(changes) == 1:
        (change,) = changes
        return f"{change.where} is {change.printed}, and {_reduced(change)} makes every condition hold"
    pairs = "; ".join(f"{each.where} is {each.printed}, for {_reduced(each)}" for each in changes)
    return f"together these make every condition hold: {pairs}"


def _reduced(change: Change) -> str:
    value = Exact.of(change.value)
    same = value.form != "fraction" or value.canonical == change.value
    return change.value if same else f"{change.value} = {value.canonical}"
