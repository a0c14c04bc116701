"""The shape of everything that can be plugged in.

A plugin author implements one of these protocols; the driver owns loops, limits and clean-up.
`newel.testing` holds a contract test for each of them.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from typing import TYPE_CHECKING, Any, Protocol, runtime_checkable

import attrs
import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    from newel.results.run import Ended

__all__ = ["Array", "Controller", "ControllerMemory", "Head", "Indicator", "Norm", "Rate", "Sink", "Thinning"]

Array = NDArray[Any]
"""A NumPy array of one of the dtypes that a state may have."""

Rate = Callable[..., Any]
"""`rate(t, y)`, then `out` where the model is in place, then `params` exactly when the model has them.

`t` is a float in the model's time unit, `y` a read-only array of the state's shape and dtype; the result has
that shape, in state units per time unit. An in-place rate fills `out` and its result is ignored.
"""

Indicator = Callable[..., float]
"""`indicator(t, y[, params]) -> float`: an event is a change of its sign."""

Norm = Callable[[Array, Array], float]
"""`norm(error, scale) -> float` (unitless): at most 1 means that the error estimate is within tolerance.

`error` and `scale` have the state's shape; `scale` is abs_tol + rel_tol·max(|y_n|, |y_n+1|), entry by entry.
"""

ControllerMemory = tuple[float, ...]
"""What a controller remembers between steps: plain floats, so that it can be stored and restored."""


@runtime_checkable
class Controller(Protocol):
    """Decides whether a step is accepted and how long the next one is.

    A controller has no state of its own: it gets its memory and returns the new one, so that a march can be
    saved, restored and repeated to the bit.
    """

    @property
    def name(self) -> str:
        """The name under which the controller is known, as in a run's settings."""
        ...

    def start(self) -> ControllerMemory:
        """Return the memory at the start of a march and after every restart (break, event, changed state)."""
        ...

    def decide(
        self, error: float, step: float, order: int, memory: ControllerMemory
    ) -> tuple[bool, float, ControllerMemory]:
        """Judge one attempted step.

        Args:
            error: the error norm (unitless), 1 is the tolerance, finite and not negative.
            step: the length of the attempted step, positive, in time units.
            order: k, one more than the lower order of the pair, so that error ~ step**k.
            memory: what `start` or the last call returned.

        Returns:
            Whether the step is accepted; the factor for the next step's length, positive and finite, below 1
            where the step is rejected; the new memory.
        """
        ...


@attrs.frozen
class Thinning:
    """Which of the accepted steps a sink is given: every one, unless one of these is set.

    Args:
        at: times, in the order of the march; the march lands on each.
        every_steps: each n-th accepted step, and the first and last row.
        every_time: multiples of a time span from the start on; the march lands on each; and the last row.
    """

    at: tuple[float, ...] | None = None
    every_steps: int | None = None
    every_time: float | None = None


@attrs.frozen
class Head:
    """What a sink is told before the first row.

    `labels` name the state's entries in C order, one each; `units` go with them or are empty. `shape` and
    `dtype` are the state's. `has_events` says whether rows can carry an event's label. `about` holds the
    method's slug and digest and the settings of the march, all of it fit for JSON.
    """

    labels: Sequence[str]
    units: tuple[str, ...]
    time_unit: str
    shape: tuple[int, ...]
    dtype: np.dtype[Any]
    has_events: bool
    about: Mapping[str, Any]


@runtime_checkable
class Sink(Protocol):
    """Takes the rows of a march.

    The driver calls `open` once, `write` any number of times with whole blocks of rows, and `close` once:
    on success, on failure and on Ctrl-C alike. An attribute `thinning`, if there is one, says which rows.
    A class or factory that is registered as a sink may have `endings`, a tuple such as `(".csv",)`.
    """

    def open(self, head: Head) -> None:
        """Make the output ready, or raise `newel.errors.OutputExists` or `OSError`."""
        ...

    def write(self, times: NDArray[np.float64], states: Array, events: tuple[str, ...]) -> None:
        """Take n rows: times (n,), states (n, *shape), and n event labels ("" where there is none).

        The arrays are the driver's own and are reused: a sink that keeps rows copies them.
        """
        ...

    def close(self, ended: Ended) -> None:
        """Finish the output; `ended.reason` says how the march ended."""
        ...
