"""Prove every built-in tableau and write `tableaux/proved.toml`: `python -m tests.prove_tableaux`.

Nothing is written unless every file passes; those that fail are named with what fails. `--check` writes
nothing and tells whether the list is the one that a proof of today would give.
"""

from __future__ import annotations

import json
import sys
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

from newel.catalogue.proofs import LIST_SCHEMA
from newel.catalogue.summaries import entry_of
from newel.errors import NewelError
from newel.methods.order_conditions import PROOF_VERSION, proof_key, prove
from newel.methods.tableau_file import load_tableau

DATA = Path(__file__).parents[1] / "tableaux"
LIST = DATA / "proved.toml"
HEAD = "# Written by `python -m tests.prove_tableaux` after a full proof of every file; not edited by hand.\n"


def prove_all(folder: Path) -> tuple[list[dict[str, Any]], list[str]]:
    """Return the entry of every file that passes, and a text for every one that does not."""
    entries: list[dict[str, Any]] = []
    failed: list[str] = []
    files = folder.glob("order-*/*.toml")
    for file in sorted(files, key=lambda file: (len(file.parent.name), file.parent.name, file.stem)):
        try:
            tableau = load_tableau(file)
        except NewelError as error:
            failed.append(str(error))
            continue
        verdict = prove(tableau)
        if file.parent.name != f"order-{tableau.order}":
            failed.append(f"{file}: claims order {tableau.order}; it belongs into order-{tableau.order}")
        elif verdict:
            entries.append(entry_of(tableau, proof_key(tableau), file.read_bytes(), verdict.to_data()))
        else:
            failed += [f"{file}: {failure.message}" for failure in verdict.failures]
    return entries, failed


def render(entries: Sequence[Mapping[str, Any]]) -> str:
    """Return the list as TOML."""
    parts = [f"{HEAD}schema = {_toml(LIST_SCHEMA)}\nproof_version = {PROOF_VERSION}\n"]
    for entry in entries:
        plain = {name: value for name, value in entry.items() if name != "verdict"}
        parts.append("\n[[method]]\n" + _table(plain))
        parts.append("[method.verdict]\n" + _table(entry["verdict"]))
    return "".join(parts)


def _table(values: Mapping[str, Any]) -> str:
    return "".join(f"{name} = {_toml(value)}\n" for name, value in values.items() if value is not None)


def _toml(value: object) -> str:
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, int | float):
        return repr(value)
    if isinstance(value, str):
        return json.dumps(value, ensure_ascii=False)
    if isinstance(value, Mapping):
        return "{ " + ", ".join(f"{json.dumps(key)} = {_toml(each)}" for key, each in value.items()) + " }"
    if isinstance(value, list | tuple):
        return "[" + ", ".join(_toml(each) for each in value) + "]"
    raise TypeError(f"{value!r} has no form in TOML")


def main(arguments: Sequence[str]) -> int:
    """Prove, then write or compare; return the exit status."""
    entries, failed = prove_all(DATA)
    if failed:
        print(*failed, f"{len(failed)} failures; {LIST.name} was not written", sep="\n", file=sys.stderr)
        return 1
    text = render(entries)
    same = LIST.is_file() and LIST.read_text(encoding="utf-8") == text
    if "--check" in arguments:
        print(f"{len(entries)} methods proved; {LIST.name} is {'as it should be' if same else 'stale'}")
        return 0 if same else 1
    LIST.write_text(text, encoding="utf-8", newline="\n")
    print(f"{len(entries)} methods proved; {LIST.name} {'did not change' if same else 'was written'}")
    return 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
