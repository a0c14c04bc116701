"""State events inside the loop: found after an attempted step, landed on, recorded."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from newel.marching.failures import CannotGoOn
from newel.protocols import Array
from newel.results.run import EventRecord
from newel.stepping.continuous.hermite import CubicHermite
from newel.stepping.switching.crossings import locate
from newel.stepping.switching.spacing import spacing

if TYPE_CHECKING:
    from newel.marching.loop import Loop

__all__ = ["Switches"]

_MOST_AT_ONE_PLACE = 20


class Switches:
    """Handles the events of each attempted step, and notices when they stop the march from moving."""

    def __init__(self) -> None:
        self.here = 0

    def look(self, loop: Loop, t: float, h: float) -> tuple[float, str, list[EventRecord]]:
        """Look for events in the step attempted to t; land on the first that cuts.

        Returns:
            The time where the step ends now, the label of the event there, or "", and the events up to there.
        """
        crossings, step = loop.crossings, loop.step
        which = crossings.crossed(t, step.new)
        if not which:
            crossings.settle(t, step.new)
            return t, "", []
        cubic = self._cubic(loop, t, h)

        def land(time: float) -> Array:
            step.attempt(loop.time, time - loop.time, loop.ceiling(time))
            return step.new

        cutting = [i for i in which if crossings.events[i].cuts]
        attempted = t
        if cutting:
            t = locate(crossings, cutting, loop.time, t, cubic, land)
        records = self._observed(loop, t, h, cubic)
        happened = [i for i in crossings.settle(t, step.new) if crossings.events[i].cuts]
        labels = [crossings.events[i].label for i in happened]
        records += [EventRecord(label, t, step.new.copy()) for label in labels]
        if labels:
            self._guard(loop, t, attempted, labels[0])
        return t, "; ".join(labels), records

    def _cubic(self, loop: Loop, t: float, h: float) -> CubicHermite:
        step = loop.step
        if step.first_same_as_last:
            end_rate = step.rows[step.stages].copy()
        else:
            end_rate = np.zeros(step.shape, dtype=step.dtype)
            ceiling = loop.ceiling(t)
            step.evaluate(t if ceiling is None else ceiling, step.new, end_rate)
            step.calls += 1
        return CubicHermite(step.state, step.rows[1], step.new.copy(), end_rate, h)

    def _observed(self, loop: Loop, t: float, h: float, cubic: CubicHermite) -> list[EventRecord]:
        """Return the events that cut no step, up to t, in the order in which they happen."""
        start, crossings = loop.time, loop.crossings

        def at(time: float) -> Array:
            return cubic((time - start) / h)

        def part(fraction: float) -> Array:
            return at(start + fraction * (t - start))

        seen = [i for i in crossings.crossed(t, loop.step.new) if not crossings.events[i].cuts]
        found = [(locate(crossings, [i], start, t, part, at), i) for i in seen]
        in_order = sorted(found, key=lambda pair: pair[0] * loop.direction)
        return [EventRecord(crossings.events[i].label, time, at(time)) for time, i in in_order]

    def _guard(self, loop: Loop, t: float, attempted: float, label: str) -> None:
        # An event is located to some spacings of the end of the step attempted, which may be far from t = 0.
        near = abs(t - loop.time) <= 64.0 * max(spacing(t), spacing(attempted))
        self.here = self.here + 1 if near else 0
        if self.here >= _MOST_AT_ONE_PLACE:
            raise CannotGoOn(
                "events",
                f"event {label!r} happened {self.here} times in a row without moving t = {t!r}",
                "  Events that accumulate at one time need a model that rests after them, or ends=True.",
            )
