"""Figures that papers print for methods of `claims_more.py`, and no method twice.

All figures are from memory, none was seen, with the digits that they give. They are computed here from the
files by numpy alone: the stability polynomial is R(z) = 1 + Σ b A^(k-1) 1 z^k, the strong-stability
coefficient is the radius of absolute monotonicity (J. F. B. M. Kraaijevanger, BIT 31 (1991) 482-528).
"""

from __future__ import annotations

from functools import cache
from itertools import combinations
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from tests.independent.tree_formulas import load

TABLEAUX = Path(__file__).parents[2] / "tableaux"
FILES = {path.stem: path for path in sorted(TABLEAUX.glob("order-*/*.toml"))}
Array = np.ndarray[Any, np.dtype[np.float64]]


@cache
def method(slug: str) -> dict[str, Any]:
    """`matrix` (s, s), `nodes`, `weights` and `embedded` (s,) in float64; `embedded` may be None."""
    data = load(FILES[slug], dps=20)
    parts = ("matrix", "nodes", "weights", "embedded")
    return {part: None if data[part] is None else np.array(data[part], dtype=float) for part in parts}


def stability_polynomial(slug: str) -> Array:
    """Coefficients of R, the constant first."""
    numbers = method(slug)
    powers, found = np.ones(len(numbers["weights"])), [1.0]
    for _ in powers:
        found.append(numbers["weights"] @ powers)
        powers = numbers["matrix"] @ powers
    return np.array(found)


def growth(slug: str, place: complex) -> float:
    """|R(z)|."""
    return float(abs(np.polynomial.polynomial.polyval(place, stability_polynomial(slug))))


def is_monotone(slug: str, radius: float) -> bool:
    """Whether the method is absolutely monotone at -radius."""
    numbers = method(slug)
    s = len(numbers["weights"])
    whole = np.zeros((s + 1, s + 1))
    whole[:s, :s], whole[s, :s] = numbers["matrix"], numbers["weights"]
    inner = whole @ np.linalg.inv(np.eye(s + 1) + radius * whole)
    return bool(inner.min() >= -1e-12 and (radius * inner.sum(axis=1)).max() <= 1 + 1e-12)


STRONG_STABILITY = {
    # Spiteri & Ruuth 2002 and Ruuth 2006; Ketcheson 2008: s - 1 and n^2 - n in closed form.
    "ssp-2-stages-5": "4",
    "ssp-3-stages-6": "3.5184",
    "ssp-3-stages-8": "5.1071",
    "ssp-3-stages-16": "12",
    "ssp-4-stages-6": "2.2945",
    "ssp-4-stages-7": "3.3209",
    "ssp-4-stages-8": "4.1459",
    "ssp-4-stages-9": "4.9142",
    "isherwood-grant-gottlieb-3": "0.75",  # Isherwood, Grant & Gottlieb 2018: 3/4
    "higueras-happenhofer-koch-kupka-2": "1.2",  # Higueras and others 2014
    "gottlieb-shu-tadmor-linear-2-stages-4": "1",  # Gottlieb, Shu & Tadmor 2001
}


@pytest.mark.parametrize("slug", STRONG_STABILITY)
def test_the_strong_stability_coefficient_is_the_published_one(slug: str) -> None:
    printed = STRONG_STABILITY[slug]
    unit = 10.0 ** -len(printed.partition(".")[2]) if "." in printed else 1e-9
    assert is_monotone(slug, float(printed) - unit)
    assert not is_monotone(slug, float(printed) + unit)


IMAGINARY_LIMITS = {
    # The longest that s stages can have is s - 1 (Sonneveld & van Leer 1985; Kinnmark & Gray 1984, where s is
    # even); with order 3 and s = 5, Kinnmark & Gray 1984 give the square root of (s - 1)^2 - 1.
    "matsuno-1": 1.0,
    "sonneveld-van-leer-2": 2.0,
    "jameson-four-stage-1": 3.0,
    "jameson-five-stage-2": 4.0,
    "guerra-ullrich-3": 15**0.5,
}


