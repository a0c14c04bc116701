"""What comes back from a march: data only."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from html import escape
from typing import Any

import attrs
import numpy as np
from numpy.typing import NDArray

from newel.errors import NotKept, UnknownName
from newel.protocols import Array

__all__ = ["Ended", "EventRecord", "Note", "Run"]


@attrs.frozen
class Ended:
    """How a march ended.

    `reason` is "stop", "event", "budget", "memory", "interrupted" or "failed"; `label` names the event where
    one ended it; `time` is the last time reached, in the model's time unit.
    """

    reason: str
    time: float
    label: str | None = None


@attrs.frozen
class Note:
    """Something that a user must know about a run. `time` is where it happened, or None."""

    text: str
    time: float | None = None


@attrs.frozen(eq=False)
class EventRecord:
    """One event: its label, time, and a copy of the state at that time (on the far side of the crossing)."""

    label: str
    time: float
    state: Array


@attrs.define(eq=False, repr=False)
class Run:
    """A march's outcome: its last state, its counters, and, with a memory sink, every row.

    Attributes:
        method: the slug of the method that was run.
        digest: the digest of its exact numbers.
        settings: the step rule, controller and sinks, fit for JSON.
        last_time, last_state: always there; the state is a copy.
        calls: how often `rate` was called. `accepted`, `rejected`: attempted steps.
        estimator: "embedded", "step doubling" or "none".
        ended: how it ended; None while it goes on.
        events: the events in time order. notes: what a user must know.
        labels, units, time_unit: of the model.
        machine: versions and platform.
    """

    method: str
    digest: str
    settings: Mapping[str, Any]
    labels: Sequence[str]
    units: tuple[str, ...]
    time_unit: str
    estimator: str
    last_time: float
    last_state: Array
    calls: int = 0
    accepted: int = 0
    rejected: int = 0
    ended: Ended | None = None
    events: list[EventRecord] = attrs.field(factory=list)
    notes: list[Note] = attrs.field(factory=list)
    machine: Mapping[str, Any] = attrs.field(factory=dict)
    sinks: tuple[str, ...] = ()
    _times: NDArray[np.float64] | None = None
    _states: Array | None = None
    _event_labels: tuple[str, ...] | None = None

    @property
    def times(self) -> NDArray[np.float64]:
        """The times of the kept rows, shape (N,), in `time_unit`; raises NotKept without a memory sink."""
        return self._kept()[0]

    @property
    def states(self) -> Array:
        """The kept states, shape (N, *state shape); raises NotKept without a memory sink."""
        return self._kept()[1]

    def _kept(self) -> tuple[NDArray[np.float64], Array]:
        if self._times is None or self._states is None:
            where = ", ".join(self.sinks) or "none"
            raise NotKept(
                f"this run kept no states: its sinks were {where}\n"
                "  Read that output, or add newel.sinks.Memory() to sinks. "
                "run.last_time and run.last_state are always there."
            )
        return self._times, self._states

    def __getitem__(self, label: str) -> Array:
        """The values of one label over the kept rows, shape (N,); raises UnknownName for another label."""
        states = self.states
        if label not in self.labels:
            raise UnknownName(
                f"this run has no label {label!r}\n  Its labels: {', '.join(self.labels[:12])}",
                kind="label",
                name=label,
            )
        flat: Array = states.reshape(len(states), -1)[:, self.labels.index(label)]
        return flat

    def _facts(self) -> tuple[tuple[str, str], ...]:
        unit = f" {self.time_unit}" if self.time_unit else ""
        reason = "not ended" if self.ended is None else f"ended by {self.ended.label or self.ended.reason}"
        shown = ", ".join(
            f"{label} = {value:.6g}" if isinstance(value, (float, complex)) else f"{label} = {value}"
            for label, value in zip(self.labels[:4], self.last_state.reshape(-1)[:4].tolist(), strict=False)
        )
        more = ", …" if self.last_state.size > 4 else ""
        work = f"{self.accepted:,} steps, {self.rejected:,} rejected, {self.calls:,} rate calls"
        notes = f"; {len(self.events)} events, {len(self.notes)} notes"
        return (
            ("march", f"{self.method}, {reason} at t = {float(self.last_time):.9g}{unit}"),
            ("work", f"{work}, error estimate: {self.estimator}{notes}"),
            ("last state", f"{shown}{more}"),
        )

    def __repr__(self) -> str:
        march, work, state = (text for _, text in self._facts())
        return f"Run of {march}\n  {work}\n  {state}"

    def _repr_html_(self) -> str:
        rows = "".join(f"<tr><th>{name}</th><td>{escape(text)}</td></tr>" for name, text in self._facts())
        return f"<table>{rows}</table>"

    def columns(self) -> dict[str, Array]:
        """One array a column, `t` first: `pandas.DataFrame(run.columns())` makes a frame.

        A column `event` follows where the model has events ("" in rows without one).

        Raises:
            NotKept: without a memory sink.
        """
        times, states = self._kept()
        flat = states.reshape(len(states), -1)
        out: dict[str, Array] = {"t": times}
        out |= {label: flat[:, i] for i, label in enumerate(self.labels)}
        if self._event_labels is not None:
            out["event"] = np.array(self._event_labels, dtype=object)
        return out
