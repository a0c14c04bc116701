"""What a list shows of a method, for the built-in ones without reading their numbers."""

from __future__ import annotations

import hashlib
from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any

import attrs

from newel.catalogue.proofs import listed_proofs

if TYPE_CHECKING:
    from newel.methods.tableau import Tableau

__all__ = ["Summary", "entry_of", "listed_summary"]


@attrs.frozen
class Summary:
    """One line of a list of methods.

    Attributes:
        slug, name, also_called, authors, year: as in the tableau.
        order, embedded_order, continuous_order: the claimed orders, None where there are no such weights.
        stages: their number.
        outcome: "exact" or "rounded" as proved, or "unproven" for a method that is taken on trust.
        working_floor: the largest residual of the float64 coefficients (unitless); None where unproven.
        origin: where the method comes from.
        values: of the columns that were asked for, by their text.
        proof_key: under which values are remembered; None where it is not known without the numbers.
    """

    slug: str
    name: str
    also_called: tuple[str, ...]
    authors: tuple[str, ...]
    year: int | None
    order: int
    embedded_order: int | None
    continuous_order: int | None
    stages: int
    outcome: str
    working_floor: float | None
    origin: str
    values: Mapping[str, Any] = attrs.field(factory=dict)
    proof_key: str | None = attrs.field(default=None, repr=False, eq=False)

    @classmethod
    def of(cls, tableau: Tableau) -> Summary:
        """Return the summary of a tableau that was found in a registry."""
        proof = tableau.proof
        return cls(
            **{name: getattr(tableau, name) for name in _FROM_TABLEAU},
            outcome="unproven" if proof is None else proof.outcome,
            working_floor=None if proof is None else proof.working_floor,
            origin=tableau.origin,
        )


_FROM_TABLEAU = (
    "slug",
    "name",
    "also_called",
    "authors",
    "year",
    "order",
    "embedded_order",
    "continuous_order",
    "stages",
)


def entry_of(tableau: Tableau, key: str, file: bytes, verdict: Mapping[str, Any]) -> dict[str, Any]:
    """Return what the list of proofs keeps of a built-in method: key, summary and verdict, without Nones."""
    entry = {name: getattr(tableau, name) for name in _FROM_TABLEAU}
    entry = {name: list(value) if isinstance(value, tuple) else value for name, value in entry.items()}
    entry |= {"key": key, "file": hashlib.sha256(file).hexdigest(), "verdict": dict(verdict)}
    return {name: value for name, value in entry.items() if value is not None}


def listed_summary(slug: str, file: object) -> Summary | None:
    """Return what the list says of a built-in method; None unless it was made of this very file."""
    entry = next((each for each in listed_proofs().values() if each.get("slug") == slug), None)
    if entry is None or not isinstance(file, Path):
        return None
    try:
        if entry["file"] != hashlib.sha256(file.read_bytes()).hexdigest():
            return None
        known: dict[str, Any] = {name: entry.get(name) for name in _FROM_TABLEAU}
        known |= {name: tuple(entry[name]) for name in ("also_called", "authors")}
        verdict = entry["verdict"]
        floor = float(verdict["working_floor"])
        facts = {"outcome": verdict["outcome"], "working_floor": floor, "proof_key": entry["key"]}
        return Summary(**known, **facts, origin="built-in")
    except (OSError, KeyError, TypeError, ValueError):
        return None
