"""Step controllers against G. Söderlind, "Digital filters in adaptive time-stepping", ACM Transactions on
Mathematical Software 29 (2003) 1–26, DOI 10.1145/641876.641877 (names H p_D p_A p_F: dynamic order,
adaptivity order, order of the low-pass filter; coefficient sets from memory, structure and poles computed
here), and
G. Söderlind and L. Wang, Journal of Computational and Applied Mathematics 185 (2006) 225–243 (limiter, from
memory; figures computed from the formula).

The proportional–integral set: K. Gustafsson, ACM Transactions on Mathematical Software 17 (1991) 533–554.
"""

from __future__ import annotations

import numpy as np
import pytest

from newel.stepping.controllers import NAMED, FilterController, soderlind_h211b, soderlind_h312b

pytestmark = pytest.mark.core

# name: exponents β, exponents α, closed-loop poles, adaptivity order, filter order (p_A and p_F of the name).
TABLE = {
    "elementary": ((1,), (), (0,), 1, 0),
    "gustafsson-pi": ((0.7, -0.4), (), (0.8, -0.5), 1, 0),
    "soderlind-pi-3-3": ((2 / 3, -1 / 3), (), (0.767592, -0.434259), 1, 0),
    "soderlind-pi-4-2": ((3 / 5, -1 / 5), (), (0.689898, -0.289898), 1, 0),
    "soderlind-h211-pi": ((1 / 6, 1 / 6), (), (1 / 2, 1 / 3), 1, 1),
    "soderlind-h211b": ((1 / 4, 1 / 4), (1 / 4,), (1 / 2, 0), 1, 1),
    "soderlind-h0211": ((1 / 2, 1 / 2), (1 / 2,), (0, 0), 1, 1),
    "soderlind-h0220": ((2, -1), (-1,), (0, 0), 2, 0),
    "soderlind-h0330": ((3, -3, 1), (-2, 1), (0, 0, 0), 3, 0),
    "soderlind-h0312": ((1 / 4, 1 / 2, 1 / 4), (3 / 4, 1 / 4), (0, 0, 0), 1, 2),
    "soderlind-h312b": ((1 / 8, 2 / 8, 1 / 8), (3 / 8, 1 / 8), (1 / 2, 0, 0), 1, 2),
    "soderlind-h312-pid": ((1 / 18, 1 / 9, 1 / 18), (), (0.622839, 0.5, -0.178395), 1, 2),
    "soderlind-h0321": ((5 / 4, 1 / 2, -3 / 4), (-1 / 4, -3 / 4), (0, 0, 0), 2, 1),
    "soderlind-h321": ((1 / 3, 1 / 18, -5 / 18), (-5 / 6, -1 / 6), (2 / 3, 1 / 2, 1 / 3), 2, 1),
}


def polynomials(controller: FilterController) -> tuple[np.ndarray, np.ndarray]:
    """The numerator and the denominator of the closed loop, error ~ phi·step^k (Söderlind, section 4)."""
    numerator = np.array(controller.errors)
    integrator = np.polymul([1.0, -1.0], [1.0, *controller.steps])
    return numerator, np.polyadd(integrator, numerator)


def multiplicity(coefficients: np.ndarray, root: float) -> int:
    count = 0
    while len(coefficients) and abs(np.polyval(coefficients, root)) < 1e-12:
        coefficients = np.polydiv(coefficients, [1.0, -root])[0]
        count += 1
    return count


def test_every_named_set_is_in_the_table() -> None:
    assert set(TABLE) == set(NAMED)


@pytest.mark.parametrize("name", TABLE)
def test_the_exponents_are_those_of_the_table(name: str) -> None:
    controller, (errors, steps, *_) = NAMED[name](), TABLE[name]
    assert controller.errors == pytest.approx((*errors, 0, 0)[:3], abs=1e-15)
    assert controller.steps == pytest.approx((*steps, 0, 0)[:2], abs=1e-15)


@pytest.mark.parametrize("name", TABLE)
def test_the_closed_loop_has_the_poles_of_the_table(name: str) -> None:
    _, denominator = polynomials(NAMED[name]())
    want = np.zeros(3)
    want[: len(TABLE[name][2])] = TABLE[name][2]
    np.testing.assert_allclose(denominator, np.poly(want), atol=5e-7)


