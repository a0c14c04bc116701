"""Rows handed to a function."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, Any, SupportsFloat, SupportsIndex

import numpy as np
from numpy.typing import NDArray

from newel.errors import BadRequest
from newel.protocols import Array, Head
from newel.results.sinks.thinning import Times, thinning

if TYPE_CHECKING:
    from newel.results.run import Ended

__all__ = ["Call"]


class Call:
    """Calls `function(t, y)` for each row, as soon as the step is accepted.

    `t` is a float in the model's time unit; `y` has the state's shape and dtype, in its units, is read-only,
    and is valid during the call only: keep `y.copy()`. What the function returns is ignored; what it raises
    ends the march (the other sinks are closed, and the error is an OutputFailed whose cause is yours).

    Args:
        function: called with a time and a state.
        at, every_steps, every_time: one of them at most, for fewer rows; see `newel.protocols.Thinning`.

    Raises:
        BadRequest: if `function` cannot be called, or for a thinning out of range.

    >>> sink = Call(lambda t, y: print(t, y.max()))
    >>> sink.write(np.array([0.5]), np.array([[1.0, 2.0]]), ("",))
    0.5 2.0
    """

    rows_at_once = 1

    def __init__(
        self,
        function: Callable[[float, Array], Any],
        *,
        at: Times | None = None,
        every_steps: SupportsIndex | None = None,
        every_time: SupportsFloat | None = None,
    ) -> None:
        if not callable(function):
            raise BadRequest(
                f"Call was given {function!r}, which cannot be called\n  Give function(t, y).",
                argument="function",
            )
        self.function = function
        self.thinning = thinning(at, every_steps, every_time)

    def __str__(self) -> str:
        return f"call of {getattr(self.function, '__qualname__', repr(self.function))}"

    def __repr__(self) -> str:
        return f"Call({self.function!r}, {self.thinning!r})"

    def open(self, head: Head) -> None:
        """Nothing is to be made ready."""

    def write(self, times: NDArray[np.float64], states: Array, events: tuple[str, ...]) -> None:
        """Call the function once a row, in order."""
        seen = states.view()
        seen.flags.writeable = False
        for row, time in enumerate(times.tolist()):
            self.function(time, seen[row, ...])

    def close(self, ended: Ended) -> None:
        """Nothing is to be finished."""
