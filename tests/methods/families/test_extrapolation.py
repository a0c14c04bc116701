"""Extrapolation as a tableau: a step is the corner of Neville's table, and sizes are held to bounds."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction
from itertools import pairwise

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from newel.errors import BadRequest
from newel.methods.families import extrapolation
from newel.methods.families.extrapolation import extrapolated, extrapolated_midpoint, step_numbers
from newel.methods.order_conditions import prove
from tests.methods.families.rational_steps import logistic, step

pytestmark = pytest.mark.core


def euler(y: Fraction, h: Fraction, n: int) -> Fraction:
    for k in range(n):
        y += h / n * logistic(k * h / n, y)
    return y


def gragg(y: Fraction, h: Fraction, n: int, smoothed: bool) -> Fraction:
    """Gragg's modified midpoint rule, from its definition (Hairer, Nørsett and Wanner I, (9.13))."""
    sub = h / n
    states = [y, y + sub * logistic(Fraction(0), y)]
    for k in range(1, n + 1):
        states.append(states[k - 1] + 2 * sub * logistic(k * sub, states[k]))
    if smoothed:
        return (states[n - 1] + 2 * states[n] + states[n + 1]) / 4
    return states[n]


def corner(values: Sequence[Fraction], steps: Sequence[int], power: int) -> Fraction:
    """The last entry of the table, column by column (Hairer, Nørsett and Wanner I, (9.10))."""
    column = list(values)
    for k in range(1, len(values)):
        column = [
            now + (now - before) / (Fraction(steps[j + k], steps[j]) ** power - 1)
            for j, (before, now) in enumerate(pairwise(column))
        ]
    return column[-1]


@settings(deadline=None, derandomize=True, max_examples=30)
@given(
    st.sets(st.integers(1, 5), min_size=2, max_size=3),
    st.sampled_from(["euler", "midpoint", "smoothed"]),
    st.fractions(-1, 1, max_denominator=7),
    st.fractions(0, 1, max_denominator=5),
)
def test_a_step_is_the_corner_of_the_table_and_its_left_neighbour_is_embedded(
    numbers: set[int], rule: str, y: Fraction, h: Fraction
) -> None:
    base = "euler" if rule == "euler" else "midpoint"
    steps = tuple(sorted(numbers)) if base == "euler" else tuple(sorted(2 * n for n in numbers))
    power = 1 if base == "euler" else 2
    pair = extrapolated(base, steps, smoothed=rule == "smoothed")
    values = [euler(y, h, n) if base == "euler" else gragg(y, h, n, rule == "smoothed") for n in steps]
    assert pair.embedded_weights is not None
    assert step(pair, pair.weights, y, h) == corner(values, steps, power)
    assert step(pair, pair.embedded_weights, y, h) == corner(values[1:], steps[1:], power)


FAMILIES = [
    ("extrapolated_euler", 5, 11),
    ("extrapolated_euler_romberg", 4, 12),
    ("extrapolated_euler_bulirsch", 5, 12),
    ("extrapolated_midpoint", 8, 17),
    ("extrapolated_midpoint_romberg", 6, 12),
    ("extrapolated_midpoint_bulirsch", 8, 17),
    ("extrapolated_midpoint_smoothed", 6, 13),
]


@pytest.mark.parametrize(("family", "order", "stages"), FAMILIES)
def test_each_family_proves_exactly_what_it_claims(family: str, order: int, stages: int) -> None:
    pair = getattr(extrapolation, family)(order)
    verdict = prove(pair)
    before = order - (1 if "euler" in family else 2)
    assert (verdict.outcome, verdict.order, verdict.embedded_order) == ("exact", order, before)
    assert pair.stages == stages
    assert pair.is_exact


def test_the_sequences_are_the_usual_ones() -> None:
    assert step_numbers("harmonic", 5) == (1, 2, 3, 4, 5)
    assert step_numbers("romberg", 5) == (1, 2, 4, 8, 16)
    assert step_numbers("bulirsch", 9) == (1, 2, 3, 4, 6, 8, 12, 16, 24)
    assert step_numbers("bulirsch", 4, even=True) == (2, 4, 6, 8)


@pytest.mark.parametrize("order", [-2, 0, 3, 18, 999_999_999])
def test_an_order_that_is_none_of_the_family_is_refused_with_those_that_are(order: int) -> None:
    with pytest.raises(BadRequest, match=f"order {order} .*\n.*every second order from 2 to 16"):
        extrapolated_midpoint(order)


@pytest.mark.parametrize(
    ("base", "steps", "words"),
    [
        ("trapezoid", (1,), "no base method"),
        ("euler", (2, 2), "do not increase"),
        ("euler", (), "do not increase"),
        ("midpoint", (2, 3), "even ones"),
        ("euler", (1, 1000), "at most order 16 and 512 stages".capitalize()),
    ],
)
def test_sub_steps_that_make_no_method_are_refused(base: str, steps: tuple[int, ...], words: str) -> None:
    with pytest.raises(BadRequest, match=words):
        extrapolated(base, steps)


def test_smoothing_belongs_to_the_midpoint_rule() -> None:
    with pytest.raises(BadRequest, match="smoothing"):
        extrapolated("euler", (1, 2), smoothed=True)
