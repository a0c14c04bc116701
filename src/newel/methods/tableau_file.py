"""Tableau files: one method a file, in TOML, with its numbers as texts.

`tableaux/README.md` documents the format. Reading and writing round-trip exactly, printed texts included.
"""

from __future__ import annotations

import os
import re
import stat
from collections.abc import Mapping
from difflib import get_close_matches
from math import isfinite
from pathlib import Path
from typing import Any

from newel.errors import BadTableau, OutputFailed
from newel.methods.digits import shown
from newel.methods.storage import ARRAYS_OF, FORMS, Storage
from newel.methods.tableau import Notes, Tableau
from newel.methods.tableau_text import NOTE_KEYS, SCHEMA, format_tableau, quoted
from newel.methods.text_file import write_text

__all__ = [
    "MOST_BYTES",
    "SCHEMA",
    "format_tableau",
    "load_tableau",
    "parse_tableau",
    "read_document",
    "tableau_of",
    "write_tableau",
]

MOST_BYTES = 2 * 1024 * 1024

# Reading an integer takes time that grows with the square of its digits, and other libraries lift Python's
# own limit for the whole process.
_LONG_INTEGER = re.compile(r"(?:^|[\s,\[=])[+-]?[0-9][0-9_]{4000,}", re.MULTILINE)
_WRITE_TEXTS = 'an integer of thousands of digits; numbers are written as texts: "1/2"'

_KNOWN = {
    "": (
        *("schema", "slug", "name", "also_called", "authors", "year", "source", "numbers"),
        *("order", "nodes", "matrix", "weights", "digits", "embedded", "continuous", "storage", "notes"),
    ),
    "embedded": ("order", "weights"),
    "continuous": ("order", "weights"),
    "storage": ("form", "digits", *(key for keys in ARRAYS_OF.values() for key in keys)),
    "notes": NOTE_KEYS,
}
_TO_WRITE = {
    "schema": f'as the first line: schema = "{SCHEMA}"',
    "slug": 'the file\'s name without .toml: slug = "my-method-3"',
    "name": 'the usual name: name = "…"',
    "source": 'where the numbers stand, as a citation: source = "…"',
    "numbers": 'how the numbers came here: numbers = "published", "derived" or "from memory"',
    "order": "the claimed order of the weights: order = 4",
    "matrix": 'a row for each stage, the first one empty: matrix = [[], ["1/2"]]',
    "weights": 'a number for each stage: weights = ["0", "1"]',
}


def load_tableau(path: str | os.PathLike[str]) -> Tableau:
    """Read one tableau file. What it claims is not proved here.

    Args:
        path: a file of at most 2 MiB that ends in `.toml` and is named after the slug in it.

    Returns:
        The tableau; its `origin` is the path.

    Raises:
        BadTableau: the file cannot be read or breaks a rule of the format; the text names file, key, value,
            and what is allowed.

    >>> load_tableau("plant.py")
    Traceback (most recent call last):
      ...
    newel.errors.BadTableau: plant.py is a model, not a tableau. For a model: newel examine plant.py
    """
    place = Path(path)
    file = str(place)
    if place.suffix == ".py":
        raise _sentence(f"{file} is a model, not a tableau. For a model: newel examine {file}", file)
    text = _read(place, file)
    tableau = parse_tableau(text, file=file)
    if tableau.slug != place.stem:
        raise BadTableau(
            f"{tableau.slug!r} is not the file's name\n"
            f"  Name the file {tableau.slug}.toml, or write slug = {quoted(place.stem)}.",
            file=file,
            key="slug",
        )
    return tableau


def _sentence(text: str, file: str) -> BadTableau:
    """Make an error whose text names the file itself."""
    error = BadTableau(text)
    error.file = file
    return error


