"""Rooted trees against published tables.

- Numbers of trees: A. Cayley, "On the theory of the analytical forms called trees", Phil. Mag. 13 (1857)
  172-176; N. J. A. Sloane, On-Line Encyclopedia of Integer Sequences, A000081. From memory, and recomputed.
- Symmetry σ, density γ, orderings α: J. C. Butcher, Numerical Methods for Ordinary Differential Equations,
  section 30; E. Hairer, S. P. Nørsett, G. Wanner, Solving Ordinary Differential Equations I, section II.2:
  tables of the trees up to order 5. From memory, and recomputed.
"""

from __future__ import annotations

from fractions import Fraction
from itertools import accumulate
from math import factorial

import pytest

from newel.methods.trees import tree_count, trees

pytestmark = pytest.mark.core

A000081 = [1, 1, 2, 4, 9, 20, 48, 115, 286, 719, 1842, 4766, 12486, 32973, 87811, 235381, 634847, 1721159]
A000081 += [4688676, 12826228]
CONDITIONS = [1, 2, 4, 8, 17, 37, 85, 200, 486, 1205, 3047, 7813]  # conditions for order 1, 2, …

UP_TO_FIVE = {
    "τ": (1, 1, 1),
    "[τ]": (1, 2, 1),
    "[τ,τ]": (2, 3, 1),
    "[[τ]]": (1, 6, 1),
    "[τ,τ,τ]": (6, 4, 1),
    "[τ,[τ]]": (1, 8, 3),
    "[[τ,τ]]": (2, 12, 1),
    "[[[τ]]]": (1, 24, 1),
    "[τ,τ,τ,τ]": (24, 5, 1),
    "[τ,τ,[τ]]": (2, 10, 6),
    "[τ,[τ,τ]]": (2, 15, 4),
    "[τ,[[τ]]]": (1, 30, 4),
    "[[τ],[τ]]": (2, 20, 3),
    "[[τ,τ,τ]]": (6, 20, 1),
    "[[τ,[τ]]]": (1, 40, 3),
    "[[[τ,τ]]]": (2, 60, 1),
    "[[[[τ]]]]": (1, 120, 1),
}


def test_the_numbers_of_trees_are_those_of_a000081() -> None:
    assert [tree_count(order) for order in range(1, 21)] == A000081
    assert [len(trees(order)) for order in range(1, 12)] == A000081[:11]


def test_the_numbers_of_conditions_are_those_of_the_textbooks() -> None:
    assert list(accumulate(len(trees(order)) for order in range(1, 13))) == CONDITIONS


def test_symmetry_density_and_orderings_up_to_order_five_are_those_of_the_tables() -> None:
    found = {
        tree.bracket: (tree.symmetry, tree.density, tree.orderings)
        for order in range(1, 6)
        for tree in trees(order)
    }
    assert found == UP_TO_FIVE


@pytest.mark.parametrize("order", range(1, 11))
def test_sums_over_all_trees_of_an_order_have_their_closed_forms(order: int) -> None:
    """Increasing labellings number (n−1)!, all labelled rooted trees n^(n−1) (Cayley), and Σ 1/(σγ) = 1/n."""
    same = trees(order)
    assert sum(tree.orderings for tree in same) == factorial(order - 1)
    assert sum(Fraction(factorial(order), tree.symmetry) for tree in same) == order ** (order - 1)
    assert sum(Fraction(1, tree.symmetry * tree.density) for tree in same) == Fraction(1, order)
