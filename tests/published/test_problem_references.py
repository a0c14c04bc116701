"""The test problems and their references, held against closed forms, printed digits and SciPy.

The 1972 set: T. E. Hull, W. H. Enright, B. M. Fellen, A. E. Sedgwick, SIAM J. Numer. Anal. 9 (1972) 603-637.
Orbits: the sources beside each in tests/problems/orbits.py. The references are made by a program of our own
(tests/problems/make_references.py); each of the checks here comes from another place.
"""

from __future__ import annotations

import json
import math

import mpmath
import numpy as np
import pytest
from scipy.integrate import solve_ivp

from tests.problems import nonstiff_1972, orbits
from tests.problems.arithmetic import FLOATS, high_precision
from tests.problems.make_references import TIMES, solve
from tests.problems.nonstiff_1972 import NONSTIFF, REFERENCES, STOP, references
from tests.problems.orbits import ORBITS

DIGITS = 25
WITH_CLOSED_FORM = [name for name, problem in NONSTIFF.items() if problem.closed is not None]

# End states at t = 20 to the digits given, found by an independent extrapolation code at 70 digits or
# from the closed form beside them. D: E - e sin E = t.
PRINTED = {
    "A1": ("2.0611536224385578e-9",),
    "A2": ("0.21821789023599238127",),  # 1/sqrt 21
    "A3": ("2.491650271850414523461175",),  # exp(sin 20)
    "A4": ("17.73016648131483984886829",),  # 20/(1 + 19 exp(-5))
    "A5": ("-0.7887826688964014237307156",),
    "B1": ("0.6761876008576606607255741", "0.1860816099640029800751086"),
    "B5": ("-0.9396570798729203961884", "-0.3421177754000749065348", "0.7414126596199953007826"),
    "D1": (
        "0.21988353520083966128",
        "0.94270768463418130852",
        "-0.97876598410581765146",
        "0.32879779909620360826",
    ),
    "D2": (
        "-0.17770273571404116933",
        "0.94677847199058925804",
        "-1.030294163192969574",
        "0.12110748900539521633",
    ),
    "D3": (
        "-0.57804329530353612328",
        "0.86338400091941928013",
        "-0.95950837303807273563",
        "-0.065049151267120901677",
    ),
    "D4": (
        "-0.95389902934163943974",
        "0.6907409024219431517",
        "-0.82126742708774330945",
        "-0.1539574259125824708",
    ),
    "D5": (
        "-1.2952662509875743677",
        "0.40039389637923215273",
        "-0.67753909247075658875",
        "-0.12708381542786861877",
    ),
    "E2": ("2.008149762174948592014", "-0.04250887527320214698593"),
}


def stored(name: str) -> dict[str, list[mpmath.mpf]]:
    states = json.loads(REFERENCES.read_text(encoding="utf-8"))["states"][name]
    return {time: [mpmath.mpf(text) for text in state] for time, state in states.items()}


def digits(text: str) -> int:
    return len(text.split("e")[0].replace("-", "").replace(".", "").lstrip("0"))


def test_references_cover_every_problem_at_five_times() -> None:
    assert list(NONSTIFF) == [f"{letter}{i}" for letter in "ABCDE" for i in range(1, 6)]
    for name, problem in NONSTIFF.items():
        assert tuple(stored(name)) == TIMES
        assert all(len(state) == problem.state.size for state in stored(name).values())
    assert float(TIMES[-1]) == STOP


def test_references_were_computed_with_forty_digits_or_more() -> None:
    document = json.loads(REFERENCES.read_text(encoding="utf-8"))
    assert document["printed_digits"] == DIGITS
    for kind in ("set_of_1972", "orbits"):
        assert document[kind]["working_digits"] >= 40
        assert len(set(document[kind]["tolerances"])) == 2


@pytest.mark.parametrize("name", WITH_CLOSED_FORM)
def test_references_agree_with_the_closed_form(name: str) -> None:
    closed = NONSTIFF[name].closed
    assert closed is not None
    with mpmath.workdps(90):
        for time, state in stored(name).items():
            for i, (value, exact) in enumerate(zip(state, closed(mpmath.mpf(time)), strict=True), start=1):
                assert abs(value - exact) <= abs(exact) * mpmath.mpf(10) ** (1 - DIGITS), (time, i)


