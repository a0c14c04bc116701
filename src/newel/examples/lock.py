"""A canal lock fills: `example:lock`.

Quillmere Lock joins two pounds of the Sedgeway Canal. The place is invented, and so is every figure. Water
runs from the upper pound into the chamber through openings in the ground and in the gate: the ground paddles
are wound up slowly, the gate paddle is dropped open at once. When the levels are within 0.02 m of each other
the gates may be opened.

The flow through an opening of area a under a head h is Q = C·a·√(2·g·|h|), along the head: Torricelli's law
with a contraction coefficient (textbook hydraulics, from memory). With vertical walls on both sides √h then
falls in proportion to ∫a dt, so that everything here is known in closed form.

An example for learning: not for the design or operation of real works without independent checks, local codes
and licensed practice.
"""

from __future__ import annotations

import math

import attrs
import numpy as np
from numpy.typing import ArrayLike, NDArray

from newel.errors import BadModel
from newel.models.events import StateEvent
from newel.models.model import Model

__all__ = ["Lock", "closed_form", "flow", "gates_open_at", "head", "head_left", "model", "rate"]

GRAVITY = 9.81  # m/s2
POUND_LEVEL = 34.6  # m above datum, at the start
HEAD_AT_OPENING = 0.02  # m


@attrs.frozen
class Lock:
    """The lock, in metres and seconds.

    Args:
        paddle: how far the ground paddles are wound up, from 0 (shut) to 1 (all the way).
        lift: the head at the start, m.
        coefficient: contraction coefficient of the openings, unitless; 0.62 suits a sharp edge.
        gate_at: when the gate paddle is dropped open, s after the start.
        chamber_area, pound_area: the water surfaces of the chamber and of the upper pound, m2.
        ground_area, gate_area: the openings of the ground and the gate paddles, m2.
        wind_from, wind_to: between these times the ground paddles are wound up, s.
    """

    paddle: float = 1.0
    lift: float = 2.8
    coefficient: float = 0.62
    gate_at: float = 150.0
    chamber_area: float = 120.0
    pound_area: float = 9000.0
    ground_area: float = 0.5
    gate_area: float = 0.3
    wind_from: float = 20.0
    wind_to: float = 80.0

    def __attrs_post_init__(self) -> None:
        limits = {"paddle": (0.0, 1.0), "lift": (0.05, 30.0), "coefficient": (0.1, 1.0)}
        limits |= {"chamber_area": (1.0, 1e6), "pound_area": (1.0, 1e9)}
        for name, value in attrs.asdict(self).items():
            low, high = limits.get(name, (0.0, 1e6))
            if not (isinstance(value, (int, float)) and low <= value <= high):
                raise BadModel(
                    f"{name} is {value!r}\n  Give a number from {low:g} to {high:g}.", argument=name
                )
        if not self.wind_from < self.wind_to:
            what = f"wind_to is {self.wind_to!r}, not after wind_from ({self.wind_from!r})"
            raise BadModel(f"{what}\n  Give a later time.", argument="wind_to")

    @property
    def fall(self) -> float:
        """The fall of √head for each m2·s of opening: C·√(2·g)/2·(1/chamber + 1/pound), in √m/(m2·s)."""
        areas = 1.0 / self.chamber_area + 1.0 / self.pound_area
        return self.coefficient * math.sqrt(2.0 * GRAVITY) / 2.0 * areas

    def opening(self, t: float) -> float:
        """Return the open area at a time, m2; it bends where winding begins and ends, jumps at `gate_at`."""
        wound = (t - self.wind_from) / (self.wind_to - self.wind_from)
        ground = self.ground_area * self.paddle * min(max(wound, 0.0), 1.0)
        return ground + (self.gate_area if t >= self.gate_at else 0.0)

    def opened(self, t: float) -> float:
        """Return ∫ opening dt from 0 to t, m2·s, in closed form."""
        span = self.wind_to - self.wind_from
        wound = min(max(t - self.wind_from, 0.0), span)
        ground = self.ground_area * self.paddle * (wound**2 / (2.0 * span) + max(t - self.wind_to, 0.0))
        return ground + self.gate_area * max(t - self.gate_at, 0.0)


