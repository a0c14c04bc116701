"""Principal error norms of published methods, against the figures printed for them.

Sources, all quoted from memory (`from memory` below), with the digits that they give:

- J. R. Dormand and P. J. Prince, A family of embedded Runge-Kutta formulae, J. Comput. Appl. Math. 6 (1980)
  19-26: Dormand–Prince 5(4), orders 5 and 4.
- P. J. Prince and J. R. Dormand, High order embedded Runge-Kutta formulae, J. Comput. Appl. Math. 7 (1981)
  67-75: Prince–Dormand 8(7), order 8.
- A. Ralston, Runge-Kutta methods with minimum error bounds, Math. Comp. 16 (1962) 431-437: the second-order
  method with node 2/3 has the least bound.
- C. A. Kennedy, M. H. Carpenter and R. M. Lewis, Appl. Numer. Math. 35 (2000) 177-219: the normalisation,
  1/σ(t) in each term, and the usual figures for the classical methods.

The second column of figures, to ten digits, was recomputed with independent code in rational arithmetic.
"""

from __future__ import annotations

from functools import cache
from math import sqrt

import pytest

from newel.catalogue.shipped import tableau_files
from newel.methods.analysis.error_norms import error_norm, largest_error_term
from newel.methods.tableau import Tableau
from newel.methods.tableau_file import parse_tableau

pytestmark = pytest.mark.core


@cache
def method(slug: str) -> Tableau:
    return parse_tableau(tableau_files()[slug].read_text(encoding="utf-8"), file=slug)


PRINTED = [
    ("ralston-3", False, 0.0418, 2e-3),
    ("kutta-4", False, 1.45e-2, 4e-3),
    ("kutta-three-eighths-4", False, 1.27e-2, 4e-3),
    ("fehlberg-4-5", False, 1.84e-3, 3e-3),
    ("fehlberg-4-5", True, 3.36e-3, 3e-3),
    ("cash-karp-5-4", False, 9.48e-4, 1e-3),
    ("dormand-prince-5-4", False, 3.99e-4, 2e-3),
    ("dormand-prince-5-4", True, 1.18e-3, 5e-3),
    ("prince-dormand-8-7", False, 4.51e-6, 2e-3),
]


@pytest.mark.parametrize(("slug", "embedded", "printed", "digits"), PRINTED)
def test_the_norm_is_the_one_printed_to_its_digits(
    slug: str, embedded: bool, printed: float, digits: float
) -> None:
    """Published figures, from memory."""
    assert error_norm(method(slug), embedded=embedded) == pytest.approx(printed, rel=digits)


RECOMPUTED = [
    ("euler-1", False, 0.5, 0.2357022604),
    ("midpoint-2", False, 0.1717960677, 0.1397542486),
    ("heun-2", False, 0.1863389981, 0.1443375673),
    ("ralston-2", False, 0.1666666667, 0.1382702271),
    ("heun-3", False, 0.0462962963, 0.04833967919),
    ("kutta-3", False, 0.0589255651, 0.0803765072),
    ("ssp-3-stages-3", False, 0.07216878365, 0.05648634333),
    ("ralston-3", False, 0.04181109229, 0.0439622149),
    ("bogacki-shampine-3-2", False, 0.04181109229, 0.0439622149),
    ("bogacki-shampine-3-2", True, 0.02946278255, 0.03975087896),
    ("williamson-3", False, 19 / 432, None),
    ("wray-3", False, 0.04425112276, None),
    ("kutta-4", False, 0.01450458234, 0.0160353147),
    ("kutta-three-eighths-4", False, 0.01266936775, 0.01444179799),
    ("gill-4", False, 0.0132312395411, None),
    ("ralston-4", False, 0.0137039673821, None),
    ("merson-4-3", False, 0.005705443307, 0.00749182304),
    ("carpenter-kennedy-4", False, 5.733372954e-3, None),
    ("fehlberg-4-5", False, 0.001839243418, 0.005805132286),
    ("fehlberg-4-5", True, 0.003355744693, 0.006765362752),
    ("cash-karp-5-4", False, 9.482886175e-4, 0.001368939978),
    ("cash-karp-5-4", True, 5.390749137e-4, None),
    ("dormand-prince-5-4", False, 3.990801609e-4, 0.003955786594),
    ("dormand-prince-5-4", True, 1.182957151e-3, 1.823754583e-3),
    ("nystrom-5", False, 3.840684488e-3, None),
    ("kutta-5", False, 4.043299594e-3, None),
    ("butcher-6", False, 1.501965818e-3, None),
    ("verner-1978-6-5", False, 2.072401101e-3, None),
    ("verner-1978-6-5", True, 6.955820586e-4, None),
    ("fehlberg-7-8", False, 1.100651234e-5, None),
    ("fehlberg-7-8", True, 1.090585251e-5, None),
    ("prince-dormand-8-7", False, 4.5074472e-6, 9.784e-6),
    ("prince-dormand-8-7", True, 2.879665418e-5, 6.447e-5),
    ("cooper-verner-8", False, 1.226396827e-4, None),
]


