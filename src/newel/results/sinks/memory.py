"""Rows kept in memory, up to a limit."""

from __future__ import annotations

import math
import operator
import os
from typing import TYPE_CHECKING, Any, SupportsFloat, SupportsIndex

import numpy as np
from numpy.typing import DTypeLike, NDArray

from newel.errors import BadRequest
from newel.protocols import Array, Head
from newel.results.sinks.thinning import Times, thinning

if TYPE_CHECKING:
    from newel.results.run import Ended

__all__ = ["Memory", "MemoryFull", "bytes_as_text", "free_memory"]

_MOST = 4 << 30
_CHUNK = 64 << 20
_FIRST_ROWS = 256


class MemoryFull(Exception):
    """A memory sink has reached its limit: a signal for the driver, which then ends the march.

    All rows up to then stay. Attributes: `rows` (how many are kept), `limit` (bytes).
    """

    def __init__(self, rows: int, limit: int) -> None:
        self.rows, self.limit = rows, limit
        super().__init__(f"{rows:,} rows fill the memory sink; its limit is {bytes_as_text(limit)}")


class Memory:
    """Keeps rows in memory: `run.times`, `run.states`.

    The limit counts times and states: 8 bytes and the state's own a row (a pointer for each entry of an
    object state). Rows are kept in pieces and put together at the end, one piece after the other, so that
    the peak lies at most 64 MiB (or one row) above what is kept.

    Args:
        limit: the most bytes to keep; None is a quarter of the free memory, at most 4 GiB.
        at, every_steps, every_time: one of them at most, for fewer rows; see `newel.protocols.Thinning`.

    Attributes:
        times: shape (N,), float64 (object for object states), in the model's time unit.
        states: shape (N, *state shape), of the state's dtype, in its units.
        events: N labels ("" where there is none), or None where the model has no events.

    Raises:
        BadRequest: for a limit or a thinning out of range.

    >>> memory = Memory(limit=1_000_000, every_steps=10)
    >>> memory.size_of(rows=1000, shape=(3,), dtype="float64")
    32000
    """

    def __init__(
        self,
        limit: SupportsIndex | float | None = None,
        *,
        at: Times | None = None,
        every_steps: SupportsIndex | None = None,
        every_time: SupportsFloat | None = None,
    ) -> None:
        self._limit = None if limit is None else _checked_limit(limit)
        self.thinning = thinning(at, every_steps, every_time)
        self._clear((), np.dtype(float), False)

    def __str__(self) -> str:
        return "memory"

    def __repr__(self) -> str:
        return f"Memory(limit={self._limit!r}, {self.thinning!r})"

    @property
    def limit(self) -> int:
        """The most bytes that are kept; the default is fixed when it is first asked for."""
        if self._limit is None:
            self._limit = min(free_memory() // 4, _MOST)
        return self._limit

    @staticmethod
    def size_of(rows: int, shape: tuple[int, ...], dtype: DTypeLike) -> int:
        """The bytes that this many rows of such states take, their times included."""
        return rows * (8 + np.dtype(dtype).itemsize * math.prod(shape))

    def require_room(self, rows: int, shape: tuple[int, ...], dtype: DTypeLike) -> None:
        """Refuse a march of known length that cannot fit.

        Raises:
            BadRequest: with the size needed, the limit, and the ways out.
        """
        needed = self.size_of(rows, shape, dtype)
        if needed <= self.limit:
            return
        count = math.prod(shape)
        what = f"{rows:,} row{'s' if rows != 1 else ''} of {count:,} {np.dtype(dtype).name}"
        sizes = f"need {bytes_as_text(needed)}; the limit is {bytes_as_text(self.limit)}"
        raise BadRequest(
            f"{what} {sizes}. Nothing was run.\n"
            f'  at=[...], every_steps=100, sinks="rows.csv", or sinks=newel.sinks.Memory(limit=...)',
            argument="sinks",
        )

    @property
    def room(self) -> int:
        """How many more rows fit under the limit, once open."""
        return max(0, self.limit // self.size_of(1, self._shape, self._dtype) - self._kept)

    def open(self, head: Head) -> None:
        """Start anew; an earlier march's rows stay with its run. Raises BadRequest if not one row fits."""
        self._clear(head.shape, head.dtype, head.has_events)
        self.require_room(1, head.shape, head.dtype)

    def write(self, times: NDArray[np.float64], states: Array, events: tuple[str, ...]) -> None:
        """Copy n rows. Raises MemoryFull when the limit is reached; the rows that fit are kept."""
        taken = min(len(times), self.room)
        done = 0
        while done < taken:
            done += self._fill(times[done:taken], states[done:taken], events[done:taken])
        if taken < len(times):
            raise MemoryFull(self._kept, self.limit)

    def close(self, ended: Ended) -> None:
        """Put the pieces together."""
        self._gather()

    @property
    def times(self) -> NDArray[np.float64]:
        """The times of the kept rows, shape (N,)."""
        self._gather()
        times: NDArray[np.float64] = self._chunks[0][0][: self._kept]
        return times

    @property
    def states(self) -> Array:
        """The kept states, shape (N, *state shape)."""
        self._gather()
        return self._chunks[0][1][: self._kept]

    @property
    def events(self) -> tuple[str, ...] | None:
        """A label a row ("" where there is none), or None where the model has no events."""
        if not self._has_events:
            return None
        return tuple(self._labels.get(row, "") for row in range(self._kept))

    def _clear(self, shape: tuple[int, ...], dtype: np.dtype[Any], has_events: bool) -> None:
        self._shape, self._dtype, self._has_events = tuple(shape), dtype, has_events
        self._time_dtype = dtype if dtype.hasobject else np.dtype(np.float64)
        self._labels: dict[int, str] = {}
        self._kept = self._filled = 0
        self._chunks = [self._chunk(0)]

    def _chunk(self, rows: int) -> tuple[Array, Array]:
        return np.empty(rows, self._time_dtype), np.empty((rows, *self._shape), self._dtype)

    def _fill(self, times: Array, states: Array, events: tuple[str, ...]) -> int:
        """Copy into the last chunk what it takes; the counters come last, so that no half row counts."""
        if self._filled == len(self._chunks[-1][0]):
            largest = max(1, _CHUNK // self.size_of(1, self._shape, self._dtype))
            self._chunks.append(self._chunk(min(max(_FIRST_ROWS, self._kept), largest, self.room)))
            self._filled = 0
        chunk_times, chunk_states = self._chunks[-1]
        start = self._filled
        count = min(len(times), len(chunk_times) - start)
        chunk_times[start : start + count] = times[:count]
        chunk_states[start : start + count] = states[:count]
        if any(events):
            self._labels |= {self._kept + i: label for i, label in enumerate(events[:count]) if label}
        self._filled += count
        self._kept += count
        return count

    def _gather(self) -> None:
        """Make the chunks one, and let go of each as soon as it is copied."""
        if len(self._chunks) == 1 and len(self._chunks[0][0]) == self._kept:
            return
        whole = self._chunk(self._kept)
        chunks, self._chunks, done = self._chunks, [whole], 0
        chunks.reverse()
        while chunks:
            times, states = chunks.pop()
            count = min(len(times), self._kept - done)
            whole[0][done : done + count] = times[:count]
            whole[1][done : done + count] = states[:count]
            done += count
        self._filled = self._kept


def _checked_limit(limit: SupportsIndex | float) -> int:
    try:
        number = int(limit) if isinstance(limit, float) else operator.index(limit)
    except (TypeError, ValueError, OverflowError):
        number = 0
    if number < 1 or isinstance(limit, bool):
        remedy = "Give a number of bytes, such as 2e9, or None."
        raise BadRequest(f"limit={limit!r}\n  {remedy}", argument="limit")
    return number


def bytes_as_text(count: int) -> str:
    """A number of bytes as people read it.

    >>> bytes_as_text(4 << 30)
    '4.0 GiB'
    """
    if count < 1024:
        return f"{count} bytes"
    size, units = count / 1024, ["KiB", "MiB", "GiB", "TiB"]
    while size >= 1024 and len(units) > 1:
        size /= 1024
        units.pop(0)
    return f"{size:.1f} {units[0]}" if size < 10 else f"{size:,.0f} {units[0]}"


def free_memory() -> int:
    """The bytes that this process may still take: what the machine has left, or its container's limit."""
    return min(_machine_memory(), _container_memory())


def _machine_memory() -> int:
    try:
        with open("/proc/meminfo", encoding="ascii") as lines:
            for line in lines:
                if line.startswith("MemAvailable:"):
                    return int(line.split()[1]) * 1024
    except (OSError, ValueError):
        pass
    try:
        return int(os.sysconf("SC_PAGE_SIZE")) * int(os.sysconf("SC_PHYS_PAGES"))
    except (AttributeError, OSError, ValueError):
        return 4 * _MOST


def _container_memory() -> int:
    try:
        with open("/sys/fs/cgroup/memory.max", encoding="ascii") as allowed:
            most = int(allowed.read())
        with open("/sys/fs/cgroup/memory.current", encoding="ascii") as used:
            return max(0, most - int(used.read()))
    except (OSError, ValueError):
        return 1 << 62
