"""Exact linear systems that are solved as far as they determine the unknowns.

Conditions come one at a time, so that the first that contradicts the others is known, and what is left free
is a basis. Numbers are Fractions, or Exacts of one field Q(√d): anything with exact `+ - * /`.
"""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction
from typing import Any, TypeAlias

__all__ = ["Number", "System", "Vector", "inner"]

Number: TypeAlias = Any
"""A Fraction or an Exact; both have exact arithmetic with ints."""
Vector: TypeAlias = list[Number]


def inner(u: Sequence[Number], v: Sequence[Number]) -> Number:
    """Return the inner product of two vectors, exactly.

    >>> inner([1, Fraction(1, 2)], [2, 4])
    Fraction(4, 1)
    """
    return sum((x * y for x, y in zip(u, v, strict=True) if x and y), Fraction(0))


class System:
    """Equations row·x = target in n unknowns, kept reduced: each pivot stands in one row alone.

    >>> system = System(2)
    >>> system.add([1, 1], 1), system.add([2, 2], 2), system.add([1, 1], 0)
    (True, True, False)
    >>> system.particular(), system.directions()
    ([Fraction(1, 1), Fraction(0, 1)], [[Fraction(-1, 1), Fraction(1, 1)]])
    """

    def __init__(self, unknowns: int) -> None:
        self.unknowns = unknowns
        self.rows: dict[int, Vector] = {}

    @property
    def rank(self) -> int:
        """The number of independent equations."""
        return len(self.rows)

    def copy(self) -> System:
        """Return an independent copy."""
        made = System(self.unknowns)
        made.rows = {pivot: list(row) for pivot, row in self.rows.items()}
        return made

    def add(self, row: Sequence[Number], target: Number) -> bool:
        """Add one equation; False, and nothing is added, where it contradicts those before."""
        reduced: Vector = [Fraction(x) if isinstance(x, int) else x for x in (*row, target)]
        for pivot, known in self.rows.items():
            _subtract(reduced, known, reduced[pivot])
        pivot = next((i for i in range(self.unknowns) if reduced[i]), -1)
        if pivot < 0:
            return not reduced[-1]
        scale = reduced[pivot]
        reduced = [x / scale if x else x for x in reduced]
        for known in self.rows.values():
            _subtract(known, reduced, known[pivot])
        self.rows[pivot] = reduced
        return True

    def particular(self) -> Vector:
        """Return the solution whose free unknowns are zero."""
        zero = Fraction(0)
        return [self.rows[i][-1] if i in self.rows else zero for i in range(self.unknowns)]

    def directions(self) -> list[Vector]:
        """Return a basis of what may be added to a solution: one vector for each free unknown."""
        found = []
        for free in range(self.unknowns):
            if free in self.rows:
                continue
            vector: Vector = [Fraction(0)] * self.unknowns
            vector[free] = Fraction(1)
            for pivot, row in self.rows.items():
                vector[pivot] = -row[free]
            found.append(vector)
        return found

    def closest(
        self,
        rows: Sequence[Sequence[Number]],
        targets: Sequence[Number],
        factors: Sequence[int] | None = None,
    ) -> None:
        """Add the equations that make Σ factor·(row·x − target)² least among the solutions, exactly.

        With a solution x₀ + N z these are the normal equations (R N)ᵀ W (R N) z = (R N)ᵀ W (targets − R x₀),
        which can always be solved.

        >>> system = System(2)
        >>> system.closest([[1, 1], [1, 0]], [2, 1])
        >>> system.particular()
        [Fraction(1, 1), Fraction(1, 1)]
        """
        directions = self.directions()
        if not directions:
            return
        start = self.particular()
        gaps = [target - inner(row, start) for row, target in zip(rows, targets, strict=True)]
        reach = [[inner(row, direction) for row in rows] for direction in directions]
        steps = System(len(directions))
        for each in reach:
            scaled = each if factors is None else [f * x for f, x in zip(factors, each, strict=True)]
            steps.add([inner(scaled, other) for other in reach], inner(scaled, gaps))
        free = [i for i in range(self.unknowns) if i not in self.rows]
        # z is the values of the free unknowns, so that an equation in z is one in them.
        for row in steps.rows.values():
            equation: Vector = [Fraction(0)] * self.unknowns
            for place, factor in zip(free, row[:-1], strict=True):
                equation[place] = factor
            self.add(equation, row[-1])


def _subtract(row: Vector, other: Sequence[Number], factor: Number) -> None:
    if factor:
        for i, x in enumerate(other):
            if x:
                row[i] = row[i] - factor * x
