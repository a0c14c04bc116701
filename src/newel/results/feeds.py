"""Rows gathered in blocks and handed to sinks, and what happens when a sink fails."""

from __future__ import annotations

import errno
import math
from types import FrameType, TracebackType
from typing import Any

import numpy as np

from newel.errors import NewelError, OutputFailed
from newel.protocols import Array, Head, Sink
from newel.results.picking import Pick
from newel.results.run import Ended
from newel.results.sinks.memory import MemoryFull

__all__ = ["BLOCK_ROWS", "Feed", "Outlet", "Uninterrupted", "name_of"]

BLOCK_ROWS = 256
_BLOCK_BYTES = 1 << 20


def name_of(sink: Sink) -> str:
    """How messages and `run.sinks` name a sink: its path, or what `str` gives if its class defines that."""
    path = getattr(sink, "path", None)
    if path is not None:
        return str(path)
    return str(sink) if type(sink).__str__ is not object.__str__ else type(sink).__name__


class Outlet:
    """One sink, how far it has got, and whether it can go on."""

    def __init__(self, sink: Sink) -> None:
        self.sink: Any = sink
        self.rows = 0
        self.safe_time: float | None = None
        self.opened = self.failed = False
        self.handed = 0

    def open(self, head: Head) -> None:
        """Open the sink. Raises OutputFailed, or the NewelError that the sink raised."""
        try:
            self.sink.open(head)
        except NewelError:
            raise
        except Exception as error:
            raise OutputFailed(
                name_of(self.sink),
                f"{_reason(error, 'open')}; nothing was run\n  {_remedy(error)}",
            ) from error
        self.opened = True

    def write(self, times: Array, states: Array, events: tuple[str, ...]) -> None:
        """Hand over a block once. Raises OutputFailed, MemoryFull, or the NewelError that the sink raised."""
        if self.failed or self.handed:
            return
        self.handed = len(times)
        try:
            self.sink.write(times, states, events)
        except MemoryFull as full:
            self.failed, self.rows = True, full.rows
            raise
        except Exception as error:
            self.failed = True
            if isinstance(error, NewelError):
                raise
            place = f"in the rows from t = {float(times[0])!r} to {float(times[-1])!r}"
            text = f"{_reason(error, 'write')}, {place}\n  {self._kept()}\n  {_remedy(error)}"
            raise OutputFailed(name_of(self.sink), text) from error
        self.rows += len(times)
        self.safe_time = float(times[-1])

    def close(self, ended: Ended) -> None:
        """Close the sink, once. Raises OutputFailed unless an earlier failure was raised already."""
        if not self.opened:
            return
        self.opened = False
        try:
            self.sink.close(ended)
        except Exception as error:
            if self.failed:
                return
            self.failed = True
            if isinstance(error, NewelError):
                raise
            raise OutputFailed(
                name_of(self.sink),
                f"{_reason(error, 'close')}\n"
                f"  {self._rows()} were handed over; whether the last of them are there is not known.\n"
                f"  {_remedy(error)}",
            ) from error

    def discard(self, ended: Ended) -> None:
        """Take back an opening: another sink could not open. Raises nothing: that error is on its way."""
        if not self.opened:
            return
        self.opened = False
        discard = getattr(self.sink, "discard", None)
        try:
            if callable(discard):
                discard()
            else:
                self.sink.close(ended)
        except Exception:
            self.failed = True

    def _rows(self) -> str:
        if self.safe_time is None:
            return "no rows"
        return f"{self.rows:,} row{'s' if self.rows != 1 else ''} up to t = {self.safe_time!r}"

    def _kept(self) -> str:
        if getattr(self.sink, "half_written", True):
            return f"Kept: {self._rows()}; what may follow them there is part of a block."
        return f"Kept: {self._rows()}; nothing half-written follows them."


