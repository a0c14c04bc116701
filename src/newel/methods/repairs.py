"""A repair of a tableau as plain data: which entries to change, and into what."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import attrs

from newel.errors import BadRequest

__all__ = ["Change", "Repair"]


@attrs.frozen
class Change:
    """One entry to be changed.

    `where` is its place, counted from 1: `matrix[5][2]`, `weights[3]`, `nodes[4]`, `embedded[2]` or
    `continuous[1][2]`; `printed` the text that stands there, `value` the text to put there. Of an exact
    entry that text is the exact number; of a rounded one it has the digits that the tableau states.
    """

    where: str
    printed: str
    value: str

    def __str__(self) -> str:
        return f"{self.where}: {self.printed} → {self.value}"


@attrs.frozen(kw_only=True)
class Repair:
    """Changes with which every condition of the claims holds.

    Attributes:
        changes: one change, or several that only help together.
        distance: the edit distance between the printed and the repaired texts: a sign, a fraction turned
            over, two neighbouring digits swapped and a character typed wrong count one each.
        text: one line for people.

    >>> Repair(changes=(Change("weights[3]", "1/6", "1/3"),), distance=1, text="weight 3").where
    'weights[3]'
    """

    changes: tuple[Change, ...]
    distance: int
    text: str

    @property
    def where(self) -> str:
        """The places of all changes, with commas between them."""
        return ", ".join(change.where for change in self.changes)

    @property
    def printed(self) -> str:
        """The texts that stand there, with commas between them."""
        return ", ".join(change.printed for change in self.changes)

    @property
    def value(self) -> str:
        """The texts to put there, with commas between them."""
        return ", ".join(change.value for change in self.changes)

    def __str__(self) -> str:
        return self.text

    def to_data(self) -> dict[str, Any]:
        """Return dicts, lists, texts and integers."""
        return attrs.asdict(self, value_serializer=lambda _, __, value: value)

    @classmethod
    def from_data(cls, data: Mapping[str, Any]) -> Repair:
        """Return the repair that `to_data` wrote; raises BadRequest for anything else.

        >>> repair = Repair(changes=(Change("nodes[2]", "1/3", "1/2"),), distance=1, text="node 2")
        >>> Repair.from_data(repair.to_data()) == repair
        True
        """
        try:
            changes = tuple(Change(**change) for change in data["changes"])
            return cls(changes=changes, distance=int(data["distance"]), text=str(data["text"]))
        except (KeyError, TypeError, ValueError) as error:
            raise BadRequest(f"no stored repair: {error!r}", argument="data") from None
