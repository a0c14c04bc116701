"""Orbits and oscillators with known values at given times, and where their data come from.

The starting data are the published ones, as printed. Each value in `values` is a text of 16 to 30 digits: a
figure that the source prints, or the solution for exactly those data; all of them are computed anew by
`python -m tests.problems.make_references`, and a test holds both against each other. `reachable` is the error
in double precision that no method should be asked to go below, at the last of the times (common practice:
about ten times what SciPy's order-8 pair reaches at its tightest tolerance).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np

from tests.problems import nonstiff_closed
from tests.problems.arithmetic import FLOATS, Arithmetic, Array, Build, Rate

__all__ = ["ARENSTORF_PERIOD", "ORBITS", "VAN_DER_POL_CYCLE", "Orbit", "kepler"]


@dataclass(frozen=True)
class Orbit:
    """One orbit: `values` maps times to states, both as texts in the order of the state."""

    name: str
    description: str
    source: str
    build: Build
    values: dict[str, tuple[str, ...]]
    reachable: float

    @cached_property
    def rate(self) -> Rate:
        """`rate(t, y)` in double precision."""
        return self.build(FLOATS)[0]

    @property
    def state(self) -> Array:
        """The state at t = 0, a fresh float64 array."""
        return self.build(FLOATS)[1]

    def known(self) -> dict[float, Array]:
        """The known states by time, in float64."""
        return {float(time): np.array([float(text) for text in state]) for time, state in self.values.items()}


def _restricted(mass: str, *start: str) -> Build:
    """A weightless body near two heavy ones, in coordinates that turn with them; state (x, y, x', y')."""

    def build(maths: Arithmetic) -> tuple[Rate, Array]:
        light = maths.number(mass)
        heavy = 1 - light

        def rate(t: Any, y: Array) -> Array:
            a, b, u, v = y.tolist()
            first, second = (a + light) ** 2 + b * b, (a - heavy) ** 2 + b * b
            one, other = heavy / (first * maths.sqrt(first)), light / (second * maths.sqrt(second))
            return np.array(
                [u, v, a + 2 * v - one * (a + light) - other * (a - heavy), b - 2 * u - one * b - other * b]
            )

        return rate, maths.vector(*start)

    return build


def _pleiades(maths: Arithmetic) -> tuple[Rate, Array]:
    """Seven stars in a plane, of masses 1 to 7; state: x (7), y (7), x' (7), y' (7)."""
    masses = np.arange(1, 8)
    unit = np.eye(7, dtype=int)

    def rate(t: Any, y: Array) -> Array:
        across, up = y[:7], y[7:14]
        dx, dy = across[None, :] - across[:, None], up[None, :] - up[:, None]
        weight = masses / (dx * dx + dy * dy + unit) ** 1.5
        return np.concatenate([y[14:], (weight * dx).sum(axis=1), (weight * dy).sum(axis=1)])

    places = ("3", "3", "-1", "-3", "2", "-2", "2", "3", "-3", "2", "0", "0", "-4", "4")
    speeds = ("0", "0", "0", "0", "0", "1.75", "-1.5", "0", "0", "0", "-1.25", "1", "0", "0")
    return rate, maths.vector(*places, *speeds)


def _plain(slope: Callable[..., list[Any]], *start: str) -> Build:
    def build(maths: Arithmetic) -> tuple[Rate, Array]:
        return lambda t, y: np.array(slope(*y.tolist())), maths.vector(*start)

    return build


def _lorenz(*start: str) -> Build:
    return _plain(lambda x, y, z: [10 * (y - x), x * (28 - z) - y, x * y - 8 * z / 3], *start)


def _van_der_pol(stiffness: int) -> Build:
    return _plain(lambda a, b: [b, stiffness * (1 - a * a) * b - a], "2", "0")


def kepler(eccentricity: str, t: float) -> Array:
    """The state (x, y, x', y') of a two-body orbit of period 2 pi at t, from Kepler's equation, in float64.

    The orbit starts at (1 - e, 0) with velocity (0, sqrt((1 + e)/(1 - e))); J. Kepler, Astronomia nova
    (1609), or any textbook of celestial mechanics.
    """
    import mpmath

    return np.array([float(value) for value in nonstiff_closed.orbit(eccentricity)(mpmath.mpf(t))])


ARENSTORF_PERIOD = "17.0652165601579625588917206249"
VAN_DER_POL_CYCLE = ("2.00861986087484313650964", "6.663286859323130189699682")
"""Amplitude and period of the limit cycle for stiffness 1 (C. M. Andersen and J. F. Geer, SIAM J. Appl.
Math. 42 (1982) 678, print 2.00862 and 6.66328686, from memory)."""

_ARENSTORF_START = ("0.994", "0", "0", "-2.00158510637908252240537862224")

_ALL = (
    Orbit(
        "arenstorf",
        "a closed orbit in the restricted three-body problem of earth and moon",
        "R. F. Arenstorf, Amer. J. Math. 85 (1963) 27-35; data as in E. Hairer, S. P. Norsett, G. Wanner, "
        "Solving Ordinary Differential Equations I, section II.0 (from memory)",
        _restricted("0.012277471", *_ARENSTORF_START),
        {
            "1": (
                "0.31328459555610224299",
                "0.34800897467514167457",
                "-1.0426165112787883218",
                "0.67338411409655613188",
            ),
            "2": (
                "-0.57987672323638947737",
                "0.60907835550230616315",
                "-0.42253009227388059646",
                "0.24422199185507654963",
            ),
            "5": (
                "0.022688783647977123181",
                "0.86654014017124730293",
                "-0.11773647864086439065",
                "-0.42178580416287772627",
            ),
            "10": (
                "-0.83980716633898647154",
                "0.44683141709847205637",
                "0.37374253561439383395",
                "-0.14966964466689517725",
            ),
            "15": (
                "-0.60557549043757421762",
                "-0.62586702912994646774",
                "0.36591446387862388288",
                "0.27044361080365878429",
            ),
            ARENSTORF_PERIOD: _ARENSTORF_START,
        },
        1e-8,
    ),
    Orbit(
        "pleiades",
        "seven stars in a plane, with close encounters",
        "E. Hairer, S. P. Norsett, G. Wanner, Solving Ordinary Differential Equations I, II.10 (starting "
        "data seen; its 16 digits of the state at t = 3, from memory, agree with the values here to 1.8e-15)",
        _pleiades,
        {
            "3": (
                "0.3706139143970512901",
                "3.237284092057233093",
                "-3.222559032418323347",
                "0.6597091455775308359",
                "0.3425581707156579790",
                "1.562172101400631016",
                "-0.7003092922212495385",
                "-3.943437585517392055",
                "-3.271380973972549928",
                "5.225081843456544192",
                "-2.590612434977469511",
                "1.198213693392274638",
                "-0.2429682344935823409",
                "1.091449240428979748",
                "3.417003806314314752",
                "1.354584501625501221",
                "-2.590065597810775420",
                "2.025053734714241106",
                "-1.155815100160449093",
                "-0.8072988170223021726",
                "0.5952396354208718767",
                "-3.741244961234008471",
                "0.3773459685750629037",
                "0.9386858869551078887",
                "0.3667922227200569867",
                "-0.3474046353808494366",
                "2.344915448180936923",
                "-1.947020434263291901",
            ),
        },
        1e-9,
    ),
    Orbit(
        "brusselator",
        "a chemical oscillator with a limit cycle",
        "E. Hairer, S. P. Norsett, G. Wanner, Solving Ordinary Differential Equations I (data from memory)",
        _plain(lambda a, b: [1 + a * a * b - 4 * a, 3 * a - a * a * b], "1.5", "3"),
        {"20": ("0.49863707126834784864985548299328", "4.5967803494520111832017439531334")},
        1e-11,
    ),
    Orbit(
        "lorenz",
        "a chaotic flow, started near its attractor; errors grow like exp(0.906 t)",
        "E. N. Lorenz, J. Atmos. Sci. 20 (1963) 130-141; starting state as in E. Hairer, S. P. Norsett, "
        "G. Wanner (from memory)",
        _lorenz("-8", "8", "27"),
        {
            "1": ("9.057167838929164060754", "14.55894899109949103109", "18.41529394688126031518"),
            "5": ("12.53362673927780128997", "6.849133792362495171950", "37.52987408763451005789"),
            "10": ("8.176101755353761590301", "12.18221559734876277339", "19.89126162409428395131"),
            "16": ("-9.131313027368752927862672", "-12.47617881107825333391899", "22.8433389609823882055019"),
            "20": ("0.02677816073628964580472", "0.1954869301952758552552", "14.36805160617910210307"),
        },
        1e-4,
    ),
    Orbit(
        "lorenz-from-ones",
        "the same flow from (1, 1, 1)",
        "E. N. Lorenz, J. Atmos. Sci. 20 (1963) 130-141",
        _lorenz("1", "1", "1"),
        {
            "1": ("-9.378570010925062360842", "-8.357033788426644732902", "29.36232533736342818034"),
            "10": ("-4.902687541134645731904", "-3.743872921802919616315", "24.69085810279055545322"),
            "20": ("13.79319959512861883160", "12.95180393618989854005", "34.90160868113514290711"),
        },
        1e-4,
    ),
    Orbit(
        "van-der-pol",
        "Van der Pol's oscillator, stiffness 1",
        "B. van der Pol, Phil. Mag. (7) 2 (1926) 978-992 (the equation)",
        _van_der_pol(1),
        {"20": ("2.008149762174948592014", "-0.04250887527320214698593")},
        1e-11,
    ),
    Orbit(
        "van-der-pol-5",
        "Van der Pol's oscillator, stiffness 5",
        "B. van der Pol, Phil. Mag. (7) 2 (1926) 978-992 (the equation)",
        _van_der_pol(5),
        {
            "10": ("-1.158701266030990803181", "0.4304698089791423962965"),
            "20": ("-1.601296879542853908822", "0.1983266763386620845495"),
        },
        1e-11,
    ),
)

ORBITS = {orbit.name: orbit for orbit in _ALL}
"""All of them by name."""
