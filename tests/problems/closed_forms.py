"""Small problems with closed-form solutions, for measured orders of convergence.

`warped` is the one that tells orders apart: it is nonlinear, depends on time, couples its components, and
none of its elementary differentials vanishes, so that no order condition goes unseen. The others each leave
some conditions out (a linear problem sees only the tall trees, a quadrature only the bushy ones).
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np

from tests.problems.arithmetic import Array, Rate

__all__ = ["CLOSED_FORMS", "SWITCHED", "WARPED", "Known", "measured_order"]


@dataclass(frozen=True)
class Known:
    """A problem over [start, stop] whose solution(t) is known, shape and dtype as the state (float64)."""

    name: str
    description: str
    rate: Rate
    solution: Callable[[float], Array]
    start: float = 0.0
    stop: float = 2.0
    breaks: tuple[float, ...] = field(default=())

    @property
    def state(self) -> Array:
        """The state at `start`, a fresh array."""
        return self.solution(self.start)

    def error(self, state: Array) -> float:
        """The Euclidean length of the error of a state at `stop`."""
        return float(np.linalg.norm(np.asarray(state, dtype=np.float64) - self.solution(self.stop)))


# Three members of the same system side by side, so that no leading error vanishes in all of them by chance.
PHASES = np.array([0.0, 2.0, 4.0])


def _warped_rate(t: float, y: Array) -> Array:
    pace = 1.0 + t / 2.0
    out = np.empty_like(y)
    np.multiply(y[0], y[1] * pace, out=out[0])
    np.multiply(np.log(y[0]), -pace, out=out[1])
    return out


def _warped(t: float) -> Array:
    """In the time t + t²/4 it is y1' = y1 y2, y2' = -ln y1, solved by exp(sin) and cos."""
    own = PHASES + (t + t * t / 4.0)
    return np.array([np.exp(np.sin(own)), np.cos(own)])


WARPED = Known("warped", "nonlinear, coupled, depends on time; shape (2, 3)", _warped_rate, _warped, 0.0, 1.5)

SWITCH = 0.75


def _switched_rate(t: float, y: Array) -> Array:
    if t < SWITCH:
        return _warped_rate(t, y)
    return -y[0] * y


def _switched(t: float) -> Array:
    """As `warped` up to the switch; from there both components fall like 1/(1 + y1 t)."""
    if t < SWITCH:
        return _warped(t)
    at_switch = _warped(SWITCH)
    falling: Array = at_switch / (1.0 + at_switch[0] * (t - SWITCH))
    return falling


SWITCHED = Known("switched", "the rate jumps at one time", _switched_rate, _switched, 0.0, 1.5, (SWITCH,))


def _logistic(t: float) -> Array:
    return np.array([1.0 / (1.0 + 3.0 * math.exp(-t))])


def _oscillation(t: float) -> Array:
    return np.array([math.cos(2.0 * t), -2.0 * math.sin(2.0 * t)])


CLOSED_FORMS = {
    known.name: known
    for known in (
        Known("logistic", "one equation, nonlinear: y' = y (1 - y)", lambda t, y: y * (1.0 - y), _logistic),
        Known(
            "oscillator",
            "linear, in two components: y1' = y2, y2' = -4 y1",
            lambda t, y: np.array([y[1], -4.0 * y[0]]),
            _oscillation,
        ),
        Known(
            "paced-growth",
            "linear with a factor that depends on time: y' = y cos t",
            lambda t, y: y * math.cos(t),
            lambda t: np.array([math.exp(math.sin(t))]),
        ),
        WARPED,
        SWITCHED,
    )
}
"""All of them by name."""

# Below this the rounding of double precision shows in the slopes.
FLOOR = 1e-12


def measured_order(error_of: Callable[[int], float], start: int = 2, most: int = 512) -> float:
    """The slope of the error over the number of steps, between the finest two of a ladder above rounding.

    `error_of(n)` is the error of a march in n equal steps. The ladder doubles n, from `start` and from
    1.5·start, until the error falls below 1e-12 or n passes `most`.
    """
    slopes: dict[int, float] = {}
    for first in (start, start + start // 2):
        count, error = first, error_of(first)
        while 2 * count <= most:
            finer = error_of(2 * count)
            if finer < FLOOR:
                break
            slopes[2 * count] = math.log2(error / finer)
            count, error = 2 * count, finer
    return slopes[max(slopes)]
