"""Strong stability: against matrices inverted by numpy, and laws."""

from __future__ import annotations

from fractions import Fraction
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from newel.methods.analysis.monotonicity import linear_threshold, ssp_coefficient
from newel.methods.tableau import Tableau
from tests.methods.chains import chain

pytestmark = pytest.mark.core

weight = st.fractions(0, 1, max_denominator=8)


def nonzero(s: int) -> st.SearchStrategy[list[Fraction]]:
    return st.lists(weight, min_size=s, max_size=s).filter(any)


@st.composite
def methods(draw: st.DrawFn) -> Tableau:
    s = draw(st.integers(1, 4))
    matrix = [draw(st.lists(weight, min_size=i, max_size=i)) for i in range(s)]
    return Tableau("any-1", order=1, matrix=matrix, weights=draw(nonzero(s)))


def holds(t: Tableau, r: float) -> bool:
    """Absolute monotonicity at −r by numpy: Kraaijevanger 1991, the definition."""
    s = t.stages
    K = np.zeros((s + 1, s + 1))
    K[:s, :s], K[s, :s] = t.A, t.b
    M = K @ np.linalg.inv(np.eye(s + 1) + r * K)
    return bool((M >= -1e-12).all() and (r * M.sum(axis=1) <= 1 + 1e-12).all())


def all_needed(t: Tableau) -> bool:
    used, reach = set(np.flatnonzero(t.b)), True
    while reach:
        more = {int(j) for i in used for j in np.flatnonzero(t.A[i])} - used
        used |= more
        reach = bool(more)
    return len(used) == t.stages


@settings(deadline=None, derandomize=True, max_examples=80)
@given(methods().filter(all_needed))
def test_the_coefficient_is_the_last_r_at_which_numpy_finds_it_monotone(method: Tableau) -> None:
    found = ssp_coefficient(method)
    if found:
        assert holds(method, found * (1 - 1e-6))
    assert not holds(method, found + 1e-3 * max(found, 1.0))


@settings(deadline=None, derandomize=True, max_examples=60)
@given(methods())
def test_a_linear_problem_is_never_the_harder_one(method: Tableau) -> None:
    assert linear_threshold(method) >= ssp_coefficient(method) - 1e-12


@settings(deadline=None, derandomize=True, max_examples=40)
@given(st.lists(st.fractions("1/100", "1/2", max_denominator=100), min_size=1, max_size=4))
def test_the_threshold_is_the_last_r_with_no_negative_derivative(higher: list[Fraction]) -> None:
    found = linear_threshold(chain(*higher))
    p = np.polynomial.Polynomial([1.0, 1.0, *map(float, higher)])

    def derivatives(r: float) -> list[float]:
        return [float(p.deriv(k)(-r)) for k in range(len(higher) + 2)]

    assert min(derivatives(found * (1 - 1e-9))) >= -1e-9
    assert min(derivatives(found + 1e-3)) < 0


def test_whole_numbers_come_out_whole() -> None:
    heun: dict[str, Any] = {"order": 2, "matrix": [[], [1]], "weights": ["1/2", "1/2"]}
    assert ssp_coefficient(Tableau("heun-2", **heun)) == 1.0
    three = Tableau(
        "ssp-2-stages-3", order=2, matrix=[[], ["1/2"], ["1/2", "1/2"]], weights=["1/3", "1/3", "1/3"]
    )
    assert ssp_coefficient(three) == linear_threshold(three) == 2.0


def test_a_zero_in_the_wrong_place_is_zero_not_small() -> None:
    assert ssp_coefficient(chain("1/2", "1/6", "1/24")) == 0.0
    negative = Tableau("a-1", order=1, matrix=[[], ["-1/1000000"]], weights=["1/2", "1/2"])
    assert ssp_coefficient(negative) == 0.0
    assert linear_threshold(chain("1/2", "-1/1000000")) == 0.0


def test_a_stage_that_only_estimates_takes_no_part() -> None:
    plain = Tableau("heun-2", order=2, matrix=[[], [1]], weights=["1/2", "1/2"])
    pair = Tableau(
        "heun-2-1",
        order=2,
        embedded_order=1,
        matrix=[[], [1], ["-3", "4"]],
        weights=["1/2", "1/2", 0],
        embedded_weights=[0, 0, 1],
    )
    assert ssp_coefficient(pair) == ssp_coefficient(plain)
