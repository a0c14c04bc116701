"""A sink: one line for each row, the cells between bars."""

from __future__ import annotations

from pathlib import Path
from typing import IO, Any

import numpy as np
from numpy.typing import NDArray

from newel.errors import OutputExists
from newel.protocols import Head
from newel.results.run import Ended


class Ledger:
    """Writes rows as `| t | x | v |`, and says at the end how the march ended.

    Args:
        path: the file.
        overwrite: whether a file that is there may be replaced.
    """

    endings = (".ledger",)

    def __init__(self, path: str | Path, overwrite: bool = False) -> None:
        self.path = Path(path)
        self.overwrite = overwrite
        self._file: IO[str] | None = None

    def open(self, head: Head) -> None:
        """Begin the file with a line of labels."""
        try:
            self._file = self.path.open("w" if self.overwrite else "x", encoding="utf-8")
        except FileExistsError:
            raise OutputExists(str(self.path)) from None
        self._line("t", *head.labels)

    def write(self, times: NDArray[np.float64], states: NDArray[Any], events: tuple[str, ...]) -> None:
        """Write one line for each row."""
        for time, state in zip(times.tolist(), states.reshape(len(states), -1).tolist(), strict=True):
            self._line(time, *state)

    def close(self, ended: Ended) -> None:
        """Say how the march ended, and close the file."""
        if self._file is not None:
            self._line("ended", ended.reason)
            self._file.close()
            self._file = None

    def _line(self, *cells: object) -> None:
        if self._file is not None:
            self._file.write(f"| {' | '.join(map(str, cells))} |\n")
