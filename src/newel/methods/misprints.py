"""The misprint finder: the smallest repair of a tableau whose proof fails.

One wrong entry shows in a linear condition: an entry of the matrix in its row sum (the node is independent
evidence), a weight in the sum of the weights. That gives row and amount, and every entry of the row is put to
the proof with the amount added. Without printed nodes the conditions are polynomials in the one entry, whose
common root is taken in exact arithmetic. What is found is ranked by the distance of the texts, never by the
size of the change. Only where no single change does it are several tried together.
"""

from __future__ import annotations

from collections.abc import Iterator
from fractions import Fraction
from itertools import chain
from typing import TYPE_CHECKING

import attrs

from newel.errors import BadNumber, BadTableau
from newel.methods.misprint_bench import Bench, Place, Proposal, changed, repaired
from newel.methods.misprint_groups import grouped, in_turn
from newel.methods.misprint_lines import single_along_lines
from newel.methods.repairs import Repair

if TYPE_CHECKING:
    from newel.methods.tableau import Tableau

__all__ = ["Search", "changed", "find_repairs", "repaired", "singles"]

MOST_DOUBTFUL = 2
"""So many rows are looked at where no sum is beyond its rounding."""


@attrs.frozen
class Search:
    """What a search found: repairs, the nearest to the printed text first, and what it cannot decide."""

    repairs: tuple[Repair, ...] = ()
    undecided: tuple[str, ...] = ()


def find_repairs(tableau: Tableau) -> Search:
    """Look for the smallest change with which every claim of a tableau is proved.

    Args:
        tableau: a method whose proof fails. Nodes that were left out, and are the row sums, are no evidence.

    Returns:
        Repairs by increasing distance of the texts, equally near ones all; single changes if there are any,
        else changes of several entries. `undecided` says where there are none, and what was not looked at.

    >>> from newel.methods.tableau import Tableau
    >>> wrong = Tableau("slip", order=2, matrix=[[], ["1/2"]], nodes=["0", "1/2"], weights=["0", "-1"])
    >>> for repair in find_repairs(wrong).repairs: print(repair)
    weights[2] is -1, and 1 makes every condition hold
    """
    bench = Bench(tableau)
    try:
        found, undecided = singles(bench)
        if found:
            return Search(ranked(found), tuple(undecided))
        more, left = grouped(bench)
        if not more:
            more = [each for each in [in_turn(bench, nearest_single)] if each is not None]
    except BadNumber as error:  # two square roots in one sum
        return Search((), (f"no repair was looked for: {error}",))
    except BadTableau as error:
        return Search((), (f"no repair was looked for: {error.reason}",))
    said = ["no change of a single coefficient makes every condition of the claims hold"]
    if not more:
        said[0] += "; nor does any of the changes of several that were tried"
    return Search(ranked(more), (*said, *undecided, *left))


def ranked(repairs: list[Repair]) -> tuple[Repair, ...]:
    """Return repairs by distance, then by the length of what is to be written; one for each place."""
    once: dict[str, Repair] = {}
    for each in repairs:
        kept = once.setdefault(each.where, each)
        if each.distance < kept.distance:
            once[each.where] = each
    return tuple(sorted(once.values(), key=lambda each: (each.distance, len(each.value), len(each.changes))))


def singles(bench: Bench) -> tuple[list[Repair], list[str]]:
    """Return every change of one coefficient that does it, and what could not be decided."""
    proposals = list(chain(_in_sums(bench), _in_rows(bench), _in_ends(bench), _in_storage(bench)))
    found = [repair for each in proposals if (repair := bench.tried([each])) is not None]
    if bench.rounded and not found and not bench.row_defects:
        found = [repair for each in _in_doubtful_sums(bench) if (repair := bench.tried([each])) is not None]
    undecided: list[str] = []
    if not bench.nodes_printed and bench.sum_defect("weights") is None:
        more, undecided = single_along_lines(bench)
        found += more
    return found, undecided


def nearest_single(tableau: Tableau) -> Repair | None:
    """Return the single change nearest to the printed text, or None."""
    found = ranked(singles(Bench(tableau))[0])
    return found[0] if found else None


def _in_rows(bench: Bench) -> Iterator[Proposal | None]:
    """Add what a row lacks to each of its entries, or take its sum for the node."""
    if len(bench.row_defects) != 1 or not bench.nodes_printed:
        return
    ((i, (lack, slack)),) = bench.row_defects.items()
    for j in range(i):
        yield bench.added(Place("matrix", i, j), lack, slack)
    yield Proposal(Place("nodes", i), bench.row_totals[i], slack)


def _in_doubtful_sums(bench: Bench) -> Iterator[Proposal | None]:
    """Add what the least exact sums lack: a slip in a late digit may be excused in a sum, not in a tree."""
    for array in ("weights", "embedded"):
        if array == "weights" or bench.tableau.embedded_weights is not None:
            lack, slack = bench.lack_of_sum(array)
            yield from (bench.added(Place(array, j), lack, slack) for j in range(bench.tableau.stages))
    if not bench.nodes_printed:
        return
    lacks = [node - total for node, total in zip(bench.tableau.nodes, bench.row_totals, strict=True)]
    doubtful = sorted(range(len(lacks)), key=lambda i: abs(lacks[i]), reverse=True)
    for i in doubtful[:MOST_DOUBTFUL]:
        slack = bench.half["nodes"][i] + sum(bench.half["matrix"][i])
        if lacks[i]:
            yield from (bench.added(Place("matrix", i, j), lacks[i], slack) for j in range(i))


def _in_storage(bench: Bench) -> Iterator[Proposal]:
    """Take from the storage form, which is evidence of its own, what stands in the failing places."""
    storage = bench.tableau.storage
    if storage is None:
        return
    matrix, weights = storage.butcher()
    places = {Place("weights", j): value for j, value in enumerate(weights)}
    places |= {
        Place("matrix", i, j): value for i, row in enumerate(matrix) for j, value in enumerate(row[:i])
    }
    for place, value in places.items():
        slack = bench.unit(place, value) if bench.rounded else Fraction(0)
        if abs(bench.entry(place) - value) > 1000 * slack:
            yield Proposal(place, value, slack)


def _in_ends(bench: Bench) -> Iterator[Proposal | None]:
    """Let continuous weights end in the weight of their stage: by one of them, or by the weight."""
    for i, lack, slack in bench.end_defects():
        powers = range(len((bench.tableau.continuous_weights or ((),))[0]))
        yield from (bench.added(Place("continuous", i, power), lack, slack) for power in powers)
        yield bench.added(Place("weights", i), -lack, slack)


def _in_sums(bench: Bench) -> Iterator[Proposal | None]:
    """Add what a sum of weights lacks to each of them."""
    if bench.row_defects and bench.nodes_printed:
        return
    tableau, stages = bench.tableau, range(bench.tableau.stages)
    for array in ("weights", "embedded"):
        present = array == "weights" or tableau.embedded_weights is not None
        missing = bench.sum_defect(array) if present else None
        if missing is not None:
            yield from (bench.added(Place(array, j), *missing) for j in stages)
    for power in range(len((tableau.continuous_weights or ((),))[0])):
        missing = bench.sum_defect("continuous", power)
        if missing is not None:
            yield from (bench.added(Place("continuous", j, power), *missing) for j in stages)
