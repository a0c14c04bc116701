"""The polished files are what the printed numbers lead to.

The printed numbers are from memory: D. Stanescu and W. G. Habashi, J. Comput. Phys. 143 (1998) 674-681, with
seven decimals; V. Allampalli, R. Hixon, M. Nallasamy and S. D. Sawyer, J. Comput. Phys. 228 (2009) 3837-3850,
with twelve; M. Bernardini and S. Pirozzoli, J. Comput. Phys. 228 (2009) 4182-4199, with five.
"""

from __future__ import annotations

from math import factorial
from pathlib import Path
from typing import Any

import mpmath
import pytest

from tests.independent.tree_formulas import load, orders
from tests.polish.polishing import defects, density, polish, solve, trees, two_registers, vertices

TABLEAUX = Path(__file__).parents[2] / "tableaux"
TWO_REGISTERS = {
    # A of stages 2 to s, then B of stages 1 to s; the decimals in print; which are held by name.
    "stanescu-habashi-4-stages-5": (
        "-0.6051226 -2.0437564 -0.7406999 -4.4231765 0.2687454 0.8014706 0.5051570 0.5623568 0.0590065",
        7,
        (),
    ),
    "stanescu-habashi-4-stages-6": (
        "-0.4412737 -1.0739820 -1.7063570 -2.7979293 -4.0913537"
        " 0.1158488 0.3728769 0.7379536 0.5798110 1.0312849 0.15",
        7,
        (10,),
    ),
    "allampalli-hixon-4-stages-6": (
        "-0.691750960670 -1.727127405211 -0.694890150986 -1.039942756197 -1.531977447611"
        " 0.122 0.477263056358 0.381941220320 0.447757195744 0.498614246822 0.186648570846",
        12,
        (5,),
    ),
    "bernardini-pirozzoli-2": (
        "-1.0 -1.55798 -1.0 -0.45031 0.2 0.83204 0.6 0.35394 0.2",
        5,
        (0, 1, 2, 4, 6, 7, 8),
    ),
}


def flat(rows: Any, weights: Any) -> list[Any]:
    return [entry for row in rows for entry in row] + list(weights)


@pytest.mark.parametrize("slug", TWO_REGISTERS)
def test_the_printed_numbers_lead_to_the_file(slug: str) -> None:
    text, decimals, held = TWO_REGISTERS[slug]
    printed = text.split()
    (path,) = TABLEAUX.glob(f"order-*/{slug}.toml")
    data = load(path)
    numbers, solved = polish(two_registers, printed, data["order"], held)
    with mpmath.workdps(60):
        moved = [abs(number - mpmath.mpf(old)) for number, old in zip(numbers, printed, strict=True)]
        assert max(moved) < mpmath.mpf(10) ** -decimals
        assert all(by < 1e-58 for place, by in enumerate(moved) if place not in solved)
        below = [row[:stage] for stage, row in enumerate(data["matrix"])]
        for made, written in zip(flat(*two_registers(numbers)), flat(below, data["weights"]), strict=True):
            assert abs(made - written) <= mpmath.mpf(10) ** -39


def test_the_conditions_are_those_of_the_independent_formulas() -> None:
    """Kutta 1901: the classical method meets all eight of order 4, and the first to fail is of order 5."""
    data = load(TABLEAUX / "order-4" / "kutta-4.toml")
    with mpmath.workdps(50):
        rows = [row[:stage] for stage, row in enumerate(data["matrix"])]
        found = defects(rows, data["weights"], 5)
        assert len(found) == 8 + 9
        assert max(map(abs, found[:8])) < 1e-40
        assert max(map(abs, found)) == pytest.approx(orders(data).weights.residuals[5], rel=1e-30)


def test_trees_are_as_many_as_the_literature_counts() -> None:
    """A. Cayley 1857: 1, 1, 2, 4, 9, 20, 48 rooted trees; the tallest has the density n factorial."""
    assert [len(trees(order)) for order in range(1, 8)] == [1, 1, 2, 4, 9, 20, 48]
    assert {vertices(tree) for tree in trees(6)} == {6}
    assert max(map(density, trees(6))) == factorial(6)


def test_a_system_without_a_solution_near_by_is_said_to_have_none() -> None:
    with pytest.raises(ArithmeticError, match="no convergence"):
        solve(lambda numbers: [numbers[0] ** 2 + 1], ["0.3"])
