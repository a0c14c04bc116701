"""A model: the physics that is marched, and nothing of how it is marched."""

from __future__ import annotations

import html
import importlib
from collections.abc import Callable, Iterable, Mapping, Sequence
from functools import cached_property
from pathlib import Path
from typing import TYPE_CHECKING, Any

import attrs

from newel.models.checks import bad, check_call, check_labels, flag, nearest, number, text_tuple, within_pair
from newel.models.intake import copy_params, own_state
from newel.models.labels import IndexLabels
from newel.protocols import Array, Rate

if TYPE_CHECKING:
    from newel.models.events import StateEvent
    from newel.models.examine import Examination
    from newel.models.layout import Layout

__all__ = ["Model"]


def _start(value: Any) -> float:
    return number(value, "start")


def _stop(value: Any) -> float:
    return number(value, "stop")


def _in_place(value: Any) -> bool:
    return flag(value, "in_place")


def _copies(value: Any) -> bool:
    return flag(value, "copies")


def _jacobian(value: Any) -> Any:
    if value is not None and not callable(value):
        raise bad("jacobian", f"jacobian is {value!r}", "Give a function, or leave it out.")
    return value


def _judged_with_the_rest(value: Any) -> Any:
    return value


def _sorted_breaks(given: Any, forward: bool) -> tuple[float, ...]:
    try:
        listed = [given] if isinstance(given, (str, float, int)) else list(given)
    except TypeError:
        raise bad("breaks", f"breaks is {given!r}", "Give a sequence of times.") from None
    times = {number(value, f"breaks: entry {i}") for i, value in enumerate(listed, start=1)}
    return tuple(sorted(times, reverse=not forward))


def _taken_labels(given: Any, size: int) -> tuple[Layout | None, tuple[str, ...]]:
    if given is None or (isinstance(given, (tuple, list)) and not given):
        return None, ()
    if hasattr(given, "pack") and hasattr(given, "views"):
        if given.size != size:
            what = f"labels: the layout has {given.size} entries, the state {size}"
            raise bad("labels", what, f"Give state=layout.pack(…), of {given}.")
        return given, ()
    labels = text_tuple(given, "labels")
    if len(labels) != size:
        what = f"labels: {len(labels)} texts for a state of {size} entries"
        raise bad("labels", what, "Give one for each entry.")
    check_labels(labels)
    return None, labels


def _taken_units(given: Any, size: int, layout: Layout | None) -> tuple[str, ...] | dict[str, str]:
    if isinstance(given, Mapping):
        parts = () if layout is None else layout.parts
        for name in given:
            if name not in parts:
                what = f"units: {name!r} is no part of the layout{nearest(str(name), parts)}"
                kept = ", ".join(parts) or "none was given"
                raise bad("units", what, f"Give units for parts of a Layout ({kept}), or one for each entry.")
        return dict(zip(given, text_tuple(given.values(), "units"), strict=True))
    units = () if given is None else text_tuple(given, "units")
    if units and len(units) != size:
        what = f"units: {len(units)} texts for a state of {size} entries"
        raise bad("units", what, "Give one for each entry, or none.")
    return units


def _paths(value: Any) -> tuple[Path, ...]:
    try:
        return (Path(value),) if isinstance(value, (str, Path)) else tuple(Path(one) for one in value)
    except TypeError:
        raise bad("files", f"files is {value!r}", "Give a sequence of paths.") from None


