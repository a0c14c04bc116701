"""Loops as people write them: right and wrong, in place and low in storage, for lists, arrays and numbers."""

from __future__ import annotations

import math
from typing import Any

import numpy as np


def classical(rate: Any, t: float, y: Any, h: float) -> Any:
    k1 = rate(t, y)
    k2 = rate(t + h / 2, y + h / 2 * k1)
    k3 = rate(t + h / 2, y + h / 2 * k2)
    k4 = rate(t + h, y + h * k3)
    return y + h / 6 * (k1 + 2 * k2 + 2 * k3 + k4)


def classical_one_weight_wrong(rate: Any, t: float, y: Any, h: float) -> Any:
    k1 = rate(t, y)
    k2 = rate(t + h / 2, y + h / 2 * k1)
    k3 = rate(t + h / 2, y + h / 2 * k2)
    k4 = rate(t + h, y + h * k3)
    return y + h / 6 * (k1 + 2 * k2 + k3 + k4)


def classical_one_stage_wrong(rate: Any, t: float, y: Any, h: float) -> Any:
    """The third stage starts from the first rate again."""
    k1 = rate(t, y)
    k2 = rate(t + h / 2, y + h / 2 * k1)
    k3 = rate(t + h / 2, y + h / 2 * k1)
    k4 = rate(t + h, y + h * k3)
    return y + h / 6 * (k1 + 2 * k2 + 2 * k3 + k4)


def classical_without_time(rate: Any, t: float, y: Any, h: float) -> Any:
    """For a rate that does not depend on t; nobody noticed that the times are wrong."""
    k1 = h * rate(t, y)
    k2 = h * rate(t, y + k1 / 2)
    k3 = h * rate(t, y + k2 / 2)
    k4 = h * rate(t, y + k3)
    return y + (k1 + 2 * k2 + 2 * k3 + k4) / 6


def wrong_constant(rate: Any, t: float, y: Any, h: float) -> Any:
    """One constant in the node and in the row alike."""
    third = 1 / 3
    k1 = rate(t, y)
    k2 = rate(t + third * h, y + third * h * k1)
    k3 = rate(t + h / 2, y + h / 2 * k2)
    k4 = rate(t + h, y + h * k3)
    return y + h / 6 * (k1 + 2 * k2 + 2 * k3 + k4)


def convex_sums(rate: Any, t: float, y: Any, h: float) -> Any:
    """Three Euler steps and their averages: the optimal method of order 3 for shocks."""
    u = y + h * rate(t, y)
    u = 3 / 4 * y + 1 / 4 * (u + h * rate(t + h, u))
    return 1 / 3 * y + 2 / 3 * (u + h * rate(t + h / 2, u))


def two_registers(rate: Any, t: float, y: Any, h: float) -> None:
    """In place, with one register more than the state (J. H. Williamson 1980, order 3)."""
    s = np.zeros_like(y)
    for a, b, c in ((0.0, 1 / 3, 0.0), (-5 / 9, 15 / 16, 1 / 3), (-153 / 128, 8 / 15, 3 / 4)):
        s *= a
        s += h * rate(t + c * h, y)
        y += b * s


def two_registers_sign_lost(rate: Any, t: float, y: Any, h: float) -> None:
    s = np.zeros_like(y)
    for a, b, c in ((0.0, 1 / 3, 0.0), (-5 / 9, 15 / 16, 1 / 3), (153 / 128, 8 / 15, 3 / 4)):
        s *= a
        s += h * rate(t + c * h, y)
        y += b * s


def gill(rate: Any, t: float, y: Any, h: float) -> Any:
    r = math.sqrt(2.0)
    k1 = rate(t, y)
    k2 = rate(t + h / 2, y + h / 2 * k1)
    k3 = rate(t + h / 2, y + h * ((r - 1) / 2 * k1 + (2 - r) / 2 * k2))
    k4 = rate(t + h, y + h * (-r / 2 * k2 + (2 + r) / 2 * k3))
    return y + h / 6 * (k1 + (2 - r) * k2 + (2 + r) * k3 + k4)


def on_lists(rate: Any, t: float, y: Any, h: float) -> list[float]:
    k1 = rate(t, list(y))
    k2 = rate(t + h, [a + h * b for a, b in zip(y, k1, strict=True)])
    return [a + h / 2 * (b + c) for a, b, c in zip(y, k1, k2, strict=True)]


def two_unknowns(rate: Any, t: float, y: Any, h: float) -> tuple[float, float]:
    x, v = y
    dx, dv = rate(t, (x, v))
    dx, dv = rate(t + h / 2, (x + h / 2 * dx, v + h / 2 * dv))
    return x + h * dx, v + h * dv


def one_number(rate: Any, t: float, y: Any, h: float) -> float:
    if not isinstance(y, float):
        raise TypeError("a number is wanted")
    k1 = rate(t, y)
    k2 = rate(t + 2 * h / 3, y + 2 * h / 3 * k1)
    return y + h / 4 * k1 + 3 * h / 4 * k2


def into_out(rate: Any, t: float, y: Any, h: float) -> Any:
    k = np.empty_like(y)
    rate(t, y, k)
    half = y + h / 2 * k
    rate(t + h / 2, half, k)
    return y + h * k


def prints(rate: Any, t: float, y: Any, h: float) -> Any:
    print("t =", t)
    return y + h * rate(t, y)


def overwrites(rate: Any, t: float, y: Any, h: float) -> Any:
    """`half` is y itself, so that the last line does not start from the old state."""
    k1 = rate(t, y)
    half = y
    half += h / 2 * k1
    return y + h * rate(t + h / 2, half)


class Multistep:
    """Remembers the rate of the step before."""

    def __init__(self) -> None:
        self.before: Any = None

    def __call__(self, rate: Any, t: float, y: Any, h: float) -> Any:
        now = rate(t, y)
        before, self.before = self.before, now
        return y + h * (now if before is None or len(before) != len(now) else 1.5 * now - 0.5 * before)


def clipped(rate: Any, t: float, y: Any, h: float) -> Any:
    half = np.maximum(y + h / 2 * rate(t, y), 0.0)
    return y + h * rate(t + h / 2, half)


def repeats_where_large(rate: Any, t: float, y: Any, h: float) -> Any:
    k = rate(t, y)
    if np.abs(y).max() > 5.0:
        k = rate(t + h, y + h * k)
    return y + h * k


def never_calls(rate: Any, t: float, y: Any, h: float) -> Any:
    return y


def raises(rate: Any, t: float, y: Any, h: float) -> Any:
    raise ValueError("no table for this range")


def other_order(rate: Any, t: float, y: Any, h: float) -> Any:
    return y + h * rate(y, t)


def returns_nothing(rate: Any, t: float, y: Any, h: float) -> None:
    rate(t, y)


def goes_on(rate: Any, t: float, y: Any, h: float) -> Any:
    while True:
        y = y + h * rate(t, y)


def taylor(rate: Any, t: float, y: Any, h: float) -> Any:
    """A coefficient that depends on the step length."""
    k1 = rate(t, y)
    return y + h * k1 + h * h / 2 * rate(t, y + h * k1)
