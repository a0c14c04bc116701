"""Each order condition judged: by intervals first, by rounding bounds where digits are stated, by exact
arithmetic only to confirm zeros.

A condition of a formula whose coefficients are all exact holds when its residual is exactly zero. Where some
carry a rounding, the residual r must satisfy |r| ≤ 2·Σ|∂r/∂x|·δ_x over the coefficients x, with δ_x half a
unit in the last trusted digit, and |r| ≤ 1e-12: twice, because the bound is of first order; the cap, so that
few stated digits never excuse a formula of lower order.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from fractions import Fraction
from functools import cached_property
from math import factorial, inf
from typing import Any, Literal

import attrs
import numpy as np
from numpy.typing import NDArray

from newel.methods.elementary_weights import (
    ElementaryWeights,
    FixedPoint,
    Interval,
    Matrix,
    Row,
    ScaledIntegers,
    ScaledSurds,
)
from newel.methods.exact import Exact
from newel.methods.residues import Residues
from newel.methods.sensitivities import Sensitivities
from newel.methods.trees import Tree, trees
from newel.methods.verdict import Failure

__all__ = ["LIMIT", "Conditions", "Formula", "Part", "allowed", "readable"]

LIMIT = 1e-12
"""The largest residual that rounded coefficients may leave, whatever digits are stated."""

MANY_TREES = 10
"""Above this order exact conditions are decided for all trees at once, modulo primes."""

HANDFUL = 5
LONGEST_EXACT = 48
COSTLIEST_EXACT = 20_000


@attrs.frozen(kw_only=True, eq=False)
class Formula:
    """One weight vector and what its conditions ask for.

    `weights` holds s exact numbers and `slack` their δ, shape (s,). `power` is None for weights that belong
    to the end of the step; k for the coefficients of θ^k, whose sums are 1/γ for trees of order k alone.
    """

    weights: Row
    slack: NDArray[np.float64]
    power: int | None = None

    def target(self, tree: Tree) -> Fraction:
        """Return what bᵀΦ(tree) should be."""
        if self.power is None or self.power == tree.order:
            return Fraction(1, tree.density)
        return Fraction(0)

    def condition(self, tree: Tree) -> str:
        """Return the name of the condition."""
        return tree.bracket if self.power is None else f"{tree.bracket} θ^{self.power}"


@attrs.frozen(kw_only=True)
class Part:
    """The formulas that share one claim."""

    name: Literal["weights", "embedded", "continuous"]
    claimed: int
    formulas: tuple[Formula, ...]


class Conditions:
    """The order conditions of one matrix, which may be any square one.

    Args:
        matrix: s rows of s exact numbers, all in one field Q(√d).
        slack: their δ, shape (s, s), float64; zero where exact.
        floats: the matrix in float64, shape (s, s).
        radicand: d, or 1.
        bits: binary digits of the fixed point arithmetic.
        tick: called once for each tree that has been judged.
    """

    def __init__(
        self,
        matrix: Matrix,
        slack: NDArray[np.float64],
        floats: NDArray[np.float64],
        radicand: int,
        bits: int,
        tick: Callable[[], None] = lambda: None,
    ) -> None:
        self.matrix, self.slack, self.radicand, self.tick = matrix, slack, radicand, tick
        self.arithmetic = FixedPoint(matrix, bits)
        self.fixed = ElementaryWeights(self.arithmetic)
        self.sensitivities = Sensitivities(floats)
        self.rounded_matrix = bool(slack.any())
        self._exact_vectors: dict[Formula, Any] = {}
        self._zeros: dict[Formula, NDArray[np.bool_]] = {}

    def decide(self, parts: Sequence[Part]) -> None:
        """Decide the conditions of parts with high claims, where all coefficients are exact, in one go."""
        highest = max(part.claimed for part in parts)
        formulas = [f for part in parts for f in part.formulas if not f.slack.any()]
        if highest > MANY_TREES and formulas and not self.rounded_matrix:
            exact = Residues(self.matrix, self.radicand)
            zeros = exact.zeros([(f.weights, f.power) for f in formulas], highest)
            self._zeros = dict(zip(formulas, zeros, strict=True))

    @cached_property
    def exact(self) -> ElementaryWeights[Any]:
        """The same weights in exact arithmetic, made when the first zero is to be confirmed."""
        if self.radicand == 1:
            return ElementaryWeights(ScaledIntegers(self.matrix))
        return ElementaryWeights(ScaledSurds(self.matrix, self.radicand))

    def proven_order(self, part: Part) -> tuple[int, list[Failure]]:
        """Return the order up to which a part holds, and the failures of the next if that was claimed.

        Goes on past the claim until a condition fails. No formula of s stages is of higher order than 2·s,
        and no polynomial in θ of higher order than its degree.
        """
        order, highest = 1, 2 * len(self.matrix)
        if part.name == "continuous":
            highest = min(highest, len(part.formulas))
        while order <= highest:
            if order > part.claimed and self._plainly_fails(part, order):
                return order - 1, []
            failures = self._failures(part, order, HANDFUL if order <= part.claimed else 1)
            if failures:
                return order - 1, failures if order <= part.claimed else []
            order += 1
        return order - 1, []

    def _plainly_fails(self, part: Part, order: int) -> bool:
        """Tell whether the bushy or the tall tree disproves an order, for which no other tree is needed."""
        arithmetic = self.arithmetic
        nodes = arithmetic.apply(arithmetic.ones())
        bushy, tall = nodes, nodes
        for _ in range(order - 2):
            bushy, tall = arithmetic.product(bushy, nodes), arithmetic.apply(tall)
        for formula in part.formulas:
            weights = arithmetic.vector(formula.weights)
            rounded = self.rounded_matrix or bool(formula.slack.any())
            wanted = formula.power in (None, order)
            for stages, density in ((bushy, order), (tall, factorial(order))):
                residual = arithmetic.residual(weights, stages, Fraction(int(wanted), density))
                if residual.excludes_zero and (not rounded or residual.least > LIMIT):
                    return order > 1
        return False

    def _decided_failures(self, part: Part, order: int, most: int) -> list[Failure]:
        """Return the failures among conditions that `decide` has decided."""
        failures: list[Failure] = []
        for tree in trees(order):
            for formula in part.formulas:
                if not self._zeros[formula][tree.index] and len(failures) < most:
                    vector = self.arithmetic.vector(formula.weights)
                    stages = self.fixed.stages(tree.index)
                    residual = self.arithmetic.residual(vector, stages, formula.target(tree))
                    failures.append(self._failure(part, formula, tree, float(residual), 0.0))
            self.tick()
        return failures

    def _failures(self, part: Part, order: int, most: int) -> list[Failure]:
        last = trees(order)[-1].index
        if all(f in self._zeros and last < len(self._zeros[f]) for f in part.formulas):
            return self._decided_failures(part, order, most)
        failures: list[Failure] = []
        doubtful: list[tuple[int, Tree, Interval]] = []
        vectors = [self.arithmetic.vector(formula.weights) for formula in part.formulas]
        for tree in trees(order):
            stages = self.fixed.stages(tree.index)
            for which, formula in enumerate(part.formulas):
                residual = self.arithmetic.residual(vectors[which], stages, formula.target(tree))
                rounded = self.rounded_matrix or bool(formula.slack.any())
                if residual.excludes_zero and (not rounded or residual.least > LIMIT):
                    bound = LIMIT if rounded else 0.0
                    failures.append(self._failure(part, formula, tree, float(residual), bound))
                elif rounded or not residual.excludes_zero:
                    doubtful.append((which, tree, residual))
            self.tick()
            if len(failures) >= most:
                return failures[:most]
        # A condition that intervals disprove has decided this order; the rest is not worth exact arithmetic.
        return failures or list(self._doubtful_failures(part, doubtful))[:most]

    def _doubtful_failures(
        self, part: Part, doubtful: Sequence[tuple[int, Tree, Interval]]
    ) -> Iterator[Failure]:
        # What the rounding of the weights alone explains needs no gradient of the matrix.
        least = self._rounding_bounds(part, [tree for _, tree, _ in doubtful], gradients=False)
        doubtful = [each for each in doubtful if each[2].magnitude > least.get((each[0], each[1].index), 0.0)]
        bounds = self._rounding_bounds(part, [tree for _, tree, _ in doubtful])
        for which, tree, interval in doubtful:
            formula = part.formulas[which]
            bound = bounds.get((which, tree.index), 0.0)
            if interval.magnitude <= bound:
                continue
            if not interval.excludes_zero:
                residual = self.exact_residual(formula, tree)
                if not residual or abs(residual) <= Fraction(bound):
                    continue
            yield self._failure(part, formula, tree, float(interval), bound)

    def _rounding_bounds(
        self, part: Part, some: Sequence[Tree], gradients: bool = True
    ) -> dict[tuple[int, int], float]:
        """Return the largest residual to accept, by formula and tree; without any rounding, none.

        Without `gradients` the rounding of the weights alone is counted, which makes a bound too small.
        """
        slacks = np.array([formula.slack for formula in part.formulas])
        if not some or not (self.rounded_matrix or slacks.any()):
            return {}
        wanted = list(dict.fromkeys(some))
        weights = np.array([[float(x) for x in formula.weights] for formula in part.formulas])
        bounds = {}
        with np.errstate(all="ignore"):
            for piece in self.sensitivities.in_pieces(wanted, len(weights)):
                total = slacks @ np.abs(self.sensitivities.stage_vectors(piece)).T
                if gradients:
                    found = np.abs(self.sensitivities.matrix_gradients(piece, weights))
                    total = total + np.tensordot(found, self.slack, axes=2)
                for which, row in enumerate(total.tolist()):
                    for tree, value in zip(piece, row, strict=True):
                        bounds[which, tree.index] = allowed(value)
        return bounds

    def exact_residual(self, formula: Formula, tree: Tree) -> Exact:
        """Return the residual in exact arithmetic."""
        arithmetic: Any = self.exact.arithmetic
        if formula not in self._exact_vectors:
            self._exact_vectors[formula] = arithmetic.vector(formula.weights)
        stages = self.exact.stages(tree.index)
        residual: Exact = arithmetic.residual(
            self._exact_vectors[formula], tree, stages, formula.target(tree)
        )
        return residual

    def _failure(self, part: Part, formula: Formula, tree: Tree, residual: float, bound: float) -> Failure:
        text = f"{residual:.4g}"
        exact: Any = self.exact.arithmetic
        if not bound and exact.denominator.bit_length() * tree.order < COSTLIEST_EXACT:
            text = readable(self.exact_residual(formula, tree))
        condition = formula.condition(tree)
        accepted = f"; the stated digits excuse {bound:.2g}" if bound else ""
        message = (
            f"{part.name}: {condition} of order {tree.order} should give {formula.target(tree)} "
            f"and is off by {text}{accepted}"
        )
        return Failure(
            part=part.name,
            condition=condition,
            residual=residual,
            residual_text=text,
            bound=bound,
            message=message,
        )


def allowed(first_order_bound: float) -> float:
    """Return the largest residual to accept for a first-order rounding bound.

    >>> allowed(3e-17), allowed(1.0)
    (6e-17, 1e-12)
    """
    return min(2 * first_order_bound, LIMIT) if first_order_bound < inf else LIMIT


def readable(value: Exact) -> str:
    """Return an exact number as it was printed or exactly where that is short, else four digits of it.

    >>> readable(Exact.of("0.25")), readable(Exact.of(1) / 3**40)
    ('0.25', '1/12157665459056928801')
    """
    text = value.text or (value.canonical if _short(value) else "")
    if text and len(text) <= LONGEST_EXACT:
        return text
    if not value or abs(value) > Fraction(1, 10**300):
        return f"{float(value):.4g}" if abs(value) < 10**300 else "more than 1e300"
    return "less than 1e-300, but not zero"


def _short(value: Exact) -> bool:
    parts = (
        value.rational.numerator,
        value.rational.denominator,
        value.surd.numerator,
        value.surd.denominator,
    )
    return max(part.bit_length() for part in parts) <= 4 * LONGEST_EXACT
