"""The loop: one accepted step after another, with breaks, events, limits and rejections.

`march` and `Stepper` both drive this; nothing goes twice through the same place.
"""

from __future__ import annotations

from fractions import Fraction
from typing import TYPE_CHECKING, Any

import numpy as np

from newel.errors import BadModel
from newel.marching.adaptive import FEWEST_SPACINGS, adaptive_step
from newel.marching.failures import CannotGoOn, not_finite, outside
from newel.marching.first_step import first_step
from newel.marching.pacing import Pace
from newel.marching.requests import breaks_inside, check_state_kind, pace_of, tolerances
from newel.marching.switches import Switches
from newel.models.intake import copy_params
from newel.protocols import Array, Controller, ControllerMemory
from newel.results.run import EventRecord, Note
from newel.stepping.numpy_step import NumpyStep
from newel.stepping.rate_call import RateCall, where_defined
from newel.stepping.rules import Adaptive, StepRule
from newel.stepping.switching.crossings import Crossings
from newel.stepping.switching.spacing import just_after, just_before, spacing

if TYPE_CHECKING:
    from newel.methods.tableau import Tableau
    from newel.models.model import Model

__all__ = ["Loop"]

_SAME_PLACE = 4.0


class Loop:
    """A march in progress.

    Args:
        model: what is marched. tableau: the method, with embedded weights where the rule is adaptive.
        rule: the step rule. controller: where the rule is adaptive.
        estimate: whether an error estimate is wanted though the rule does not use it.

    Attributes:
        time: where the march is, in time units. step: the engine, whose `state` is the state there.
        next_step: the length proposed next (positive; adaptive only). last_step: signed, of the last step.
        accepted, rejected: counters. notes, events: for the run. ended_by: the label of an ending event.
    """

    def __init__(
        self,
        model: Model,
        tableau: Tableau,
        rule: StepRule,
        controller: Controller | None = None,
        estimate: bool = False,
    ) -> None:
        self.model, self.tableau, self.rule, self.controller = model, tableau, rule, controller
        self.exact_time = model.state.dtype == np.dtype(object)
        self.params = copy_params(model.params)[0]
        self.extra: tuple[Any, ...] = () if model.params is None else (self.params,)
        self.direction = 1.0 if model.forward else -1.0
        self.start: Any = Fraction(model.start) if self.exact_time else model.start
        self.stop: Any = Fraction(model.stop) if self.exact_time else model.stop
        self.time: Any = self.start
        self.accepted = self.rejected = 0
        self.last_step: Any = 0.0
        self.next_step = 0.0
        self.memory: ControllerMemory = ()
        self.notes = [Note(text) for text in model.notes]
        self.events: list[EventRecord] = []
        self.ended_by: str | None = None
        self.pending: Any = None
        self.alias: tuple[Any, Any] | None = None
        self.switches = Switches()
        self.adaptive = isinstance(rule, Adaptive)
        self.order = min(tableau.order, tableau.embedded_order or 0) + 1 if self.adaptive else 0
        check_state_kind(model, self.adaptive)
        self.limits = tolerances(model, rule) if isinstance(rule, Adaptive) else None
        self.rate = RateCall(model, self.params)
        self.step = NumpyStep(
            tableau,
            self.rate,
            model.state,
            estimate=self.adaptive or estimate,
            compensated=not self.adaptive or tableau.order >= 7,
            after_stage=None if model.after_stage is None else self._after_stage,
        )
        self.breaks = breaks_inside(model)
        self.stop_breaks = not self.exact_time and self.stop in model.breaks
        self.reach = max(self.step.nodes)
        self.break_index = 0
        self.wall: Any = self.break_ahead()
        self.crossings = Crossings(model.events, self.extra)
        self.has_events, self.has_within = bool(model.events), model.within is not None
        self.pace = Pace() if self.adaptive else pace_of(rule, self.start, self.stop, self.extra)
        if self.pace.note:
            self.notes.append(Note(self.pace.note))

    def prepare(self) -> None:
        """Make the first rate call, arm the events, and choose the first step."""
        step = self.step
        if not self.inside(self.time, step.state):
            raise BadModel(outside(self.model, step.state, self.time) + ", at the start", argument="within")
        if self.time in self.model.breaks and not self.exact_time:
            step.floor = just_after(self.time, self.direction)
        self.rate.first(self.time if step.floor is None else step.floor, step.state, step.rows[1])
        step.evaluate = self.rate.evaluate
        step.fresh = True
        step.calls += 1
        self.notes += [Note(text, float(self.time)) for text in self.rate.notes]
        if not self.exact_time and not np.isfinite(step.rows[1]).all():
            raise CannotGoOn(
                "not finite",
                f"{not_finite(step, self.model, self.time, 0.0)}, at the start",
                f"  {where_defined(self.model.rate)}",
            )
        self.crossings.arm(self.time, step.state)
        if isinstance(self.rule, Adaptive):
            assert self.controller is not None
            self.memory = self.controller.start()
            self.next_step = self._first_length(self.rule)

    def _first_length(self, rule: Adaptive) -> float:
        assert self.limits is not None
        rel_tol, ratio, norm, smallest, largest = self.limits
        if rule.first is not None:
            return min(float(rule.first), largest)
        span = abs(self.wall - self.time)
        abs_tol = ratio * rel_tol
        length = first_step(self.step, self.time, span, self.direction, self.order, rel_tol, abs_tol, norm)
        least = FEWEST_SPACINGS * spacing(self.time)
        return min(max(length, smallest, least), largest)

    # One accepted step.

    def break_ahead(self) -> Any:
        """The next place that a step may not cross: a break, or stop."""
        return self.breaks[self.break_index] if self.break_index < len(self.breaks) else self.stop

    def advance(self, landing: float | None = None) -> str:
        """Make one accepted step, at most to `landing`; return the label of an event there, or ""."""
        if self.adaptive:
            t, h = adaptive_step(self, landing)
        else:
            t, h = self._paced_step(landing)
        label = ""
        records: list[EventRecord] = []
        if self.has_events:
            t, label, records = self.switches.look(self, t, h)
        self._commit(t, records, restart=bool(label))
        return label

    def ceiling(self, t: Any) -> Any:
        """The last time before a break, for a step to t whose stages would reach it.

        At the model's stop the last time is stop itself, whatever t + h rounds to.
        """
        wall = self.wall
        if wall == self.stop and not self.stop_breaks:
            return wall if t == wall and self.reach <= 1 and not self.exact_time else None
        reached = t if self.reach <= 1 else self.time + self.reach * (t - self.time)
        return just_before(wall, self.direction) if (reached - wall) * self.direction >= 0 else None

    def _paced_step(self, landing: Any) -> tuple[Any, Any]:
        ahead, h = self.pace.target(self.time, self.step.state)
        wall = self.wall
        self.alias = None
        if landing is not None and self.exact_time:
            landing = Fraction(landing)
        if landing is not None and (landing - wall) * self.direction < 0:
            wall = landing
        if wall != ahead:
            gap = (wall - ahead) * (1 if self.direction > 0 else -1)
            near = 0 if self.exact_time else _SAME_PLACE * max(spacing(wall), spacing(self.time))
            same = abs(gap) <= near
            if same and ahead != self.stop:
                # A break that rounding sets beside a grid point is that grid point.
                self.alias = wall, ahead
            if gap < 0 or same:
                ahead, h = wall, wall - self.time
        self.step.attempt(self.time, h, self.ceiling(ahead))
        if not self.step.new_is_finite():
            self.refuse_not_finite(h)
        if self.has_within:
            self.refuse_outside(ahead)
        return ahead, h

    def inside(self, t: Any, state: Array) -> bool:
        """Whether the model allows this state at t."""
        within = self.model.within
        if within is None:
            return True
        if callable(within):
            return bool(within(t, state, *self.extra))
        return bool(((state >= within[0]) & (state <= within[1])).all())

    def _commit(self, t: Any, records: list[EventRecord], restart: bool) -> None:
        """Make the attempted step the state; a Ctrl-C in here is finished by `settle`."""
        last_step = t - self.time
        self.pending = (t, self.accepted + 1, records)
        self.step.accept()
        self.time, self.accepted, _ = self.pending
        if records:
            self._record(records)
        self.pending = None
        self.last_step = last_step
        at_break = (t - self.wall) * self.direction >= 0 and self._pass_breaks(t)
        if not self.adaptive:
            self.pace.reached(self.alias[1] if self.alias is not None and t == self.alias[0] else t)
        after_step = self.model.after_step
        if after_step is not None:
            self._after_step(after_step(t, self.step.state, *self.extra))
            if self.extra:
                # It may have written to the params: the rate at the new state is not what it was.
                self.step.fresh = False
        if at_break or restart:
            self.step.fresh = False
            if at_break:
                # Beyond the break, whichever side `t < t_break` and `t <= t_break` give to the break itself.
                self.step.floor = just_after(t, self.direction)
            if self.controller is not None:
                self.memory = self.controller.start()

    def _record(self, records: list[EventRecord]) -> None:
        """Keep the events of the step just made; the first that ends the march does."""
        ending = {event.label for event in self.model.events if event.ends}
        self.events += records
        for record in records:
            if self.ended_by is None and record.label in ending:
                self.ended_by = record.label

    def _pass_breaks(self, t: Any) -> bool:
        before = self.break_index
        while self.break_index < len(self.breaks):
            if (self.breaks[self.break_index] - t) * self.direction > 0:
                break
            self.break_index += 1
        self.wall = self.break_ahead()
        return self.break_index > before

    def accept_proposal(self, t: Any) -> None:
        """Commit a step that a caller proposed; its events are recorded at its end."""
        happened = self.crossings.settle(t, self.step.new) if self.has_events else []
        labels = [self.crossings.events[i].label for i in happened]
        self.alias = None
        records = [EventRecord(label, t, self.step.new.copy()) for label in labels]
        self._commit(t, records, restart=bool(labels))
        self.pace.restart(t)

    def refuse_outside(self, t: Any) -> None:
        """Say which entry of the last attempt, which ended at t, the model's `within` does not allow."""
        if not self.inside(t, self.step.new):
            raise CannotGoOn("within", outside(self.model, self.step.new, t), "  Take a smaller step.")

    def refuse_not_finite(self, h: Any) -> None:
        """Say where the last attempt stopped being finite."""
        where = f"  {where_defined(self.model.rate)}"
        raise CannotGoOn("not finite", not_finite(self.step, self.model, self.time, h), where)

    def restart(self, t: Any, state: Array) -> None:
        """Go on from another time and state; nothing is remembered but counters and events."""
        self._check_dtype(state, "state")
        self.time, self.ended_by = t, None
        self.break_index = 0
        self._pass_breaks(t)
        self.replace_state(state)
        self.step.floor = just_after(t, self.direction) if t in self.model.breaks else None
        self.pace.restart(t)
        if self.controller is not None:
            self.memory = self.controller.start()

    def settle(self) -> None:
        """Finish a commit that an interruption cut short, so that time and state belong together."""
        if self.pending is not None:
            time, self.accepted, records = self.pending
            self.step.load(self.step.new.copy())
            self.time = time
            if records and (not self.events or self.events[-1] is not records[-1]):
                self._record(records)
            self.pending = None
            if self._pass_breaks(time):
                self.step.floor = just_after(time, self.direction)
            self.pace.restart(time)

    def _after_stage(self, t: Any, y: Array) -> Any:
        assert self.model.after_stage is not None
        return self.model.after_stage(t, y, *self.extra)

    def _after_step(self, given: Any) -> None:
        if given is None:
            return
        array = np.asarray(given)
        if array.shape != self.step.shape:
            raise BadModel(
                f"after_step returned shape {array.shape}, and the state has shape {self.step.shape}\n"
                "  Return an array of the state's shape, or None to leave it.",
                argument="after_step",
            )
        self._check_dtype(array, "after_step")
        if not self.exact_time and not np.isfinite(array).all():
            raise CannotGoOn(
                "not finite",
                f"after_step returned a state that is not finite at t = {float(self.time):g}",
                f"  {where_defined(self.model.after_step)}",
            )
        self.replace_state(array)

    def replace_state(self, state: Array) -> None:
        """Put another state in the place of the present one; the rate there is evaluated anew."""
        self.step.load(state.astype(self.step.dtype))
        self.crossings.arm(self.time, self.step.state)

    def _check_dtype(self, state: Array, source: str) -> None:
        dtype = self.step.dtype
        if not np.can_cast(state.dtype, dtype, casting="same_kind"):
            raise BadModel(
                f"{source} has dtype {state.dtype}, and the model's state has dtype {dtype}\n"
                f"  Give {dtype}, or a model with a state of dtype {state.dtype}.",
                argument=source,
            )

    def take_params(self, params: Any) -> None:
        """Go on with other params; every function of the model gets them from now on."""
        if self.model.params is None:
            return
        self.params, self.extra = params, (params,)
        self.rate.take_params(self.extra)
        self.step.evaluate = self.rate.evaluate
        self.crossings.extra = self.extra
        self.pace.extra = self.extra
