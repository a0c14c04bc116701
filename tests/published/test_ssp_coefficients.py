"""Strong-stability coefficients and linear thresholds against published figures.

Sources, quoted from memory:

- C.-W. Shu and S. Osher, J. Comput. Phys. 77 (1988) 439-471: C = 1 for two and three stages.
- R. J. Spiteri and S. J. Ruuth, SIAM J. Numer. Anal. 40 (2002) 469-491: s − 1 of order 2, 2 for four stages
  of order 3, 1.508 for five stages of order 4.
- D. I. Ketcheson, SIAM J. Sci. Comput. 30 (2008) 2113-2136: n² − n for n² stages of order 3, 6 for ten
  stages of order 4.
- S. J. Ruuth, Math. Comp. 75 (2006) 183-207: 2.65062919 for five stages of order 3.
- J. F. B. M. Kraaijevanger, BIT 31 (1991) 482-528: methods of order above 4 have C = 0, and so has every
  method of four stages and order 4. The threshold of a polynomial of degree s and order p is at most s − p
  + 1.

The thresholds of the pairs were recomputed by independent code.
"""

from __future__ import annotations

from functools import cache

import pytest

from newel.catalogue.shipped import tableau_files
from newel.methods.analysis.monotonicity import linear_threshold, ssp_coefficient
from newel.methods.tableau import Tableau
from newel.methods.tableau_file import parse_tableau

pytestmark = pytest.mark.core


@cache
def method(slug: str) -> Tableau:
    return parse_tableau(tableau_files()[slug].read_text(encoding="utf-8"), file=slug)


PRINTED = [
    ("euler-1", 1.0, 1.0, 1e-14),
    ("heun-2", 1.0, 1.0, 1e-14),
    ("ssp-2-stages-3", 2.0, 2.0, 1e-14),
    ("ssp-2-stages-4", 3.0, 3.0, 1e-14),
    ("ssp-3-stages-3", 1.0, 1.0, 1e-14),
    ("ssp-3-stages-4", 2.0, 2.0, 1e-14),
    ("ssp-3-stages-9", 6.0, 6.0, 1e-14),
    ("ssp-3-stages-5", 2.65062919, None, 1e-8),
    ("ssp-4-stages-5", 1.508, None, 2e-4),
    ("ssp-4-stages-10", 6.0, 6.0, 1e-14),
    ("ralston-2", 0.5, 1.0, 1e-14),
]


@pytest.mark.parametrize(("slug", "coefficient", "threshold", "digits"), PRINTED)
def test_the_coefficients_are_the_printed_ones(
    slug: str, coefficient: float, threshold: float | None, digits: float
) -> None:
    """From memory, but for Ralston's, which was recomputed."""
    assert ssp_coefficient(method(slug)) == pytest.approx(coefficient, rel=digits)
    if threshold is not None:
        assert linear_threshold(method(slug)) == pytest.approx(threshold, rel=digits)


THRESHOLDS = [
    ("midpoint-2", 1.0),
    ("kutta-3", 1.0),
    ("heun-3", 1.0),
    ("ralston-3", 1.0),
    ("bogacki-shampine-3-2", 1.0),
    ("kutta-4", 1.0),
    ("kutta-three-eighths-4", 1.0),
    ("fehlberg-4-5", 13 / 15),
    ("cash-karp-5-4", 10 / 9),
    ("dormand-prince-5-4", 5 / 6),
]


@pytest.mark.parametrize(("slug", "threshold"), THRESHOLDS)
def test_methods_that_are_not_strongly_stable_have_a_linear_threshold_still(
    slug: str, threshold: float
) -> None:
    """Recomputed by independent code."""
    assert ssp_coefficient(method(slug)) == 0.0
    assert linear_threshold(method(slug)) == pytest.approx(threshold, rel=1e-13)


@pytest.mark.parametrize("slug", sorted(tableau_files()))
def test_no_file_beats_kraaijevangers_barriers(slug: str) -> None:
    """C = 0 above order 4 and for four stages of order 4; R ≤ s − p + 1 (from memory)."""
    t = method(slug)
    coefficient, threshold = ssp_coefficient(t), linear_threshold(t)
    if t.order > 4 or (t.order, t.stages) == (4, 4):
        assert coefficient == 0.0
    assert coefficient <= threshold + 1e-12
    assert threshold <= t.stages - t.order + 1 + 1e-9