class Feed:
    """Sinks that get the same rows, and the block in which these are gathered.

    `take` is on the march's hot path: it writes into views that were made once and creates nothing a row.
    """

    def __init__(self, outlets: list[Outlet], head: Head, most_rows: int = BLOCK_ROWS) -> None:
        self.outlets = outlets
        row_bytes = 8 + head.dtype.itemsize * math.prod(head.shape)
        self._block = max(1, min(most_rows, BLOCK_ROWS, _BLOCK_BYTES // row_bytes))
        self._exact = head.dtype.hasobject
        self._times = np.empty(self._block, head.dtype if self._exact else np.float64)
        self._states = np.empty((self._block, *head.shape), head.dtype)
        self._rows = [self._states[i, ...] for i in range(self._block)]
        self._seen_times, self._seen_states = _sealed(self._times), _sealed(self._states)
        self._labels: dict[int, str] = {}
        self._no_labels = ("",) * self._block
        self._pending = False
        self._filled = 0
        self._capacity = self._block
        self._limited: list[Outlet] = []

    def begin(self) -> None:
        """Set the length of the first block, once the sinks are open."""
        self._limited = [outlet for outlet in self.outlets if getattr(outlet.sink, "room", None) is not None]
        self._capacity = max(1, min(self._block, self._room()))

    def take(self, time: float, state: Array, event: str) -> None:
        """Add a row. Raises MemoryFull when it was the last that fits, and OutputFailed."""
        filled = self._filled
        self._times[filled] = time
        self._rows[filled][...] = state
        if event:
            self._labels[filled] = event
        self._filled = filled = filled + 1
        if filled == self._capacity:
            self.flush()

    def offer(self, pick: Pick, time: float, state: Array, event: str, last: bool) -> None:
        """Add a row if it is asked for; else keep it in the free place: it may turn out to be the last."""
        asked = pick.wants(time, event, last)
        if asked is not None:
            self._pending = False
            self.take(time if self._exact else asked, state, event)
        elif pick.keeps_last:
            self._times[self._filled] = time
            self._rows[self._filled][...] = state
            self._pending = True

    def holds(self, time: float) -> bool:
        """Whether the last row that came in, taken or waiting, is that of this time."""
        if self._pending and self._times[self._filled] == time:
            return True
        if self._filled:
            return bool(self._times[self._filled - 1] == time)
        return any(outlet.safe_time == float(time) for outlet in self.outlets)

    def finish(self) -> None:
        """Hand over what is left, the last row of the march included."""
        if self._pending:
            self._pending = False
            self._filled += 1
        self.flush(ending=True)

    def flush(self, ending: bool = False) -> None:
        """Hand over the block. Raises the first error, after every sink has had its turn."""
        filled = self._filled
        if not filled:
            return
        error: Exception | None = None
        try:
            with Uninterrupted(self._block > 1):
                error = self._hand_over(filled)
        finally:
            # a lost output comes before a Ctrl-C: both end the march, and only one of the two has to be told
            if error is not None:
                raise error
        room = self._room()
        self._capacity = max(1, min(self._block, room))
        if not room and not ending:
            raise MemoryFull(max(outlet.rows for outlet in self.outlets), self._limit())

    def _hand_over(self, filled: int) -> Exception | None:
        """Each sink gets the block once, even where Ctrl-C comes between two and the end flushes again."""
        events = self._no_labels[:filled]
        if self._labels:
            events = tuple(self._labels.get(i, "") for i in range(filled))
        times, states = self._seen_times[:filled], self._seen_states[:filled]
        first: Exception | None = None
        for outlet in self.outlets:
            try:
                outlet.write(times, states, events)
            except Exception as error:
                first = first or error
        for outlet in self.outlets:
            outlet.handed = 0
        if self._pending:
            self._times[0] = self._times[filled]
            self._rows[0][...] = self._rows[filled]
        self._labels.clear()
        self._filled = 0
        return first

    def _room(self) -> int:
        """The rows that still fit into the sinks that say so."""
        if not self._limited:
            return self._block
        return min(
            (int(outlet.sink.room) for outlet in self._limited if not outlet.failed), default=self._block
        )

    def _limit(self) -> int:
        return min((int(getattr(outlet.sink, "limit", 0)) for outlet in self._limited), default=0)


def _sealed(array: Array) -> Array:
    view = array.view()
    view.flags.writeable = False
    return view


def _reason(error: Exception, action: str) -> str:
    if isinstance(error, OSError) and error.strerror:
        return error.strerror[:1].lower() + error.strerror[1:]
    return f"{action} raised {type(error).__name__}: {error}"


def _remedy(error: Exception) -> str:
    if not isinstance(error, OSError):
        return "The sink's own code raised this: see the cause of this error (error.__cause__)."
    if error.errno in (errno.ENOENT, errno.ENOTDIR):
        return "Make the folder first, or give another path."
    if error.errno == errno.EISDIR:
        return "Give the name of a file in it."
    if error.errno in (errno.EACCES, errno.EPERM, errno.EROFS):
        return "Give a place where you may write."
    if error.errno in (errno.ENOSPC, errno.EFBIG, errno.EDQUOT):
        return "Make room or give another place, and march again."
    return "Give another place, and march again."


class Uninterrupted:
    """Holds Ctrl-C back while a block goes out, so that every sink has it or none; a second one goes through.

    It acts only where Python's own handler is in force, and in the main thread.
    """

    def __init__(self, wanted: bool = True) -> None:
        self._wanted = wanted
        self._held = 0
        self._before: Any = None

    def __enter__(self) -> Uninterrupted:
        if self._wanted:
            import signal
            import threading

            ours = threading.current_thread() is threading.main_thread()
            if ours and signal.getsignal(signal.SIGINT) is signal.default_int_handler:
                self._before = signal.signal(signal.SIGINT, self._hold)
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        if self._before is not None:
            import signal

            signal.signal(signal.SIGINT, self._before)
            if self._held == 1:
                raise KeyboardInterrupt

    def _hold(self, number: int, frame: FrameType | None) -> None:
        self._held += 1
        if self._held > 1:
            raise KeyboardInterrupt
