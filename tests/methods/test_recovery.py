"""Reading A, b and c off a step function, and the fractions that floats were meant to be."""

from __future__ import annotations

from fractions import Fraction
from math import nextafter, sqrt
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from newel.errors import BadNumber, BadRequest, NotRecovered
from newel.methods.near_fractions import near_fraction, simplest_between
from newel.methods.probing import MOST_CALLS, watch
from newel.methods.recovery import read_step

pytestmark = pytest.mark.core

small = st.fractions(min_value=-4, max_value=4, max_denominator=500)
laws = settings(deadline=None, derandomize=True, max_examples=25)


@laws
@given(small, st.integers(-2, 2))
def test_a_fraction_is_found_again_two_units_in_the_last_place_away(x: Fraction, units: int) -> None:
    near = float(x)
    for _ in range(abs(units)):
        near = nextafter(near, 9.0 if units > 0 else -9.0)
    assert near_fraction(near) == x


@pytest.mark.parametrize("x", ["19372/6561", "-212/729", "44275/110592", "13525/55296", "9/40", "1/9000"])
def test_coefficients_as_they_are_printed_are_found(x: str) -> None:
    """Of the pairs of Dormand and Prince (1980) and of Cash and Karp (1990), and of Shanks (1966)."""
    assert near_fraction(float(Fraction(x))) == Fraction(x)


@pytest.mark.parametrize("x", [sqrt(2), (3 - sqrt(5)) / 2, 0.123456789012345, 2.718281828459045])
def test_what_is_no_short_fraction_is_not_made_one(x: float) -> None:
    assert near_fraction(x) is None


def test_what_is_left_when_terms_cancel_is_nothing() -> None:
    assert near_fraction(1 / 3 - 0.5 + 1 / 6) == 0
    assert near_fraction(0.1 + 0.2 - 0.3 + 0.25) == Fraction(1, 4)
    with pytest.raises(BadNumber, match="finite"):
        near_fraction(float("nan"))


@laws
@given(small, small)
def test_the_simplest_fraction_between_two_is_between_them_and_has_no_simpler(
    a: Fraction, b: Fraction
) -> None:
    low, high = min(a, b), max(a, b)
    found = simplest_between(low, high)
    assert low <= found <= high
    for below in range(1, found.denominator):
        assert not any(low <= Fraction(above, below) <= high for above in _near(low, below))


def _near(low: Fraction, below: int) -> range:
    first = -(-low.numerator * below // low.denominator)
    return range(first, first + 1)


def generic(matrix: Any, weights: Any, nodes: Any) -> Any:
    def step(rate: Any, t: float, y: Any, h: float) -> Any:
        k: list[Any] = []
        for row, c in zip(matrix, nodes, strict=True):
            k.append(rate(t + c * h, y + h * sum((a * x for a, x in zip(row, k, strict=False)), 0.0 * y)))
        return y + h * sum((b * x for b, x in zip(weights, k, strict=True)), 0.0 * y)

    return step


numbers = st.fractions(min_value=-3, max_value=3, max_denominator=50).map(float)


@st.composite
def coefficients(draw: Any) -> tuple[Any, Any, Any]:
    s = draw(st.integers(1, 4))
    matrix = [draw(st.lists(numbers, min_size=i, max_size=i)) for i in range(s)]
    return (
        matrix,
        draw(st.lists(numbers, min_size=s, max_size=s)),
        draw(st.lists(numbers, min_size=s, max_size=s)),
    )


@laws
@given(coefficients(), st.sampled_from([None, 0, 1, 2, 3]))
def test_any_coefficients_are_read_back_with_a_state_of_any_length(given_: Any, length: int | None) -> None:
    matrix, weights, nodes = given_
    reading = read_step(generic(matrix, weights, nodes), length)
    s = len(weights)
    full = np.zeros((s, s))
    for i, row in enumerate(matrix):
        full[i, :i] = row
    assert reading.matrix == pytest.approx(full, abs=1e-15)
    assert reading.weights == pytest.approx(np.array(weights), abs=1e-15)
    assert reading.nodes == pytest.approx(np.array(nodes), abs=1e-15)


def test_more_stages_than_the_first_probe_holds_are_read_too() -> None:
    s = 40
    matrix = [[1.0 / s] * i for i in range(s)]
    reading = read_step(generic(matrix, [1.0 / s] * s, [i / s for i in range(s)]))
    assert reading.matrix.shape == (s, s)
    assert reading.length == s


def test_code_that_reads_a_little_behind_its_state_does_no_harm() -> None:
    """A compiled loop for six numbers is tried with shorter states, which have room behind them."""

    def step(rate: Any, t: float, y: Any, h: float) -> Any:
        assert y.base is not None
        assert y.base.size >= y.size + 6
        return y + h * rate(t, y)

    assert read_step(step).weights.tolist() == [1.0]


def test_a_length_that_is_asked_for_is_the_only_one_tried() -> None:
    seen = []

    def step(rate: Any, t: float, y: Any, h: float) -> Any:
        seen.append(len(y))
        return y + h * rate(t, y)

    assert read_step(step, 3).length == 3
    assert set(seen) == {3}
    for wrong in (-1, True, MOST_CALLS + 1):
        with pytest.raises(BadRequest, match="length="):
            read_step(step, wrong)


def test_the_given_state_is_a_copy_and_the_answers_are_fresh() -> None:
    y, answer = np.ones(2), np.zeros(2)

    def step(rate: Any, t: float, state: Any, h: float) -> None:
        k = rate(t, state)
        k += 5.0
        state += k

    seen = watch(step, 0.0, y, 1.0, lambda call: answer)
    assert y.tolist() == [1.0, 1.0]
    assert answer.tolist() == [0.0, 0.0]
    assert seen.result.tolist() == [6.0, 6.0]
    assert not seen.overwritten


def test_a_step_that_swallows_the_refusal_is_refused_all_the_same() -> None:
    def step(rate: Any, t: float, y: Any, h: float) -> Any:
        try:
            return y + h * rate(t, y, h, 1)
        except Exception:
            return y

    with pytest.raises(NotRecovered, match="with 4 arguments") as error:
        read_step(step)
    assert error.value.reason == "signature"


def test_an_exit_is_an_error_and_ctrl_c_is_not_held_back() -> None:
    def leaves(rate: Any, t: float, y: Any, h: float) -> Any:
        raise SystemExit(3)

    def stopped(rate: Any, t: float, y: Any, h: float) -> Any:
        raise KeyboardInterrupt

    with pytest.raises(NotRecovered, match=r"sys.exit\(3\)"):
        read_step(leaves)
    with pytest.raises(KeyboardInterrupt):
        read_step(stopped)


def test_a_pair_of_time_and_state_may_come_back() -> None:
    def step(rate: Any, t: float, y: Any, h: float) -> Any:
        return t + h, y + h * rate(t, y)

    assert read_step(step).weights.tolist() == [1.0]
