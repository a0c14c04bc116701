"""Where proofs are remembered: in memory, in the list that ships with the data, in the user's cache folder.

A proof is found by its key, which covers the exact numbers, the claims, the digits and the version of the
proof; so a changed tableau or a changed proof never finds an old verdict. A cache that is damaged, unreadable
or cannot be written costs time, never an answer.
"""

from __future__ import annotations

import hashlib
import json
import os
import sys
import tempfile
from collections.abc import Callable, Mapping
from functools import cache
from pathlib import Path
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from newel.methods.order_conditions import Verdict
    from newel.methods.tableau import Tableau

__all__ = ["Listed", "Progress", "Proofs", "listed_proofs", "user_cache_folder"]

LIST_SCHEMA = "newel-proofs/1"
CACHE_SCHEMA = "newel-proof/1"

Progress = Callable[[int, int], None]
"""`progress(done, all)`: called while a proof runs, with numbers of conditions."""

Listed = Mapping[str, Any]
"""One entry of `tableaux/proved.toml`: slug, key, name, also_called, verdict."""


def user_cache_folder() -> Path | None:
    """Return `NEWEL_CACHE`, or else `newel` in the platform's folder for caches; None for a homeless user."""
    try:
        return _cache_folder()
    except RuntimeError:  # no home folder can be determined
        return None


def _cache_folder() -> Path:
    named = os.environ.get("NEWEL_CACHE")
    if named:
        return Path(named).expanduser()
    if sys.platform == "darwin":
        return Path.home() / "Library" / "Caches" / "newel"
    if sys.platform == "win32":
        return Path(os.environ.get("LOCALAPPDATA") or Path.home() / "AppData" / "Local") / "newel"
    base = os.environ.get("XDG_CACHE_HOME", "")
    return (Path(base) if os.path.isabs(base) else Path.home() / ".cache") / "newel"


@cache
def listed_proofs() -> Mapping[str, Listed]:
    """Return the entries of the list that ships with the built-in tableaux, by proof key; it may be empty."""
    import tomllib
    from importlib.resources import files

    try:
        data = tomllib.loads(files("newel.tableaux").joinpath("proved.toml").read_text(encoding="utf-8"))
        if data["schema"] != LIST_SCHEMA:
            return {}
        return {entry["key"]: entry for entry in data["method"]}
    except (OSError, ValueError, KeyError, TypeError):
        return {}


class Proofs:
    """Verdicts by proof key; `folder` is the cache on disk, or None for none."""

    def __init__(self, folder: Path | None) -> None:
        self._folder = folder
        self._memory: dict[str, Verdict] = {}

    def verdict(
        self, tableau: Tableau, progress: Progress | None = None, *, listed: bool = True, anew: bool = False
    ) -> Verdict:
        """Return the verdict on a tableau, proving it where no proof is remembered.

        Args:
            tableau: what is to be proved.
            progress: called while a proof runs.
            listed: whether the list that ships with newel counts as a proof.
            anew: prove even if a proof is remembered.
        """
        from newel.methods.order_conditions import proof_key, prove

        key = proof_key(tableau)
        found = None if anew else self._remembered(key, listed)
        if found is None:
            found = prove(tableau, progress)
            self._memory[key] = found
            self._write(key, found)
        return found

    def _remembered(self, key: str, listed: bool) -> Verdict | None:
        if key in self._memory:
            return self._memory[key]
        found = self._from_list(key) if listed else None
        if found is None:
            found = self._read(key)
            if found is not None:
                self._memory[key] = found
        return found

    @staticmethod
    def _from_list(key: str) -> Verdict | None:
        from newel.methods.order_conditions import Verdict

        entry = listed_proofs().get(key)
        try:
            return None if entry is None else Verdict.from_data(entry["verdict"])
        except (KeyError, TypeError, ValueError):
            return None

    def _read(self, key: str) -> Verdict | None:
        from newel.methods.order_conditions import Verdict

        if self._folder is None:
            return None
        try:
            kept = json.loads((self._folder / "proofs" / f"{key}.json").read_text(encoding="utf-8"))
            data = kept["verdict"]
            whole = kept["schema"] == CACHE_SCHEMA and kept["sum"] == _sum(key, data)
            return Verdict.from_data(data) if whole else None
        except (OSError, ValueError, KeyError, TypeError, AttributeError, RecursionError):
            return None

    def _write(self, key: str, verdict: Verdict) -> None:
        """Write beside the place and rename, so that no reader ever sees half a file."""
        if self._folder is None:
            return
        data = verdict.to_data()
        kept = {"schema": CACHE_SCHEMA, "key": key, "sum": _sum(key, data), "verdict": data}
        folder, temporary = self._folder / "proofs", None
        try:
            folder.mkdir(parents=True, exist_ok=True)
            handle, temporary = tempfile.mkstemp(dir=folder, prefix=key[:8], suffix=".part")
            with os.fdopen(handle, "w", encoding="utf-8") as file:
                json.dump(kept, file)
            os.replace(temporary, folder / f"{key}.json")
        except OSError:
            if temporary is not None:
                Path(temporary).unlink(missing_ok=True)


def _sum(key: str, data: object) -> str:
    """Return a checksum, so that a flipped bit in the cache cannot turn into another verdict."""
    return hashlib.sha256(f"{key} {json.dumps(data, sort_keys=True)}".encode()).hexdigest()
