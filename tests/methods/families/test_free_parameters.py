"""Kutta's families: known members come out, every member is proved, special values have functions."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from newel.catalogue.shipped import tableau_files
from newel.errors import BadRequest
from newel.methods.families import free_parameters as family
from newel.methods.order_conditions import prove
from newel.methods.tableau import Tableau
from newel.methods.tableau_file import parse_tableau

pytestmark = pytest.mark.core

fractions = st.fractions(-2, 2, max_denominator=12)


@pytest.mark.parametrize(
    ("made", "slug"),
    [
        (family.second_order("1/2"), "midpoint-2"),
        (family.second_order(1), "heun-2"),
        (family.second_order("2/3"), "ralston-2"),
        (family.third_order("1/2", 1), "kutta-3"),
        (family.third_order("1/3", "2/3"), "heun-3"),
        (family.third_order("1/2", "3/4"), "ralston-3"),
        (family.third_order_equal_nodes("3/8"), "nystrom-3"),
        (family.fourth_order("1/3", "2/3"), "kutta-three-eighths-4"),
        (family.fourth_order_equal_nodes("1/3"), "kutta-4"),
        (family.fourth_order_equal_nodes("(2 + sqrt(2))/6"), "gill-4"),
    ],
    ids=lambda x: x if isinstance(x, str) else "",
)
def test_the_usual_methods_are_members(made: Tableau, slug: str) -> None:
    """Which member is which: Butcher, Numerical Methods for Ordinary Differential Equations, section 32."""
    file = parse_tableau(tableau_files()[slug].read_text(encoding="utf-8"))
    assert (made.matrix, made.weights, made.nodes) == (file.matrix, file.weights, file.nodes)


@settings(deadline=None, derandomize=True, max_examples=40)
@given(st.sampled_from(sorted(family.__all__)), fractions, fractions)
def test_every_member_is_proved_exactly(name: str, first: Any, second: Any) -> None:
    function: Callable[..., Tableau] = getattr(family, name)
    arguments = (first, second) if name in ("third_order", "fourth_order") else (first,)
    try:
        made = function(*arguments)
    except BadRequest:
        assume(False)
    verdict = prove(made)
    assert verdict.outcome == "exact"
    assert made.order == {"second": 2, "third": 3, "fourth": 4}[name.split("_")[0]]


@pytest.mark.parametrize(
    ("call", "argument"),
    [
        (lambda: family.second_order(0), "c2"),
        (lambda: family.third_order("2/3", 1), "c2"),
        (lambda: family.third_order("1/2", "1/2"), "c3"),
        (lambda: family.fourth_order("1/2", "1/3"), "c2"),
        (lambda: family.fourth_order("1/3", 1), "c3"),
        (lambda: family.fourth_order("1/4", "4/5"), "c3"),
        (lambda: family.fourth_order_at_end(0), "b4"),
        (lambda: family.fourth_order_equal_nodes(0), "b3"),
    ],
)
def test_values_that_no_formula_takes_are_refused_by_name(call: Callable[[], Tableau], argument: str) -> None:
    with pytest.raises(BadRequest) as caught:
        call()
    assert caught.value.argument == argument
