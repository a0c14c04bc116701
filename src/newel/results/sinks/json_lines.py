"""Rows in a file of JSON lines."""

from __future__ import annotations

import os
from collections.abc import Mapping
from typing import TYPE_CHECKING, Any, SupportsFloat, SupportsIndex

import numpy as np
from numpy.typing import NDArray

from newel.protocols import Array, Head
from newel.results.sinks.block_file import BlockFile
from newel.results.sinks.digits import cells, columns
from newel.results.sinks.thinning import Times, thinning

if TYPE_CHECKING:
    from newel.results.run import Ended

__all__ = ["JsonLines"]

_NO_NUMBERS = frozenset(("nan", "inf", "-inf"))


class JsonLines:
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

    def __init__(
        self,
        path: str | os.PathLike[str],
        overwrite: bool = False,
        *,
        at: Times | None = None,
        every_steps: SupportsIndex | None = None,
        every_time: SupportsFloat | None = None,
    ) -> None:
        self.thinning = thinning(at, every_steps, every_time)
        self._file = BlockFile(path, overwrite)
        self._head = ""
        self._has_events = False

    def __str__(self) -> str:
        return self.path

    def __repr__(self) -> str:
        return f"JsonLines({self.path!r}, overwrite={self._file.overwrite}, {self.thinning!r})"

    @property
    def path(self) -> str:
        """The file, as it was given."""
        return self._file.path

    @property
    def half_written(self) -> bool:
        """Whether a write failed and left part of a block behind."""
        return self._file.half_written

    def open(self, head: Head) -> None:
        """Make the file ready. Raises OutputExists or OSError; an old file stays till the first rows come."""
        self._head = _dumped(_head(head)) + "\n"
        self._has_events = head.has_events
        self._file.open()

    def write(self, times: NDArray[np.float64], states: Array, events: tuple[str, ...]) -> None:
        """Append n rows in one piece. Raises OSError; the file then ends with the rows before these."""
        rows = cells(times, states)
        if states.dtype.hasobject:
            rows = [list(map(_dumped, row)) for row in rows]
        elif not (np.isfinite(times).all() and np.isfinite(states).all()):
            rows = [[f'"{cell}"' if cell in _NO_NUMBERS else cell for cell in row] for row in rows]
        if self._has_events:
            rows = [[*row, _dumped(event)] for row, event in zip(rows, events, strict=True)]
        text = "".join([f"[{','.join(row)}]\n" for row in rows])
        self._file.write(text if self._file.started else self._head + text)

    def close(self, ended: Ended) -> None:
        """Close the file. Raises OSError."""
        self._file.finish(self._head)

    def discard(self) -> None:
        """Close the file because another sink could not open, and remove it if it is new."""
        self._file.discard()


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
