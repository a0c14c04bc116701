"""Step rules: how the lengths of the steps are chosen."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Sequence
from typing import Any

import attrs
import numpy as np

from newel.errors import BadRequest
from newel.protocols import Controller, Norm

__all__ = ["Adaptive", "Fixed", "Given", "StepRule", "chosen_rule"]

_NO_RULE = """{problem}: give one of
  step=0.01                       every step the same (or a function of t and y)
  rel_tol=1e-6, abs_tol=1e-9      adaptive
  steps=newel.Given([...])        a step to each of these times"""


def _number(value: Any, argument: str) -> float:
    try:
        return float(value)
    except (TypeError, ValueError):
        raise BadRequest(f"{argument}={value!r} is not a number", argument=argument) from None


def _positive(value: Any, argument: str, why: str = "") -> float:
    number = _number(value, argument)
    if not 0.0 < number < math.inf:
        raise BadRequest(f"{argument}={value!r}: must be positive and finite{why}", argument=argument)
    return number


def _times(values: Iterable[Any]) -> tuple[float, ...]:
    return tuple(_number(value, "times") for value in values)


def _rel_tol(value: Any) -> float:
    return _positive(value, "rel_tol")


@attrs.frozen
class Fixed:
    """Every step has one length, or the length that a function gives.

    Args:
        step: a positive length in time units, whatever the direction of the march (for object states, a
            number of the state's kind), or a function of (t, y[, params]) that returns one.

    Raises:
        BadRequest: for a length that is not positive and finite.
    """

    step: Any

    def __attrs_post_init__(self) -> None:
        """Check the length now: no rate is called for a request that cannot be met."""
        if not callable(self.step):
            _positive(self.step, "step", "; the march finds its direction from start and stop")

    def settings(self) -> dict[str, Any]:
        """Return the rule as plain data."""
        return {"steps": "fixed", "step": _described(self.step)}


@attrs.frozen
class Given:
    """A step to each of these times, in the order of the march; the last is the model's stop.

    Args:
        times: times in time units; the model's start may stand first.

    Raises:
        BadRequest: where they are not finite or not strictly in order.
    """

    times: tuple[float, ...] = attrs.field(converter=_times)

    def __attrs_post_init__(self) -> None:
        """Check the order now, in either direction."""
        if not self.times:
            raise BadRequest("steps=newel.Given([]): give at least one time", argument="times")
        array = np.array(self.times)
        if not np.isfinite(array).all():
            raise BadRequest("newel.Given: every time must be finite", argument="times")
        differences = np.diff(array)
        wrong = np.flatnonzero(differences * (array[-1] - array[0]) <= 0)
        if wrong.size:
            first = int(wrong[0])
            raise BadRequest(
                f"newel.Given: time {first + 2}, {array[first + 1]:g}, does not come after time {first + 1}, "
                f"{array[first]:g}; the times go strictly one way",
                argument="times",
            )

    def settings(self) -> dict[str, Any]:
        """Return the rule as plain data."""
        return {"steps": "given", "times": len(self.times), "first": self.times[0], "last": self.times[-1]}


@attrs.frozen(kw_only=True)
class Adaptive:
    """The step follows an estimate of the local error.

    Args:
        rel_tol: relative tolerance, unitless. abs_tol: absolute tolerance in state units, a number or an
            array that broadcasts to the state's shape; it has no default because it depends on the units.
        controller: a name in the registry or an object with the `newel.protocols.Controller` protocol.
        norm: a function of (error, scale) in place of the weighted root mean square.
        first: the first step's length; smallest, largest: bounds of every step, in time units. Where the
            error asks for less than `smallest` the march fails rather than go on inaccurately.

    Raises:
        BadRequest: for tolerances and lengths that are not positive and finite.
    """

    rel_tol: float = attrs.field(converter=_rel_tol)
    abs_tol: Any = attrs.field()
    controller: str | Controller = "gustafsson-pi"
    norm: Norm | None = None
    first: float | None = None
    smallest: float | None = None
    largest: float | None = None

    def __attrs_post_init__(self) -> None:
        """Check what can be checked without the model."""
        try:
            tolerance = np.asarray(self.abs_tol, dtype=np.float64)
        except (TypeError, ValueError):
            raise BadRequest(
                f"abs_tol={self.abs_tol!r} is not a number or an array of numbers", argument="abs_tol"
            ) from None
        if not ((tolerance > 0) & np.isfinite(tolerance)).all():
            raise BadRequest(
                f"abs_tol={self.abs_tol!r}: must be positive and finite everywhere, in state units; "
                "it is the error that is of no interest even where the state is zero",
                argument="abs_tol",
            )
        for name in ("first", "smallest", "largest"):
            if getattr(self, name) is not None:
                _positive(getattr(self, name), name)
        if self.smallest is not None and self.largest is not None and self.smallest > self.largest:
            raise BadRequest(
                f"smallest={self.smallest!r} is above largest={self.largest!r}", argument="smallest"
            )
        if self.first is not None and self.smallest is not None and self.first < self.smallest:
            raise BadRequest(f"first={self.first!r} is below smallest={self.smallest!r}", argument="first")

    def settings(self) -> dict[str, Any]:
        """Return the rule as plain data."""
        name = self.controller if isinstance(self.controller, str) else self.controller.name
        return {
            "steps": "adaptive",
            "rel_tol": self.rel_tol,
            "abs_tol": np.asarray(self.abs_tol, dtype=np.float64).tolist(),
            "controller": name,
            "norm": "root mean square" if self.norm is None else _described(self.norm),
            "first": self.first,
            "smallest": self.smallest,
            "largest": self.largest,
        }


StepRule = Fixed | Given | Adaptive


def _described(value: Any) -> Any:
    """A number as it is, a function by its name."""
    if callable(value):
        return getattr(value, "__qualname__", type(value).__qualname__)
    return value if isinstance(value, (int, float)) else str(value)


def chosen_rule(
    step: float | Callable[..., float] | None,
    rel_tol: float | None,
    abs_tol: float | Sequence[float] | None,
    steps: StepRule | None,
) -> StepRule:
    """Return the one step rule that was asked for.

    Raises:
        BadRequest: for none or more than one, with the forms that there are.
    """
    tolerances = rel_tol is not None or abs_tol is not None
    count = (step is not None) + tolerances + (steps is not None)
    if count == 0:
        raise BadRequest(_NO_RULE.format(problem="no step rule"), argument="step")
    if count > 1:
        names = [
            name
            for name, value in (("step", step), ("rel_tol", rel_tol), ("abs_tol", abs_tol), ("steps", steps))
            if value is not None
        ]
        problem = f"{' and '.join(names)} together are more than one step rule"
        raise BadRequest(_NO_RULE.format(problem=problem), argument=names[-1])
    if step is not None:
        return Fixed(step)
    if steps is not None:
        if not isinstance(steps, (Fixed, Given, Adaptive)):
            raise BadRequest(_NO_RULE.format(problem=f"steps={steps!r} is not a step rule"), argument="steps")
        return steps
    if rel_tol is None or abs_tol is None:
        missing = "rel_tol" if rel_tol is None else "abs_tol"
        problem = f"{missing} is missing; an adaptive march needs both tolerances"
        raise BadRequest(_NO_RULE.format(problem=problem), argument=missing)
    return Adaptive(rel_tol=rel_tol, abs_tol=abs_tol)
