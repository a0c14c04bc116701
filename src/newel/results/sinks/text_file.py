"""What the sinks have in common that write rows as text: the file, its head, and rows as whole blocks."""

from __future__ import annotations

import os
from typing import TYPE_CHECKING, SupportsFloat, SupportsIndex

import numpy as np
from numpy.typing import NDArray

from newel.protocols import Array, Head
from newel.results.sinks.block_file import BlockFile
from newel.results.sinks.thinning import Times, thinning

if TYPE_CHECKING:
    from newel.results.run import Ended

__all__ = ["TextFile"]


class TextFile:
    """A sink that writes text. A kind says in `head_text` and `rows_text` what its text is.

    Args:
        path: the file; a pipe or a device works too.
        overwrite: whether a file that is there may be replaced.
        at, every_steps, every_time: one of them at most, for fewer rows; see `newel.protocols.Thinning`.

    Raises:
        BadRequest: for a thinning out of range. When opened: OutputExists, OutputFailed.
    """

    endings: tuple[str, ...] = ()

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
        self.has_events = False
        self._file = BlockFile(path, overwrite)
        self._head = ""

    def __str__(self) -> str:
        return self.path

    def __repr__(self) -> str:
        return f"{type(self).__name__}({self.path!r}, overwrite={self._file.overwrite}, {self.thinning!r})"

    def head_text(self, head: Head) -> str:
        """Return the text before the first row."""
        raise TypeError(f"{type(self).__name__} has no head_text")

    def rows_text(self, times: NDArray[np.float64], states: Array, events: tuple[str, ...]) -> str:
        """Return the text of n rows; `has_events` says whether they can carry a label."""
        raise TypeError(f"{type(self).__name__} has no rows_text")

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
        self._head, self.has_events = self.head_text(head), head.has_events
        self._file.open()

    def write(self, times: NDArray[np.float64], states: Array, events: tuple[str, ...]) -> None:
        """Append n rows in one piece. Raises OSError; the file then ends with the rows before these."""
        text = self.rows_text(times, states, events)
        self._file.write(text if self._file.started else self._head + text)

    def close(self, ended: Ended) -> None:
        """Close the file. Raises OSError."""
        self._file.finish(self._head)

    def discard(self) -> None:
        """Close the file because another sink could not open, and remove it if it is new."""
        self._file.discard()
