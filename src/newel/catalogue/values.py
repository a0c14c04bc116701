"""The values of a method's properties, remembered in the user's cache folder under the key of its proof.

The key covers numbers, claims and digits, so that a changed method never finds old values. A cache that is
damaged, unreadable or cannot be written costs time, never an answer.
"""

from __future__ import annotations

import hashlib
import json
import os
import tempfile
from collections.abc import Callable, Iterable
from pathlib import Path
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from newel.methods.tableau import Tableau

__all__ = ["Values"]

SCHEMA = "newel-values/1"


class Values:
    """Values of properties by proof key; `folder` is the cache on disk, or None for none."""

    def __init__(self, folder: Path | None) -> None:
        self._folder = folder
        self._memory: dict[str, dict[str, Any]] = {}

    def of(self, key: str, load: Callable[[], Tableau], names: Iterable[str]) -> dict[str, Any]:
        """Return values by name; the tableau is loaded only where one of them is not remembered.

        Args:
            key: the key of the method's proof.
            load: returns the tableau.
            names: of properties, in full.
        """
        from newel.methods.analysis.properties import property_named

        known = self._memory.get(key)
        if known is None:
            known = self._memory[key] = self._read(key)
        found, fresh = {}, False
        tableau: Tableau | None = None
        for name in names:
            if name not in known:
                tableau = load() if tableau is None else tableau
                each = property_named(name)
                assert each is not None, name
                value = each.function(tableau)
                if not each.kept:
                    found[name] = value
                    continue
                known[name], fresh = value, True
            found[name] = known[name]
        if fresh:
            self._write(key, known)
        return found

    def _file(self, key: str) -> Path | None:
        return None if self._folder is None else self._folder / "values" / f"{key}.json"

    def _read(self, key: str) -> dict[str, Any]:
        file = self._file(key)
        if file is None:
            return {}
        try:
            kept = json.loads(file.read_text(encoding="utf-8"))
            values = kept["values"]
            whole = kept["schema"] == _schema() and kept["sum"] == _sum(key, values)
            return dict(values) if whole else {}
        except (OSError, ValueError, KeyError, TypeError, RecursionError):
            return {}

    def _write(self, key: str, values: dict[str, Any]) -> None:
        """Write beside the place and rename, so that no reader ever sees half a file."""
        file = self._file(key)
        if file is None:
            return
        kept = {"schema": _schema(), "sum": _sum(key, values), "values": values}
        temporary = None
        try:
            file.parent.mkdir(parents=True, exist_ok=True)
            handle, temporary = tempfile.mkstemp(dir=file.parent, prefix=key[:8], suffix=".part")
            with os.fdopen(handle, "w", encoding="utf-8") as stream:
                json.dump(kept, stream)
            os.replace(temporary, file)
        except OSError:
            if temporary is not None:
                Path(temporary).unlink(missing_ok=True)


def _schema() -> str:
    from newel.methods.analysis.properties import ANALYSIS_VERSION

    return f"{SCHEMA}, analysis {ANALYSIS_VERSION}"


def _sum(key: str, values: object) -> str:
    """Return a checksum, so that a flipped bit in the cache cannot turn into another value."""
    return hashlib.sha256(f"{key} {json.dumps(values, sort_keys=True)}".encode()).hexdigest()
