"""Searches along a line: one unknown x, every order condition a polynomial in it.

With printed nodes two entries of a row move against each other, so that the row sum stays; without them a
single entry moves, and its node with it.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from fractions import Fraction
from itertools import combinations
from typing import Any

from newel.methods.exact import Exact
from newel.methods.misprint_bench import Bench, Place, Proposal
from newel.methods.repairs import Repair
from newel.methods.residual_polynomials import Asked, Found, Polynomial, common_values

__all__ = ["Line", "pairs_of_row", "pairs_of_weights", "polynomials", "single_along_lines", "values_along"]

Line = Mapping[Place, tuple[Exact, int]]
"""By place: where the entry starts, and its factor of x."""


def single_along_lines(bench: Bench) -> tuple[list[Repair], list[str]]:
    """Return every change of one matrix entry, with its node, that does it, and what is not decided."""
    repairs, undecided = [], []
    for i in range(1, bench.tableau.stages):
        for j in range(i):
            place = Place("matrix", i, j)
            found = values_along(bench, {place: (bench.entry(place), 1)})
            for x in found.values:
                slack = _slack(bench, found) + bench.half_at(place)
                repair = bench.tried([Proposal(place, bench.entry(place) + x, slack)])
                repairs += [] if repair is None else [repair]
            if found.unsolved:
                undecided.append(f"{place}: what the conditions leave is not rational, and was not tried")
    return repairs, undecided


def pairs_of_row(bench: Bench, i: int) -> Iterator[Repair]:
    """Yield each change of two entries of row `i` that keeps to the node and does it."""
    lack, slack = bench.row_defects.get(i, (Exact(0), bench.half["nodes"][i]))
    for j, k in combinations(range(i), 2):
        first, second = Place("matrix", i, j), Place("matrix", i, k)
        line = {first: (bench.entry(first) + lack, 1), second: (bench.entry(second), -1)}
        yield from _along(bench, line, slack)


def pairs_of_weights(bench: Bench, array: str) -> Iterator[Repair]:
    """Yield each change of two weights that keeps their sum and does it."""
    for j, k in combinations(range(bench.tableau.stages), 2):
        first, second = Place(array, j), Place(array, k)
        line = {first: (bench.entry(first), 1), second: (bench.entry(second), -1)}
        yield from _along(bench, line, Fraction(0))


def _along(bench: Bench, line: Line, slack: Fraction) -> Iterator[Repair]:
    found = values_along(bench, line)
    for x in found.values:
        more = _slack(bench, found) + slack
        proposals = [
            Proposal(place, start + x * factor, more + bench.half_at(place) if bench.rounded else Fraction(0))
            for place, (start, factor) in line.items()
        ]
        repair = bench.tried(proposals)
        if repair is not None:
            yield repair


def values_along(bench: Bench, line: Line) -> Found:
    """Return the values of x with which the conditions hold when entries move along a line."""
    number = _number(bench)
    moving = {
        (place.array, place.row, place.column): _polynomial(number(start), factor)
        for place, (start, factor) in line.items()
    }
    matrix = [
        [moving.get(("matrix", i, j), _constant(number(x))) for j, x in enumerate(row)]
        for i, row in enumerate(bench.tableau.matrix)
    ]
    return common_values(matrix, list(_asked(bench, moving)), bench.rounded)


def polynomials(bench: Bench, matrix: Sequence[Sequence[Exact]]) -> list[list[Polynomial]]:
    """Return a matrix of numbers as polynomials without x."""
    number = _number(bench)
    return [[_constant(number(x)) for x in row] for row in matrix]


def _asked(bench: Bench, moving: Mapping[tuple[str, int, int], Polynomial]) -> Iterator[Asked]:
    number = _number(bench)
    for part in bench.coefficients.parts():
        for formula in part.formulas:
            weights = [
                moving.get((part.name, j, -1), _constant(number(x))) for j, x in enumerate(formula.weights)
            ]
            yield Asked(weights, part.claimed, formula.target)


def _number(bench: Bench) -> Any:
    """Fractions where all numbers are rational, for they are quicker."""
    return (lambda x: x.rational) if bench.coefficients.radicand == 1 else (lambda x: x)


def _constant(x: Any) -> Polynomial:
    return [x] if x else []


def _polynomial(start: Any, factor: int) -> Polynomial:
    return [start, start * 0 + factor]


def _slack(bench: Bench, found: Found) -> Fraction:
    """Return how far a root may be off: the rounding of all that enters the condition, over its slope."""
    if not found.slope:
        return Fraction(0)
    rows = bench.half["matrix"]
    total = sum(bench.half["weights"], Fraction(0)) + sum(
        (sum(row, Fraction(0)) for row in rows), Fraction(0)
    )
    return min(total / Fraction(found.slope), Fraction(1, 100))
