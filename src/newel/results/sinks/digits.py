"""Numbers as text: the shortest digits that read back the same."""

from __future__ import annotations

from typing import Any

import numpy as np

from newel.protocols import Array, Head

__all__ = ["cells", "columns"]


def columns(head: Head) -> tuple[str, ...]:
    """The names of the columns: `t`, a name an entry, and `event` where rows can carry one.

    A complex entry has two columns, `label.re` and `label.im`.
    """
    labels: tuple[str, ...] = tuple(head.labels)
    if head.dtype.kind == "c":
        labels = tuple(f"{label}.{part}" for label in labels for part in ("re", "im"))
    return ("t", *labels, *(("event",) if head.has_events else ()))


def cells(times: Array, states: Array) -> list[list[str]]:
    """One list a row: the time and the entries in C order, as text that reads back as the same number.

    Args:
        times: shape (n,).
        states: shape (n, *state shape); real, complex or object (whose entries are written by `str`).

    >>> cells(np.array([0.1]), np.array([[1 / 3, 1e22]]))
    [['0.1', '0.3333333333333333', '1e+22']]
    """
    flat = states.reshape(len(times), -1)
    if flat.dtype.kind == "c":
        flat = np.ascontiguousarray(flat).view(flat.real.dtype)
    if flat.dtype == np.float64:
        table = np.empty((len(times), 1 + flat.shape[1]))
        table[:, 0] = times
        table[:, 1:] = flat
        return [list(map(repr, row)) for row in table.tolist()]
    stamps = [_time(t) for t in times.tolist()]
    return [[stamp, *row] for stamp, row in zip(stamps, _entries(flat), strict=True)]


def _time(time: Any) -> str:
    return repr(time) if isinstance(time, float) else str(time)


def _entries(flat: Array) -> list[list[str]]:
    if flat.dtype == np.float32:
        shortest: list[list[str]] = flat.astype(str).tolist()
        return shortest
    return [[_time(x) for x in row] for row in flat.tolist()]
