"""A repair written into a tableau file: the texts of its entries are replaced, and nothing else."""

from __future__ import annotations

import os
import re
import secrets
from collections.abc import Iterator
from pathlib import Path

from newel.errors import BadTableau, OutputFailed
from newel.methods.misprint_bench import repaired
from newel.methods.repairs import Repair
from newel.methods.tableau_file import load_tableau, parse_tableau

__all__ = ["repaired_text", "write_repair"]

_TOKEN = re.compile(r'#[^\n]*|"(?:[^"\\\n]|\\.)*"|\'[^\'\n]*\'|[\[\],]|[^\s\[\],#"\']+')
_TABLES = {"embedded": ("embedded", "weights"), "continuous": ("continuous", "weights")}


def write_repair(path: str | os.PathLike[str], repair: Repair) -> None:
    """Carry out a repair in a tableau file; its comments and its layout stay.

    Args:
        path: the file whose check gave the repair.
        repair: what to change.

    Raises:
        BadTableau: another text stands in one of the places, or the place cannot be found in the file.
        OutputFailed: the file cannot be written; it is as it was then.
    """
    place = Path(path)
    wanted = repaired(load_tableau(place), repair)
    text = place.read_text(encoding="utf-8")
    made = repaired_text(text, repair)
    found = parse_tableau(made, file=str(place))
    if (found.digest, found.nodes) != (wanted.digest, wanted.nodes):
        raise BadTableau("an entry could not be placed in this file; change it by hand", file=str(place))
    beside = place.with_name(f".{place.name}.{secrets.token_hex(4)}.part")
    try:
        beside.write_text(made, encoding="utf-8", newline="")
        beside.replace(place)
    except OSError as error:
        raise OutputFailed(str(place), f"{error.strerror or error}; nothing was changed") from error
    finally:
        beside.unlink(missing_ok=True)


def repaired_text(text: str, repair: Repair) -> str:
    """Return the text of a tableau file with the changes of a repair.

    Raises:
        BadTableau: a place cannot be found.

    >>> from newel.methods.repairs import Change
    >>> slip = Repair(changes=(Change("weights[2]", "-1", "1"),), distance=1, text="")
    >>> repaired_text('weights = ["0", "-1"]  # as printed', slip)
    'weights = ["0", "1"]  # as printed'
    """
    for change in repair.changes:
        array, *indices = change.where.replace("]", "").split("[")
        table, key = _TABLES.get(array, ("", array))
        wanted = tuple(map(int, indices))
        spans = [(a, b) for a, b, at in _entries(text, table, key) if at == wanted]
        if len(spans) != 1:
            raise BadTableau("this entry could not be found in the file; change it by hand", key=change.where)
        start, end = spans[0]
        text = f'{text[:start]}"{change.value}"{text[end:]}'
    return text


def _entries(text: str, table: str, key: str) -> Iterator[tuple[int, int, tuple[int, ...]]]:
    """Yield start, end and place, from 1, of each entry of one array in the text of a file."""
    start = _start(text, table, key)
    counts: list[int] = []
    for token in _TOKEN.finditer(text, start):
        if token[0] == "[":
            if counts:
                counts[-1] += 1
            counts.append(0)
        elif token[0] == "]":
            counts.pop()
            if not counts:
                return
        elif token[0] not in "," and not token[0].startswith("#"):
            counts[-1] += 1
            yield token.start(), token.end(), tuple(counts)


def _start(text: str, table: str, key: str) -> int:
    """Return where the array of a key begins, or the end of the text."""
    inside = ""
    for line in re.finditer(r"^.*$", text, re.MULTILINE):
        if header := re.match(r"\s*\[([\w-]+)\]\s*(#.*)?$", line[0]):
            inside = header[1]
        elif inside == table and (found := re.match(rf"\s*{key}\s*=\s*(?=\[)", line[0])):
            return line.start() + found.end()
    return len(text)