def _read(place: Path, file: str) -> str:
    try:
        status = place.stat()
    except FileNotFoundError:
        near = get_close_matches(place.name, _neighbours(place.parent), 1, 0.6)
        hint = f"\n  Near it: {place.parent / near[0]}" if near else ""
        raise _sentence(f"{file}: there is no such file{hint}", file) from None
    except (OSError, ValueError) as error:
        raise BadTableau(f"cannot be read: {_why(error)}", file=file) from None
    if stat.S_ISDIR(status.st_mode):
        raise BadTableau("is a folder, not a file; name one of the .toml files in it", file=file)
    if not stat.S_ISREG(status.st_mode):
        raise BadTableau("is a device or pipe, not a file", file=file)
    if place.suffix != ".toml":
        raise BadTableau(f"ends in {place.suffix or 'nothing'}; a tableau file ends in .toml", file=file)
    if status.st_size > MOST_BYTES:
        raise BadTableau(f"{status.st_size:,} bytes; a tableau file has at most {MOST_BYTES:,}", file=file)
    try:
        with place.open("rb") as stream:
            data = stream.read(MOST_BYTES + 1)
        return data.decode("utf-8")
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        raise BadTableau(
            f"line {line}: byte {data[error.start]:#04x} is not UTF-8; save the file as UTF-8", file=file
        ) from None
    except OSError as error:
        raise BadTableau(f"cannot be read: {_why(error)}", file=file) from None


def _neighbours(folder: Path) -> list[str]:
    try:
        return sorted(entry.name for entry in folder.iterdir() if entry.suffix == ".toml")
    except OSError:
        return []


def _why(error: Exception) -> str:
    return str(getattr(error, "strerror", None) or error)


def parse_tableau(text: str, file: str = "tableau") -> Tableau:
    """Read a tableau from the text of a file.

    Args:
        text: TOML; a byte-order mark at its start is passed over.
        file: the name that errors give, and the tableau's `origin`.

    Raises:
        BadTableau: the text breaks a rule of the format; `file` and `key` say where.

    >>> parse_tableau('schema = "newel-tableau/2"', file="mine.toml")
    Traceback (most recent call last):
      ...
    newel.errors.BadTableau: mine.toml: schema: 'newel-tableau/2'; this newel reads "newel-tableau/1"
    """
    try:
        return tableau_of(_toml(text), file)
    except BadTableau as error:
        raise BadTableau(error.reason, file=file, key=error.key) from None


def read_document(path: str | os.PathLike[str]) -> dict[str, Any]:
    """Read what a tableau file holds, as plain data whose keys and values are not checked yet.

    Raises:
        BadTableau: the file cannot be read, or is no TOML.
    """
    file = str(path)
    try:
        return _toml(_read(Path(path), file))
    except BadTableau as error:
        raise error if error.file else BadTableau(error.reason, file=file, key=error.key) from None


def tableau_of(data: Mapping[str, Any], file: str) -> Tableau:
    """Make a tableau of what a file holds; `file` is the name that errors give, and the tableau's origin."""
    try:
        _check_keys(data)
        embedded, continuous = data.get("embedded", {}), data.get("continuous", {})
        return Tableau(
            data["slug"],
            order=data["order"],
            matrix=_strings(data["matrix"], "matrix"),
            weights=_strings(data["weights"], "weights"),
            nodes=_strings(data.get("nodes"), "nodes"),
            embedded_weights=_strings(embedded.get("weights"), "embedded.weights"),
            embedded_order=embedded.get("order"),
            continuous_weights=_strings(continuous.get("weights"), "continuous.weights"),
            continuous_order=continuous.get("order"),
            name=data["name"],
            also_called=data.get("also_called", ()),
            authors=data.get("authors", ()),
            year=data.get("year"),
            source=data["source"],
            numbers=data["numbers"],
            digits=data.get("digits"),
            notes=Notes(**data.get("notes", {})),
            storage=_storage(data.get("storage")),
            origin=file,
        )
    except BadTableau as error:
        raise BadTableau(error.reason, file=file, key=error.key) from None


def _toml(text: str) -> dict[str, Any]:
    import tomllib

    if len(text) > MOST_BYTES:
        raise BadTableau(f"{len(text):,} characters; a tableau file has at most {MOST_BYTES:,} bytes")
    text = text.removeprefix("\ufeff")
    if _LONG_INTEGER.search(text):
        raise BadTableau(_WRITE_TEXTS)
    try:
        return tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise _misread(str(error), text) from None
    except RecursionError:
        raise BadTableau("brackets are nested too deeply to be read") from None
    except ValueError:  # an integer beyond what this Python was told to read
        raise BadTableau(_WRITE_TEXTS) from None


