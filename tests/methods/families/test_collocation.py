"""Picard iteration and deferred correction: each sweep one order, nodes exact or enclosed."""

from __future__ import annotations

from collections.abc import Callable
from fractions import Fraction

import pytest

from newel.errors import BadRequest
from newel.methods.exact import Exact
from newel.methods.families import collocation
from newel.methods.families.collocation import deferred_correction, picard, picard_gauss, picard_radau
from newel.methods.families.enclosures import Enclosure
from newel.methods.families.nodes import gauss_nodes, lobatto_nodes, radau_nodes
from newel.methods.order_conditions import prove
from newel.methods.tableau import Tableau
from tests.methods.families.rational_steps import logistic, step

pytestmark = pytest.mark.core

ROUNDED = {("picard_gauss", 7), ("picard_radau", 7)}
NAMES = [name for name in collocation.__all__ if name not in ("picard", "deferred_correction")]


@pytest.mark.parametrize("name", NAMES)
@pytest.mark.parametrize("order", [1, 2, 3, 4, 5, 7])
def test_each_proves_exactly_its_order_with_the_sweep_before_embedded(name: str, order: int) -> None:
    family: Callable[[int], Tableau] = getattr(collocation, name)
    verdict = prove(family(order))
    assert verdict.outcome == ("rounded" if (name, order) in ROUNDED else "exact")
    assert (verdict.order, verdict.embedded_order) == (order, order - 1 if order > 1 else None)


def test_picard_iteration_is_what_its_name_says() -> None:
    """Three sweeps on the nodes 0, 1/2, 1, each with Simpson's rule and its half-way companion by hand."""
    y, h = Fraction(2, 7), Fraction(1, 3)
    pair = picard(["0", "1/2", "1"], 3, "by-hand-3")
    rates = [logistic(Fraction(0), y)] * 3
    for _ in range(2):
        half = y + h * (5 * rates[0] + 8 * rates[1] - rates[2]) / 24
        full = y + h * (rates[0] + 4 * rates[1] + rates[2]) / 6
        rates = [rates[0], logistic(h / 2, half), logistic(h, full)]
    assert step(pair, pair.weights, y, h) == y + h * (rates[0] + 4 * rates[1] + rates[2]) / 6


def test_deferred_correction_is_what_its_name_says() -> None:
    """Two sweeps on the nodes 0, 1/2, 1: Euler steps, then Euler steps for the error."""
    y, h = Fraction(2, 7), Fraction(1, 3)
    pair = deferred_correction(["0", "1/2", "1"], 2, "by-hand-2")
    first = logistic(Fraction(0), y)
    middle = y + h / 2 * first
    end = middle + h / 2 * logistic(h / 2, middle)
    rates = [first, logistic(h / 2, middle), logistic(h, end)]
    to_half = h * (5 * rates[0] + 8 * rates[1] - rates[2]) / 24
    to_end = h * (rates[0] + 4 * rates[1] + rates[2]) / 6
    corrected = y + to_half
    result = corrected + h / 2 * (logistic(h / 2, corrected) - rates[1]) + to_end - to_half
    assert step(pair, pair.weights, y, h) == result
    assert pair.embedded_weights is not None
    assert step(pair, pair.embedded_weights, y, h) == end


def value(node: Exact | Enclosure) -> float:
    return float(node) if isinstance(node, Exact) else float(Fraction(node.low + node.high, 2 * 10**240))


def test_enclosed_nodes_are_the_tabulated_ones() -> None:
    # Abramowitz and Stegun, Handbook of Mathematical Functions (1964), tables 25.4 and 25.6, on [−1, 1]; from
    # memory.
    gauss = [2 * value(x) - 1 for x in gauss_nodes(4)]
    assert gauss == pytest.approx(
        [-0.861136311594053, -0.339981043584856, 0.339981043584856, 0.861136311594053]
    )
    lobatto = [2 * value(x) - 1 for x in lobatto_nodes(6)]
    inner = [0.765055323929465, 0.285231516480645]
    assert lobatto == pytest.approx([-1, -inner[0], -inner[1], inner[1], inner[0], 1])
    radau = [1 - 2 * value(x) for x in radau_nodes(4)]
    assert radau == pytest.approx([0.822824080974592, 0.181066271118531, -0.575318923521694, -1])


def test_a_member_with_enclosed_nodes_states_40_digits() -> None:
    tableau = picard_gauss(7)
    assert tableau.digits == 40
    assert picard_radau(5).is_exact


@pytest.mark.parametrize("order", [-1, 0, 11, 999_999_999])
@pytest.mark.parametrize("name", NAMES)
def test_an_order_out_of_range_is_refused_at_once(name: str, order: int) -> None:
    with pytest.raises(BadRequest, match="order from 1 to 10"):
        getattr(collocation, name)(order)


def test_bad_nodes_are_refused() -> None:
    with pytest.raises(BadRequest, match="two nodes are equal"):
        picard(["1/2", "1/2"], 2, "equal-2")
    with pytest.raises(BadRequest, match="from 0 to 1"):
        deferred_correction(["0", "1/2"], 2, "short-2")
    with pytest.raises(BadRequest, match="0 nodes"):
        picard([], 2, "none-2")
