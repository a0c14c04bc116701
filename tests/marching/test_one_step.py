"""One step for a loop of one's own."""

from __future__ import annotations

import math
from fractions import Fraction
from typing import Any

import numpy as np
import pytest

import newel
from newel.catalogue.registry import default_registry
from newel.errors import BadModel, BadRequest, UnknownMethod

pytestmark = pytest.mark.core


def swing(t: float, y: Any) -> Any:
    return np.array([y[1], -math.sin(y[0]) + t])


@pytest.mark.parametrize("method", ["kutta-4", "dormand-prince-5-4", "bogacki-shampine-3-2", "euler-1"])
def test_a_loop_of_single_steps_is_the_march_to_rounding(method: str) -> None:
    t, y, h = 0.0, np.array([1.0, 0.0]), 0.125
    for n in range(16):
        y, _ = newel.one_step(swing, n * h, y, h, method)
    run = newel.march(newel.Model(swing, start=0.0, stop=2.0, state=[1.0, 0.0]), method, step=h)
    assert y == pytest.approx(run.last_state, rel=1e-13)
    assert t == 0.0


def test_the_error_is_the_difference_of_the_pair() -> None:
    tableau = default_registry().find("fehlberg-4-5")
    state, error = newel.one_step(swing, 0.5, [1.0, 0.0], 0.25, "fehlberg-4-5")
    other = newel.Tableau(
        slug="other",
        name="other",
        order=5,
        matrix=tableau.matrix,
        nodes=tableau.nodes,
        weights=tableau.embedded_weights,
    )
    embedded, none = newel.one_step(swing, 0.5, [1.0, 0.0], 0.25, other)
    assert none is None
    assert state - embedded == pytest.approx(error, rel=1e-9)


def test_the_state_is_left_alone_and_its_shape_and_dtype_are_kept() -> None:
    y = np.ones((2, 3), dtype=np.float32)
    state, error = newel.one_step(lambda t, y: -y, 0.0, y, 0.1, "dormand-prince-5-4")
    assert (y == 1.0).all()
    assert state.shape == error.shape == (2, 3)
    assert state.dtype == error.dtype == np.float32
    assert not np.shares_memory(state, y)
    scalar, _ = newel.one_step(lambda t, y: -y, 0.0, 1.0, 0.1, "kutta-4")
    assert scalar.shape == ()


def test_a_step_may_go_backwards_and_params_are_passed() -> None:
    state, _ = newel.one_step(lambda t, y, p: p * y, 1.0, [1.0], -0.1, "kutta-4", params=2.0)
    assert state[0] == pytest.approx(math.exp(-0.2), abs=1e-5)


def test_an_exact_step_is_exact() -> None:
    y = np.array([Fraction(1)], dtype=object)
    state, _ = newel.one_step(lambda t, y: y * t, Fraction(1, 3), y, Fraction(1, 10), "midpoint-2")
    middle = Fraction(1, 3) + Fraction(1, 20)
    assert state[0] == 1 + Fraction(1, 10) * middle * (1 + Fraction(1, 60))


@pytest.mark.parametrize("step", [0.0, math.nan, math.inf])
def test_a_step_is_finite_and_not_zero(step: float) -> None:
    with pytest.raises(BadRequest, match="step=") as caught:
        newel.one_step(swing, 0.0, [1.0, 0.0], step, "kutta-4")
    assert caught.value.argument == "step"


def test_what_is_wrong_is_named() -> None:
    with pytest.raises(BadModel, match="rate returned None"):
        newel.one_step(lambda t, y: None, 0.0, [1.0], 0.1, "kutta-4")
    with pytest.raises(BadModel, match="not finite"):
        newel.one_step(lambda t, y: y * np.inf, 0.0, [1.0], 0.1, "kutta-4")
    with pytest.raises(UnknownMethod):
        newel.one_step(swing, 0.0, [1.0, 0.0], 0.1, "no-such-method")
    with pytest.raises(ZeroDivisionError):
        newel.one_step(lambda t, y: 1 / 0, 0.0, [1.0], 0.1, "kutta-4")