@pytest.mark.parametrize("name", TABLE)
def test_a_constant_disturbance_is_followed_without_error(name: str) -> None:
    numerator, denominator = polynomials(NAMED[name]())
    assert np.polyval(numerator, 1.0) / np.polyval(denominator, 1.0) == pytest.approx(1.0, abs=1e-14)


@pytest.mark.parametrize("name", TABLE)
def test_adaptivity_and_filter_order_are_those_of_the_name(name: str) -> None:
    controller = NAMED[name]()
    numerator, denominator = polynomials(controller)
    assert multiplicity(np.polysub(denominator, numerator), 1.0) == TABLE[name][3]
    assert multiplicity(np.trim_zeros(numerator, "b"), -1.0) == TABLE[name][4]


@pytest.mark.parametrize("b", [2.0, 3.0, 6.0, 8.0])
def test_h211b_has_the_pole_one_minus_two_over_b(b: float) -> None:
    """Söderlind (2003): b = 2 is the deadbeat H0211."""
    _, denominator = polynomials(soderlind_h211b(b=b))
    np.testing.assert_allclose(denominator, np.poly([1 - 2 / b, 0, 0]), atol=1e-14)


@pytest.mark.parametrize("b", [4.0, 8.0, 16.0])
def test_h312b_has_the_pole_one_minus_four_over_b(b: float) -> None:
    """Söderlind (2003): b = 4 is the deadbeat H0312."""
    _, denominator = polynomials(soderlind_h312b(b=b))
    np.testing.assert_allclose(denominator, np.poly([1 - 4 / b, 0, 0]), atol=1e-14)


def marched(controller: FilterController, disturbance: list[float], order: int = 5) -> list[float]:
    """The steps for error = (phi·step)^k, phi given step by step."""
    memory, step, steps = controller.start(), 0.5, []
    for _ in range(3):
        _, _, memory = controller.decide(step**order, step, order, memory)
    for phi in disturbance:
        accepted, factor, memory = controller.decide((phi * step) ** order, step, order, memory)
        assert accepted
        step *= factor
        steps.append(step)
    return steps


@pytest.mark.parametrize("name", [name for name, (_, _, _, _, filter_order) in TABLE.items() if filter_order])
def test_an_alternating_disturbance_is_filtered_away(name: str) -> None:
    """A filter of order 1 or 2 has a zero at q = −1: the steps become constant."""
    # The step settles where phi·step is 1/2 on average: no error is above 1, none below what is remembered.
    safety = 0.5 ** sum(NAMED[name]().errors)
    steps = marched(NAMED[name](safety=safety, smallest=1e-3, largest=1e3), [0.8, 1.25] * 60)
    assert max(steps[-10:]) / min(steps[-10:]) == pytest.approx(1.0, abs=1e-9)


def test_the_elementary_controller_hands_an_alternating_disturbance_on() -> None:
    """Its gain at q = −1 is 1: the ratio of the steps is that of the disturbances, 1.25/0.8."""
    steps = marched(NAMED["elementary"](safety=0.5, smallest=1e-3, largest=1e3), [0.8, 1.25] * 30)
    assert max(steps[-10:]) / min(steps[-10:]) == pytest.approx(1.25 / 0.8, rel=1e-9)


def test_the_gustafsson_set_is_his_formula() -> None:
    """h_new = h·(1/r_n)^(0.3/k)·(r_(n−1)/r_n)^(0.4/k); Gustafsson (1991), from memory."""
    controller = NAMED["gustafsson-pi"](safety=1.0)
    k, before, now = 5, 0.6, 0.4
    _, _, memory = controller.decide(before, 1.0, k, controller.start())
    _, factor, _ = controller.decide(now, 1.0, k, memory)
    assert factor == pytest.approx((1 / now) ** (0.3 / k) * (before / now) ** (0.4 / k))


@pytest.mark.parametrize(
    ("raw", "limited"),
    [(2.0, 1.7853981634), (1e-12, 0.2146018366), (1e12, 2.5707963268), (1.0, 1.0)],
)
def test_the_smooth_limiter_is_one_plus_an_arctangent(raw: float, limited: float) -> None:
    """Söderlind and Wang (2006), kappa = 1; the four figures computed from the formula."""
    smooth = FilterController(
        "raw", (0.0,), (-1.0,), safety=1.0, smallest=1e-3, largest=1e3, limiter="arctangent"
    )
    _, _, memory = smooth.decide(1.0, 1.0, 1, smooth.start())
    _, factor, _ = smooth.decide(1.0, raw, 1, memory)
    assert factor == pytest.approx(limited, abs=1e-9)
