"""Damping and delay of waves against published figures.

- F. Q. Hu, M. Y. Hussaini and J. L. Manthey, J. Comput. Phys. 124 (1996) 177-191, table 1 (from memory):
  the amplification factors of their methods of low dissipation and dispersion, and the wave numbers up to
  which amplitude and phase are right to 0.001 (0.67 for the classical method, 0.85, 1.35 and 1.75 for four,
  five and six stages).
- C. Bogey and C. Bailly, J. Comput. Phys. 194 (2004) 194-214 (from memory): amplification factors of their
  methods of five and six stages; the stability limit of the latter is 3.94.
- P. J. van der Houwen and B. P. Sommeijer, SIAM J. Numer. Anal. 24 (1987) 595-617: the definitions; for
  order p the two orders are the even and the odd one of p and p + 1.
"""

from __future__ import annotations

import pytest

from newel.catalogue.shipped import tableau_files
from newel.methods.analysis.stability_limits import imaginary_limit
from newel.methods.analysis.waves import dispersion_order, dissipation_order, resolved_wave_number
from newel.methods.tableau_file import parse_tableau
from tests.methods.chains import chain

pytestmark = pytest.mark.core

HU = [
    (("1/2", "1/6", "1/24"), 4, 0.67),
    (("1/2", "0.162997", "0.0407574"), 2, 0.85),
    (("1/2", "0.166558", "0.0395041", "0.00781071"), 2, 1.35),
    (("1/2", "1/6", "1/24", "0.00781005", "0.00132141"), 4, 1.75),
]


@pytest.mark.parametrize(("higher", "order", "printed"), HU)
def test_waves_are_resolved_as_far_as_printed(higher: tuple[str, ...], order: int, printed: float) -> None:
    """From memory; two digits, of which the last may be cut off."""
    assert resolved_wave_number(chain(*higher, order=order)) == pytest.approx(printed, abs=0.01)


def test_the_six_stages_of_bogey_and_bailly_are_stable_as_far_as_printed() -> None:
    """From memory."""
    six = chain("1/2", "0.165919771368", "0.040919732041", "0.007555704391", "0.000891421261")
    assert imaginary_limit(six) == pytest.approx(3.94, abs=0.01)


def test_an_optimised_method_may_grow_by_a_hair_before_its_printed_limit() -> None:
    """Its table gives 3.54 for five stages, where |R| passes 1 in earnest; strictly it does so at 1.51."""
    five = chain("1/2", "0.166558", "0.0395041", "0.00781071")
    assert imaginary_limit(five) == pytest.approx(1.5077, abs=1e-4)


@pytest.mark.parametrize("slug", sorted(tableau_files()))
def test_the_orders_follow_from_the_order_of_the_method(slug: str) -> None:
    """At order p, log R − z begins at z^(p+1): odd powers delay, even ones damp."""
    t = parse_tableau(tableau_files()[slug].read_text(encoding="utf-8"), file=slug)
    if t.stages > 64:
        return
    damped, delayed = dissipation_order(t), dispersion_order(t)
    assert damped is None or (damped % 2 == 1 and damped >= t.order)
    assert delayed is None or (delayed % 2 == 0 and delayed >= t.order)
