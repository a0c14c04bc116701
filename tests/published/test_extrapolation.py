"""Extrapolation against what is published of it.

Hairer, Nørsett and Wanner, Solving Ordinary Differential Equations I (1993), section II.9; from memory.
"""

from __future__ import annotations

from fractions import Fraction

import pytest

from newel.methods.families.extrapolation import extrapolated, extrapolated_euler, extrapolated_midpoint
from newel.methods.order_conditions import prove


def test_euler_extrapolated_twice_is_the_midpoint_rule() -> None:
    """T₂₂ of Euler with 1 and 2 sub-steps: 2·T₂₁ − T₁₁ is Runge's midpoint rule (their section II.9)."""
    made = extrapolated_euler(2)
    assert [str(c) for c in made.nodes] == ["0", "1/2"]
    assert [str(b) for b in made.weights] == ["0", "1"]


def test_the_stages_of_the_harmonic_table_of_order_p() -> None:
    """p(p − 1)/2 + 1 rates for Euler with the harmonic sequence, all rows sharing the first."""
    assert [extrapolated_euler(p).stages for p in (1, 2, 3, 4, 5)] == [1, 2, 4, 7, 11]


def test_the_stages_of_the_midpoint_table() -> None:
    """k² + 1 rates for k rows of 2, 4, …, 2k sub-steps without smoothing."""
    assert [extrapolated_midpoint(2 * k).stages for k in range(1, 8)] == [2, 5, 10, 17, 26, 37, 50]


def test_gragg_with_two_sub_steps_and_no_smoothing_is_the_midpoint_rule() -> None:
    made = extrapolated("midpoint", (2,))
    assert [str(b) for b in made.weights] == ["0", "1"]


@pytest.mark.parametrize(
    ("steps", "shares"),
    [
        # Lagrange's factors at 0 in h²: −1/3 and 4/3 for 2 and 4 sub-steps; 1/24, −16/15 and 81/40 for 2, 4
        # and 6, the shares of trapezoidal sums with 1, 2 and 3 intervals (Richardson, 1927); from memory.
        ((2, 4), ("-1/3", "4/3")),
        ((2, 4, 6), ("1/24", "-16/15", "81/40")),
    ],
)
def test_the_shares_of_the_rows_are_the_known_ones(steps: tuple[int, ...], shares: tuple[str, ...]) -> None:
    """For y' = f(t) a row of n sub-steps is a sum over the odd points, each with 2/n of the row."""
    made = extrapolated("midpoint", steps)
    last = {n: made.weights[place] for n, place in zip(steps, last_stages(steps), strict=True)}
    for n, share in zip(steps, shares, strict=True):
        assert last[n] == Fraction(share) * Fraction(2, n)


def last_stages(steps: tuple[int, ...]) -> list[int]:
    places, stages = [], 1
    for n in steps:
        stages += n - 1
        places.append(stages - 1)
    return places


def test_the_order_grows_by_two_with_each_row() -> None:
    for k in (1, 2, 3, 4):
        assert prove(extrapolated_midpoint(2 * k)).order == 2 * k
