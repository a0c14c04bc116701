"""Stability limits, region, area and error growth: against roots by numpy, grids, and closed forms."""

from __future__ import annotations

from fractions import Fraction
from math import factorial, pi, sqrt

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from newel.methods.analysis.stability import growth_polynomial, stability_polynomial
from newel.methods.analysis.stability_limits import MOST_STAGES, imaginary_limit, real_limit
from newel.methods.analysis.stability_region import (
    amplification,
    internal_growth,
    main_region,
    stability_area,
)
from newel.methods.tableau import Tableau
from tests.methods.chains import chain

pytestmark = pytest.mark.core

EULER = Tableau("euler-1", order=1, matrix=[[]], weights=[1])
HEUN = Tableau("heun-2", order=2, matrix=[[], [1]], weights=["1/2", "1/2"])
KUTTA = chain("1/2", "1/6", "1/24", order=4)


def numpy_limit(r: list[float], imaginary: bool) -> float:
    """The limit by numpy's roots of 1 − |R|², on the real or the imaginary axis."""
    signs = [1j**k if imaginary else (-1) ** k for k in range(len(r))]
    p = np.array([x * s for x, s in zip(r, signs, strict=True)])
    left = -np.real(np.convolve(p, np.conj(p)))
    left[0] += 1.0
    roots = np.roots(left[::-1])
    places = sorted(z.real for z in roots if abs(z.imag) < 1e-6 and z.real > 1e-3)
    for place, following in zip(places, [*places[1:], places[-1] + 1.0], strict=True):
        if np.polyval(left[::-1], (place + following) / 2) < 0:
            return float(place)
    raise AssertionError("no limit")


@settings(deadline=None, derandomize=True, max_examples=60)
@given(st.lists(st.fractions("1/40", "3/5", max_denominator=60), min_size=1, max_size=5))
def test_the_real_limit_is_that_of_numpys_roots(higher: list[Fraction]) -> None:
    found = real_limit(chain(*higher))
    assert found is not None
    assert found == pytest.approx(numpy_limit([1.0, 1.0, *map(float, higher)], imaginary=False), rel=1e-6)


@settings(deadline=None, derandomize=True, max_examples=60)
@given(st.lists(st.fractions("1/40", "3/5", max_denominator=60), min_size=2, max_size=5))
def test_the_imaginary_limit_is_zero_or_that_of_numpys_roots(higher: list[Fraction]) -> None:
    found = imaginary_limit(chain(*higher))
    assert found is not None
    if found == 0.0:
        y = 1e-4
        r = [Fraction(1), Fraction(1), *higher]
        even = sum((-1) ** k * x * Fraction(y) ** (2 * k) for k, x in enumerate(r[::2]))
        odd = sum((-1) ** k * x * Fraction(y) ** (2 * k + 1) for k, x in enumerate(r[1::2]))
        assert even**2 + odd**2 > 1
    else:
        wanted = numpy_limit([1.0, 1.0, *map(float, higher)], imaginary=True)
        assert found == pytest.approx(wanted, rel=1e-5)


def test_closed_forms_come_out_to_the_last_digit() -> None:
    assert real_limit(EULER) == real_limit(HEUN) == 2.0
    assert imaginary_limit(EULER) == imaginary_limit(HEUN) == 0.0
    assert imaginary_limit(chain("1/2", "1/6", order=3)) == sqrt(3)
    assert imaginary_limit(KUTTA) == sqrt(8)
    # R = T_s(1 + z/s²) reaches 2s² exactly, though |R| = 1 inside it s − 1 times.
    assert real_limit(chain("1/8")) == 8.0
    assert real_limit(chain("4/27", "4/729")) == 18.0


def test_the_lowest_coefficient_decides_however_small_it_is() -> None:
    # The coefficient of y² in |R(iy)|² is 1 − 2r₂.
    tiny = Fraction(1, 10**40)
    assert imaginary_limit(chain(Fraction(1, 2) - tiny, "1/6")) == 0.0
    assert imaginary_limit(chain(Fraction(1, 2) + tiny, "1/6")) == pytest.approx(sqrt(3))


def test_rounded_numbers_do_not_decide_by_their_last_digit() -> None:
    third = "0.3333333333333333"
    rounded = Tableau(
        "rounded-3",
        order=3,
        matrix=[[], [third], [0, "0.6666666666666667"]],
        weights=["0.25", 0, "0.75"],
        digits={"nodes": 16, "matrix": 16, "weights": "exact"},
    )
    assert stability_polynomial(rounded) != growth_polynomial(rounded)
    assert growth_polynomial(rounded) == tuple(Fraction(1, factorial(k)) for k in range(4))
    assert imaginary_limit(rounded) == sqrt(3)


