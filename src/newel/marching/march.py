"""`march`: a model from start to stop."""

from __future__ import annotations

import logging
from bisect import bisect_left
from collections.abc import Callable, Iterable, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

from newel.catalogue.registry import default_registry
from newel.errors import BadRequest, MarchFailed, MarchInterrupted, NewelError, OutputFailed
from newel.marching.arithmetic import own_sums_are_quiet
from newel.marching.failures import CannotGoOn, blame, kept
from newel.marching.loop import Loop
from newel.marching.methods import method_for
from newel.marching.pacing import GridPace
from newel.models.model import Model
from newel.models.provenance import machine
from newel.protocols import Head, Sink
from newel.results.delivery import Delivery
from newel.results.progress import open_progress
from newel.results.run import Ended, Note, Run
from newel.results.sinks.memory import Memory, MemoryFull
from newel.stepping.rules import Adaptive, Given, StepRule, chosen_rule
from newel.stepping.switching.spacing import spacing

if TYPE_CHECKING:
    from newel.catalogue.registry import Registry
    from newel.methods.tableau import Tableau

__all__ = ["march"]

log = logging.getLogger("newel")
log.addHandler(logging.NullHandler())


def march(
    model: Model,
    method: str | Path | Tableau,
    *,
    step: float | Callable[..., float] | None = None,
    rel_tol: float | None = None,
    abs_tol: float | Sequence[float] | None = None,
    steps: StepRule | None = None,
    sinks: Sink | str | Path | Iterable[Sink | str | Path] | None = None,
    progress: bool = False,
    registry: Registry | None = None,
) -> Run:
    """March a model from its start to its stop.

    Exactly one step rule is given: `step`, or `rel_tol` with `abs_tol`, or `steps`.

    Args:
        model: what is marched.
        method: a slug, a Tableau, or a path that ends in `.toml`.
        step: every step's length, positive, in time units; or a function of (t, y[, params]) that gives it.
        rel_tol: relative tolerance, unitless. abs_tol: absolute tolerance in state units, a number or an
            array that broadcasts to the state.
        steps: `newel.Fixed(...)`, `newel.Given(...)` or `newel.Adaptive(...)`.
        sinks: where the rows go: a sink, a file name whose ending chooses one, or several of these; by
            default `newel.sinks.Memory()`.
        progress: whether to show progress on a terminal.
        registry: where methods, controllers and sinks are looked up; by default the usual one.

    Returns:
        The run: its last state, counters, events, notes and, with a memory sink, times (N,) and states
        (N, *state shape).

    Raises:
        BadRequest: for no step rule or two, tolerances or times out of range.
        BadModel: for a rate that is wrong at its first call.
        UnknownMethod, NotProved: for a method that is not there or does not hold what it claims.
        OutputExists, OutputFailed: for an output that cannot be opened or written.
        MarchFailed: where the march cannot go on; its `run` holds all that was computed.
        MarchInterrupted: on Ctrl-C; its `run` holds all that was computed.

    Example:
        >>> import newel
        >>> decay = newel.Model(lambda t, y: -y, start=0.0, stop=1.0, state=[1.0])
        >>> run = newel.march(decay, "kutta-4", step=0.1)
        >>> f"{run.last_state[0]:.6f}", run.calls
        ('0.367880', 40)
    """
    if not isinstance(model, Model):
        raise BadRequest(
            f"march takes a newel.Model first and the method second, not {type(model).__name__}\n"
            "  model = newel.Model(rate, start=..., stop=..., state=...)",
            argument="model",
        )
    where = default_registry() if registry is None else registry
    rule = chosen_rule(step, rel_tol, abs_tol, steps)
    tableau, original, estimator = method_for(method, rule, where)
    controller = where.controller(rule.controller) if isinstance(rule, Adaptive) else None
    loop = Loop(model, tableau, rule, controller)
    outputs = _outputs(sinks, where)
    settings = {**rule.settings(), "estimator": estimator}
    about = {"method": original.slug, "digest": original.digest, "settings": settings}
    head = Head(
        labels=model.labels,
        units=model.units,
        time_unit=model.time_unit,
        shape=model.state.shape,
        dtype=model.state.dtype,
        has_events=bool(model.events),
        about=about,
    )
    delivery = Delivery(outputs, head, model.forward, model.start, model.stop)
    if not loop.adaptive:
        _check_landings(loop, rule, delivery)
    if loop.pace.steps is not None:
        delivery.require_room(loop.pace.steps + len(loop.breaks))
    if original.proof is None:
        loop.notes.append(Note(f"{original.slug} is unproven: it was taken on trust"))
    return _Drive(loop, delivery, outputs, about, estimator).run(progress)


def _outputs(sinks: Any, registry: Registry) -> list[Sink]:
    if sinks is None:
        return [Memory()]
    if isinstance(sinks, (str, Path)) or hasattr(sinks, "write"):
        sinks = [sinks]
    outputs: list[Sink] = []
    try:
        listed = list(sinks)
    except TypeError:
        listed = [sinks]
    for sink in listed:
        if isinstance(sink, (str, Path)):
            sink = registry.sink_for(sink)(sink)
        if not all(callable(getattr(sink, name, None)) for name in ("open", "write", "close")):
            raise BadRequest(
                f"sinks holds {sink!r}, which is no sink\n"
                "  Give a file name such as 'out.csv', or an object with open, write and close.",
                argument="sinks",
            )
        outputs.append(sink)
    return outputs


