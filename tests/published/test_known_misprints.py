"""Classic tableaux with the slips that could be, or have been, made in print; the finder names each.

- E. J. Nyström, "Über die numerische Integration von Differentialgleichungen", Acta Soc. Sci. Fenn. 50 (1925)
  no. 13, corrected a method of W. Kutta, Z. Math. Phys. 46 (1901) 435-453. Coefficients from memory, proved
  here; what was printed wrongly in 1901 was not seen, so that every entry is changed in turn.
- J. C. Butcher, Numerical Methods for Ordinary Differential Equations: two methods of order 5 with the same
  nodes and weights, whose rows 4, 5 and 6 differ. Both from memory, proved here.
"""

from __future__ import annotations

from fractions import Fraction
from itertools import product
from typing import Any

import pytest

from newel.methods.exact import Exact
from newel.methods.misprint_bench import Place, changed
from newel.methods.misprints import find_repairs, repaired
from newel.methods.order_conditions import prove
from newel.methods.tableau import Tableau

pytestmark = pytest.mark.core


def nystrom() -> Tableau:
    return Tableau(
        "nystrom",
        order=5,
        nodes=["0", "1/3", "2/5", "1", "2/3", "4/5"],
        matrix=[
            [],
            ["1/3"],
            ["4/25", "6/25"],
            ["1/4", "-3", "15/4"],
            ["2/27", "10/9", "-50/81", "8/81"],
            ["2/25", "12/25", "2/15", "8/75", "0"],
        ],
        weights=["23/192", "0", "125/192", "0", "-27/64", "125/192"],
    )


def without_nodes() -> Tableau:
    t = nystrom()
    return Tableau("nystrom", order=5, matrix=[row[:i] for i, row in enumerate(t.matrix)], weights=t.weights)


ENTRIES = [(i, j) for i in range(1, 6) for j in range(i)]


@pytest.mark.parametrize("nodes_printed", [True, False])
@pytest.mark.parametrize(("i", "j"), ENTRIES)
def test_1_81_added_to_any_entry_of_nystroms_matrix_is_found(i: int, j: int, nodes_printed: bool) -> None:
    right = nystrom() if nodes_printed else without_nodes()
    place = Place("matrix", i, j)
    text = (right.matrix[i][j] + Fraction(1, 81)).canonical
    found = find_repairs(changed(right, {place: text}, nodes_printed)).repairs
    assert found[0].where == str(place)
    assert Exact.of(found[0].value) == right.matrix[i][j]


@pytest.mark.parametrize(("i", "j", "order"), [(1, 0, 4), (2, 0, 1), (3, 1, 2), (4, 2, 1), (5, 4, 1)])
def test_without_nodes_the_order_drops_as_far_as_the_formulas_say(i: int, j: int, order: int) -> None:
    """Recomputed with independent code when the figures were gathered: order 4, 1, 2, 1, 1 by row."""
    right = without_nodes()
    text = (right.matrix[i][j] + Fraction(1, 81)).canonical
    assert prove(changed(right, {Place("matrix", i, j): text}, False)).order == order


@pytest.mark.parametrize("j", range(6))
def test_1_192_added_to_any_weight_of_nystroms_is_found(j: int) -> None:
    right, place = nystrom(), Place("weights", j)
    wrong = changed(right, {place: (right.weights[j] + Fraction(1, 192)).canonical})
    assert prove(wrong).order == 0
    found = find_repairs(wrong).repairs
    assert found[0].where == str(place)
    assert Exact.of(found[0].value) == right.weights[j]


def test_the_lost_sign_of_nystroms_fifth_weight_is_found() -> None:
    wrong = changed(nystrom(), {Place("weights", 4): "27/64"})
    assert sum(wrong.weights[1:], wrong.weights[0]) == Fraction(59, 32)
    assert [(each.where, each.value) for each in find_repairs(wrong).repairs] == [("weights[5]", "-27/64")]


ROWS: dict[str, list[list[str]]] = {
    "first": [
        ["0", "-1/2", "1"],
        ["3/16", "0", "0", "9/16"],
        ["-3/7", "2/7", "12/7", "-12/7", "8/7"],
    ],
    "second": [
        ["0", "0", "1/2"],
        ["3/16", "-3/8", "3/8", "9/16"],
        ["-3/7", "8/7", "6/7", "-12/7", "8/7"],
    ],
}


def butcher(*schemes: str) -> Tableau:
    """The method with rows 4, 5 and 6 of these schemes."""
    rows = [ROWS[scheme][row] for row, scheme in enumerate(schemes)]
    arrays: dict[str, Any] = {
        "nodes": ["0", "1/4", "1/4", "1/2", "3/4", "1"],
        "weights": ["7/90", "0", "16/45", "2/15", "16/45", "7/90"],
    }
    return Tableau("butcher", order=5, matrix=[[], ["1/4"], ["1/8", "1/8"], *rows], **arrays)


@pytest.mark.parametrize("scheme", ["first", "second"])
def test_both_schemes_of_butcher_are_of_order_five(scheme: str) -> None:
    assert prove(butcher(scheme, scheme, scheme)).outcome == "exact"


MIXED = [each for each in product(ROWS, repeat=3) if len(set(each)) == 2]


@pytest.mark.parametrize("schemes", MIXED, ids="-".join)
def test_a_row_of_the_other_scheme_is_named_and_put_right(schemes: tuple[str, str, str]) -> None:
    """Two of the three rows tell which scheme was meant."""
    meant = max(schemes, key=schemes.count)
    stray = next(row for row, scheme in enumerate(schemes) if scheme != meant) + 4
    mixed = butcher(*schemes)
    assert not prove(mixed)
    search = find_repairs(mixed)
    assert "no change of a single coefficient" in search.undecided[0]
    right = [
        each for each in search.repairs if repaired(mixed, each).matrix == butcher(meant, meant, meant).matrix
    ]
    assert len(right) == 1
    assert right[0].distance == search.repairs[0].distance
    assert {change.where.split("]")[0] for change in right[0].changes} == {f"matrix[{stray}"}
