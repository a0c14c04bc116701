"""The text of a tableau file, as it is written."""

from __future__ import annotations

import re
from collections.abc import Iterable

from newel.methods.tableau import Digits, Row, Tableau

__all__ = ["NOTE_KEYS", "SCHEMA", "format_tableau", "quoted"]

SCHEMA = "newel-tableau/1"
NOTE_KEYS = ("strengths", "weaknesses", "known_failures", "remarks")


def format_tableau(tableau: Tableau) -> str:
    """Return the text of a tableau's file, from which `parse_tableau` makes an equal one with the same texts.

    >>> t = Tableau("midpoint-2", order=2, matrix=[[], ["1/2"]], weights=[0, 1])
    >>> print(format_tableau(t))
    schema = "newel-tableau/1"
    slug = "midpoint-2"
    name = "midpoint-2"
    source = ""
    numbers = "derived"
    order = 2
    nodes = ["0", "1/2"]
    matrix = [
      [],
      ["1/2"],
    ]
    weights = ["0", "1"]
    <BLANKLINE>
    """
    t = tableau
    lines = [f'schema = "{SCHEMA}"', f"slug = {quoted(t.slug)}", f"name = {quoted(t.name)}"]
    lines += _texts("also_called", t.also_called) + _texts("authors", t.authors)
    lines += [] if t.year is None else [f"year = {t.year}"]
    lines += [f"source = {quoted(t.source)}", f"numbers = {quoted(t.numbers)}", f"order = {t.order}"]
    lines += _numbers("nodes", t.nodes)
    lines += _lines("matrix", (row[:i] for i, row in enumerate(t.matrix)))
    lines += _numbers("weights", t.weights) + _digits(t.digits)
    if t.embedded_weights is not None:
        lines += ["", "[embedded]", f"order = {t.embedded_order}", *_numbers("weights", t.embedded_weights)]
    if t.continuous_weights is not None:
        lines += ["", "[continuous]", f"order = {t.continuous_order}"]
        lines += _lines("weights", t.continuous_weights)
    if t.storage is not None:
        lines += ["", "[storage]", f"form = {quoted(t.storage.form)}"]
        for key, rows in t.storage.arrays().items():
            lines += _lines(key, rows) if isinstance(rows[0], tuple) else _numbers(key, rows)
        lines += _digits(t.storage.digits)
    notes = [line for key in NOTE_KEYS for line in _texts(key, getattr(t.notes, key))]
    lines += ["", "[notes]", *notes] if notes else []
    return "\n".join(lines) + "\n"


def quoted(text: str) -> str:
    """Return a text as a TOML string on one line.

    >>> print(quoted('a "b" \\\\ c'))
    "a \\"b\\" \\\\ c"
    """
    escaped = text.replace("\\", "\\\\").replace('"', '\\"')
    return '"' + re.sub(r"[\x00-\x1f\x7f-\x9f\u2028\u2029\ufeff]", _escaped, escaped) + '"'


def _escaped(match: re.Match[str]) -> str:
    return {"\n": "\\n", "\t": "\\t"}.get(match[0], f"\\u{ord(match[0]):04X}")


def _texts(key: str, texts: tuple[str, ...]) -> list[str]:
    if not texts:
        return []
    line = f"{key} = [{', '.join(map(quoted, texts))}]"
    if len(line) <= 100:
        return [line]
    return [f"{key} = [", *(f"  {quoted(text)}," for text in texts), "]"]


def _numbers(key: str, row: Row) -> list[str]:
    return f"{key} = {_wrapped(row, '')}".split("\n")


def _lines(key: str, rows: Iterable[Row]) -> list[str]:
    return [f"{key} = [", *(f"  {_wrapped(row, '  ')}," for row in rows), "]"]


def _wrapped(row: Row, indent: str) -> str:
    items = [quoted(str(x)) for x in row]
    if sum(map(len, items)) + 2 * len(items) <= 96:
        return f"[{', '.join(items)}]"
    body = "".join(f"{indent}  {item},\n" for item in items)
    return f"[\n{body}{indent}]"


def _digits(digits: int | Digits | None) -> list[str]:
    if not isinstance(digits, Digits):
        return [] if digits is None else [f"digits = {digits}"]
    pairs = (
        f"{quoted(k) if '[' in k else k} = {quoted(v) if isinstance(v, str) else v}"
        for k, v in digits.items()
    )
    return [f"digits = {{ {', '.join(pairs)} }}"]