@pytest.mark.parametrize("name", WITH_CLOSED_FORM)
def test_closed_forms_start_where_the_problem_starts(name: str) -> None:
    closed = NONSTIFF[name].closed
    assert closed is not None
    with mpmath.workdps(60):
        exact = closed(mpmath.mpf(10) ** -55)
        start = NONSTIFF[name].build(high_precision())[1]
        assert all(abs(a - b) < mpmath.mpf(10) ** -50 for a, b in zip(exact, start, strict=True))


@pytest.mark.parametrize("name", list(PRINTED))
def test_references_agree_with_printed_end_states(name: str) -> None:
    with mpmath.workdps(40):
        for text, value in zip(PRINTED[name], stored(name)["20"], strict=True):
            loss = mpmath.mpf(10) ** (1 - min(digits(text), DIGITS))
            assert abs(mpmath.mpf(text) - value) <= loss * abs(value)


def test_rigid_body_agrees_with_printed_state_at_twelve() -> None:
    """B5 at t = 12, found by an independent extrapolation code at 70 digits."""
    expected = ("-0.7053978095225717430", "-0.7088116324671580851", "0.8638466903702221007")
    with mpmath.workdps(40):
        assert all(abs(mpmath.mpf(a) - b) < 1e-19 for a, b in zip(expected, stored("B5")["12"], strict=True))


def test_conflict_keeps_its_invariant() -> None:
    """B1 has no closed form, but y1 - ln y1 + 2 (y2 - ln y2) stays constant along a solution."""
    with mpmath.workdps(40):
        levels = [a - mpmath.log(a) + 2 * (b - mpmath.log(b)) for a, b in stored("B1").values()]
        begin = 1 + 2 * (3 - mpmath.log(3))
        assert all(abs(level - begin) < mpmath.mpf(10) ** -23 for level in levels)


def test_outer_planets_have_the_semi_major_axes_of_the_real_ones() -> None:
    """C5's data, from memory, give the axes that any almanac prints: 5.20, 9.5, 19.2, 30.1, 39.5 (au).

    The osculating axes differ from the mean ones by up to about 1 %.
    """
    state = NONSTIFF["C5"].state
    places, speeds = state[:15].reshape(5, 3), state[15:].reshape(5, 3)
    gravity, sun = float(nonstiff_1972.GRAVITY), float(nonstiff_1972.SUN)
    pull = gravity * (sun + FLOATS.vector(*nonstiff_1972.MASSES))
    axes = 1.0 / (2.0 / np.linalg.norm(places, axis=1) - (speeds**2).sum(axis=1) / pull)
    assert axes == pytest.approx([5.203, 9.55, 19.2, 30.1, 39.5], rel=0.015)


def test_outer_planets_keep_energy_and_angular_momentum() -> None:
    """In coordinates of the common centre of mass the energy of C5 and its angular momentum stay constant."""
    gravity, sun = float(nonstiff_1972.GRAVITY), float(nonstiff_1972.SUN)
    masses = np.array([sun, *FLOATS.vector(*nonstiff_1972.MASSES)])

    def invariants(state: np.ndarray) -> np.ndarray:
        places, speeds = (np.vstack([np.zeros(3), part.reshape(5, 3)]) for part in (state[:15], state[15:]))
        places, speeds = (part - masses @ part / masses.sum() for part in (places, speeds))
        energy = (masses * (speeds**2).sum(axis=1)).sum() / 2
        for i in range(6):
            for j in range(i):
                energy -= gravity * masses[i] * masses[j] / np.linalg.norm(places[i] - places[j])
        return np.array([energy, *(masses[:, None] * np.cross(places, speeds)).sum(axis=0)])

    begin = invariants(NONSTIFF["C5"].state)
    for state in references("C5").values():
        assert invariants(state) == pytest.approx(begin, rel=1e-12)


