"""Whether a tableau is what it claims, by explicit tree formulas in exact arithmetic, and how strongly each
condition answers to each coefficient: code of its own, which never imports newel.

The rules that are judged by: a condition without rounded coefficients holds when its residual is zero; with
them, when the residual is at most twice the sum of |derivative|*(half a unit) over the coefficients, and at
most 1e-12. Derivatives are carried forward along the tree: the stage value of a tree is a product over its
branches u of (A Phi(u)), and the derivative of such a factor with respect to a_jk is Phi(u)_k in stage j plus
A times the derivative of Phi(u).
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property, reduce
from math import inf, lcm
from operator import mul
from typing import Any

import numpy as np

from tests.independent.documents import Document, Place
from tests.independent.quadratic import Number, Quadratic, denominator, is_zero, scaled, written
from tests.independent.tree_formulas import NestedTree, density, rooted_trees, size

CAP = 1e-12
KEPT = 9
"""Slopes are kept of trees with so many nodes at most: of larger ones they would fill the memory."""


@dataclass(frozen=True)
class Judgement:
    """Whether everything claimed holds, and the finding in words."""

    valid: bool
    finding: str
    by_cap: bool = False


@dataclass(frozen=True)
class Formula:
    """One weight vector: the places of its entries, and the power of theta it belongs to (0 for none)."""

    part: str
    places: tuple[Place, ...]
    power: int = 0

    def target(self, tree: NestedTree) -> Fraction:
        return Fraction(1, density(tree)) if self.power in (0, size(tree)) else Fraction(0)


def formulas(document: Document) -> Iterator[Formula]:
    """The weight vectors that make a claim."""
    stages = range(1, document.stages + 1)
    for part in ("weights", "embedded"):
        if part in document.claims:
            yield Formula(part, tuple(Place(part, stage) for stage in stages))
    for power in range(1, document.powers + 1):
        yield Formula("continuous", tuple(Place("continuous", stage, power) for stage in stages), power)


class Scaled:
    """Stage values in integers: those of a tree of n nodes times D^(n-1), D the common denominator."""

    def __init__(self, document: Document) -> None:
        self.document = document
        places = list(document.places("matrix"))
        self.scale = lcm(*(denominator(document.values[place]) for place in places))
        self.rows: list[list[tuple[int, Any]]] = [[] for _ in range(document.stages)]
        for place in places:
            if not is_zero(value := document.values[place]):
                self.rows[place.row - 1].append((place.column - 1, scaled(value, self.scale)))
        self.through: dict[NestedTree, list[Any]] = {}

    def phi(self, tree: NestedTree) -> list[Any]:
        factors = [self.applied(branch) for branch in tree]
        return [reduce(mul, column) for column in zip(*factors, strict=True)] or [1] * len(self.rows)

    def applied(self, tree: NestedTree) -> list[Any]:
        if tree not in self.through:
            below = self.phi(tree)
            self.through[tree] = [sum(entry * below[j] for j, entry in row) for row in self.rows]
        return self.through[tree]

    def residual(self, formula: Formula, tree: NestedTree) -> Number:
        weights = [self.document.values[place] for place in formula.places]
        below = lcm(*map(denominator, weights))
        total = sum(scaled(w, below) * value for w, value in zip(weights, self.phi(tree), strict=True))
        divisor = below * self.scale ** (size(tree) - 1)
        quotient = total / divisor if isinstance(total, Quadratic) else Fraction(total, divisor)
        return quotient - formula.target(tree)


class Derivatives:
    """Stage values and their derivatives with respect to the matrix, in float64."""

    def __init__(self, matrix: Any) -> None:
        self.matrix, self.stages = matrix, len(matrix)
        self.known: dict[NestedTree, tuple[Any, Any]] = {}

    def of(self, tree: NestedTree) -> tuple[Any, Any]:
        """Phi(tree), shape (s,), and its derivative, shape (s, s, s): stage, row, column."""
        if tree in self.known:
            return self.known[tree]
        s = self.stages
        value, slope = np.ones(s), np.zeros((s, s, s))
        for branch in tree:
            inner, inner_slope = self.of(branch)
            factor = self.matrix @ inner
            factor_slope = (self.matrix @ inner_slope.reshape(s, s * s)).reshape(s, s, s)
            for stage in range(s):
                factor_slope[stage, stage] += inner
            slope = slope * factor[:, None, None] + value[:, None, None] * factor_slope
            value = value * factor
        if size(tree) <= KEPT:
            self.known[tree] = value, slope
        return value, slope


@dataclass(frozen=True)
class Condition:
    """One condition, linearised: residual, derivative by place, whether a tree stands behind it."""

    name: str
    residual: Number
    slopes: Mapping[Place, float]
    by_tree: bool

    def reach(self, half_units: Mapping[Place, Fraction]) -> float:
        """The first-order rounding bound: what half a unit everywhere can make of the residual."""
        return sum(abs(slope) * float(half_units[place]) for place, slope in self.slopes.items())


def linear_conditions(document: Document) -> Iterator[Condition]:
    """Nodes against row sums, and the end of continuous weights against the weights."""
    values = document.values
    sums = [("row", "nodes", "matrix")] + ([("end", "weights", "continuous")] if document.powers else [])
    for word, total, parts in sums:
        for stage in range(1, document.stages + 1):
            terms = [place for place in document.places(parts) if place.row == stage]
            residual = sum((values[place] for place in terms), Fraction(0)) - values[Place(total, stage)]
            slopes = dict.fromkeys(terms, 1.0) | {Place(total, stage): -1.0}
            yield Condition(f"{word} {stage}", residual, slopes, False)


def tree_conditions(document: Document, slopes: bool) -> Iterator[Condition]:
    """Every tree condition of every claim, by increasing order; slopes left out unless asked for."""
    exact = Scaled(document)
    floats = Derivatives(_floats(document, "matrix")) if slopes else None
    for order in range(1, max(document.claims.values()) + 1):
        for formula in formulas(document):
            if order > document.claims[formula.part]:
                continue
            for tree in rooted_trees(order):
                found = {} if floats is None else _slopes(document, floats, formula, tree)
                name = f"{formula.part} {bracket(tree)}" + (
                    f" theta^{formula.power}" if formula.power else ""
                )
                yield Condition(name, exact.residual(formula, tree), found, True)


def bracket(tree: NestedTree) -> str:
    """The tree in bracket notation."""
    return f"[{','.join(map(bracket, tree))}]" if tree else "τ"


def judge(document: Document, trees_only: bool = False) -> Judgement:
    """Whether the row sums, the ends and all tree conditions of all claims hold."""
    powers_missing = document.powers < document.claims.get("continuous", 0)
    if powers_missing:
        return Judgement(False, "continuous weights lack powers of theta that the claim needs")
    rounded, count, closest = document.rounded, 0, 0.0
    conditions = [tree_conditions(document, rounded)]
    if not trees_only:
        conditions.insert(0, linear_conditions(document))
    for condition in (each for group in conditions for each in group):
        count += 1
        if is_zero(condition.residual):
            continue
        reach = condition.reach(document.half_units) if rounded else 0.0
        residual, bound = abs(float(condition.residual)), min(2 * reach, CAP)
        if not bound or residual > bound:
            capped = bool(bound) and residual <= 2 * reach
            words = f"{condition.name} is off by {residual:.3g}, allowed {bound:.3g}"
            return Judgement(False, words, capped)
        closest = max(closest, residual / bound)
    claims = ", ".join(f"{part} to order {order}" for part, order in document.claims.items())
    held = f"within bounds, the closest at {closest:.2g} of its own" if rounded else "exactly"
    return Judgement(True, f"all {count} row sums, ends and tree conditions hold {held}: {claims}")


def _floats(document: Document, array: str) -> Any:
    matrix = np.zeros((document.stages, document.stages))
    for place in document.places(array):
        matrix[place.row - 1, place.column - 1] = float(document.values[place])
    return matrix


def _slopes(
    document: Document, floats: Derivatives, formula: Formula, tree: NestedTree
) -> dict[Place, float]:
    value, slope = floats.of(tree)
    weights = np.array([float(document.values[place]) for place in formula.places])
    by_matrix = np.tensordot(weights, slope, axes=1)
    found = {place: float(x) for place, x in zip(formula.places, value, strict=True)}
    return found | {
        place: float(by_matrix[place.row - 1, place.column - 1]) for place in document.places("matrix")
    }


def unseen(document: Document) -> list[str]:
    """The entries of the matrix that may be changed at will without a trace in any tree condition.

    Floats find the candidates; two large changes of each, in exact arithmetic, must leave all residuals.
    """
    left = set(document.places("matrix"))
    for condition in tree_conditions(document, slopes=True):
        if not left:
            return []
        left -= {place for place in left if abs(condition.slopes[place]) > 1e-9}
    before = [condition.residual for condition in tree_conditions(document, slopes=False)]
    for change in (1, Fraction(-2, 7)):
        for place in sorted(left):
            moved = document.changed({place: written(document.values[place] + change)})
            after = (condition.residual for condition in tree_conditions(moved, slopes=False))
            if any(not is_zero(x - y) for x, y in zip(before, after, strict=True)):
                left.discard(place)
    return [str(place) for place in sorted(left)]


class Visibility:
    """Every condition of a rounded tableau against every coefficient, and the least change that shows."""

    def __init__(self, document: Document) -> None:
        self.document = document
        conditions = [*linear_conditions(document), *tree_conditions(document, True)]
        self.column = {place: index for index, place in enumerate(document.texts)}
        self.slopes = np.zeros((len(conditions), len(self.column)))
        for row, condition in enumerate(conditions):
            for place, slope in condition.slopes.items():
                self.slopes[row, self.column[place]] = slope
        self.half_units = np.array([float(document.half_units[place]) for place in document.texts])
        self.by_tree = np.array([condition.by_tree for condition in conditions])
        self.residuals = np.array([float(condition.residual) for condition in conditions])

    @cached_property
    def reach(self) -> Any:
        return np.abs(self.slopes) @ self.half_units

    def least(self, direction: Mapping[Place, int], trees_only: bool = False) -> float:
        """The least size of a change along `direction` that exceeds the bound of some condition; inf if none.

        With `trees_only` row sums and ends do not count.
        An entry of exact form counts as rounded to the digits of its array, as it does once it is changed.
        """
        along, half_units = np.zeros(len(self.column)), self.half_units.copy()
        for place, sign in direction.items():
            along[self.column[place]] = sign
            text = self.document.texts[place]
            half_units[self.column[place]] = float(self.document.half_unit(place, text, as_rounded=True))
        answers = np.abs(self.slopes @ along)
        noise = 1e-12 * (np.abs(self.slopes) @ np.abs(along))
        seen = answers > noise
        if trees_only:
            seen &= self.by_tree
        bounds = np.minimum(2 * np.abs(self.slopes) @ half_units, CAP)
        return float(np.min(bounds[seen] / answers[seen], initial=inf))
