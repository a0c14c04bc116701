"""Rows in a CSV file."""

from __future__ import annotations

import os
from typing import TYPE_CHECKING, SupportsFloat, SupportsIndex

import numpy as np
from numpy.typing import NDArray

from newel.protocols import Array, Head
from newel.results.sinks.block_file import BlockFile
from newel.results.sinks.digits import cells, columns
from newel.results.sinks.thinning import Times, thinning

if TYPE_CHECKING:
    from newel.results.run import Ended

__all__ = ["Csv"]

_LINE_END = "\r\n"


class Csv:
    """Writes rows to a CSV file: UTF-8, lines and quotes as RFC 4180 has them (so lines end in CR LF).

    The first row is `t` and the labels. Numbers have the shortest digits that read back the same; NaN and
    infinity are `nan`, `inf`, `-inf`. A complex entry has two columns, `label.re` and `label.im`; entries of
    object states are written by `str`. A last column `event` is there exactly when the model has events.

    Args:
        path: the file; a pipe or a device works too.
        overwrite: whether a file that is there may be replaced.
        at, every_steps, every_time: one of them at most, for fewer rows; see `newel.protocols.Thinning`.

    Raises:
        BadRequest: for a thinning out of range. When opened: OutputExists, OutputFailed.

    >>> Csv("lock.csv", every_time=60.0)
    Csv('lock.csv', overwrite=False, Thinning(at=None, every_steps=None, every_time=60.0))
    """

    endings = (".csv",)

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
        return f"Csv({self.path!r}, overwrite={self._file.overwrite}, {self.thinning!r})"

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
        self._head = ",".join(map(_quoted, columns(head))) + _LINE_END
        self._has_events = head.has_events
        self._file.open()

    def write(self, times: NDArray[np.float64], states: Array, events: tuple[str, ...]) -> None:
        """Append n rows in one piece. Raises OSError; the file then ends with the rows before these."""
        rows = cells(times, states)
        if states.dtype.hasobject:
            rows = [list(map(_quoted, row)) for row in rows]
        lines = list(map(",".join, rows))
        if self._has_events:
            lines = [f"{line},{_quoted(event)}" for line, event in zip(lines, events, strict=True)]
        lines.append("")
        self._file.write(("" if self._file.started else self._head) + _LINE_END.join(lines))

    def close(self, ended: Ended) -> None:
        """Close the file. Raises OSError."""
        self._file.finish(self._head)

    def discard(self) -> None:
        """Close the file because another sink could not open, and remove it if it is new."""
        self._file.discard()


def _quoted(text: str) -> str:
    """A field as RFC 4180 has it, section 2, rules 5 to 7."""
    if any(mark in text for mark in ',"\r\n'):
        return '"' + text.replace('"', '""') + '"'
    return text