@pytest.mark.parametrize("name", list(NONSTIFF))
def test_references_agree_with_scipy(name: str) -> None:
    """SciPy's order-8 pair at its tightest tolerance, in double precision, at each of the five times."""
    problem, known = NONSTIFF[name], references(name)
    solved = solve_ivp(
        problem.rate, (0.0, STOP), problem.state, method="DOP853", rtol=3e-14, atol=1e-14, t_eval=list(known)
    )
    assert solved.success
    for i, state in enumerate(known.values()):
        assert solved.y[:, i] == pytest.approx(state, rel=1e-9, abs=1e-9)


@pytest.mark.parametrize("name", list(ORBITS))
def test_orbit_values_agree_with_the_references(name: str) -> None:
    """Each value is computed anew at 55 digits; a zero is one to the digits of the printed data."""
    with mpmath.workdps(40):
        known = stored(name)
        for time, state in ORBITS[name].values.items():
            for text, value in zip(state, known[time], strict=True):
                loss = mpmath.mpf(10) ** (1 - min(digits(text), DIGITS)) if digits(text) > 3 else 0
                assert abs(mpmath.mpf(text) - value) <= loss * abs(value) + mpmath.mpf("5e-27"), time


@pytest.mark.parametrize("name", list(ORBITS))
def test_orbit_values_agree_with_scipy(name: str) -> None:
    orbit, known = ORBITS[name], ORBITS[name].known()
    solved = solve_ivp(
        orbit.rate,
        (0.0, max(known)),
        orbit.state,
        method="DOP853",
        rtol=3e-14,
        atol=1e-14,
        t_eval=list(known),
    )
    assert solved.success
    for i, state in enumerate(known.values()):
        assert solved.y[:, i] == pytest.approx(state, rel=orbit.reachable, abs=orbit.reachable)


def test_arenstorf_orbit_is_at_rest_across_halfway() -> None:
    """At half the period it crosses the axis at a right angle, by the orbit's symmetry."""
    orbit = ORBITS["arenstorf"]
    with mpmath.workdps(40):
        rate, start = orbit.build(high_precision())
        half = mpmath.nstr(mpmath.mpf(orbits.ARENSTORF_PERIOD) / 2, 35)
        (state,) = solve(rate, start, (half,), mpmath.mpf("1e-28"), columns=16)
        expected = ("-1.2448220520265697056", "0", "0", "0.55399030814222306778")
        assert all(abs(a - mpmath.mpf(b)) < mpmath.mpf("1e-19") for a, b in zip(state, expected, strict=True))


def test_van_der_pol_cycle_closes_after_its_printed_period() -> None:
    """C. M. Andersen and J. F. Geer (1982), from memory: amplitude 2.00862, period 6.66328686."""
    amplitude, period = orbits.VAN_DER_POL_CYCLE
    assert round(float(amplitude), 5) == 2.00862
    assert float(period) == pytest.approx(6.66328686, abs=1e-8)
    with mpmath.workdps(35):
        rate, _ = ORBITS["van-der-pol"].build(high_precision())
        start = high_precision().vector(amplitude, "0")
        (state,) = solve(rate, start, (period,), mpmath.mpf("1e-26"), columns=14)
        assert all(abs(a - b) < mpmath.mpf("1e-20") for a, b in zip(state, start, strict=True))


@pytest.mark.parametrize("eccentricity", ["0.1", "0.6", "0.9"])
def test_kepler_states_keep_energy_and_momentum(eccentricity: str) -> None:
    """Energy -1/2 and angular momentum sqrt(1 - e²): the classical integrals of the two-body problem."""
    for t in (0.0, 1.0, 20.0):
        x, y, u, v = orbits.kepler(eccentricity, t)
        assert (u * u + v * v) / 2 - 1 / math.hypot(x, y) == pytest.approx(-0.5, abs=1e-13)
        assert x * v - y * u == pytest.approx(math.sqrt(1 - float(eccentricity) ** 2), abs=1e-13)


def test_kepler_agrees_with_printed_state() -> None:
    """Eccentricity 0.6 at t = 20, from Kepler's equation and by an independent extrapolation code."""
    expected = [
        -0.77007557841124044927,
        0.78834481699442438906,
        -0.89418373198869149703,
        -0.12346176415844095881,
    ]
    assert orbits.kepler("0.6", 20.0) == pytest.approx(expected, rel=1e-15)
