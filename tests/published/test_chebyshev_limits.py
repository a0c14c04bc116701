"""Stabilised methods: the length of the negative axis that they were published for.

The published β is where the argument of the polynomial reaches −1; just beyond it a damped polynomial may
still be below 1. Formulas: J. G. Verwer, W. Hundsdorfer and B. P. Sommeijer, Numer. Math. 57 (1990) 157-178;
P. J. van der Houwen and B. P. Sommeijer, Z. Angew. Math. Mech. 60 (1980) 479-485; C. D. Meyer, D. S. Balsara
and T. D. Aslam, J. Comput. Phys. 257 (2014) 594-626. All from memory; the numbers of Chebyshev type were
computed from the formulas with 40 digits.
"""

from __future__ import annotations

from fractions import Fraction

import pytest

from newel.methods.families.recursions import chebyshev_1, chebyshev_2, legendre_1, legendre_2
from newel.methods.tableau import Tableau


def polynomial(tableau: Tableau) -> list[Fraction]:
    """R(z) = 1 + Σ b A^(k−1) 1 z^k, coefficients by increasing power."""
    vector = [Fraction(1)] * tableau.stages
    found = [Fraction(1)]
    weights = [b.rational for b in tableau.weights]
    rows = [[(j, a.rational) for j, a in enumerate(row) if a] for row in tableau.matrix]
    for _ in range(tableau.stages):
        found.append(sum((b * x for b, x in zip(weights, vector, strict=True)), Fraction(0)))
        vector = [sum((a * vector[j] for j, a in row), Fraction(0)) for row in rows]
    return found


def value(coefficients: list[Fraction], z: Fraction) -> Fraction:
    total = Fraction(0)
    for a in reversed(coefficients):
        total = total * z + a
    return total


def chebyshev(degree: int, x: Fraction) -> tuple[Fraction, Fraction, Fraction]:
    """T_s, T_s′ and T_s″ at x, from their explicit sums of powers."""
    coefficients = [[Fraction(1)], [Fraction(0), Fraction(1)]]
    for _ in range(degree - 1):
        doubled = [Fraction(0), *(2 * a for a in coefficients[-1])]
        before = coefficients[-2] + [Fraction(0)] * (len(doubled) - len(coefficients[-2]))
        coefficients.append([a - b for a, b in zip(doubled, before, strict=True)])
    T = coefficients[degree]
    slope = [k * a for k, a in enumerate(T)][1:]
    return value(T, x), value(slope, x), value([k * a for k, a in enumerate(slope)][1:], x)


def largest(coefficients: list[Fraction], low: Fraction, high: Fraction) -> Fraction:
    """The largest modulus on a grid of 200 points."""
    return max(abs(value(coefficients, low + (high - low) * k / 200)) for k in range(201))


@pytest.mark.parametrize(
    ("stages", "beta"),
    [
        (2, "1.96296296296"),
        (3, "5.23040391107"),
        (4, "9.80425578813"),
        (5, "15.6847661766"),
        (10, "64.6884016104"),
    ],
)
def test_order_2_with_damping_2_13(stages: int, beta: str) -> None:
    R = polynomial(chebyshev_2(stages))
    T, slope, bend = chebyshev(stages, 1 + Fraction(2, 13) / stages**2)
    b = bend / slope**2
    end = value(R, -Fraction(beta))
    assert float(end) == pytest.approx(float(1 - b * T + b * (-1) ** stages), rel=1e-10)
    assert largest(R, -Fraction(beta), Fraction(-1, 2)) <= 1 - b * T + b + Fraction(1, 10**10)
    # "about 1 − ε/3" away from 0 is the damping that the paper states.
    assert float(1 - b * T + b) == pytest.approx(1 - 2 / 39, abs=0.02)


@pytest.mark.parametrize(("stages", "share"), [(2, "1.9400476"), (5, "1.9365619"), (10, "1.9360627")])
def test_order_1_with_damping_1_20(stages: int, share: str) -> None:
    R = polynomial(chebyshev_1(stages))
    T, _, _ = chebyshev(stages, 1 + Fraction(1, 20) / stages**2)
    beta = Fraction(share) * stages**2
    assert float(value(R, -beta)) == pytest.approx(float((-1) ** stages / T), abs=2e-6)
    assert largest(R, -beta * Fraction(999, 1000), Fraction(-2)) <= 1 / T


@pytest.mark.parametrize("stages", [2, 5, 16])
def test_order_1_is_the_shifted_chebyshev_polynomial(stages: int) -> None:
    """R(z) = T_s(w₀ + w₁z)/T_s(w₀), exactly."""
    R = polynomial(chebyshev_1(stages))
    w0 = 1 + Fraction(1, 20) / stages**2
    T, slope, _ = chebyshev(stages, w0)
    for z in (Fraction(-1), Fraction(-7, 3), Fraction(1, 2)):
        assert value(R, z) == chebyshev(stages, w0 + T / slope * z)[0] / T


@pytest.mark.parametrize("stages", [2, 3, 5, 8])
def test_legendre_polynomials_reach_their_stated_ends(stages: int) -> None:
    """P_s(−1) = (−1)^s at β = s² + s for order 1, and at (s² + s − 2)/2, below 1 in between, for order 2."""
    first, second = polynomial(legendre_1(stages)), polynomial(legendre_2(stages))
    beta = Fraction(stages**2 + stages)
    assert value(first, -beta) == (-1) ** stages
    assert largest(first, -beta, Fraction(0)) == 1
    b = Fraction(stages**2 + stages - 2, 2 * stages * (stages + 1))
    assert value(second, -(beta - 2) / 2) == 1 - b + b * (-1) ** stages
    assert largest(second, -(beta - 2) / 2, Fraction(0)) == 1


def test_a_member_of_forty_digits_reaches_as_far() -> None:
    """0.653 (s² − 1) for order 2, from the exact asymptotic formula (2/3)(1 − 2ε/15)."""
    stages = 18
    R = polynomial(chebyshev_2(stages))
    beta = Fraction(2, 3) * (stages**2 - 1) * (1 - Fraction(4, 195))
    assert largest(R, -beta, Fraction(-2)) < 1
    assert abs(value(R, -beta * Fraction(21, 20))) > 1
