"""`Stepper`: the march in the caller's own hands."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from newel.catalogue.registry import default_registry
from newel.errors import BadModel, BadRequest, MarchFailed, NewelError
from newel.marching.arithmetic import own_sums_are_quiet
from newel.marching.failures import CannotGoOn, blame
from newel.marching.loop import Loop
from newel.marching.methods import method_for
from newel.marching.pacing import exactly
from newel.marching.saving import Saved, restore, save
from newel.models.model import Model
from newel.protocols import Array
from newel.results.run import EventRecord, Note, Run
from newel.stepping.rules import Adaptive, StepRule, chosen_rule

if TYPE_CHECKING:
    from newel.catalogue.registry import Registry
    from newel.methods.tableau import Tableau

__all__ = ["Stepper", "Trial"]


class Trial:
    """A proposed step, to be accepted or rejected.

    Attributes:
        time: where it ends. state: a copy of the state there. error: the estimate of the local error, or
            None without embedded weights. error_norm: 1 is the tolerance; None without tolerances.
    """

    def __init__(self, stepper: Stepper, time: float, state: Array, error: Array | None, norm: float | None):
        self.time, self.state, self.error, self.error_norm = time, state, error, norm
        self._stepper = stepper

    def accept(self) -> None:
        """Make the proposed state the stepper's state."""
        self._stepper._accept(self)

    def reject(self) -> None:
        """Leave the stepper as it was."""
        self._stepper._reject(self)


