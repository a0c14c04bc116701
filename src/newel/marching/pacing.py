"""Where the next step of a march without error control ends."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from fractions import Fraction
from typing import Any

from newel.errors import BadRequest
from newel.protocols import Array
from newel.stepping.switching.spacing import spacing

__all__ = ["FunctionPace", "GivenPace", "GridPace", "Pace", "exactly"]

# A step count is whole when (stop − start)/step is, to this many units of rounding.
_WHOLE = 8.0
# Shorter steps, in spacings of time, are lost in its rounding; times closer than that are one time.
_FEWEST = 4.0
# A step of the user's function that ends so near to stop, in parts of itself, ends there: no slivers.
_NEAR_STOP = 1e-6


def exactly(value: Any) -> Any:
    """Return a time or a step for a march whose time is exact: Python's own numbers become fractions."""
    return Fraction(value) if isinstance(value, (int, float)) else value


class Pace:
    """Proposes where steps end. `target` may be asked repeatedly; `reached` moves on."""

    note: str | None = None
    steps: int | None = None
    extra: tuple[Any, ...] = ()

    def target(self, t: Any, y: Array) -> tuple[Any, Any]:
        """Return the end of the next step and its signed length, both in time units."""
        raise TypeError(f"{type(self).__name__} proposes no steps")

    def reached(self, t: Any) -> None:
        """Take note that the march is at t, which was a target or an earlier landing."""

    def restart(self, t: Any) -> None:
        """Go on from t, which may lie before or behind."""

    def save(self) -> Any:
        """Return what `restore` needs."""
        return None

    def restore(self, saved: Any) -> None:
        """Go back to what `save` returned."""


class GridPace(Pace):
    """Equal steps: the times are start + n·step, one rounding each, never a running sum.

    Args:
        start, stop: of the march. step: positive, in time units, of the kind of time (float, or exact for
            object states).
    """

    def __init__(self, start: Any, stop: Any, step: Any) -> None:
        self.start, self.stop = start, stop
        self.signed = step if stop > start else -step
        self.index, self.at = 0, start
        ratio = (stop - start) / self.signed
        if isinstance(ratio, float):
            if not math.isfinite(ratio) or ratio > 2**53:
                raise BadRequest(
                    f"step={step!r} from {start!r} to {stop!r} makes more steps than can be counted",
                    argument="step",
                )
            least = _FEWEST * spacing(max(abs(start), abs(stop)))
            if abs(step) < least:
                raise BadRequest(
                    f"step={step!r} from {start!r} to {stop!r} is too small to move t; at least {least!r}",
                    argument="step",
                )
            unit = math.ulp(max(abs(start), abs(stop)) / abs(step))
            nearest = round(ratio)
            whole = nearest >= 1 and abs(ratio - nearest) <= _WHOLE * unit
        else:
            nearest = round(ratio)
            whole = nearest >= 1 and ratio == nearest
        self.steps = nearest if whole else math.floor(ratio) + 1
        if not whole:
            last = stop - self._time(self.steps - 1)
            self.note = (
                f"step {step!r} does not divide the span from {start!r} to {stop!r}; the last step is "
                f"{abs(last)!r}"
            )

    def _time(self, index: int) -> Any:
        return self.start + index * self.signed

    def time(self, index: int) -> Any:
        """Return grid time number `index`; the last one is stop itself."""
        assert self.steps is not None
        return self.stop if index >= self.steps else self._time(index)

    def nearest(self, t: Any) -> Any:
        """Return the grid time nearest to t."""
        index = round((t - self.start) / self.signed)
        assert self.steps is not None
        around = range(max(index - 1, 0), min(index + 1, self.steps) + 1)
        return min((self.time(i) for i in around), key=lambda g: abs(g - t), default=self.stop)

    def target(self, t: Any, y: Array) -> tuple[Any, Any]:
        """Return the next grid time; the length is the step itself where the march stands on the grid."""
        ahead = self.time(self.index + 1)
        on_grid = t == self.at and ahead == self._time(self.index + 1)
        return ahead, self.signed if on_grid else ahead - t

    def reached(self, t: Any) -> None:
        """Count the grid point where t is the next one."""
        if t == self.time(self.index + 1):
            self.index += 1
            self.at = t

    def restart(self, t: Any) -> None:
        """Stand on, or just beyond, the last grid point that is not ahead of t."""
        self.index = max(round((t - self.start) / self.signed), 0)
        ahead = (self.time(self.index) - t) * (1 if self.signed > 0 else -1)
        near = _FEWEST * spacing(t) if isinstance(t, float) else 0
        if self.index and ahead > near:
            self.index -= 1
        self.at = self.time(self.index)

    def save(self) -> Any:
        """Return the grid point that was last reached."""
        return self.index, self.at

    def restore(self, saved: Any) -> None:
        """Go back to a grid point."""
        self.index, self.at = saved


