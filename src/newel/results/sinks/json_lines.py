"""Rows in a file of JSON lines."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from newel.protocols import Array, Head
from newel.results.sinks.digits import cells, columns
from newel.results.sinks.text_file import TextFile

__all__ = ["JsonLines"]

_NO_NUMBERS = frozenset(("nan", "inf", "-inf"))


class JsonLines(TextFile):
    """Writes rows to a file with one JSON value a line, in UTF-8.

    The first line is the head, an object with `schema` ("newel-rows/1"), `method`, `digest`, `columns`,
    `labels`, `units`, `time_unit`, `shape`, `dtype`, and what else the march says about itself, such as
    `settings`. Each line after it is an array that goes with `columns`: the time, the entries in C order, and
    the event's label where the model has events. NaN and infinity are the texts "nan", "inf", "-inf"; times
    and entries of object states are texts. A complex entry has two columns, `label.re` and `label.im`.

    Args:
        path: the file; a pipe or a device works too.
        overwrite: whether a file that is there may be replaced.
        at, every_steps, every_time: one of them at most, for fewer rows; see `newel.protocols.Thinning`.

    Raises:
        BadRequest: for a thinning out of range. When opened: OutputExists, OutputFailed.

    >>> JsonLines("lock.jsonl", at=[0.0, 60.0])
    JsonLines('lock.jsonl', overwrite=False, Thinning(at=(0.0, 60.0), every_steps=None, every_time=None))
    """

    endings = (".jsonl", ".ndjson")

    def head_text(self, head: Head) -> str:
        """Return the head as one line."""
        return _dumped(_head(head)) + "\n"

    def rows_text(self, times: NDArray[np.float64], states: Array, events: tuple[str, ...]) -> str:
        """Return n lines, an array each."""
        rows = cells(times, states)
        if states.dtype.hasobject:
            rows = [list(map(_dumped, row)) for row in rows]
        elif not (np.isfinite(times).all() and np.isfinite(states).all()):
            rows = [[f'"{cell}"' if cell in _NO_NUMBERS else cell for cell in row] for row in rows]
        if self.has_events:
            rows = [[*row, _dumped(event)] for row, event in zip(rows, events, strict=True)]
        return "".join([f"[{','.join(row)}]\n" for row in rows])


def _head(head: Head) -> dict[str, Any]:
    return {
        "schema": "newel-rows/1",
        "method": None,
        "digest": None,
        **head.about,
        "columns": columns(head),
        "labels": list(head.labels),
        "units": head.units,
        "time_unit": head.time_unit,
        "shape": head.shape,
        "dtype": head.dtype.name,
    }


def _dumped(value: Any) -> str:
    import json

    return json.dumps(_plain(value), ensure_ascii=False, allow_nan=False)


def _plain(value: Any) -> Any:
    """The value in JSON's own terms: NaN and infinity as text, and whatever else is unknown by `str`."""
    if isinstance(value, Mapping):
        return {str(key): _plain(item) for key, item in value.items()}
    if isinstance(value, (list, tuple)):
        return [_plain(item) for item in value]
    if isinstance(value, (np.generic, np.ndarray)):
        return _plain(value.tolist()) if value.dtype.kind in "biuf" else str(value)
    if isinstance(value, float):
        return value if np.isfinite(value) else str(value)
    return value if value is None or isinstance(value, (str, int)) else str(value)
