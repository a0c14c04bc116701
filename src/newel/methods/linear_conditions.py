"""What every completion rests on: the linear conditions on weights, and the answer's shape."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction
from typing import Literal

import attrs

from newel.errors import BadRequest, BadTableau
from newel.methods.exact import Exact
from newel.methods.linear import Number, System, Vector, inner
from newel.methods.tableau import Row, Tableau
from newel.methods.trees import trees, trees_up_to

__all__ = [
    "HIGHEST",
    "Completion",
    "LinearConditions",
    "as_exact",
    "check_exact",
    "least_squares",
    "no_order",
    "with_end_stage",
    "with_stage",
]

HIGHEST = 10
"""No order above this one is looked for."""

MOST_STAGES = 40


@attrs.frozen(kw_only=True)
class Completion:
    """A method that was completed, and how far the conditions determine what was added.

    `tableau` holds what was found; `part` says what that is; `order` is the order of it. `free` is the number
    of parameters that the conditions of that order leave open, before the choice that `criterion` states;
    `directions` spans what they may add. `error_norm` is that of the leading error term of the choice, for
    continuous weights the root of its mean square over the step (unitless). `smooth` says of continuous
    weights whether the slope at both ends of the step is the rate there.
    """

    tableau: Tableau
    part: Literal["weights", "embedded", "continuous"]
    order: int
    free: int
    directions: tuple[tuple[Exact, ...], ...] = attrs.field(repr=False)
    criterion: str
    error_norm: float
    smooth: bool | None = None


class LinearConditions:
    """The vectors Φ(t) of a matrix, as far as they are asked for."""

    def __init__(self, matrix: Sequence[Row]) -> None:
        surds = any(x.surd for row in matrix for x in row)
        self.rows: list[Vector] = [[x if surds else x.rational for x in row] for row in matrix]
        self.stages = len(matrix)
        self._known: list[Vector] = []

    def vector(self, index: int) -> Vector:
        """Return Φ of the tree with this index: Φ(t) = Φ(rest)·(A Φ(last)), entry by entry."""
        while len(self._known) <= index:
            tree = trees_up_to(HIGHEST + 1)[len(self._known)]
            if tree.last < 0:
                self._known.append([Fraction(1)] * self.stages)
                continue
            last, rest = self._known[tree.last], self._known[tree.rest]
            self._known.append([x * inner(row, last) for x, row in zip(rest, self.rows, strict=True)])
        return self._known[index]

    def add(self, system: System, order: int) -> bool:
        """Add the conditions of one order; False where they contradict what is there."""
        return all(system.add(self.vector(t.index), Fraction(1, t.density)) for t in trees(order))

    def least_error(self, system: System, order: int) -> None:
        """Choose, among the solutions, by the error terms of one order, then by the sum of squares."""
        same = trees(order)
        rows = [[x / t.symmetry for x in self.vector(t.index)] for t in same]
        system.closest(rows, [Fraction(1, t.density * t.symmetry) for t in same])
        least_squares(system)

    def error(self, weights: Sequence[Number], order: int) -> Number:
        """Return the sum of squares of the error coefficients of one order."""
        terms = [
            (inner(weights, self.vector(t.index)) - Fraction(1, t.density)) / t.symmetry for t in trees(order)
        ]
        return inner(terms, terms)


def least_squares(system: System) -> None:
    """Choose what is left free so that the sum of squares of the unknowns is least."""
    size = system.unknowns
    unit = [[int(i == j) for j in range(size)] for i in range(size)]
    system.closest(unit, [0] * size)


def with_end_stage(tableau: Tableau) -> Tableau:
    """Return a method with the rate at the end of the step as one more stage, of weight zero.

    A method whose last stage is that already is returned as it is.

    >>> with_end_stage(Tableau("euler", order=1, matrix=[[]], weights=[1])).first_same_as_last
    True
    """
    return tableau if tableau.first_same_as_last else with_stage(tableau, tableau.weights, Exact(1))


def with_stage(tableau: Tableau, row: Sequence[Exact], node: Exact) -> Tableau:
    """Return a method with one more stage, of weight zero, and no continuous weights nor storage form."""
    return attrs.evolve(
        tableau,
        matrix=[*(entries[:i] for i, entries in enumerate(tableau.matrix)), row],
        nodes=[*tableau.nodes, node],
        weights=[*tableau.weights, 0],
        embedded_weights=tableau.embedded_weights and [*tableau.embedded_weights, 0],
        continuous_weights=None,
        continuous_order=None,
        storage=None,
        proof=None,
    )


def check_exact(tableau: Tableau) -> None:
    """Raise BadTableau or BadRequest unless linear conditions can hold exactly for these numbers."""
    if tableau.stages > MOST_STAGES:
        raise BadRequest(
            f"{tableau.slug}: {tableau.stages} stages; completion takes up to {MOST_STAGES}",
            argument="tableau",
        )
    if not tableau.is_exact:
        raise BadTableau(
            "the numbers are rounded, so that no conditions hold exactly\n"
            "  Completion needs fractions, or a + b*sqrt(d).",
            file=tableau.slug,
            key="digits",
        )
    for i, (row, node) in enumerate(zip(tableau.matrix, tableau.nodes, strict=True), 1):
        total = sum((x for x in row if x), Exact(0))
        if total != node:
            raise BadTableau(
                f"row {i} sums to {total.canonical}, its node is {node}\n  One of them is misprinted.",
                file=tableau.slug,
                key=f"nodes[{i}]",
            )


def no_order(method: Tableau, order: int) -> BadRequest:
    """Return the error for conditions that contradict each other."""
    return BadRequest(
        f"{method.slug}: the conditions of order {order} cannot be met on its {method.stages} stages\n"
        "  Ask for a lower order, or add a stage: end_stage=True.",
        argument="order",
    )


def as_exact(directions: Sequence[Vector]) -> tuple[tuple[Exact, ...], ...]:
    """Return vectors as tuples of exact numbers."""
    return tuple(tuple(Exact.of(x) for x in direction) for direction in directions)
