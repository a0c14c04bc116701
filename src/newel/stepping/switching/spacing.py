"""Distances between neighbouring floats of time."""

from __future__ import annotations

import math

__all__ = ["just_after", "just_before", "spacing"]


def spacing(t: float) -> float:
    """Return the distance from |t| to the next larger float, in the unit of t.

    Example:
        >>> spacing(1.0) == 2.0**-52
        True
    """
    return math.ulp(t)


def just_before(t: float, direction: float) -> float:
    """Return the last float before t for a march in the direction of the sign of `direction`.

    Example:
        >>> just_before(1.0, 1.0) < 1.0 < just_before(1.0, -1.0)
        True
    """
    return math.nextafter(t, -math.inf if direction > 0 else math.inf)


def just_after(t: float, direction: float) -> float:
    """Return the first float after t for a march in the direction of the sign of `direction`.

    Example:
        >>> just_after(1.0, -1.0) < 1.0 < just_after(1.0, 1.0)
        True
    """
    return just_before(t, -direction)
