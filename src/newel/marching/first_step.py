"""The length of the first step."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import numpy as np

from newel.protocols import Array, Norm

if TYPE_CHECKING:
    from newel.stepping.numpy_step import NumpyStep

__all__ = ["first_step"]


def _measure(values: Array, scale: Array, norm: Norm | None) -> float:
    with np.errstate(all="ignore"):
        if norm is not None:
            return float(norm(values, scale))
        return math.sqrt(float(np.mean(np.abs(values / scale) ** 2)))


def first_step(
    step: NumpyStep,
    t: float,
    span: float,
    direction: float,
    order: int,
    rel_tol: float,
    abs_tol: Array,
    norm: Norm | None,
) -> float:
    """Return the length of the first step, positive, in time units; calls the rate once.

    The algorithm is that of I. Gladwell, L. F. Shampine and R. W. Brankin, Journal of Computational and
    Applied Mathematics 18 (1987) 175–192, in the form of E. Hairer, S. P. Nørsett and G. Wanner, Solving
    Ordinary Differential Equations I, section II.4: sizes of the state, its rate and the rate's change over
    a tiny Euler step. Its absolute constants are fractions of the span here, and its last formula measures
    time by the model's own rates, so that scaling time or state scales the step and changes nothing else.

    Args:
        step: the engine, with the rate at t in row 1. span: to the first place that must be landed on.
        order: k, one more than the lower order of the pair. abs_tol: flat, or of size 1.
    """
    state, rate = step.state, step.rows[1]
    tolerance = abs_tol if abs_tol.size == 1 else abs_tol.reshape(step.shape)
    scale = np.asarray(tolerance + rel_tol * np.abs(state))
    size, speed = _measure(state, scale, norm), _measure(rate, scale, norm)
    small = 1e-6 * span
    trial, most = small, 0.01 * span
    if size >= 1e-5 and speed * span >= 1e-5 and math.isfinite(size) and math.isfinite(speed):
        trial = min(0.01 * size / speed, span)
        most = 100.0 * trial
    probe = np.zeros(step.shape, dtype=step.dtype)
    with np.errstate(all="ignore"):
        moved = np.asarray(state + direction * trial * rate)
    moved.flags.writeable = False
    step.evaluate(t + direction * trial, moved, probe)
    step.calls += 1
    with np.errstate(all="ignore"):
        change = _measure(probe - rate, scale, norm) / trial
    if not math.isfinite(change):
        return max(trial * 0.01, small)
    if speed > 0.0 and change > 0.0:
        # In parts of the span, so that a power of two in the unit of time changes no bit.
        bend = change * span / speed
        wanted = span * (0.01 / (speed * span * bend ** (order - 1))) ** (1.0 / order)
    elif change > 0.0:
        wanted = math.sqrt(0.01 / change)
    else:
        wanted = math.inf
    return float(min(most, wanted, span))
