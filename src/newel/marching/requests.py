"""What a request must fulfil before the first rate call."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, Any, NamedTuple

import numpy as np

from newel.errors import BadRequest
from newel.marching.pacing import FunctionPace, GivenPace, GridPace, Pace, exactly
from newel.protocols import Array, Norm
from newel.stepping.rules import Adaptive, Fixed, Given, StepRule

if TYPE_CHECKING:
    from newel.models.model import Model

__all__ = ["Limits", "breaks_inside", "check_state_kind", "pace_of", "tolerances"]


class Limits(NamedTuple):
    """An adaptive rule, fitted to a state.

    `ratio` is abs_tol/rel_tol, flat, of the state's size or of size 1.
    """

    rel_tol: float
    ratio: Array
    norm: Norm | None
    smallest: float
    largest: float


def check_state_kind(model: Model, adaptive: bool) -> None:
    """Refuse for object states what only floats can do."""
    if model.state.dtype != np.dtype(object):
        return
    wanted = {"adaptive steps": adaptive, "events": bool(model.events), "breaks": bool(model.breaks)}
    for what, given in wanted.items():
        if given:
            raise BadRequest(
                f"a state of dtype object cannot be marched with {what}\n"
                "  Give step=..., or a state of dtype float64 or longdouble.",
                argument="steps",
            )


def tolerances(model: Model, rule: Adaptive) -> Limits:
    """Fit the tolerances to the state's shape and dtype.

    Raises:
        BadRequest: for tolerances that the dtype cannot carry, or a shape that does not fit.
    """
    dtype, shape = model.state.dtype, model.state.shape
    real = np.zeros(0, dtype=dtype).real.dtype
    least = 4.0 * float(np.finfo(real).eps)
    if rule.rel_tol < least:
        raise BadRequest(
            f"rel_tol={rule.rel_tol:g} is below what a state of dtype {dtype} carries; at least {least:.1e}",
            argument="rel_tol",
        )
    tolerance = np.asarray(rule.abs_tol, dtype=real)
    try:
        wide = np.broadcast_to(tolerance, shape)
    except ValueError:
        raise BadRequest(
            f"abs_tol has shape {tolerance.shape}, and the state has shape {shape}\n"
            "  Give one number, or an array that broadcasts to the state.",
            argument="abs_tol",
        ) from None
    flat = tolerance.reshape(1) if tolerance.ndim == 0 else wide.reshape(-1).copy()
    if not (flat > 0).all():
        raise BadRequest(f"abs_tol={rule.abs_tol!r} is zero in a state of dtype {dtype}", argument="abs_tol")
    smallest, largest = float(rule.smallest or 0.0), float(rule.largest or math.inf)
    return Limits(rule.rel_tol, flat / rule.rel_tol, rule.norm, smallest, largest)


def breaks_inside(model: Model) -> list[float]:
    """Return the breaks between start and stop, in the order of the march."""
    low, high = sorted((model.start, model.stop))
    return [time for time in model.breaks if low < time < high]


def pace_of(rule: StepRule, start: Any, stop: Any, extra: tuple[Any, ...]) -> Pace:
    """Return what proposes the steps of a rule without error control."""
    if isinstance(rule, Given):
        times = rule.times if isinstance(start, float) else [exactly(t) for t in rule.times]
        return GivenPace(start, stop, times)
    assert isinstance(rule, Fixed)
    if callable(rule.step):
        return FunctionPace(stop, rule.step, extra)
    if isinstance(start, float):
        return GridPace(start, stop, float(rule.step))
    return GridPace(start, stop, exactly(rule.step))
