"""How the rows of a march reach its sinks."""

from __future__ import annotations

import heapq
import os
from collections.abc import Callable, Iterable, Iterator, Sequence
from functools import partial

from newel.errors import BadRequest
from newel.protocols import Array, Head, Sink
from newel.results.feeds import BLOCK_ROWS, Feed, Outlet, Uninterrupted, name_of
from newel.results.picking import Line, Pick, pick_for
from newel.results.run import Ended
from newel.results.sinks.memory import MemoryFull
from newel.results.sinks.thinning import checked

__all__ = ["Delivery"]


class Delivery:
    """Takes the rows of one march and hands each sink those that it asked for, in blocks.

    Every row goes to the sinks without thinning. A sink with `every_steps` gets the first row, each n-th,
    events and the last; one with `every_time` the multiples of its span from the start on, events and the
    last; one with `at` exactly its times. A time within four spacings of floats of an asked one is that one,
    and goes out as it was asked for.

    Besides the protocol, a sink may have: `thinning`; `path` (two sinks may not share one); `rows_at_once`
    (the most rows a block, so that 1 gives each row at once); `room` (how many rows still fit, or None: the
    march ends with the row that fills it); `require_room(rows, shape, dtype)`; `discard()` (takes back an
    `open`, because another sink could not); `half_written` (False when nothing is left of a failed block).

    Args:
        sinks: where rows go; the same object twice is an error.
        head: what each sink is told first.
        forward: whether time grows.
        start, stop: the ends of the march, in the model's time unit.

    Raises:
        BadRequest: for a path that two sinks share, or an asked time outside the march.

    >>> import numpy as np
    >>> from newel.results.sinks import Memory
    >>> head = Head(("x",), (), "s", (1,), np.dtype(float), False, {})
    >>> memory = Memory(every_steps=2)
    >>> delivery = Delivery([memory], head, True, 0.0, 3.0)
    >>> delivery.open()
    >>> for t in (0.0, 1.0, 2.0, 3.0):
    ...     delivery.row(t, np.array([t * t]))
    >>> delivery.close(Ended("stop", 3.0))
    >>> memory.times, delivery.counts
    (array([0., 2., 3.]), (3,))
    """

    def __init__(self, sinks: Sequence[Sink], head: Head, forward: bool, start: float, stop: float) -> None:
        self.head = head
        self._line = Line(float(start), float(stop), forward)
        _check_distinct(sinks)
        self._outlets = [Outlet(sink) for sink in sinks]
        self._picks = [pick_for(checked(getattr(sink, "thinning", None)), self._line) for sink in sinks]
        asking = [pick for pick in self._picks if pick is not None]
        self._landing = [pick for pick in asking if pick.next_after(self._line.start) is not None]
        self._every, self._thinned = self._feeds()
        self._lone = self._every[0].take if len(self._every) == 1 and not self._thinned else None
        self._open = False
        self.last_time: float | None = None

    def open(self) -> None:
        """Open all sinks or none: where one cannot, those before it are closed, files just made removed.

        Raises:
            OutputExists: if a file is there and not to be overwritten.
            OutputFailed: if an output cannot be written.
        """
        if self._open:
            raise BadRequest("this delivery is open already\n  Make one for each march.")
        try:
            for outlet in self._outlets:
                outlet.open(self.head)
        except BaseException:
            for outlet in self._outlets:
                outlet.discard(Ended("failed", self._line.start))
            raise
        for feed in self._every:
            feed.begin()
        for _, feed in self._thinned:
            feed.begin()
        self._open = True

    def row(self, t: float, y: Array, event: str = "", last: bool = False) -> None:
        """Take one row; y is copied.

        Args:
            t: the time. y: the state, of the head's shape. event: an event's label, or "".
            last: whether the march ends with this row; where that is not known, `close` sees to it.

        Raises:
            MemoryFull: when this row, which is kept, was the last that a memory sink takes.
            OutputFailed: when a sink failed; the others have the row.
        """
        if self._lone is not None and not last:
            # The usual case, one feed that takes every row: nothing has to be caught for another's sake.
            try:
                self._lone(t, y, event)
            except Exception:
                self.last_time = t
                raise
            self.last_time = t
            return
        error: Exception | None = None
        for feed in self._every:
            try:
                feed.take(t, y, event)
            except Exception as failure:
                error = error or failure
        for pick, feed in self._thinned:
            try:
                feed.offer(pick, t, y, event, last)
            except Exception as failure:
                error = error or failure
        self.last_time = t
        if error is not None and not (last and isinstance(error, MemoryFull)):
            raise error

    def complete(self, t: float, y: Array) -> None:
        """Take the last row of a march that was interrupted: no sink that has it gets it a second time.

        Raises:
            OutputFailed: when a sink failed; the others have the row.
        """
        actions = [partial(feed.take, t, y, "") for feed in self._every if not feed.holds(t)]
        actions += [
            partial(feed.offer, pick, t, y, "", True) for pick, feed in self._thinned if not feed.holds(t)
        ]
        self.last_time = t
        error = _attempt(actions)
        if error is not None:
            raise error

    def flush(self) -> None:
        """Hand over what has been gathered. Raises OutputFailed, after every sink has had its turn."""
        error = _attempt(feed.flush for feed in self._all_feeds())
        if error is not None:
            raise error

    def close(self, ended: Ended) -> None:
        """Hand over what is left and close every sink, whatever fails; does nothing the second time.

        Raises:
            OutputFailed: the first failure that was not raised before.
        """
        if not self._open:
            return
        error: Exception | None = None
        try:
            with Uninterrupted():
                error = _attempt(feed.finish for feed in self._all_feeds())
                after = _attempt(partial(outlet.close, ended) for outlet in self._outlets)
                error = error or after
                self._open = False
        finally:
            if error is not None:
                raise error

    def next_landing(self, t: float) -> float | None:
        """The next time after t, along the march, that a sink asks for by `at` or `every_time`, or None."""
        if not self._landing:
            return None
        now = float(t)
        times = [time for pick in self._landing if (time := pick.next_after(now)) is not None]
        return min(times, key=self._line.key, default=None)

    def landings(self) -> Iterator[float]:
        """All times that sinks ask for, in the order of the march, each once, computed as they are read."""
        before: float | None = None
        for time in heapq.merge(*(pick.landings() for pick in self._landing), key=self._line.key):
            if time != before:
                yield time
            before = time

    def require_room(self, steps: int) -> None:
        """Refuse a march of so many steps that cannot fit into a memory sink. Raises BadRequest."""
        for outlet, pick in zip(self._outlets, self._picks, strict=True):
            require = getattr(outlet.sink, "require_room", None)
            if callable(require):
                require(steps + 1 if pick is None else pick.rows(steps), self.head.shape, self.head.dtype)

    @property
    def counts(self) -> tuple[int, ...]:
        """How many rows each sink has taken so far, in the order of the sinks; final after `close`."""
        return tuple(outlet.rows for outlet in self._outlets)

    @property
    def safe_times(self) -> tuple[float | None, ...]:
        """The time of the last row that each sink has taken without an error, or None."""
        return tuple(outlet.safe_time for outlet in self._outlets)

    @property
    def names(self) -> tuple[str, ...]:
        """How each sink is called in messages and in `run.sinks`."""
        return tuple(name_of(outlet.sink) for outlet in self._outlets)

    def _feeds(self) -> tuple[tuple[Feed, ...], tuple[tuple[Pick, Feed], ...]]:
        """One feed for all that take every row in blocks; one each for the others."""
        shared: list[Outlet] = []
        every: list[Feed] = []
        thinned: list[tuple[Pick, Feed]] = []
        for outlet, pick in zip(self._outlets, self._picks, strict=True):
            most = getattr(outlet.sink, "rows_at_once", BLOCK_ROWS)
            if pick is not None:
                thinned.append((pick, Feed([outlet], self.head, most)))
            elif most < BLOCK_ROWS:
                every.append(Feed([outlet], self.head, most))
            else:
                shared.append(outlet)
        if shared:
            every.insert(0, Feed(shared, self.head))
        return tuple(every), tuple(thinned)

    def _all_feeds(self) -> list[Feed]:
        return [*self._every, *(feed for _, feed in self._thinned)]


def _attempt(actions: Iterable[Callable[[], None]]) -> Exception | None:
    """Do every one of these; the first error, or None."""
    first: Exception | None = None
    for action in actions:
        try:
            action()
        except Exception as error:
            first = first or error
    return first


def _check_distinct(sinks: Sequence[Sink]) -> None:
    objects: set[int] = set()
    places: dict[str, str] = {}
    for sink in sinks:
        if id(sink) in objects:
            raise BadRequest(
                f"sinks holds the same {type(sink).__name__} twice\n  Make one for each output.",
                argument="sinks",
            )
        objects.add(id(sink))
        path = getattr(sink, "path", None)
        if not isinstance(path, (str, os.PathLike)):
            continue
        place = os.path.realpath(path)
        if place in places:
            names = f"{places[place]} and {path}"
            raise BadRequest(
                f"two sinks write to one file: {names}; nothing was written\n  Give each its own.",
                argument="sinks",
            )
        places[place] = os.fspath(path)
