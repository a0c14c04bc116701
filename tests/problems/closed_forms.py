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

    def error(self, state: Array) -> Array:
        """The error of a state at `stop`, of the same shape."""
        return np.asarray(state, dtype=np.float64) - self.solution(self.stop)


# Three members of the same system side by side, so that no leading error vanishes in all of them by chance.
PHASES = np.array([0.0, 2.0, 4.0])


def _warped_rate(t: float, y: Array) -> Array:
    """The solution stays positive; the absolute value lets the coarsest steps stray."""
    pace = 1.0 + t / 2.0
    out = np.empty_like(y)
    np.multiply(y[0], y[1] * pace, out=out[0])
    np.multiply(np.log(np.abs(y[0])), -pace, out=out[1])
    return out


def _warped(t: float) -> Array:
    """In the time t + t²/4 it is y1' = y1 y2, y2' = -ln y1, solved by exp(sin) and cos."""
    own = PHASES + (t + t * t / 4.0)
    return np.array([np.exp(np.sin(own)), np.cos(own)])


WARPED = Known("warped", "nonlinear, coupled, depends on time; shape (2, 3)", _warped_rate, _warped, 0.0, 1.5)

SWITCH = 1.5


def _switched_rate(t: float, y: Array) -> Array:
    if t < SWITCH:
        return _warped_rate(t, y)
    return -y[0] * y / 4.0


def _switched(t: float) -> Array:
    """As `warped` up to the switch; from there both components fall like 1/(4 + y1 t)."""
    if t < SWITCH:
        return _warped(t)
    at_switch = _warped(SWITCH)
    falling: Array = at_switch / (1.0 + at_switch[0] * (t - SWITCH) / 4.0)
    return falling


SWITCHED = Known("switched", "the rate jumps at one time", _switched_rate, _switched, 0.0, 3.0, (SWITCH,))


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

ROUNDING = 5e-16


def measured_order(
    error_of: Callable[[int], Array], order: int, working_floor: float = 0.0, most: int = 128
) -> float:
    """The slope of the leading error over the number of steps, at the finest ones that rounding leaves clear.

    Args:
        error_of: the error of a march in n equal steps, as an array.
        order: the claimed order p. With E(n) = C n^-p + D n^-(p+1) + …, what is measured is the slope of
            2^(p+1) E(2n) - E(n) = C n^-p + O(n^-(p+2)), which a small C beside a large D does not bend.
            A method of a lower order q shows q; one of a higher order shows more than p + 1.
        working_floor: the residual that coefficients of few digits leave in the order conditions.
        most: the ladders double n from 4, 5, 6 and 7 on, up to `most`.
    """
    clear = 20.0 * 2 ** (order + 1) * max(ROUNDING, working_floor)
    slopes: dict[int, float] = {}
    for first in (4, 5, 6, 7):
        counts = [first]
        errors = [error_of(first)]
        sizes: list[float] = []
        while 2 * counts[-1] <= most:
            counts.append(2 * counts[-1])
            errors.append(error_of(counts[-1]))
            sizes.append(float(np.linalg.norm(2 ** (order + 1) * errors[-1] - errors[-2])))
            if len(sizes) > 1:
                if sizes[-1] < clear:
                    break
                slopes[counts[-1]] = math.log2(sizes[-2] / sizes[-1])
    return slopes[max(slopes)]