class GivenPace(Pace):
    """A step to each of the given times, which end at stop."""

    def __init__(self, start: Any, stop: Any, times: Sequence[Any]) -> None:
        listed = [t for i, t in enumerate(times) if not (i == 0 and t == start)]
        for number, t in enumerate(listed, start=1):
            if not (start < t <= stop or stop <= t < start):
                raise BadRequest(
                    f"newel.Given: time {number}, {t!r}, lies outside the march from {start!r} to {stop!r}",
                    argument="steps",
                )
        if not listed or listed[-1] != stop:
            last = listed[-1] if listed else start
            raise BadRequest(
                f"newel.Given ends at {last!r}, and the model stops at {stop!r}\n"
                "  Add the stop as the last time, or march model.replace(stop=...).",
                argument="steps",
            )
        self.start, self.stop = start, stop
        self.times, self.index, self.steps = listed, 0, len(listed)

    def target(self, t: Any, y: Array) -> tuple[Any, Any]:
        """Return the next given time."""
        ahead = self.times[self.index]
        return ahead, ahead - t

    def reached(self, t: Any) -> None:
        """Count the time where it is the next one."""
        if t == self.times[self.index]:
            self.index = min(self.index + 1, len(self.times) - 1)

    def restart(self, t: Any) -> None:
        """Go on with the first time that lies ahead of t."""
        forward = self.stop > self.start
        ahead = [i for i, time in enumerate(self.times) if (time > t) == forward and time != t]
        self.index = ahead[0] if ahead else len(self.times) - 1

    def save(self) -> Any:
        """Return how many times were reached."""
        return self.index

    def restore(self, saved: Any) -> None:
        """Go back."""
        self.index = saved


class FunctionPace(Pace):
    """Each step has the length that the user's function gives."""

    def __init__(self, stop: Any, step: Callable[..., Any], extra: tuple[Any, ...]) -> None:
        self.stop, self.step, self.extra = stop, step, extra
        self.exact = not isinstance(stop, float)

    def target(self, t: Any, y: Array) -> tuple[Any, Any]:
        """Ask the function; a step that would pass stop ends there."""
        length = self.step(t, y, *self.extra)
        try:
            number = float(length)
        except (TypeError, ValueError):
            number = math.nan
        if not 0.0 < number < math.inf:
            raise BadRequest(
                f"the step function gave {length!r} at t = {t!r}; a step is a positive length in time units",
                argument="step",
            )
        forward = self.stop > t
        if self.exact:
            exact = exactly(length)
            ahead = t + exact if forward else t - exact
            near: Any = 0
        else:
            ahead = t + number if forward else t - number
            near = _NEAR_STOP * number
        if ahead == t:
            raise BadRequest(
                f"the step function gave {length!r} at t = {t!r}, which is too small to move t",
                argument="step",
            )
        if (self.stop - ahead if forward else ahead - self.stop) <= near:
            ahead = self.stop
        return ahead, ahead - t
