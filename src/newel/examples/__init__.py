"""Small models, addressed on the command line as `example:name`."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

__all__ = ["midpoint_step"]


def midpoint_step(rate: Callable[[float, Any], Any], t: float, y: Any, h: float) -> Any:
    """Return the state after one step: a loop as people write it, for `newel recover`.

    >>> midpoint_step(lambda t, y: y, 0.0, 1.0, 0.5)
    1.625
    """
    half = y + h / 2 * rate(t, y)
    return y + h * rate(t + h / 2, half)
