"""Real and imaginary stability limits against published figures.

Sources, quoted from memory (`from memory`), with the digits that they give:

- J. D. Lambert, Computational Methods in Ordinary Differential Equations (1973), table 8: the real
  intervals of the methods of orders 1 to 4 with as many stages, −2, −2, −2.51, −2.78.
- M. H. Carpenter and C. A. Kennedy, NASA TM-109112 (1994): 3.34 and 4.65 for their five-stage method.
- J. Berland, C. Bogey and C. Bailly, Comput. Fluids 35 (2006) 1459-1463: 3.82 for their six-stage method.
- B. P. Sommeijer, P. J. van der Houwen and J. G. Verwer, J. Comput. Appl. Math. 88 (1998) 315-326, and
  before them W. Markov: 2s² is reached by the Chebyshev polynomial of s stages.
- I. P. E. Kinnmark and W. G. Gray, Math. Comput. Simulation 26 (1984) 181-188: no method of s > 1 stages
  passes s − 1 on the imaginary axis.

The figures with more digits were recomputed by independent code at 40 digits.
"""

from __future__ import annotations

from functools import cache
from math import factorial, sqrt

import numpy as np
import pytest

from newel.catalogue.registry import default_registry
from newel.catalogue.shipped import tableau_files
from newel.methods.analysis.stability import growth_polynomial
from newel.methods.analysis.stability_limits import imaginary_limit, real_limit
from newel.methods.tableau import Tableau
from newel.methods.tableau_file import parse_tableau
from tests.methods.chains import chain

pytestmark = pytest.mark.core


@cache
def method(slug: str) -> Tableau:
    return parse_tableau(tableau_files()[slug].read_text(encoding="utf-8"), file=slug)


PRINTED = [
    ("euler-1", 2.0, 0.0, 1e-2),
    ("heun-2", 2.0, 0.0, 1e-2),
    ("kutta-3", 2.51, sqrt(3), 1e-2),
    ("kutta-4", 2.78, 2 * sqrt(2), 1e-2),
    ("carpenter-kennedy-4", 4.65, 3.34, 1e-2),
    ("berland-bogey-bailly-4", None, 3.82, 1e-2),
]


@pytest.mark.parametrize(("slug", "real", "imaginary", "digits"), PRINTED)
def test_the_limits_are_the_printed_ones(
    slug: str, real: float | None, imaginary: float, digits: float
) -> None:
    """From memory."""
    if real is not None:
        assert real_limit(method(slug)) == pytest.approx(real, abs=digits)
    assert imaginary_limit(method(slug)) == pytest.approx(imaginary, abs=digits)


RECOMPUTED = [
    ("heun-3", False, 2.512745326618, 1.732050807569),
    ("bogacki-shampine-3-2", False, 2.512745326618, 1.732050807569),
    ("bogacki-shampine-3-2", True, 3.152346612087, 2.246433045166),
    ("kutta-three-eighths-4", False, 2.785293563405, 2.828427124746),
    ("gill-4", False, 2.785293563405, 2.828427124746),
    ("fehlberg-4-5", False, 3.020017543971, 0.0),
    ("fehlberg-4-5", True, 3.677706621322, 0.0),
    ("cash-karp-5-4", False, 3.734359607235, 0.0),
    ("cash-karp-5-4", True, 4.207827305833, 0.0),
    ("dormand-prince-5-4", False, 3.306567892635, 0.997189008633),
    ("dormand-prince-5-4", True, 4.384986320802, 0.0),
    ("carpenter-kennedy-4", False, 4.65675706628, 3.34071798638),
    ("kutta-5", False, 3.217047866640, 0.0),
]


@pytest.mark.parametrize(("slug", "embedded", "real", "imaginary"), RECOMPUTED)
def test_the_limits_are_right_to_twelve_digits(
    slug: str, embedded: bool, real: float, imaginary: float
) -> None:
    """Recomputed by independent code at 40 digits."""
    assert real_limit(method(slug), embedded) == pytest.approx(real, rel=1e-12)
    assert imaginary_limit(method(slug), embedded) == pytest.approx(imaginary, rel=1e-12, abs=0.0)


