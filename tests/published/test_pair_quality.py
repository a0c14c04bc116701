"""Quality figures of pairs, and error growth within a step, against published figures.

- J. R. Dormand and P. J. Prince, J. Comput. Appl. Math. 6 (1980) 19-26: the largest coefficient of their
  5(4) pair is 11.6 (from memory).
- D. I. Ketcheson, L. Lóczi and M. Parsani, SIAM J. Numer. Anal. 52 (2014) 2227-2249, table of maximum
  internal amplification factors (from memory): Merson 4(3) 5.6, Fehlberg 5(4) 5.4, Bogacki–Shampine 5(4)
  7.0, Prince–Dormand 8(7) 138.8.

The other figures, in the normalisation of C. A. Kennedy, M. H. Carpenter and R. M. Lewis, Appl. Numer.
Math. 35 (2000) 177-219, were recomputed by independent code in rational arithmetic.
"""

from __future__ import annotations

from functools import cache

import pytest

from newel.catalogue.shipped import tableau_files
from newel.methods.analysis.pair_quality import (
    embedded_error_ratio,
    estimate_error_ratio,
    solution_error_ratio,
)
from newel.methods.analysis.stability_region import internal_growth
from newel.methods.analysis.structure import largest_coefficient
from newel.methods.tableau import Tableau
from newel.methods.tableau_file import parse_tableau

pytestmark = pytest.mark.core


@cache
def method(slug: str) -> Tableau:
    return parse_tableau(tableau_files()[slug].read_text(encoding="utf-8"), file=slug)


FIGURES = [
    ("dormand-prince-5-4", 1.5416912, 1.6653347, 0.337358, 25360 / 2187),
    ("cash-karp-5-4", 2.1392863, 1.3784556, 1.7591, 2.59259),
    ("fehlberg-5-4", 3.156261, 1.3641503, 1.82452, 8.0),
    ("bogacki-shampine-3-2", 1.3491896, 1.3772078, 1.41912, 1.0),
    ("verner-1978-6-5", 3.7491074, 1.4801549, 2.97938, 9.1667),
]


@pytest.mark.parametrize(("slug", "embedded", "estimate", "solution", "largest"), FIGURES)
def test_the_figures_of_a_pair_are_those_of_independent_code(
    slug: str, embedded: float, estimate: float, solution: float, largest: float
) -> None:
    """Recomputed; the largest coefficient counts the nodes too."""
    t = method(slug)
    assert embedded_error_ratio(t) == pytest.approx(embedded, rel=1e-6)
    assert estimate_error_ratio(t) == pytest.approx(estimate, rel=1e-6)
    assert solution_error_ratio(t) == pytest.approx(solution, rel=1e-5)
    assert float(largest_coefficient(t)) == pytest.approx(largest, rel=1e-5)


def test_the_largest_coefficient_is_the_printed_one() -> None:
    """From memory, to the digits that the source gives."""
    assert float(largest_coefficient(method("dormand-prince-5-4"))) == pytest.approx(11.6, abs=0.05)


GROWTH = [
    ("merson-4-3", 5.6, 0.05),
    ("fehlberg-5-4", 5.4, 0.05),
    ("bogacki-shampine-5-4", 7.0, 0.1),
    ("prince-dormand-8-7", 138.8, 3.0),
]


@pytest.mark.parametrize(("slug", "printed", "digits"), GROWTH)
def test_errors_grow_within_a_step_as_printed(slug: str, printed: float, digits: float) -> None:
    """From memory; the extreme lies between two of the angles that are looked at, which costs up to 2 %."""
    assert internal_growth(method(slug)) == pytest.approx(printed, abs=digits)