# No slots: the labels of 10⁶ entries are made only when asked for.
@attrs.frozen(eq=False, repr=False, slots=False)
class Model:
    """What is marched: dy/dt = rate(t, y) from `start` to `stop`, with its switches, limits and labels.

    The state and the parameters are copied in; a model never changes. `replace` makes another.

    Args:
        rate: `rate(t, y)`, then `out` where `in_place`, then the params exactly when `params` is given.
            `t` is in `time_unit`, `y` a read-only array of the state's shape and dtype; the result has that
            shape, in state units per time unit.
        start, stop: finite and different, in `time_unit`; `stop` may lie before `start`.
        state: the state at `start`, of any shape. Integers become float64; float32, float64, longdouble,
            complex64, complex128 and object arrays stay what they are.
        params: handed to every function as its last argument, where not None.
        in_place: `rate` fills `out` instead of returning an array.
        events: `StateEvent` objects with different labels.
        breaks: times at which `rate` jumps or bends; kept in the order of the march, each once. Those outside
            the span from `start` to `stop` are kept, for a later `replace`, but not used; `notes` names them.
        within: the limits of valid states, a pair (low, high) that broadcasts to the state, or a function
            `within(t, y[, params]) -> bool`.
        after_step, after_stage: `f(t, y[, params])`, which returns a changed state or None.
        jacobian: stored only.
        labels: a text for each entry in C order, or a `Layout`; by default `y[0]`, `y[1]`, … (`y[0,1]`).
        units: a text for each entry, or none; with a `Layout` also a dict from its parts to units.
        time_unit: the unit of `t`, a text.
        files: paths of the files that `rate` depends on, for the record.
        copies: `rate` gets a private writable copy of the state.

    Attributes:
        layout: the `Layout` that was given as `labels`, or None.
        notes: what a user must know about the model, such as parameters that could not be copied.

    Raises:
        BadModel: an argument is not what a march needs; the text names it, the value, and what to do.

    Example:
        >>> cooling = Model(lambda t, y: -0.1 * (y - 20.0), start=0.0, stop=60.0, state=[90.0],
        ...                 labels=("coffee",), units=("degC",), time_unit="min")
        >>> cooling.replace(stop=30.0).stop
        30.0
    """

    rate: Rate
    start: float = attrs.field(kw_only=True, converter=_start)
    stop: float = attrs.field(kw_only=True, converter=_stop)
    state: Array = attrs.field(kw_only=True, converter=own_state)
    params: Any = attrs.field(default=None, kw_only=True)
    in_place: bool = attrs.field(default=False, kw_only=True, converter=_in_place)
    events: tuple[StateEvent, ...] = attrs.field(default=(), kw_only=True, converter=_judged_with_the_rest)
    breaks: tuple[float, ...] = attrs.field(default=(), kw_only=True, converter=_judged_with_the_rest)
    within: tuple[Array, Array] | Callable[..., bool] | None = attrs.field(
        default=None, kw_only=True, converter=_judged_with_the_rest
    )
    after_step: Callable[..., Any] | None = attrs.field(default=None, kw_only=True)
    after_stage: Callable[..., Any] | None = attrs.field(default=None, kw_only=True)
    jacobian: Callable[..., Any] | None = attrs.field(default=None, kw_only=True, converter=_jacobian)
    _labels: Any = attrs.field(default=(), kw_only=True)
    _units: Any = attrs.field(default=(), kw_only=True)
    time_unit: str = attrs.field(default="", kw_only=True)
    files: tuple[Path, ...] = attrs.field(default=(), kw_only=True, converter=_paths)
    copies: bool = attrs.field(default=False, kw_only=True, converter=_copies)
    layout: Layout | None = attrs.field(init=False, default=None)
    notes: tuple[str, ...] = attrs.field(init=False, default=())

    def __attrs_post_init__(self) -> None:
        if self.start == self.stop:
            what = f"stop equals start ({self.start}): there is nothing to march"
            raise bad("stop", what, "Give a later stop, or an earlier one to march backwards.")
        if not isinstance(self.time_unit, str):
            raise bad("time_unit", f"time_unit is {self.time_unit!r}", 'Give a text, such as "s".')
        params, kept = copy_params(self.params)
        self._set("params", params)
        self._set("breaks", _sorted_breaks(self.breaks, self.forward))
        self._set("events", self._checked_events())
        self._check_functions()
        self._set("within", self._checked_within())
        layout, labels = _taken_labels(self._labels, self.state.size)
        self._set("layout", layout)
        self._set("_labels", labels)
        self._set("_units", _taken_units(self._units, self.state.size, layout))
        notes = [
            f"{name} is kept as given, for newel cannot copy it: its changes change the model"
            for name in kept
        ]
        low, high = sorted((self.start, self.stop))
        outside = [time for time in self.breaks if not low <= time <= high]
        notes += [
            f"the break at {time!r} lies outside {low!r} to {high!r} and is not used" for time in outside
        ]
        self._set("notes", tuple(notes))

    def _set(self, name: str, value: Any) -> None:
        object.__setattr__(self, name, value)

    @property
    def forward(self) -> bool:
        """Whether time grows along the march."""
        return self.stop > self.start

    @cached_property
    def labels(self) -> Sequence[str]:
        """One text for each entry of the state, in C order."""
        if self._labels:
            return tuple(self._labels)
        if self.layout is not None:
            return self.layout.labels
        return IndexLabels({"y": self.state.shape})

    @cached_property
    def units(self) -> tuple[str, ...]:
        """One unit for each entry of the state, in C order; empty where none were given."""
        if isinstance(self._units, Mapping) and self.layout is not None:
            return tuple(self._units.get(name, "") for name in self.layout.owners())
        return tuple(self._units)

    def _arguments(self, *names: str) -> tuple[str, ...]:
        return names if self.params is None else (*names, "params")

    def _checked_events(self) -> tuple[StateEvent, ...]:
        given: Any = self.events
        single = hasattr(given, "indicator") or not isinstance(given, Iterable)
        events: tuple[StateEvent, ...] = (given,) if single else tuple(given)
        labels: set[str] = set()
        for i, event in enumerate(events, start=1):
            if not (hasattr(event, "label") and hasattr(event, "indicator") and hasattr(event, "crossing")):
                raise bad("events", f"events: entry {i} is {event!r}", "Give newel.StateEvent objects.")
            if event.label in labels:
                what = f"events: two are labelled {event.label!r}"
                raise bad("events", what, "Give each event a label of its own.")
            labels.add(event.label)
            check_call(event.indicator, f"indicator of {event.label!r}", self._arguments("t", "y"))
        return events

    def _check_functions(self) -> None:
        check_call(self.rate, "rate", self._arguments("t", "y", *(("out",) if self.in_place else ())))
        for name in ("after_step", "after_stage"):
            if getattr(self, name) is not None:
                check_call(getattr(self, name), name, self._arguments("t", "y"))

    def _checked_within(self) -> tuple[Array, Array] | Callable[..., bool] | None:
        given: Any = self.within
        if given is None:
            return None
        if callable(given):
            check_call(given, "within", self._arguments("t", "y"))
            limits: Callable[..., bool] = given
            return limits
        return within_pair(given, self.state)

    def replace(self, **changes: Any) -> Model:
        """Return a new model with some arguments changed, by the names that `Model` takes.

        Raises:
            BadModel: an unknown name, or a value that the model cannot have.
        """
        given = {
            field.alias or field.name: getattr(self, field.name)
            for field in attrs.fields(Model)
            if field.init
        }
        if self.layout is not None:
            given["labels"] = self.layout
        for name in changes:
            if name not in given:
                what = f"a model has no {name!r}{nearest(name, given)}"
                raise bad(name, what, f"It has: {', '.join(given)}.")
        given |= changes
        return Model(given.pop("rate"), **given)

    def examine(self) -> Examination:
        """Call the model's functions a few times and report what would spoil a march."""
        examine: Callable[[Model], Examination] = importlib.import_module("newel.models.examine").examine
        return examine(self)

    def _facts(self) -> tuple[tuple[str, str], ...]:
        rate = getattr(self.rate, "__name__", type(self.rate).__name__)
        unit = f" {self.time_unit}" if self.time_unit else ""
        names = ", ".join(self.labels[:4]) + (", …" if self.state.size > 4 else "")
        events = ", ".join(event.label + (" (ends)" if event.ends else "") for event in self.events)
        extras = [name for name in ("in_place", "after_step", "after_stage", "copies") if getattr(self, name)]
        extras += ["params"] if self.params is not None else []
        extras += ["within"] if self.within is not None else []
        return (
            ("rate", f"{rate}, t from {self.start:g} to {self.stop:g}{unit}"),
            ("state", f"{names}; shape {self.state.shape}, {self.state.dtype}"),
            ("has", "; ".join([f"{len(self.breaks)} breaks", f"events: {events or 'none'}", *extras])),
        )

    def __repr__(self) -> str:
        rate, state, has = (text for _, text in self._facts())
        return f"Model of {rate}\n  {state}\n  {has}"

    def _repr_html_(self) -> str:
        rows = "".join(
            f"<tr><th>{html.escape(k)}</th><td>{html.escape(v)}</td></tr>" for k, v in self._facts()
        )
        return f"<table>{rows}</table>"
