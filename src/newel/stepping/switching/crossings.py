"""State events: sign changes of indicators, found after a step and located within it."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from typing import TYPE_CHECKING, Any

import numpy as np

from newel.errors import BadModel
from newel.protocols import Array
from newel.stepping.switching.spacing import spacing

if TYPE_CHECKING:
    from newel.models.events import StateEvent

__all__ = ["Crossings", "locate"]

_MOST_LANDINGS = 60


class Crossings:
    """Watches the indicators of a model.

    A crossing has happened where the indicator is zero or has its new sign. One that is exactly zero at the
    start is not armed: its first sign is no crossing.

    Args:
        events: the model's state events, in order of declaration.
        extra: the params of this march, or nothing.
    """

    def __init__(self, events: Sequence[StateEvent], extra: tuple[Any, ...]) -> None:
        self.events, self.extra = tuple(events), extra
        self.signs = [0] * len(self.events)

    def value(self, index: int, t: float, y: Array) -> float:
        """Return an indicator's value, in its own unit; it must be a number."""
        event = self.events[index]
        value = event.indicator(t, y, *self.extra)
        if isinstance(value, np.ndarray) and value.ndim:
            value = value.tolist()
        try:
            number = float(value)
        except (TypeError, ValueError):
            raise BadModel(
                f"the indicator of event {event.label!r} returned {value!r} at t = {t:g}\n"
                "  Return one real number; an event is a change of its sign.",
                argument="events",
            ) from None
        if math.isnan(number):
            raise BadModel(f"the indicator of event {event.label!r} gave NaN at t = {t:g}", argument="events")
        return number

    def arm(self, t: float, y: Array) -> None:
        """Take the signs at the start of a march or after the state was changed."""
        self.signs = [_sign(self.value(i, t, y)) for i in range(len(self.events))]

    def crossed(self, t: float, y: Array) -> list[int]:
        """Return which events have happened since the last `arm` or `settle`, in order of declaration."""
        return [i for i, sign in enumerate(self.signs) if self._is_crossing(i, sign, self.value(i, t, y))]

    def settle(self, t: float, y: Array) -> list[int]:
        """Take the signs at an accepted state and return which events that makes happen."""
        happened = []
        for i, sign in enumerate(self.signs):
            value = self.value(i, t, y)
            if self._is_crossing(i, sign, value):
                happened.append(i)
            # At zero the far side counts as reached, so that leaving it there is no second crossing.
            self.signs[i] = _sign(value) or -sign
        return happened

    def _is_crossing(self, index: int, before: int, value: float) -> bool:
        if before == 0 or _sign(value) == before:
            return False
        crossing = self.events[index].crossing
        return crossing == "both" or crossing == ("rising" if before < 0 else "falling")


def _sign(value: float) -> int:
    return (value > 0) - (value < 0)


def locate(
    crossings: Crossings,
    which: Sequence[int],
    t0: float,
    t1: float,
    interpolant: Callable[[float], Array],
    land: Callable[[float], Array],
) -> float:
    """Find the first of the crossings within a step and leave the step landed just beyond it.

    The interpolant gives the first guess; then the method itself is landed there and the guess corrected,
    so that the time found is as good as the method and not only as good as the interpolant.

    Args:
        crossings: the watch, with the signs at t0.
        which: the events that have crossed at t1.
        t0, t1: the ends of the step, in time units.
        interpolant: the state at a fraction of the step.
        land: makes the step end at a time and returns the state there (the step's own buffer).

    Returns:
        The time landed on: the event's indicator is zero or has its new sign there, and the crossing is, by
        its slope, within 10 spacings of t before it.
    """
    fractions = {i: _first_guess(crossings, i, t0, t1, interpolant) for i in which}
    first = min(which, key=lambda i: fractions[i][0])
    fraction, slope = fractions[first]
    return _refine(crossings, first, t0, t1, t0 + fraction * (t1 - t0), slope / (t1 - t0), land)


def _first_guess(
    crossings: Crossings, index: int, t0: float, t1: float, interpolant: Callable[[float], Array]
) -> tuple[float, float]:
    """Return the crossing as a fraction of the step, and the slope of the indicator per step there."""

    def value(fraction: float) -> float:
        return crossings.value(index, t0 + fraction * (t1 - t0), interpolant(fraction))

    low, high, before = 0.0, 1.0, crossings.signs[index]
    at_low, at_high = value(low), value(high)
    if _sign(at_low) not in (before, 0) or _sign(at_high) == before:
        return 1.0, 0.0
    for step in range(80):
        middle = 0.5 * (low + high)
        if step % 3 and at_high != at_low:
            # A secant step two times out of three, a bisection the third: fast, and never stuck.
            secant = low - at_low * (high - low) / (at_high - at_low)
            middle = min(max(secant, low), high) if math.isfinite(secant) else middle
        at_middle = value(middle)
        if _sign(at_middle) == before:
            low, at_low = middle, at_middle
        else:
            high, at_high = middle, at_middle
        if high - low <= 1e-12:
            break
    width = min(1e-3, high) or 1e-3
    return high, (value(high) - value(high - width)) / width


def _refine(
    crossings: Crossings,
    index: int,
    t0: float,
    t1: float,
    guess: float,
    slope: float,
    land: Callable[[float], Array],
) -> float:
    direction = 1.0 if t1 > t0 else -1.0
    before = crossings.signs[index]
    near, far, close = t0, t1, 10.0 * max(spacing(t0), spacing(t1))
    last: tuple[float, float] | None = None
    at, landed = guess, t1
    for trial in range(_MOST_LANDINGS):
        # Kept strictly inside the bracket; a guess outside it is replaced by the middle.
        if not near < at * 1.0 < far and not far < at < near:
            at = near + 0.5 * (far - near)
        if at in (near, far):
            break
        value = crossings.value(index, at, land(at))
        landed = at
        if _sign(value) == before:
            near = at
        else:
            far = at
        if last is not None and value != last[1] and at != last[0]:
            slope = (value - last[1]) / (at - last[0])
        last = (at, value)
        if not math.isfinite(slope):
            slope = 0.0
        reach = abs(value / slope) if slope else math.inf
        if (at == far and reach <= 0.8 * close) or abs(far - near) <= close:
            break
        if trial % 6 == 5 or not slope:
            at = near + 0.5 * (far - near)
        else:
            at = at - value / slope + direction * 0.3 * close
    if landed != far:
        land(far)
    return far