def head(y: NDArray[np.float64]) -> float:
    """Return the head, upper level less chamber level, m, of a state (upper level, chamber level, volume)."""
    return float(y[0] - y[1])


def flow(t: float, y: NDArray[np.float64], lock: Lock) -> float:
    """Return the flow into the chamber, m3/s, at a time and state."""
    h = head(y)
    return lock.coefficient * lock.opening(t) * math.copysign(math.sqrt(2.0 * GRAVITY * abs(h)), h)


def rate(t: float, y: NDArray[np.float64], lock: Lock) -> list[float]:
    """Return what the levels, m/s, and the volume let in, m3/s, change by."""
    q = flow(t, y, lock)
    return [-q / lock.pound_area, q / lock.chamber_area, q]


def head_left(t: float, y: NDArray[np.float64], lock: Lock) -> float:
    """Return how far the head still has to fall, m, before the gates may be opened."""
    return head(y) - HEAD_AT_OPENING


def model(
    paddle: float = 1.0,
    lift: float = 2.8,
    coefficient: float = 0.62,
    gate_at: float = 150.0,
    stop: float = 900.0,
) -> Model:
    """Return the model of the lock; its state is upper level [m], chamber level [m] and volume let in [m3].

    Args:
        paddle, lift, coefficient, gate_at: see `Lock`.
        stop: the latest end of the march, s; "gates may be opened" ends it earlier.

    Raises:
        BadModel: a value out of its range.

    Example:
        >>> model(paddle=0.5).events[0].label
        'gates may be opened'
    """
    lock = Lock(paddle=paddle, lift=lift, coefficient=coefficient, gate_at=gate_at)
    return Model(
        rate,
        start=0.0,
        stop=stop,
        state=[POUND_LEVEL, POUND_LEVEL - lock.lift, 0.0],
        params=lock,
        events=[StateEvent("gates may be opened", head_left, crossing="falling", ends=True)],
        breaks=[lock.wind_from, lock.wind_to, lock.gate_at],
        labels=("upper level", "chamber level", "volume"),
        units=("m", "m", "m3"),
        time_unit="s",
    )


def closed_form(times: ArrayLike, lock: Lock | None = None) -> NDArray[np.float64]:
    """Return the exact states at N times, shape (N, 3), in the units of `model`; by default of `Lock()`.

    √head(t) = √lift − `lock.fall`·∫opening dt until the levels meet; what leaves the pound
    enters the chamber.

    Example:
        >>> closed_form([0.0, 900.0]).round(3).tolist()
        [[34.6, 31.8, 0.0], [34.563, 34.563, 331.579]]
    """
    lock = lock or Lock()
    root = math.sqrt(lock.lift)
    fallen = np.array([min(lock.fall * lock.opened(float(t)), root) for t in np.atleast_1d(times)])
    lost_head = fallen * (2.0 * root - fallen)
    volume = lost_head / (1.0 / lock.chamber_area + 1.0 / lock.pound_area)
    upper = POUND_LEVEL - volume / lock.pound_area
    chamber = POUND_LEVEL - lock.lift + volume / lock.chamber_area
    return np.stack([upper, chamber, volume], axis=1)


def gates_open_at(lock: Lock | None = None) -> float:
    """Return the exact time at which the head has fallen to 0.02 m, s; infinity where it never does."""
    lock = lock or Lock()
    needed = (math.sqrt(lock.lift) - math.sqrt(HEAD_AT_OPENING)) / lock.fall
    knots = sorted({0.0, lock.wind_from, lock.wind_to, lock.gate_at})
    knot = max(time for time in knots if lock.opened(time) <= needed)
    left, area = needed - lock.opened(knot), lock.opening(knot)
    winding = lock.wind_from <= knot < lock.wind_to
    slope = lock.ground_area * lock.paddle / (lock.wind_to - lock.wind_from) if winding else 0.0
    speed = area + math.sqrt(area**2 + 2.0 * slope * left)
    return knot + 2.0 * left / speed if speed > 0.0 else math.inf
