"""The 25 non-stiff problems of 1972, each over t from 0 to 20.

T. E. Hull, W. H. Enright, B. M. Fellen, A. E. Sedgwick, "Comparing numerical methods for ordinary
differential equations", SIAM J. Numer. Anal. 9 (1972) 603-637: classes A (single equations), B (small
systems), C (moderate systems), D (orbits), E (equations of higher order). The equations and the data of C5
are written from memory; the closed forms, where there is one, are derived in `nonstiff_closed` and agree
with the references, and the orbits of C5 have the semi-major axes of the outer planets (see
tests/published/test_problem_references.py).

All quantities are unitless but in C5: masses in suns, lengths in astronomical units, times in hundreds of
days.
"""

from __future__ import annotations

import json
from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path
from typing import Any

import numpy as np

from tests.problems import nonstiff_closed as closed
from tests.problems.arithmetic import FLOATS, Arithmetic, Array, Build, Rate

__all__ = ["NONSTIFF", "REFERENCES", "STOP", "Problem", "references"]

STOP = 20.0
REFERENCES = Path(__file__).with_name("references.json")


@dataclass(frozen=True)
class Problem:
    """One problem of the set. `closed(t)` gives the exact state as mpmath numbers, where it is known."""

    name: str
    description: str
    build: Build
    closed: Callable[[Any], list[Any]] | None = None

    @cached_property
    def rate(self) -> Rate:
        """`rate(t, y)` in double precision."""
        return self.build(FLOATS)[0]

    @property
    def state(self) -> Array:
        """The state at t = 0, a fresh float64 array."""
        return self.build(FLOATS)[1]


def _single(slope: Callable[[Any, Any], Any], start: str) -> Build:
    """One equation y' = slope(t, y)."""

    def build(maths: Arithmetic) -> tuple[Rate, Array]:
        return lambda t, y: slope(t, y), maths.vector(start)

    return build


def _a3(maths: Arithmetic) -> tuple[Rate, Array]:
    return lambda t, y: y * maths.cos(t), maths.vector("1")


def _small(slope: Callable[..., list[Any]], *start: str) -> Build:
    """A few equations, given as slope(*y) -> list."""

    def build(maths: Arithmetic) -> tuple[Rate, Array]:
        return lambda t, y: np.array(slope(*y.tolist())), maths.vector(*start)

    return build


def _b4(maths: Arithmetic) -> tuple[Rate, Array]:
    def rate(t: Any, y: Array) -> Array:
        a, b, c = y.tolist()
        radius = maths.sqrt(a * a + b * b)
        return np.array([-b - a * c / radius, a - b * c / radius, a / radius])

    return rate, maths.vector("3", "0", "0")


def _b5(maths: Arithmetic) -> tuple[Rate, Array]:
    k = maths.number("0.51")
    return _small(lambda a, b, c: [b * c, -a * c, -k * a * b], "0", "1", "1")(maths)


def _chain(grows: bool) -> Build:
    """C1 and C2: ten equations, each fed by the one before; in C2 the i-th decays i times as fast."""

    def build(maths: Arithmetic) -> tuple[Rate, Array]:
        decay = np.array([(i if grows else 1) for i in range(1, 10)])

        def rate(t: Any, y: Array) -> Array:
            flow = decay * y[:-1]
            out = np.empty_like(y)
            out[0] = -flow[0]
            out[1:-1] = flow[:-1] - flow[1:]
            out[-1] = flow[-1]
            return out

        return rate, maths.vector("1", *["0"] * 9)

    return build


def _diffusion(size: int) -> Build:
    """C3 and C4: the matrix with -2 on the diagonal and 1 beside it."""

    def build(maths: Arithmetic) -> tuple[Rate, Array]:
        def rate(t: Any, y: Array) -> Array:
            out = -2 * y
            out[:-1] += y[1:]
            out[1:] += y[:-1]
            return out

        return rate, maths.vector("1", *["0"] * (size - 1))

    return build


GRAVITY = "2.95912208286"
SUN = "1.00000597682"
MASSES = (
    "0.954786104043e-3",
    "0.285583733151e-3",
    "0.437273164546e-4",
    "0.517759138449e-4",
    "0.277777777778e-5",
)
POSITIONS = (
    ("3.42947415189", "3.35386959711", "1.35494901715"),
    ("6.64145542550", "5.97156957878", "2.18231499728"),
    ("11.2630437207", "14.6952576794", "6.27960525067"),
    ("-30.1552268759", "1.65699966404", "1.43785752721"),
    ("-21.1238353380", "28.4465098142", "15.3882659679"),
)
VELOCITIES = (
    ("-0.557160570446", "0.505696783289", "0.230578543901"),
    ("-0.415570776342", "0.365682722812", "0.169143213293"),
    ("-0.325325669158", "0.189706021964", "0.0877265322780"),
    ("-0.0240476254170", "-0.287659532608", "-0.117219543175"),
    ("-0.176860753121", "-0.216393453025", "-0.0148647893090"),
)


def _c5(maths: Arithmetic) -> tuple[Rate, Array]:
    """Five planets, in coordinates that move with the sun; state: (5, 3) places, then velocities."""
    gravity, sun, masses = maths.number(GRAVITY), maths.number(SUN), maths.vector(*MASSES)
    unit = np.eye(5, dtype=int)
    pull = sun + masses

    def rate(t: Any, y: Array) -> Array:
        place = y[:15].reshape(5, 3)
        away = place[None, :, :] - place[:, None, :]
        apart = ((away * away).sum(axis=2) + unit) ** 1.5
        radius = (place * place).sum(axis=1) ** 1.5
        direct = ((masses / apart)[:, :, None] * away).sum(axis=1)
        towards = (masses / radius)[:, None] * place
        through_sun = towards.sum(axis=0) - towards
        force = direct - through_sun - (pull / radius)[:, None] * place
        return np.concatenate([y[15:], (gravity * force).ravel()])

    texts = [text for rows in (POSITIONS, VELOCITIES) for row in rows for text in row]
    return rate, maths.vector(*texts)


