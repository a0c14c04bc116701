"""Tableau files that are not finished: which numbers are still missing."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from newel.errors import BadTableau
from newel.methods.tableau import Tableau
from newel.methods.tableau_file import read_document, tableau_of

__all__ = ["read_draft"]


def read_draft(path: Path) -> tuple[Tableau, dict[str, int | None]]:
    """Read a file in which weights may be missing: left out, or "?" throughout.

    Returns:
        The tableau, in which missing weights are zeros and missing sections left out, and which of "weights",
        "embedded" and "continuous" are missing, with the order that the file asks for, or None.

    Raises:
        BadTableau: the file breaks a rule of the format, or a "?" stands among numbers.
    """
    data = read_document(path)
    missing: dict[str, int | None] = {}
    if _open(data.get("weights", "?")) and isinstance(data.get("matrix"), list):
        missing["weights"] = None
        data["weights"] = ["0"] * len(data["matrix"])
    for part in ("embedded", "continuous"):
        section = data.get(part)
        if isinstance(section, dict) and _open(section.get("weights", "?")):
            order = section.get("order")
            missing[part] = order if isinstance(order, int) and not isinstance(order, bool) else None
            del data[part]
    if "nodes" in data and isinstance(data["nodes"], list) and _open(data["nodes"][1:] or ["0"]):
        del data["nodes"]
    tableau = tableau_of(data, str(path))
    if tableau.slug != path.stem:
        raise BadTableau(f"{tableau.slug!r} is not the file's name", file=str(path), key="slug")
    return tableau, missing


def _open(value: Any) -> bool:
    """Tell whether a value is "?" all through."""
    if isinstance(value, list):
        return bool(value) and all(map(_open, value))
    return bool(value == "?")
