"""Indicators watched and located, apart from any march."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest

import newel
from newel.errors import BadModel
from newel.stepping.continuous.hermite import CubicHermite
from newel.stepping.switching.crossings import Crossings, locate
from newel.stepping.switching.spacing import just_after, just_before, spacing

pytestmark = pytest.mark.core


def watch(indicator: Any, crossing: str = "both") -> Crossings:
    return Crossings([newel.StateEvent("it", indicator, crossing=crossing)], ())


@pytest.mark.parametrize(("crossing", "up", "down"), [("rising", 1, 0), ("falling", 0, 1), ("both", 1, 1)])
def test_directions_count_along_the_march(crossing: str, up: int, down: int) -> None:
    crossings = watch(lambda t, y: t, crossing)
    crossings.arm(-1.0, np.zeros(1))
    assert len(crossings.crossed(1.0, np.zeros(1))) == up
    assert len(crossings.settle(1.0, np.zeros(1))) == up
    assert len(crossings.settle(-1.0, np.zeros(1))) == down


def test_zero_is_the_far_side_and_leaving_it_there_is_no_second_crossing() -> None:
    crossings = watch(lambda t, y: t)
    crossings.arm(-1.0, np.zeros(1))
    assert crossings.settle(0.0, np.zeros(1)) == [0]
    assert crossings.settle(1.0, np.zeros(1)) == []
    assert crossings.settle(-1.0, np.zeros(1)) == [0]


def test_zero_at_the_start_is_not_armed() -> None:
    crossings = watch(lambda t, y: t)
    crossings.arm(0.0, np.zeros(1))
    assert crossings.settle(1.0, np.zeros(1)) == []
    assert crossings.settle(-1.0, np.zeros(1)) == [0]


@pytest.mark.parametrize("value", [math.nan, None, "high", 1j, np.zeros(2), np.zeros(1)])
def test_an_indicator_that_gives_no_number_is_named(value: Any) -> None:
    crossings = watch(lambda t, y: value)
    with pytest.raises(BadModel, match="indicator of event 'it'") as caught:
        crossings.arm(0.5, np.zeros(1))
    assert "t = 0.5" in str(caught.value)
    assert caught.value.argument == "events"


CROSSED = {
    "line": (lambda t: t - 0.3, 0.3),
    "steep": (lambda t: math.tanh(1e9 * (t - 0.7)), 0.7),
    "jump": (lambda t: 1.0 if t >= 0.123456789 else -1.0, 0.123456789),
    "jump to infinity": (lambda t: math.inf if t >= 0.6 else -1.0, 0.6),
    "flat": (lambda t: (t - 0.4) ** 3, 0.4),
    "flatter": (lambda t: (t - 0.4) ** 9, 0.4),
    "huge": (lambda t: 1e300 * (t - 0.9), 0.9),
    "tiny": (lambda t: 1e-300 * (t - 0.9), 0.9),
    "square root": (lambda t: math.copysign(abs(t - 0.2) ** 0.5, t - 0.2), 0.2),
    "at the end": (lambda t: t - 1.0, 1.0),
    "first of three": (lambda t: -math.cos(8.0 * t), math.pi / 16),
}


@pytest.mark.parametrize("name", CROSSED)
@pytest.mark.parametrize("backwards", [False, True])
def test_crossings_are_located_to_some_spacings(name: str, backwards: bool) -> None:
    function, root = CROSSED[name]
    sign = -1.0 if backwards else 1.0
    calls = []

    def indicator(t: float, y: Any) -> float:
        calls.append(t)
        return function(sign * t)

    crossings = watch(indicator)
    crossings.arm(0.0, np.zeros(1))
    landed: list[float] = []

    def land(t: float) -> Any:
        landed.append(t)
        return np.zeros(1)

    at = locate(crossings, [0], 0.0, sign, lambda fraction: np.zeros(1), land)
    assert landed == [] or landed[-1] == at
    assert not function(sign * at) < 0 or name == "first of three"
    loose = {"flat": 1e-5, "flatter": 1e-2}.get(name, 24 * spacing(1.0))
    assert -1e-18 <= sign * at - root <= loose or name == "first of three"
    assert len(landed) <= 61
    assert len(calls) < 250


def test_a_cubic_is_its_own_interpolant() -> None:
    """E. Hairer, S. P. Nørsett and G. Wanner I, section II.6: exact for polynomials up to degree 3."""

    def y(t: float) -> Any:
        return np.array([t**3 - 2 * t, 1.0 - t**2])

    def dy(t: float) -> Any:
        return np.array([3 * t**2 - 2, -2 * t])

    for start, h in ((1.0, 0.5), (1.0, -0.5)):
        cubic = CubicHermite(y(start), dy(start), y(start + h), dy(start + h), h)
        for fraction in (0.0, 0.25, 0.5, 0.9, 1.0):
            np.testing.assert_allclose(cubic(fraction), y(start + fraction * h), rtol=1e-14, atol=1e-14)


def test_neighbours_in_time() -> None:
    assert just_before(1.0, 1.0) == math.nextafter(1.0, 0.0)
    assert just_after(1.0, 1.0) == math.nextafter(1.0, 2.0)
    assert just_before(1.0, -1.0) == just_after(1.0, 1.0)
    assert spacing(-2.0) == spacing(2.0) == 2.0**-51