SERIES = [
    (5, 3.217047866640, 0.0),
    (6, 3.553441258462, 0.0),
    (7, 3.954129730631, 1.764421324553),
    (8, 4.313627227774, 3.395140220575),
    (9, 4.700827255521, 0.0),
    (10, 5.069518410987, 0.0),
    (11, 5.450423040945, 1.701188258916),
    (12, 5.822779068194, 3.379377314157),
]


@pytest.mark.parametrize(("order", "real", "imaginary"), SERIES)
def test_the_exponential_series_has_the_limits_of_independent_code(
    order: int, real: float, imaginary: float
) -> None:
    """Recomputed by independent code at 40 digits."""
    t = chain(*(f"1/{factorial(k)}" for k in range(2, order + 1)), order=order)
    assert real_limit(t) == pytest.approx(real, rel=1e-12)
    assert imaginary_limit(t) == pytest.approx(imaginary, rel=1e-12, abs=0.0)


CHEBYSHEV = [
    (1, 2, 4 * 1.9400476),
    (1, 5, 25 * 1.9365619),
    (1, 10, 100 * 1.9360627),
    (2, 10, 64.6884016104),
    (2, 3, 5.23040391107),
    (2, 5, 15.6847661766),
]


@pytest.mark.parametrize(("order", "stages", "damped"), CHEBYSHEV)
def test_damped_chebyshev_methods_reach_as_far_as_their_formula_says(
    order: int, stages: int, damped: float
) -> None:
    """The usual figure is where the argument w₀ + w₁z is −1; |R| = 1 again at −w₀, or later.

    The figures, for the dampings 0.05 and 2/13, were recomputed by independent code.
    """
    w = 1 + (0.05, 2 / 13)[order - 1] / stages**2
    found = real_limit(default_registry().load(f"chebyshev-{order}-stages-{stages}"))
    assert found is not None
    if order == 1 or stages % 2 == 0:
        assert found == pytest.approx(damped * 2 * w / (w + 1), rel=1e-7)
    else:
        assert damped < found < 1.2 * damped


def test_fifty_stages_keep_their_smallest_coefficients() -> None:
    """The closed form of order 2, 2w₀·T″_s(w₀)/T′_s(w₀), by numpy's derivatives of T_s."""
    s = 50
    polynomial = np.polynomial.Chebyshev.basis(s)
    w = 1 + (2 / 13) / s**2
    wanted = 2 * w * polynomial.deriv(2)(w) / polynomial.deriv(1)(w)
    assert real_limit(default_registry().load("chebyshev-2-stages-50")) == pytest.approx(wanted, rel=1e-9)


@pytest.mark.parametrize("slug", sorted(tableau_files()))
def test_no_method_passes_what_any_polynomial_can_reach(slug: str) -> None:
    """2s² on the real axis (Markov), s − 1 on the imaginary one (Kinnmark and Gray); from memory."""
    t = method(slug)
    real, imaginary = real_limit(t), imaginary_limit(t)
    if real is None or imaginary is None:
        return
    assert 0.0 < real <= 2.0 * t.stages**2
    assert 0.0 <= imaginary <= max(t.stages - 1, 0) + 1e-12


@pytest.mark.parametrize("slug", sorted(tableau_files()))
def test_the_limits_of_every_method_are_roots_by_numpy(slug: str) -> None:
    """numpy's companion matrix finds |R| = 1 at the limit, as near as float64 lets it."""
    t = method(slug)
    polynomial, real, imaginary = growth_polynomial(t), real_limit(t), imaginary_limit(t)
    assert polynomial is not None
    if real is None or imaginary is None:
        return
    r = np.array([float(x) for x in polynomial])
    places = [(-real, -1.0)] + ([(1j * imaginary, 1j)] if imaginary else [])
    for place, direction in places:
        modulus = abs(np.polyval(r[::-1], place))
        size = np.polyval(np.abs(r[::-1]), abs(place))
        assert modulus == pytest.approx(1.0, abs=1e-13 * size)
        beyond = abs(np.polyval(r[::-1], place + 1e-5 * direction))
        assert beyond > 1.0 - 1e-13 * size