@pytest.mark.parametrize(("slug", "embedded", "first", "second"), RECOMPUTED)
def test_the_norms_are_those_of_independent_code(
    slug: str, embedded: bool, first: float, second: float | None
) -> None:
    """Recomputed in rational arithmetic by independent code; the second figure is that of the order above."""
    tableau = method(slug)
    claimed = tableau.embedded_order if embedded else tableau.order
    assert claimed is not None
    assert error_norm(tableau, embedded=embedded) == pytest.approx(first, rel=1e-9)
    if second is not None:
        rel = 2e-4 if slug == "prince-dormand-8-7" else 1e-9
        assert error_norm(tableau, claimed + 2, embedded) == pytest.approx(second, rel=rel)


LARGEST = [
    ("euler-1", False, 1 / 2),
    ("midpoint-2", False, 1 / 6),
    ("heun-2", False, 1 / 6),
    ("ralston-2", False, 1 / 6),
    ("kutta-3", False, 1 / 24),
    ("kutta-4", False, 1 / 120),
    ("fehlberg-4-5", False, 1 / 780),
    ("fehlberg-4-5", True, 0.00181624),
    ("cash-karp-5-4", False, 1 / 2400),
    ("dormand-prince-5-4", False, 1 / 3600),
    ("dormand-prince-5-4", True, 8.08333e-4),
]


@pytest.mark.parametrize(("slug", "embedded", "largest"), LARGEST)
def test_the_largest_error_terms_are_those_of_independent_code(
    slug: str, embedded: bool, largest: float
) -> None:
    """Recomputed in rational arithmetic by independent code, to the digits written."""
    assert largest_error_term(method(slug), embedded=embedded) == pytest.approx(largest, rel=5e-6)


def test_the_figures_tell_the_normalisation_apart() -> None:
    """Without 1/σ the Dormand–Prince figure would be 5.029e-4, which is 26 % off the printed one."""
    assert error_norm(method("dormand-prince-5-4")) != pytest.approx(5.029e-4, rel=0.2)


def test_ralstons_second_order_method_has_the_least_norm_of_its_family() -> None:
    """Ralston 1962 (from memory): among two-stage methods of order 2, c₂ = 2/3 has the least error bound."""
    for numerator in range(1, 40):
        c = f"{numerator}/20"
        b = f"10/{numerator}"  # 1/(2 c₂)
        t = Tableau("two-stages", order=2, matrix=[[], [c]], weights=[f"1 - {b}", b])
        norm = error_norm(t)
        assert norm is not None
        # τ = (b c² − 1/3)/2 and −1/6, written out.
        assert norm == pytest.approx(sqrt(((numerator / 40 - 1 / 3) / 2) ** 2 + 1 / 36), rel=1e-12)
        assert norm > 1 / 6
