"""Which rows a sink is given: the three arguments that every shipped sink has, checked in one place."""

from __future__ import annotations

import math
import operator
from collections.abc import Iterable
from typing import Any, SupportsFloat, SupportsIndex

import numpy as np

from newel.errors import BadRequest
from newel.protocols import Thinning

__all__ = ["Times", "checked", "thinning"]

Times = Iterable[SupportsFloat] | SupportsFloat
"""One time or several, in the model's time unit."""

_FORMS = (
    "  at=[...]        rows at these times\n"
    "  every_steps=n   each n-th accepted step, the first and the last row\n"
    "  every_time=span each span of time from the start on, and the last row"
)


def thinning(
    at: Times | None = None, every_steps: SupportsIndex | None = None, every_time: SupportsFloat | None = None
) -> Thinning:
    """Check the three arguments by which a sink asks for fewer rows.

    Args:
        at: times in the model's time unit, in any order; the march lands on each.
        every_steps: 1 or more; each n-th accepted step, the first and the last row.
        every_time: a positive span in the model's time unit, counted from the start; and the last row.

    Returns:
        The same, as floats and ints.

    Raises:
        BadRequest: if two of them are given, or one is out of range.

    >>> thinning(every_steps=10)
    Thinning(at=None, every_steps=10, every_time=None)
    """
    given = {"at": at, "every_steps": every_steps, "every_time": every_time}
    named = [name for name, value in given.items() if value is not None]
    if len(named) > 1:
        both = " and ".join(named)
        raise BadRequest(f"{both} are given together; a sink takes one of\n{_FORMS}", argument=named[1])
    return Thinning(
        at=None if at is None else _times(at),
        every_steps=None if every_steps is None else _count(every_steps),
        every_time=None if every_time is None else _span(every_time),
    )


def checked(asked: Thinning | None) -> Thinning:
    """Check a thinning that somebody else made, such as a plugin's sink. Raises BadRequest."""
    if asked is None:
        return Thinning()
    return thinning(at=asked.at, every_steps=asked.every_steps, every_time=asked.every_time)


def _times(at: Times) -> tuple[float, ...]:
    asked: list[Any] = np.ravel(at).tolist() if isinstance(at, np.ndarray) else _listed(at)
    try:
        times = tuple(float(time) for time in asked)
    except (TypeError, ValueError):
        times = (math.nan,)
    if not times:
        raise BadRequest("at=[] asks for no row at all\n  Leave at away for every step.", argument="at")
    if not all(map(math.isfinite, times)) or any(isinstance(time, str) for time in asked):
        raise BadRequest(f"at={at!r} holds something that is no time\n  Give finite numbers.", argument="at")
    return times


def _listed(at: Times) -> list[Any]:
    return list(at) if isinstance(at, Iterable) else [at]


def _count(every_steps: SupportsIndex) -> int:
    try:
        count = operator.index(every_steps)
    except TypeError:
        count = 0
    if count < 1 or isinstance(every_steps, bool):
        remedy = "Give a whole number, 1 or more."
        raise BadRequest(f"every_steps={every_steps!r}\n  {remedy}", argument="every_steps")
    return count


def _span(every_time: SupportsFloat) -> float:
    try:
        span = float(every_time)
    except (TypeError, ValueError):
        span = math.nan
    if not (math.isfinite(span) and span > 0):
        raise BadRequest(
            f"every_time={every_time!r}\n  Give a positive span of time; the march gives the direction.",
            argument="every_time",
        )
    return span
