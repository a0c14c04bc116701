"""Chebyshev and Legendre methods: the recursion as published, exact or to 40 digits, and held to bounds."""

from __future__ import annotations

from collections.abc import Callable
from fractions import Fraction

import pytest

from newel.catalogue.registry import Registry
from newel.errors import BadRequest
from newel.methods.exact import Exact
from newel.methods.families import recursions
from newel.methods.families.recursions import chebyshev_1, chebyshev_2, legendre_1, legendre_2
from newel.methods.order_conditions import prove
from newel.methods.tableau import Tableau

pytestmark = pytest.mark.core

FAMILIES = [(chebyshev_1, 1), (chebyshev_2, 2), (legendre_1, 1), (legendre_2, 2)]


@pytest.mark.parametrize(("family", "order"), FAMILIES)
@pytest.mark.parametrize("stages", [2, 3, 7, 20])
def test_each_proves_exactly_its_order(family: Callable[[int], Tableau], order: int, stages: int) -> None:
    verdict = prove(family(stages))
    assert verdict.outcome == ("exact" if stages <= 16 else "rounded")
    assert verdict.order == order
    assert verdict.digits == (None if stages <= 16 else 40)


@pytest.mark.parametrize(("family", "order"), FAMILIES)
def test_forty_digits_are_right_to_the_last(
    family: Callable[[int], Tableau], order: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    """The decimals of 19 stages are held against the fractions that the same rule gives without rounding."""
    rounded = family(19)
    monkeypatch.setattr(recursions, "MOST_EXACT", 19)
    exact = family(19)
    assert exact.is_exact
    for array, entries, units in (
        ("matrix", exact.matrix[18], rounded.half_units("matrix")[18]),
        ("weights", exact.weights, rounded.half_units("weights")),
        ("nodes", exact.nodes, rounded.half_units("nodes")),
    ):
        given = rounded.matrix[18] if array == "matrix" else getattr(rounded, array)
        for x, y, unit in zip(given, entries, units, strict=True):
            assert abs(x - y) <= unit
            assert not y or Fraction(1, 10**41) < unit / abs(y) < Fraction(1, 10**39)


def test_one_chebyshev_stage_is_forward_euler() -> None:
    assert chebyshev_1(1).weights == (Exact(1),)
    assert legendre_1(1).weights == (Exact(1),)


@pytest.mark.parametrize("stages", [-1, 0, 1, 257, 1_000_000])
def test_an_absurd_number_of_stages_is_refused_with_the_limit(stages: int) -> None:
    registry = Registry(folders=[], plugins=False, cache=None)
    with pytest.raises(BadRequest, match="From 2 to 256 stages") as caught:
        registry.find(f"chebyshev-2-stages-{stages}")
    assert caught.value.argument == "stages"


def test_the_longest_is_made() -> None:
    assert legendre_2(128).stages == 128