class Stepper:
    """Marches a model step by step, for programs that own the loop.

    Args:
        model, method, step, rel_tol, abs_tol, steps, registry: as for `newel.march`.

    Raises:
        BadRequest, BadModel, UnknownMethod, NotProved: as for `newel.march`; the rate is called once.

    Example:
        >>> import newel
        >>> decay = newel.Model(lambda t, y: -y, start=0.0, stop=1.0, state=[1.0])
        >>> stepper = Stepper(decay, "kutta-4", step=0.25)
        >>> stepper.advance()
        0.25
        >>> trial = stepper.propose(0.5)
        >>> trial.reject()
        >>> stepper.advance_to(1.0)
        1.0
        >>> f"{stepper.state[0]:.4f}"
        '0.3679'
    """

    def __init__(
        self,
        model: Model,
        method: str | Path | Tableau,
        *,
        step: float | Callable[..., float] | None = None,
        rel_tol: float | None = None,
        abs_tol: float | Sequence[float] | None = None,
        steps: StepRule | None = None,
        registry: Registry | None = None,
    ) -> None:
        where = default_registry() if registry is None else registry
        rule = chosen_rule(step, rel_tol, abs_tol, steps)
        tableau, original, self.estimator = method_for(method, rule, where)
        controller = where.controller(rule.controller) if isinstance(rule, Adaptive) else None
        self.method, self.digest = original.slug, original.digest
        self._settings = {**rule.settings(), "estimator": self.estimator}
        pair = tableau.embedded_weights is not None
        self._loop = Loop(model, tableau, rule, controller, estimate=pair)
        self._trial: Trial | None = None
        self._guarded(self._loop.prepare)

    # What it shows.

    @property
    def time(self) -> float:
        """Where the march is, in time units."""
        return self._loop.time  # type: ignore[no-any-return]  # a float, or exact for object states

    @property
    def state(self) -> Array:
        """A copy of the state."""
        return self._loop.step.state.copy()

    @property
    def view(self) -> Array:
        """The state itself, read-only; it changes with the march."""
        return self._loop.step.state

    @property
    def last_step(self) -> float:
        """The signed length of the last accepted step, in time units; 0 before the first."""
        return self._loop.last_step  # type: ignore[no-any-return]  # a float, or exact for object states

    @property
    def next_step(self) -> float:
        """The length that `advance` will try next, positive, in time units."""
        loop = self._loop
        if loop.adaptive:
            return loop.next_step
        if loop.time == loop.stop:
            return 0.0
        return abs(loop.pace.target(loop.time, loop.step.state)[1])  # type: ignore[no-any-return]  # as above

    @property
    def calls(self) -> int:
        """How often the rate was called."""
        return self._loop.step.calls

    @property
    def accepted(self) -> int:
        """How many steps were accepted."""
        return self._loop.accepted

    @property
    def rejected(self) -> int:
        """How many attempted steps were rejected."""
        return self._loop.rejected

    @property
    def events(self) -> tuple[EventRecord, ...]:
        """The events so far, in time order."""
        return tuple(self._loop.events)

    @property
    def notes(self) -> tuple[Note, ...]:
        """What a user must know."""
        return tuple(self._loop.notes)

    # How it moves.

    def advance(self, step: float | None = None) -> float:
        """Make one accepted step and return the time reached.

        Args:
            step: the length of the step, positive, in time units, made as it is whatever its error; by
                default the step rule chooses.

        Raises:
            BadRequest: at the model's stop, after an event that ends the march, or for a step past stop.
            MarchFailed: where the step cannot be made; the stepper stays where it was.
        """
        if step is not None:
            self.propose(step).accept()
            return self.time
        self._check_can_move()
        self._trial = None
        self._guarded(self._loop.advance)
        return self.time

    def advance_to(self, t: float) -> float:
        """March to t exactly, or to an event that ends the march, and return the time reached.

        Raises:
            BadRequest: for a time that is behind, or beyond the model's stop.
            MarchFailed: where the march cannot go on; the stepper stays at the last accepted step.
        """
        loop = self._loop
        target = exactly(t) if loop.exact_time else float(t)
        self._check_target(target)
        self._trial = None

        def go() -> None:
            while loop.time != target and loop.ended_by is None:
                loop.advance(target)

        self._guarded(go)
        return self.time

    def propose(self, step: float) -> Trial:
        """Try a step of this length (positive, in time units) and return it for judgement.

        Raises:
            BadRequest: for a length that is not positive and finite, or that passes the model's stop.
            MarchFailed: where the result is not finite, or outside the model's `within`.
        """
        loop = self._loop
        self._check_can_move()
        number = float(step)
        if not 0.0 < number < math.inf:
            raise BadRequest(f"step={step!r}: must be positive and finite, in time units", argument="step")
        length = exactly(step) if loop.exact_time else number
        ahead = loop.time + (length if loop.direction > 0 else -length)
        if not loop.exact_time and abs(ahead - loop.stop) <= 4.0 * math.ulp(max(abs(ahead), abs(loop.time))):
            ahead = loop.stop
        self._check_target(ahead)
        h = ahead - loop.time
        engine = loop.step
        self._guarded(lambda: engine.attempt(loop.time, h, loop.ceiling(ahead)))
        if not engine.new_is_finite():
            self._guarded(lambda: loop.refuse_not_finite(h))
        if loop.has_within:
            self._guarded(lambda: loop.refuse_outside(ahead))
        error = norm = None
        if engine.has_estimate:
            error = engine.error_and_scale(0.0, np.ones(1))[0]
        if loop.limits is not None:
            with own_sums_are_quiet():
                norm = engine.error_norm(loop.limits.rel_tol, loop.limits.ratio, loop.limits.norm)
        self._trial = Trial(self, ahead, engine.new.copy(), error, norm)
        return self._trial

    def restart(self, state: Any = None, time: float | None = None) -> None:
        """Go on from another state, or time, or both: the rate is evaluated anew and nothing is remembered.

        Args:
            state: in the model's shape and units. time: within the model's span, in time units.

        Raises:
            BadRequest: for a time outside the span. BadModel: for a state of another shape or not finite.
        """
        loop = self._loop
        low, high = sorted((loop.model.start, loop.model.stop))
        at = loop.time if time is None else time
        if not low <= at <= high:
            raise BadRequest(
                f"time={time!r} is outside the model's span, {low!r} to {high!r}", argument="time"
            )
        at = exactly(at) if loop.exact_time else float(at)
        array = loop.step.state if state is None else np.asarray(state)
        if array.shape != loop.step.shape:
            raise BadModel(
                f"state has shape {array.shape}, and the model's state has shape {loop.step.shape}",
                argument="state",
            )
        if not loop.exact_time and not np.isfinite(array).all():
            raise BadModel("state holds a number that is not finite", argument="state")
        self._trial = None
        self._guarded(lambda: loop.restart(at, array.copy()))

    def save(self) -> Saved:
        """Return all that `restore` needs to go on from here to the bit."""
        return save(self._loop)

    def restore(self, saved: Saved) -> None:
        """Go back to where `save` was called, counters and events included.

        Raises:
            BadRequest: for what is not a saved place of a march of this state.
        """
        restore(self._loop, saved)
        self._trial = None

    # The judgement of a trial.

    def _accept(self, trial: Trial) -> None:
        self._spend(trial)
        self._guarded(lambda: self._loop.accept_proposal(trial.time))

    def _reject(self, trial: Trial) -> None:
        self._spend(trial)
        self._loop.rejected += 1

    def _spend(self, trial: Trial) -> None:
        if trial is not self._trial:
            raise BadRequest(
                f"this trial, which ends at t = {trial.time!r}, is spent: it was judged already, or the "
                "stepper has moved or tried another since\n  Propose again.",
                argument="trial",
            )
        self._trial = None

    def _check_can_move(self) -> None:
        loop = self._loop
        if loop.ended_by is not None:
            raise BadRequest(f"event {loop.ended_by!r} ended this march at t = {loop.time!r}")
        if loop.time == loop.stop:
            raise BadRequest(
                f"the stepper stands at the model's stop, t = {loop.time!r}\n"
                "  Make it from model.replace(stop=...) to go farther."
            )

    def _check_target(self, t: Any) -> None:
        loop = self._loop
        if not (t - loop.time) * loop.direction >= 0:
            raise BadRequest(f"t = {t!r} lies behind the stepper, which is at {loop.time!r}", argument="t")
        if (t - loop.stop) * loop.direction > 0:
            raise BadRequest(
                f"t = {t!r} lies beyond the model's stop, {loop.stop!r}\n"
                "  Make the stepper from model.replace(stop=...).",
                argument="t",
            )

    def _guarded(self, action: Callable[[], Any]) -> None:
        """Do it; a failure leaves the stepper at its last accepted step and says so."""
        loop = self._loop
        try:
            with own_sums_are_quiet():
                action()
        except CannotGoOn as error:
            raise self._failure(f"{error.headline}\n{error.advice}".rstrip(), error.reason) from None
        except NewelError:
            raise
        except Exception as error:
            words = blame(error, loop.model)
            if words is None:
                raise
            raise self._failure(words, "raised") from error
        finally:
            loop.settle()

    def _failure(self, message: str, reason: str) -> MarchFailed:
        loop = self._loop
        run = Run(
            method=self.method,
            digest=self.digest,
            settings=self._settings,
            labels=loop.model.labels,
            units=loop.model.units,
            time_unit=loop.model.time_unit,
            estimator=self.estimator,
            last_time=loop.time,
            last_state=loop.step.state.copy(),
            calls=loop.step.calls,
            accepted=loop.accepted,
            rejected=loop.rejected,
            events=list(loop.events),
            notes=list(loop.notes),
        )
        return MarchFailed(message, run=run, time=float(loop.time), reason=reason)