def _misread(message: str, text: str) -> BadTableau:
    found = re.search(r"\s*\(at line (\d+), column (\d+)\)", message)
    if found is None:
        what = re.sub(r"\s*\(at end of document\)", "", message)
        return BadTableau(f"at the end of the file: {what}\n  A bracket or a quotation mark is left open.")
    line, column = int(found[1]), int(found[2])
    printed = text.split("\n")[line - 1].strip()
    hint = 'Texts and numbers stand in quotation marks: ["0", "1/2"].'
    if re.search("overwrite|declare|mutate", message):
        hint = "A key or table stands once in a file."
    what = f"line {line}, column {column}: {message[: found.start()]}"
    return BadTableau(f"{what}\n  {shown(printed)}\n  {hint}")


def _check_keys(data: Mapping[str, Any]) -> None:
    if data.get("schema", SCHEMA) != SCHEMA:
        raise BadTableau(f'{shown(data["schema"])}; this newel reads "{SCHEMA}"', key="schema")
    for key in data:
        _check_known(key, "")
    for table in ("embedded", "continuous", "storage", "notes"):
        value = data.get(table, {})
        if not isinstance(value, dict):
            raise BadTableau(f"{shown(value)} is no table; write [{table}] on a line of its own", key=table)
        for key in value:
            _check_known(key, table)
    for key, words in _TO_WRITE.items():
        if key not in data:
            raise BadTableau(f"missing; write {words}", key=key)


def _check_known(key: str, table: str) -> None:
    if key in _KNOWN[table]:
        return
    where = f" in [{table}]" if table else ""
    if table and key in _KNOWN[""]:
        raise BadTableau(f"unknown key{where}; it belongs above the first [table]", key=key)
    near = get_close_matches(key, _KNOWN[table], 1, 0.5)
    hint = f"; the nearest known key is {near[0]}" if near else ""
    raise BadTableau(f"unknown key{where}{hint}\n  Known{where}: {', '.join(_KNOWN[table])}.", key=key[:60])


def _storage(table: Mapping[str, Any] | None) -> Storage | None:
    if table is None:
        return None
    if "form" not in table:
        forms = ", ".join(f'"{name}"' for name in FORMS)
        raise BadTableau(f"missing; write form = one of {forms}", key="storage.form")
    arrays = {key: _strings(value, f"storage.{key}") for key, value in table.items() if key != "form"}
    return Storage(table["form"], **arrays)


def _strings(value: Any, key: str) -> Any:
    """Return `value` as it is, having found no TOML float in it: those have lost their digits already."""
    if isinstance(value, float):
        remedy = f'write it as a string: "{value!r}"' if isfinite(value) else "a coefficient is finite"
        raise BadTableau(f"{value!r} stands without quotation marks; {remedy}", key=key)
    if isinstance(value, list):
        for i, item in enumerate(value, 1):
            _strings(item, f"{key}[{i}]")
    return value


def write_tableau(tableau: Tableau, path: str | os.PathLike[str], overwrite: bool = False) -> None:
    """Write a tableau to a file, all of it or nothing.

    Args:
        tableau: what to write.
        path: the file, named after the slug: `folder/slug.toml`. Its folder exists.
        overwrite: whether a file that is there already may be replaced.

    Raises:
        OutputExists: the file is there already, and `overwrite` is False.
        OutputFailed: the folder is missing or cannot be written, or the disk is full.
        BadTableau: the file's name is not the slug, so that the file could not be read again.
    """
    place = Path(path)
    if place.is_dir():
        raise OutputFailed(str(place), f"is a folder; name the file: {place / tableau.slug}.toml")
    if place.name != f"{tableau.slug}.toml":
        raise BadTableau(f"a file of {tableau.slug!r} is named {tableau.slug}.toml", file=str(place))
    write_text(format_tableau(tableau), place, overwrite)
