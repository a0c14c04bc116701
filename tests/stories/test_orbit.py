"""An eccentric orbit for a mission file: adaptive, a row every hour, against Kepler's closed form.

The position follows from Kepler's equation M = E − e sin E, solved here by Newton's method; a textbook form:
x = a (cos E − e), y = a √(1 − e²) sin E.
"""

import csv
import math

import numpy as np
import pytest

import newel

pytestmark = pytest.mark.core

EARTH = 398600.4418  # km3/s2, geocentric gravitational constant
A, E = 26600.0, 0.74  # km, unitless: a twelve-hour orbit
PERIOD = 2.0 * math.pi * math.sqrt(A**3 / EARTH)  # s
HOUR = 3600.0


def rate(t, y, gravity):
    position, velocity = y
    return np.array([velocity, -gravity * position / np.hypot(*position) ** 3])


def position_at(t):
    mean = 2.0 * math.pi * t / PERIOD
    angle = mean + E * math.sin(mean)
    for _ in range(50):
        angle -= (angle - E * math.sin(angle) - mean) / (1.0 - E * math.cos(angle))
    return A * np.array([math.cos(angle) - E, math.sqrt(1.0 - E**2) * math.sin(angle)])


def satellite(periods=2.0):
    nearest = A * (1.0 - E)
    fastest = math.sqrt(EARTH / A * (1.0 + E) / (1.0 - E))
    return newel.Model(
        rate,
        start=0.0,
        stop=periods * PERIOD,
        state=[[nearest, 0.0], [0.0, fastest]],
        params=EARTH,
        labels=("x", "y", "vx", "vy"),
        units=("km", "km", "km/s", "km/s"),
        time_unit="s",
    )


TOLERANCES = np.array([[1e-6, 1e-6], [1e-9, 1e-9]])  # km and km/s, one for each entry


def test_the_file_has_a_row_every_hour_and_each_is_where_kepler_says(tmp_path):
    hourly = newel.sinks.Csv(tmp_path / "orbit.csv", every_time=HOUR)
    run = newel.march(satellite(), "prince-dormand-8-7", rel_tol=1e-11, abs_tol=TOLERANCES, sinks=hourly)
    assert run.ended.reason == "stop"
    with open(tmp_path / "orbit.csv", newline="", encoding="utf-8") as file:
        rows = [{name: float(cell) for name, cell in row.items()} for row in csv.DictReader(file)]
    assert list(rows[0]) == ["t", "x", "y", "vx", "vy"]
    assert [row["t"] for row in rows[:-1]] == [k * HOUR for k in range(len(rows) - 1)]
    assert rows[-1]["t"] == 2.0 * PERIOD
    apart = [math.dist((row["x"], row["y"]), position_at(row["t"])) for row in rows]
    assert max(apart) < 1e-3  # km, of an orbit of 46,000 km


def test_the_rows_that_are_asked_for_do_not_change_where_the_orbit_ends(tmp_path):
    how = {"rel_tol": 1e-11, "abs_tol": TOLERANCES}
    alone = newel.march(satellite(), "prince-dormand-8-7", **how)
    hourly = newel.sinks.Csv(tmp_path / "orbit.csv", every_time=HOUR)
    watched = newel.march(satellite(), "prince-dormand-8-7", **how, sinks=hourly)
    assert math.dist(alone.last_state[0], watched.last_state[0]) < 1e-3


def test_the_steps_are_short_near_the_earth_and_long_far_out():
    run = newel.march(satellite(1.0), "dormand-prince-5-4", rel_tol=1e-9, abs_tol=TOLERANCES)
    lengths = np.diff(run.times)
    distances = np.hypot(run["x"], run["y"])[:-1]
    assert lengths[distances > A].min() > 3.0 * lengths[distances < A * (1.0 - E) * 1.2].max()


@pytest.mark.parametrize("method", ["bogacki-shampine-3-2", "dormand-prince-5-4", "prince-dormand-8-7"])
def test_a_tighter_tolerance_buys_a_smaller_error(method):
    errors = []
    for rel_tol in (1e-5, 1e-7, 1e-9):
        run = newel.march(satellite(1.0), method, rel_tol=rel_tol, abs_tol=rel_tol * TOLERANCES * 1e5)
        errors.append(math.dist(run.last_state[0], position_at(PERIOD)))
    assert errors[1] < 0.2 * errors[0]
    assert errors[2] < 0.2 * errors[1]
