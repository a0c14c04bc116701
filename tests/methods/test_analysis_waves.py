"""Damping and delay of waves: against the argument and the modulus themselves."""

from __future__ import annotations

from cmath import exp, phase
from fractions import Fraction
from math import factorial

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from newel.methods.analysis.waves import (
    dispersion_coefficient,
    dispersion_order,
    dissipation_coefficient,
    dissipation_order,
    resolved_wave_number,
)
from newel.methods.tableau import Tableau
from tests.methods.chains import chain

pytestmark = pytest.mark.core

SERIES = [Fraction(1, factorial(k)) for k in range(2, 9)]


@pytest.mark.parametrize("order", range(1, 8))
def test_the_exponential_series_leaves_the_next_terms(order: int) -> None:
    """log R − z starts with −z^(p+1)/(p+1)! + z^(p+2)·(1/(p+1)! − 1/(p+2)!), worked out by hand."""
    t = chain(*SERIES[: order - 1], order=order)
    first = -Fraction(1, factorial(order + 1))
    second = Fraction(1, factorial(order + 1)) - Fraction(1, factorial(order + 2))
    even, odd = (first, second) if order % 2 else (second, first)
    lower, upper = order, order + 1
    even_power, odd_power = (lower + 1, upper + 1) if order % 2 else (upper + 1, lower + 1)
    assert dissipation_order(t) == even_power - 1
    assert dispersion_order(t) == odd_power - 1
    assert dissipation_coefficient(t) == pytest.approx(float(-even * (-1) ** (even_power // 2)), rel=1e-12)
    assert dispersion_coefficient(t) == pytest.approx(float(-odd * (-1) ** (odd_power // 2)), rel=1e-12)


@settings(deadline=None, derandomize=True, max_examples=60)
@given(st.lists(st.fractions("1/20", 1, max_denominator=20), min_size=1, max_size=4))
def test_the_leading_terms_are_what_small_waves_show(higher: list[Fraction]) -> None:
    t = chain(*higher)
    nu = 1e-2
    z = 1j * nu
    kept = (1 + z + sum(float(x) * z**k for k, x in enumerate(higher, 2))) * exp(-z)
    power, factor = dissipation_order(t), dissipation_coefficient(t)
    assert power is not None
    assert factor is not None
    if abs(factor) > 1e-2 and power < 4:
        assert (1 - abs(kept)) / nu ** (power + 1) == pytest.approx(factor, rel=0.2)
    power, factor = dispersion_order(t), dispersion_coefficient(t)
    assert power is not None
    assert factor is not None
    if abs(factor) > 1e-2 and power < 4:
        assert -phase(kept) / nu ** (power + 1) == pytest.approx(factor, rel=0.2)


@pytest.mark.parametrize("accuracy", [1e-1, 1e-3, 1e-6])
def test_waves_are_resolved_up_to_the_number_and_not_beyond(accuracy: float) -> None:
    found = resolved_wave_number(chain(*SERIES[:3], order=4), accuracy)
    assert found is not None

    def error(nu: float) -> float:
        z = 1j * nu
        kept = sum(z**k / factorial(k) for k in range(5)) * exp(-z)
        return max(abs(abs(kept) - 1), abs(phase(kept)))

    assert error(found) == pytest.approx(accuracy, rel=1e-6)
    assert all(error(found * k / 100) <= accuracy for k in range(1, 100))


def test_rounding_is_not_taken_for_damping() -> None:
    third = "0.3333333333"
    rounded = Tableau(
        "rounded-3",
        order=3,
        matrix=[[], [third], [0, "0.6666666667"]],
        weights=["0.25", 0, "0.75"],
        digits={"nodes": 10, "matrix": 10, "weights": "exact"},
    )
    assert (dissipation_order(rounded), dispersion_order(rounded)) == (3, 4)
