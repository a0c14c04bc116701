"""Changes of several entries that only help together; tried where no single change does it."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from itertools import combinations, product
from typing import TYPE_CHECKING, Any

import attrs

from newel.methods.digits import Digits
from newel.methods.misprint_bench import Bench, Place, Proposal, changed, repaired
from newel.methods.misprint_lines import pairs_of_row, pairs_of_weights
from newel.methods.misprint_rows import row_from_conditions
from newel.methods.order_conditions import prove
from newel.methods.repairs import Repair

if TYPE_CHECKING:
    from newel.methods.tableau import Tableau

__all__ = ["grouped", "in_turn"]

MOST_STAGES = 12
"""Up to so many stages, changes of several entries are looked for without a row that disagrees."""
MOST_PRODUCTS = 250


def grouped(bench: Bench) -> tuple[list[Repair], list[str]]:
    """Return the changes of several entries that do it, and what was not looked at."""
    if not bench.nodes_printed:
        return [], ["without printed nodes only changes of one coefficient, and its node with it, are tried"]
    rows, large = list(bench.row_defects), bench.tableau.stages > MOST_STAGES
    summed = bench.sum_defect("weights") is None
    found: list[Repair] = []
    if len(rows) == 1 and summed:
        found += pairs_of_row(bench, rows[0])
    if not rows and summed and not large:
        for i in range(2, bench.tableau.stages):
            found += pairs_of_row(bench, i)
        found += pairs_of_weights(bench, "weights")
        if bench.tableau.embedded_weights is not None and bench.sum_defect("embedded") is None:
            found += pairs_of_weights(bench, "embedded")
    if summed:
        found += _exchanged(bench, rows)
    if len(rows) == 2:
        found += _two_rows(bench, rows)
    elif len(rows) > 2:
        found += _nodes(bench, rows)
    if not found and len(rows) <= 1 and summed and not bench.rounded and not large:
        for i in rows or range(2, bench.tableau.stages):
            found += _whole_row(bench, i)
    skipped = f"pairs of entries and whole rows were not tried: that is done up to {MOST_STAGES} stages"
    return found, [skipped] if large and not rows and not found else []


def _whole_row(bench: Bench, i: int) -> Iterator[Repair]:
    values = row_from_conditions(bench, i)
    if values is not None:
        proposals = [Proposal(Place("matrix", i, j), value) for j, value in enumerate(values)]
        different = [each for each in proposals if each.value != bench.entry(each.place)]
        repair = bench.tried(different)
        if repair is not None:
            yield repair


def _exchanged(bench: Bench, rows: list[int]) -> Iterator[Repair]:
    """Yield the exchanges of two rows, or of two nodes, that do it."""
    tableau, totals = bench.tableau, bench.row_totals
    if len(rows) > 2:
        return
    for i, k in combinations(range(1, tableau.stages), 2):
        crossed = totals[i] == tableau.nodes[k] and totals[k] == tableau.nodes[i]
        if not crossed or not set(rows) <= {i, k}:
            continue
        texts = {Place("nodes", i): str(tableau.nodes[k]), Place("nodes", k): str(tableau.nodes[i])}
        if rows and bench.holds(texts):
            yield bench.repair(texts)
        if any(tableau.matrix[k][i:]):
            continue  # the longer row does not fit above the diagonal
        texts = {Place("matrix", i, j): str(tableau.matrix[k][j]) for j in range(i)}
        texts |= {Place("matrix", k, j): str(tableau.matrix[i][j]) for j in range(k)}
        if bench.holds(texts):
            found = bench.repair(texts)
            yield attrs.evolve(found, text=f"rows {i + 1} and {k + 1} are mixed up; {found.text}")


def _two_rows(bench: Bench, rows: list[int]) -> Iterator[Repair]:
    """Yield changes of one entry, or the node, in each of two rows."""
    choices = []
    for i in rows:
        lack, slack = bench.row_defects[i]
        entries = [bench.added(Place("matrix", i, j), lack, slack) for j in range(i)]
        choices.append([*entries, Proposal(Place("nodes", i), bench.row_totals[i], slack)])
    if len(choices[0]) * len(choices[1]) <= MOST_PRODUCTS:
        for both in product(*choices):
            repair = bench.tried(list(both))
            if repair is not None:
                yield repair


def _nodes(bench: Bench, rows: list[int]) -> Iterator[Repair]:
    """Yield the repair that takes all row sums for the nodes."""
    proposals = [Proposal(Place("nodes", i), bench.row_totals[i], bench.row_defects[i][1]) for i in rows]
    repair = bench.tried(proposals)
    if repair is not None:
        yield repair


def in_turn(bench: Bench, nearest_single: Callable[[Tableau], Repair | None]) -> Repair | None:
    """Repair the method itself first, then its embedded weights, then its continuous ones.

    Each step takes the single change nearest to the printed text; None where one of them finds none.
    """
    tableau = bench.tableau
    if tableau.embedded_weights is None and tableau.continuous_weights is None:
        return None
    texts: dict[Place, str] = {}
    for kept in ((), ("embedded",), ("embedded", "continuous")):
        part = without(changed(tableau, texts, bench.nodes_printed), kept)
        if prove(part):
            continue
        repair = nearest_single(part)
        if repair is None or not prove(repaired(part, repair)):
            return None
        texts |= {_place(change.where): change.value for change in repair.changes}
    return bench.repair(texts) if len(texts) > 1 and bench.holds(texts) else None


def without(tableau: Tableau, kept: tuple[str, ...]) -> Tableau:
    """Return a tableau with only the named of its embedded and continuous weights."""
    dropped = [part for part in ("embedded", "continuous") if part not in kept]
    fields: dict[str, Any] = {}
    for part in dropped:
        fields |= {f"{part}_weights": None, f"{part}_order": None}
    digits = tableau.digits
    if isinstance(digits, Digits):
        fields["digits"] = _digits_without(digits, dropped)
    return attrs.evolve(tableau, **fields)


def _digits_without(digits: Digits, dropped: list[str]) -> Mapping[str, object] | None:
    kept = {key: value for key, value in digits.items() if key.split("[")[0] not in dropped}
    return kept or None


def _place(where: str) -> Place:
    array, *indices = where.replace("]", "").split("[")
    return Place(array, *(int(index) - 1 for index in indices))
