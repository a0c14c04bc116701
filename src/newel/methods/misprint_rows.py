"""A whole row of the matrix from the conditions that are linear in it.

A stage is visited at most once on the way from the root of a tree to a leaf. In a tree each vertex of which
carries at most one child that is no leaf, the row of a stage therefore enters once, besides its sum, and the
sum is the printed node. These conditions are linear equations for the entries of the row.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from fractions import Fraction
from typing import Any

from newel.errors import BadNumber
from newel.methods.elementary_weights import ElementaryWeights
from newel.methods.exact import Exact
from newel.methods.misprint_bench import Bench
from newel.methods.trees import Tree, trees

__all__ = ["row_from_conditions", "solve"]

HIGHEST_ORDER = 7


class _Numbers:
    """The arithmetic of `ElementaryWeights` over Fractions or Exacts."""

    def __init__(self, rows: Sequence[Sequence[Any]]) -> None:
        self.rows = rows

    def ones(self) -> list[Any]:
        return [Fraction(1)] * len(self.rows)

    def product(self, u: list[Any], v: list[Any]) -> list[Any]:
        return [x * y for x, y in zip(u, v, strict=True)]

    def apply(self, v: list[Any]) -> list[Any]:
        return [
            sum((a * x for a, x in zip(row, v, strict=True) if a and x), Fraction(0)) for row in self.rows
        ]


def row_from_conditions(bench: Bench, i: int) -> list[Exact] | None:
    """Return the one row `i` (from 0) with which the linear conditions hold, or None if there is none.

    The row keeps to its node. Where the conditions leave it open, None is returned too.
    """
    tableau = bench.tableau
    lack = bench.row_defects.get(i, (Exact(0), Fraction(0)))[0]
    rows = [[_number(x) for x in row] for row in tableau.matrix]
    rows[i][0] = rows[i][0] + _number(lack)
    start = list(_residuals(bench, rows))
    slopes = []
    for j in range(1, i):
        moved = [list(row) for row in rows]
        moved[i][0], moved[i][j] = moved[i][0] - 1, moved[i][j] + 1
        ends = _residuals(bench, moved)
        slopes.append([end - begin for end, begin in zip(ends, start, strict=True)])
    solution = solve([[*line, -begin] for *line, begin in zip(*slopes, start, strict=True)], i - 1)
    if solution is None:
        return None
    row = [rows[i][0] - sum(solution, Fraction(0)), *(rows[i][j + 1] + y for j, y in enumerate(solution))]
    return [x if isinstance(x, Exact) else Exact(x) for x in row]


def _residuals(bench: Bench, rows: Sequence[Sequence[Any]]) -> Iterator[Any]:
    elementary = ElementaryWeights(_Numbers(rows))
    for part in bench.coefficients.parts():
        for formula in part.formulas:
            weights = [_number(x) for x in formula.weights]
            for order in range(1, min(part.claimed, HIGHEST_ORDER) + 1):
                for tree in filter(_linear, trees(order)):
                    pairs = zip(weights, elementary.stages(tree.index), strict=True)
                    yield sum((b * x for b, x in pairs if b and x), Fraction(0)) - formula.target(tree)


def _linear(tree: Tree) -> bool:
    inner = [child for child in tree.children if child.children]
    return len(inner) <= 1 and all(_linear(child) for child in inner)


def solve(lines: list[list[Any]], unknowns: int) -> list[Any] | None:
    """Return the one solution of linear equations `[a1, …, an, right side]`, or None where there is not one.

    >>> solve([[Fraction(1), Fraction(1), Fraction(3)], [Fraction(1), Fraction(-1), Fraction(1)]], 2)
    [Fraction(2, 1), Fraction(1, 1)]
    """
    lines = [list(line) for line in lines]
    for column in range(unknowns):
        pivot = next((r for r in range(column, len(lines)) if lines[r][column]), None)
        if pivot is None:
            return None
        lines[column], lines[pivot] = lines[pivot], lines[column]
        try:
            lines[column] = [x / lines[column][column] for x in lines[column]]
            for r, line in enumerate(lines):
                if r != column and line[column]:
                    factor = line[column]
                    lines[r] = [x - factor * y for x, y in zip(line, lines[column], strict=True)]
        except BadNumber:  # two square roots meet
            return None
    if any(line[unknowns] for line in lines[unknowns:]):
        return None
    return [line[unknowns] for line in lines[:unknowns]]


def _number(x: Exact) -> Any:
    return x if x.surd else x.rational