def _orbit(eccentricity: str) -> Build:
    def build(maths: Arithmetic) -> tuple[Rate, Array]:
        e = maths.number(eccentricity)

        def rate(t: Any, y: Array) -> Array:
            x, z, u, v = y.tolist()
            square = x * x + z * z
            cube = square * maths.sqrt(square)
            return np.array([u, v, -x / cube, -z / cube])

        zero = maths.number("0")
        return rate, np.array([1 - e, zero, zero, maths.sqrt((1 + e) / (1 - e))])

    return build


PI = "3.14159265358979323846264338327950288419716939937510582097494459230781640628620899862803"


def _e1(maths: Arithmetic) -> tuple[Rate, Array]:
    """Bessel's equation of order 1/2 with its argument shifted by one, started on J."""

    def rate(t: Any, y: Array) -> Array:
        a, b = y.tolist()
        x = t + 1
        return np.array([b, -(b / x + (1 - 1 / (4 * x * x)) * a)])

    one = maths.number("1")
    scale = maths.sqrt(2 / maths.number(PI))
    sine, cosine = maths.sin(one), maths.cos(one)
    return rate, np.array([scale * sine, scale * (cosine - sine / 2)])


def _e3(maths: Arithmetic) -> tuple[Rate, Array]:
    pace = maths.number("2.78535")

    def rate(t: Any, y: Array) -> Array:
        a, b = y.tolist()
        return np.array([b, a * a * a / 6 - a + 2 * maths.sin(pace * t)])

    return rate, maths.vector("0", "0")


def _e4(maths: Arithmetic) -> tuple[Rate, Array]:
    weight, drag = maths.number("0.032"), maths.number("0.4")
    return _small(lambda a, b: [b, weight - drag * b * b], "30", "0")(maths)


def _e5(maths: Arithmetic) -> tuple[Rate, Array]:
    def rate(t: Any, y: Array) -> Array:
        b = y.tolist()[1]
        return np.array([b, maths.sqrt(1 + b * b) / (25 - t)])

    return rate, maths.vector("0", "0")


_PROBLEMS = (
    Problem("A1", "exponential decay, y' = -y", _single(lambda t, y: -y, "1"), closed.a1),
    Problem(
        "A2",
        "a special case of Riccati's equation, y' = -y^3/2",
        _single(lambda t, y: -(y**3) / 2, "1"),
        closed.a2,
    ),
    Problem("A3", "an oscillating factor, y' = y cos t", _a3, closed.a3),
    Problem(
        "A4",
        "logistic growth, y' = y/4 (1 - y/20)",
        _single(lambda t, y: y / 4 * (1 - y / 20), "1"),
        closed.a4,
    ),
    Problem("A5", "a spiral, y' = (y - t)/(y + t)", _single(lambda t, y: (y - t) / (y + t), "4"), closed.a5),
    Problem(
        "B1",
        "two populations in conflict",
        _small(lambda a, b: [2 * (a - a * b), -(b - a * b)], "1", "3"),
    ),
    Problem(
        "B2",
        "a linear reaction between three substances",
        _small(lambda a, b, c: [b - a, a - 2 * b + c, b - c], "2", "0", "1"),
        closed.b2,
    ),
    Problem(
        "B3", "a nonlinear reaction", _small(lambda a, b, c: [-a, a - b * b, b * b], "1", "0", "0"), closed.b3
    ),
    Problem("B4", "a curve on a torus", _b4, closed.b4),
    Problem("B5", "Euler's equations of a rigid body without forces", _b5, closed.b5),
    Problem("C1", "a chain of decays, all at one pace", _chain(grows=False), closed.c1),
    Problem("C2", "a chain of decays, each faster than the one before", _chain(grows=True), closed.c2),
    Problem("C3", "diffusion on 10 points", _diffusion(10), closed.c3),
    Problem("C4", "diffusion on 51 points", _diffusion(51), closed.c4),
    Problem("C5", "the sun and the five outer planets", _c5),
    *(
        Problem(f"D{i}", f"two bodies, eccentricity {e}", _orbit(e), closed.orbit(e))
        for i, e in enumerate(("0.1", "0.3", "0.5", "0.7", "0.9"), start=1)
    ),
    Problem("E1", "Bessel's equation of order one half", _e1, closed.e1),
    Problem("E2", "Van der Pol's equation", _small(lambda a, b: [b, (1 - a * a) * b - a], "2", "0")),
    Problem("E3", "Duffing's equation", _e3),
    Problem("E4", "a falling body with drag", _e4, closed.e4),
    Problem("E5", "linear pursuit", _e5, closed.e5),
)

NONSTIFF = {problem.name: problem for problem in _PROBLEMS}
"""All 25 problems by name, in the order of the paper."""


def references(name: str) -> dict[float, Array]:
    """A problem's computed states by time, rounded to float64."""
    texts = json.loads(REFERENCES.read_text(encoding="utf-8"))["states"][name]
    return {float(time): np.array([float(text) for text in state]) for time, state in texts.items()}
