"""Which rows a thinned sink gets, and on which times the march must land for it."""

from __future__ import annotations

import math
from bisect import bisect_right
from collections.abc import Iterator
from typing import Protocol

import attrs

from newel.errors import BadRequest
from newel.protocols import Thinning

__all__ = ["AtTimes", "EverySpan", "EverySteps", "Line", "Pick", "pick_for"]

_NEAR = 4
"""Times that differ by at most so many spacings of floats are one time: grids are computed with roundings."""


@attrs.frozen
class Line:
    """The stretch of time that is marched, from `start` to `stop`, in either direction."""

    start: float
    stop: float
    forward: bool

    def key(self, time: float) -> float:
        """A number that grows along the march."""
        return time if self.forward else -time

    def blur(self, time: float) -> float:
        """How far apart two times may be and still be one; small near a start at 0, for dense outputs."""
        return _NEAR * math.ulp(max(abs(self.start), abs(time)))

    def snapped(self, time: float) -> float:
        """The time, or the end of the line that is the same but for rounding."""
        for end in (self.start, self.stop):
            if abs(time - end) <= self.blur(end):
                return end
        return time

    def span_text(self) -> str:
        """The stretch as messages name it."""
        return f"from {self.start!r} to {self.stop!r}"


class Pick(Protocol):
    """Says row by row whether a sink gets it."""

    keeps_last: bool
    """Whether the last row goes to the sink too, wherever the march ends."""

    def wants(self, time: float, event: str, last: bool) -> float | None:
        """The time under which the sink gets this row, or None."""
        ...

    def next_after(self, time: float) -> float | None:
        """The next time on which the march must land, or None."""
        ...

    def landings(self) -> Iterator[float]:
        """All times on which the march must land, in its order."""
        ...

    def rows(self, steps: int) -> int:
        """The most rows that a march of so many steps gives, events apart."""
        ...


class EverySteps:
    """Each n-th accepted step, events, the first and the last row."""

    keeps_last = True

    def __init__(self, every: int) -> None:
        self._every, self._seen = every, 0

    def wants(self, time: float, event: str, last: bool) -> float | None:
        """The time, if the count or the event or the end calls for the row."""
        due = self._seen % self._every == 0
        self._seen += 1
        return time if due or event or last else None

    def next_after(self, time: float) -> float | None:
        """None: any step will do."""
        return None

    def landings(self) -> Iterator[float]:
        """None."""
        return iter(())

    def rows(self, steps: int) -> int:
        """The first, each n-th, and the last."""
        return 1 + math.ceil(steps / self._every)


class AtTimes:
    """The asked times and nothing else; an event's row goes there only where it falls on one."""

    keeps_last = False

    def __init__(self, times: tuple[float, ...], line: Line) -> None:
        snapped = [line.snapped(time) for time in times]
        for time, asked in zip(snapped, times, strict=True):
            if not line.key(line.start) <= line.key(time) <= line.key(line.stop):
                raise BadRequest(
                    f"at holds {asked!r}; this march goes {line.span_text()}\n"
                    f"  Leave that time away, or change the model's start or stop.",
                    argument="at",
                )
        self._line = line
        self._keys = sorted(set(map(line.key, snapped)))
        self._next = 0

    def wants(self, time: float, event: str, last: bool) -> float | None:
        """The asked time that this one is, but for rounding."""
        if self._next == len(self._keys):
            return None
        due, key = self._keys[self._next], self._line.key(time)
        if key < due - self._line.blur(due):
            return None
        if key > due + self._line.blur(due):
            raise BadRequest(
                f"the march went on to t = {time!r} without landing on {self._line.key(due)!r}, for which"
                f" at asked\n"
                f"  Give times of the march's own grid, or an adaptive step rule, which lands on each.",
                argument="at",
            )
        self._next += 1
        return self._line.key(due)

    def next_after(self, time: float) -> float | None:
        """The next asked time."""
        index = bisect_right(self._keys, self._line.key(time) + self._line.blur(time))
        return self._line.key(self._keys[index]) if index < len(self._keys) else None

    def landings(self) -> Iterator[float]:
        """The asked times."""
        return map(self._line.key, self._keys)

    def rows(self, steps: int) -> int:
        """As many as times."""
        return len(self._keys)


class EverySpan:
    """start, start + span, start + 2·span, …, events, and the last row."""

    keeps_last = True

    def __init__(self, span: float, line: Line) -> None:
        if span <= 2 * line.blur(line.stop):
            raise BadRequest(
                f"every_time={span!r} is below what floats can tell apart {line.span_text()}\n"
                f"  Give a longer span.",
                argument="every_time",
            )
        self._line, self._span, self._due = line, span, 0
        self._last = 0
        count = math.floor(abs(line.stop - line.start) / span) + 1
        while count and line.key(self._time(count)) > line.key(line.stop):
            count -= 1
        self._last = count

    def wants(self, time: float, event: str, last: bool) -> float | None:
        """The multiple that this time is, but for rounding; else the time of an event or of the end."""
        line, key = self._line, self._line.key(time)
        due = self._time(self._due)
        if self._due > self._last or key < line.key(due) - line.blur(due):
            return time if event or last else None
        if key > line.key(due) + line.blur(due):
            raise BadRequest(
                f"the march went on to t = {time!r} without landing on {due!r}, for which"
                f" every_time={self._span!r} asked\n"
                f"  Give a multiple of the step, or an adaptive step rule, which lands on each.",
                argument="every_time",
            )
        self._due += 1
        return due

    def next_after(self, time: float) -> float | None:
        """The next multiple."""
        line = self._line
        passed = line.key(time) + line.blur(time)
        index = max(0, math.floor((line.key(time) - line.key(line.start)) / self._span))
        while index <= self._last and line.key(self._time(index)) <= passed:
            index += 1
        return self._time(index) if index <= self._last else None

    def landings(self) -> Iterator[float]:
        """The multiples, each computed when it is asked for."""
        return map(self._time, range(self._last + 1))

    def rows(self, steps: int) -> int:
        """The multiples, and the last row."""
        return min(steps + 1, self._last + 2)

    def _time(self, index: int) -> float:
        """One rounding, never a running sum."""
        distance = index * self._span
        return self._line.snapped(self._line.start + (distance if self._line.forward else -distance))


def pick_for(asked: Thinning, line: Line) -> Pick | None:
    """What this thinning means on this line; None where every row is asked for. Raises BadRequest."""
    if asked.at is not None:
        return AtTimes(asked.at, line)
    if asked.every_steps is not None:
        return EverySteps(asked.every_steps)
    if asked.every_time is not None:
        return EverySpan(asked.every_time, line)
    return None