def _check_landings(loop: Loop, rule: StepRule, delivery: Delivery) -> None:
    """Refuse asked times that a march without error control does not reach; nothing is interpolated."""
    pace = loop.pace
    if isinstance(pace, GridPace):
        nearest: Callable[[float], float] = pace.nearest
    elif isinstance(rule, Given):
        times = sorted((loop.model.start, *rule.times))

        def nearest(t: float) -> float:
            index = bisect_left(times, t)
            return min(times[max(index - 1, 0) : index + 1], key=lambda given: abs(given - t))
    else:
        return
    for t in delivery.landings():
        close = nearest(t)
        if abs(t - close) > 4.0 * spacing(max(abs(t), abs(loop.model.start))):
            raise BadRequest(
                f"a sink asks for t = {t!r}, which is no time of this march; the nearest is {close!r}\n"
                "  Ask for times of the grid, take another step, or let the step adapt.",
                argument="at",
            )


class _Drive:
    """One march: the loop, its outputs, and an end that always leaves both in order."""

    def __init__(
        self, loop: Loop, delivery: Delivery, outputs: list[Sink], about: dict[str, Any], estimator: str
    ) -> None:
        self.loop, self.delivery, self.outputs = loop, delivery, outputs
        self.about, self.estimator = about, estimator

    def run(self, progress: bool) -> Run:
        """Go from start to stop; whatever happens, close every sink and keep what was computed."""
        with own_sums_are_quiet():
            return self._run(progress)

    def _run(self, progress: bool) -> Run:
        loop, model = self.loop, self.loop.model
        self.delivery.open()
        try:
            bar = open_progress(progress, model.start, model.stop, model.time_unit)
            if bar is None:
                ended = self._go(None)
            else:
                with bar:
                    ended = self._go(bar.update)
        except KeyboardInterrupt:
            raise self._interrupted(self._rescue("interrupted")) from None
        except OutputFailed as error:
            error.run = self._rescue("failed")
            raise
        except CannotGoOn as error:
            raise self._failure(error.headline, error.advice, error.reason) from None
        except NewelError as error:
            if loop.accepted == 0:
                self._rescue("failed")
                raise
            raise self._failure(str(error), "", type(error).__name__) from error
        except Exception as error:
            words = blame(error, model)
            if words is None:
                self._rescue("failed")
                raise
            raise self._failure(words, "", "raised") from error
        except BaseException:
            self._rescue("failed")
            raise
        return self._finish(ended)

    def _go(self, show: Callable[[float, int, int, float], None] | None) -> Ended:
        loop, row = self.loop, self.delivery.row
        state, stop = loop.step.state, loop.stop
        try:
            loop.prepare()
            row(loop.time, state)
            landing = (
                self.delivery.next_landing(loop.time) if loop.adaptive or loop.pace.steps is None else None
            )
            while loop.time != stop:
                label = loop.advance(landing)
                last = loop.time == stop or loop.ended_by is not None
                row(loop.time, state, label, last)
                if landing is not None:
                    landing = self.delivery.next_landing(loop.time)
                if show is not None:
                    show(float(loop.time), loop.accepted, loop.rejected, float(loop.last_step))
                if loop.ended_by is not None:
                    return Ended("event", loop.time, loop.ended_by)
        except MemoryFull as full:
            loop.notes.append(Note(f"{full}; the march ended there", float(loop.time)))
            return Ended("memory", loop.time)
        return Ended("stop", loop.time)

    def _interrupted(self, run: Run) -> MarchInterrupted:
        loop = self.loop
        message = f"stopped by Ctrl-C at t = {float(loop.time):g}\n{kept(loop.accepted, loop.time)}"
        return MarchInterrupted(message, run=run)

    def _failure(self, headline: str, advice: str, reason: str) -> MarchFailed:
        loop = self.loop
        run = self._rescue("failed")
        lines = [headline, kept(loop.accepted, loop.time), advice]
        message = "\n".join(line for line in lines if line)
        return MarchFailed(message, run=run, time=float(loop.time), reason=reason)

    def _rescue(self, reason: str) -> Run:
        """Put what was computed into the sinks and close them, though the march cannot go on."""
        loop = self.loop
        loop.settle()
        ended = Ended(reason, loop.time)
        try:
            if self.delivery.last_time is not None and self.delivery.last_time != loop.time:
                self.delivery.complete(loop.time, loop.step.state)
        except (NewelError, MemoryFull) as error:
            loop.notes.append(Note(str(error)))
        try:
            self.delivery.close(ended)
        except NewelError as error:
            loop.notes.append(Note(str(error)))
        return self._made(ended)

    def _finish(self, ended: Ended) -> Run:
        try:
            self.delivery.close(ended)
        except OutputFailed as error:
            error.run = self._made(ended)
            raise
        except KeyboardInterrupt:
            # The sinks are closed all the same, and the march is over.
            raise self._interrupted(self._made(ended)) from None
        return self._made(ended)

    def _made(self, ended: Ended) -> Run:
        loop, model = self.loop, self.loop.model
        memory = next((sink for sink in self.outputs if isinstance(sink, Memory)), None)
        log.info(
            "%s: t = %r to %r, %s, %d steps, %d rejected, %d calls, ended by %s",
            self.about["method"],
            model.start,
            loop.time,
            self.about["settings"]["steps"],
            loop.accepted,
            loop.rejected,
            loop.step.calls,
            ended.label or ended.reason,
        )
        return Run(
            method=self.about["method"],
            digest=self.about["digest"],
            settings=self.about["settings"],
            labels=model.labels,
            units=model.units,
            time_unit=model.time_unit,
            estimator=self.estimator,
            last_time=loop.time,
            last_state=loop.step.state.copy(),
            calls=loop.step.calls,
            accepted=loop.accepted,
            rejected=loop.rejected,
            ended=ended,
            events=loop.events,
            notes=loop.notes,
            machine=machine(),
            sinks=self.delivery.names,
            times=None if memory is None else memory.times,
            states=None if memory is None else memory.states,
            event_labels=None if memory is None else memory.events,
        )
