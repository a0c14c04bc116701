"""No file beats Butcher's barriers, and some meet them.

Source: J. C. Butcher, Numerical Methods for Ordinary Differential Equations, sections 32-33 (from memory):
the least number of stages of orders 1 to 8 is 1, 2, 3, 4, 6, 7, 9, 11; above order 8 at least p + 3 (BIT 25
(1985) 521-540). Proved there: order 5 in Math. Comp. 18 (1964), order 7 in Math. Comp. 19 (1965). The list
of largest orders for a number of stages, 1, 2, 3, 4, 4, 5, 6, 6, 7, 7, 8, was seen in an encyclopaedia of
integer sequences (A187102).
"""

from __future__ import annotations

import pytest

from newel.catalogue.shipped import tableau_files
from newel.methods.tableau_file import parse_tableau

pytestmark = pytest.mark.core

LEAST = {1: 1, 2: 2, 3: 3, 4: 4, 5: 6, 6: 7, 7: 9, 8: 11}
CLAIMS = {
    slug: parse_tableau(file.read_text(encoding="utf-8"), file=slug) for slug, file in tableau_files().items()
}


def least(order: int) -> int:
    return LEAST.get(order, order + 3)


@pytest.mark.parametrize("slug", sorted(CLAIMS))
def test_no_method_has_fewer_stages_than_its_order_needs(slug: str) -> None:
    t = CLAIMS[slug]
    for order, weights in ((t.order, t.weights), (t.embedded_order, t.embedded_weights)):
        if order is None or weights is None:
            continue
        # A last stage that is only kept for the next step still counts: it is a stage of the tableau.
        assert t.stages >= least(order), f"order {order} with {t.stages} stages"
        used = max(i for i, x in enumerate(weights, 1) if x)
        assert used >= least(order)


@pytest.mark.parametrize("order", [1, 2, 3, 4, 5, 6, 7, 8])
def test_the_barrier_is_met(order: int) -> None:
    """Euler, Heun, Kutta, Kutta, Nyström, Butcher, Butcher, and Cooper and Verner reach it."""
    fewest = min(t.stages for t in CLAIMS.values() if t.order == order)
    assert fewest == least(order)


def test_the_largest_orders_for_a_number_of_stages_are_those_listed() -> None:
    """Seen."""
    largest = [max(p for p in LEAST if LEAST[p] <= s) for s in range(1, 12)]
    assert largest == [1, 2, 3, 4, 4, 5, 6, 6, 7, 7, 8]