@pytest.mark.parametrize("slug", IMAGINARY_LIMITS)
def test_the_imaginary_stability_limit_is_the_published_one(slug: str) -> None:
    limit = IMAGINARY_LIMITS[slug]
    assert max(growth(slug, 1j * limit * k / 200) for k in range(1, 200)) <= 1 + 1e-12
    assert growth(slug, 1j * limit * (1 + 1e-6)) > 1


POLYNOMIALS = {
    # Hu, Hussaini & Manthey 1996, tables 1 and 2; Bogey & Bailly 2004.
    "hu-hussaini-manthey-2-stages-4": (0.5, 0.162997, 0.0407574),
    "hu-hussaini-manthey-2-stages-5": (0.5, 0.166558, 0.0395041, 0.00781071),
    "hu-hussaini-manthey-2-stages-6": (0.5, 1 / 6, 1 / 24, 0.00781005, 0.00132141),
    "bogey-bailly-2-stages-5": (0.5, 0.165250353664, 0.039372585984, 0.007149096448),
    "bogey-bailly-2-stages-6": (0.5, 0.165919771368, 0.040919732041, 0.007555704391, 0.000891421261),
}


@pytest.mark.parametrize("slug", POLYNOMIALS)
def test_the_stability_polynomial_is_the_published_one(slug: str) -> None:
    assert stability_polynomial(slug) == pytest.approx([1.0, 1.0, *POLYNOMIALS[slug]], rel=1e-12)


FOURTH_ORDER = (1.0, 1.0, 1 / 2, 1 / 6, 1 / 24)
ALTERNATING = {
    # Hu, Hussaini & Manthey 1996, table 3: what follows z^4 in the first and in the second half.
    "hu-hussaini-manthey-2-stages-10": ((), (0.0162098, 0.00286365)),
    "hu-hussaini-manthey-2-stages-11": ((0.00361050,), (0.0121101, 0.00285919)),
}


@pytest.mark.parametrize("slug", ALTERNATING)
def test_the_polynomial_of_an_alternating_scheme_is_the_product_of_its_published_halves(slug: str) -> None:
    first, second = (np.array([*FOURTH_ORDER, *rest]) for rest in ALTERNATING[slug])
    product = np.polynomial.polynomial.polymul(first, second)
    halved = product * 0.5 ** np.arange(len(product))
    assert stability_polynomial(slug) == pytest.approx(halved, rel=1e-12)


def step(slug: str, part: str) -> Array:
    """The state after one long step of a nonlinear problem that sees every tree: it tells methods apart.

    Stages in another order, or stages that nothing uses, leave it as it is.
    """
    numbers, start, h = method(slug), np.array([0.9, 1.4, -0.3]), 0.8
    slopes = np.zeros((len(numbers["weights"]), 3))
    for stage, row in enumerate(numbers["matrix"]):
        y, t = start + h * row @ slopes, 0.3 + h * numbers["nodes"][stage]
        slopes[stage] = (
            np.sin(2 * y[1] + t) * y[0],
            np.cos(y[0] * y[2]) - t * y[1] ** 2 / (1 + y[1] ** 2),
            np.sin(y[0] + 3 * t) + y[1] * y[2] / (1 + y[2] ** 2),
        )
    return np.asarray(start + h * numbers[part] @ slopes)


def test_no_two_files_carry_the_same_solution_on_with_the_same_estimate() -> None:
    """Reordered or unused stages make no other method, and only other embedded weights make another pair."""
    carried = {slug: step(slug, "weights") for slug in FILES}
    estimates = {slug: step(slug, "embedded") for slug in FILES if method(slug)["embedded"] is not None}
    for one, other in combinations(FILES, 2):
        if np.abs(carried[one] - carried[other]).max() < 1e-12:
            assert (one in estimates) or (other in estimates), f"{one} repeats {other}"
            if one in estimates and other in estimates:
                assert np.abs(estimates[one] - estimates[other]).max() > 1e-9, f"{one} repeats {other}"


def test_the_step_tells_methods_apart_but_not_the_order_of_their_stages() -> None:
    assert np.abs(step("kutta-4", "weights") - step("kutta-three-eighths-4", "weights")).max() > 1e-6
    assert np.abs(step("nystrom-3", "weights") - step("isherwood-grant-gottlieb-3", "weights")).max() > 1e-6
    assert np.array_equal(step("kutta-4", "weights"), step("zonneveld-4-3", "weights"))
