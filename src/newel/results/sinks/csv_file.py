"""Rows in a CSV file."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from newel.protocols import Array, Head
from newel.results.sinks.digits import cells, columns
from newel.results.sinks.text_file import TextFile

__all__ = ["Csv"]

_LINE_END = "\r\n"


class Csv(TextFile):
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

    def head_text(self, head: Head) -> str:
        """Return `t` and the labels as a line."""
        return ",".join(map(_quoted, columns(head))) + _LINE_END

    def rows_text(self, times: NDArray[np.float64], states: Array, events: tuple[str, ...]) -> str:
        """Return n lines."""
        rows = cells(times, states)
        if states.dtype.hasobject:
            rows = [list(map(_quoted, row)) for row in rows]
        lines = list(map(",".join, rows))
        if self.has_events:
            lines = [f"{line},{_quoted(event)}" for line, event in zip(lines, events, strict=True)]
        lines.append("")
        return _LINE_END.join(lines)


def _quoted(text: str) -> str:
    """A field as RFC 4180 has it, section 2, rules 5 to 7."""
    if any(mark in text for mark in ',"\r\n'):
        return '"' + text.replace('"', '""') + '"'
    return text