def test_rounded_numbers_that_break_the_claim_are_not_mended() -> None:
    wrong = Tableau("wrong-2", order=2, matrix=[[], ["0.49"]], weights=[0, 1], digits=9)
    found = growth_polynomial(wrong)
    assert found is not None
    assert float(found[2]) == pytest.approx(0.49)


def test_two_square_roots_in_one_method_still_give_limits() -> None:
    t = Tableau("mixed-1", order=1, matrix=[[], ["sqrt(3)/4"]], weights=["1 - sqrt(2)/2", "sqrt(2)/2"])
    assert stability_polynomial(t) is None
    c = sqrt(6) / 8
    assert real_limit(t) == pytest.approx(1 / c, rel=1e-14)


def test_too_many_stages_have_no_exact_limits_and_take_no_time() -> None:
    t = chain(*["1/2"] * MOST_STAGES)
    assert real_limit(t) is None
    assert imaginary_limit(t) is None
    assert stability_area(t) is None


def test_a_constant_polynomial_is_stable_everywhere() -> None:
    assert real_limit(Tableau("still-1", order=1, matrix=[[]], weights=[0])) == float("inf")


def test_the_embedded_limits_are_those_of_the_embedded_weights() -> None:
    pair = Tableau(
        "heun-euler-2-1",
        order=2,
        embedded_order=1,
        matrix=[[], [1]],
        weights=["1/2", "1/2"],
        embedded_weights=["3/4", "1/4"],
    )
    assert real_limit(pair, embedded=True) == pytest.approx(4.0)
    assert real_limit(HEUN, embedded=True) is None


def test_areas_with_a_closed_form() -> None:
    assert stability_area(EULER) == pytest.approx(pi, rel=1e-8)
    # R = T₂(1 + z/4): w = z/4 + 1, |2w² − 1| ≤ 1 is a lemniscate of area 1·16.
    assert stability_area(chain("1/8")) == pytest.approx(16.0, rel=1e-4)


@pytest.mark.parametrize("method", [HEUN, KUTTA, chain("1/2", "1/6", "1/24", "1/200", order=4)])
def test_the_area_is_what_a_grid_counts(method: Tableau) -> None:
    x, y = np.arange(-8.0, 2.0, 0.02) + 0.01, np.arange(0.0, 6.0, 0.02) + 0.01
    inside = amplification(method, x[None, :] + 1j * y[:, None]) <= 1.0
    assert stability_area(method) == pytest.approx(2 * inside.sum() * 0.02**2, rel=2e-3)


def test_the_amplification_is_the_polynomial_and_infinite_far_outside() -> None:
    z = np.array([0.3 + 0.4j, -2.0, 1e200])
    found = amplification(KUTTA, z)
    assert found[0] == pytest.approx(abs(sum(z[0] ** k / factorial(k) for k in range(5))), rel=1e-14)
    assert found[1] == pytest.approx(1 / 3, rel=1e-14)
    assert found[2] == np.inf


def test_error_growth_within_a_step_is_what_the_region_holds_at_most() -> None:
    x, y = np.arange(-3.2, 0.6, 0.02), np.arange(0.0, 3.2, 0.02)
    z = (x[None, :] + 1j * y[:, None])[amplification(KUTTA, x[None, :] + 1j * y[:, None]) <= 1.0]
    largest = max(np.abs(v * (KUTTA.b @ np.linalg.inv(np.eye(4) - v * KUTTA.A))).max() for v in z)
    assert internal_growth(KUTTA) == pytest.approx(largest, rel=2e-2)


def test_islands_far_out_do_not_count_as_error_growth() -> None:
    # z⁵·10⁻⁹ makes islands beyond |z| = 1000, where single stages grow without bound.
    far = chain("1/2", "1/6", "1/24", "1/1000000000")
    near = internal_growth(far)
    assert near is not None
    assert near < 100


def test_a_long_thin_region_fits_its_window() -> None:
    # Ten stages of T₁₀(1 + z/100): from −200 to 0, about ±8 high.
    r = []
    for k in range(1, 11):
        # r_k of T_s(1 + z/s²): Π_{j<k} (s² − j²)/((2j + 1)(j + 1)) / s^(2k).
        top = Fraction(1)
        for j in range(k):
            top *= Fraction(100 - j * j, (2 * j + 1) * (j + 1) * 100)
        r.append(top)
    assert r[0] == 1
    region = main_region(chain(*r[1:]))
    low, high, up = region.extent
    assert low == pytest.approx(-200, rel=0.02)
    assert high <= 0.5
    assert 1 < up < 20
    assert real_limit(chain(*r[1:])) == pytest.approx(200.0, rel=1e-14)
