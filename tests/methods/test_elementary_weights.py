"""Elementary weights: the arithmetics agree, and the error bound of fixed point holds."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from newel.methods.elementary_weights import ElementaryWeights, FixedPoint, ScaledIntegers, ScaledSurds
from newel.methods.exact import Exact
from newel.methods.sensitivities import Sensitivities
from newel.methods.trees import Tree, trees, trees_up_to

pytestmark = pytest.mark.core

calm = settings(deadline=None, derandomize=True, max_examples=20)
entries = st.fractions(min_value=-20, max_value=20, max_denominator=50)


@st.composite
def methods(draw: st.DrawFn, surds: bool = False) -> tuple[list[list[Exact]], list[Exact]]:
    """Draw a full matrix and weights, rational or in Q(√5)."""
    s = draw(st.integers(1, 3))

    def entry() -> Exact:
        return Exact(draw(entries), draw(entries) if surds else 0, 5)

    return [[entry() for _ in range(s)] for _ in range(s)], [entry() for _ in range(s)]


def by_recursion(tree: Tree, matrix: list[list[Exact]], weights: list[Exact]) -> Exact:
    """Σ b Φ straight from the definition, branch by branch."""

    def stage(tree: Tree, i: int) -> Exact:
        product = Exact(1)
        for child in tree.children:
            product *= sum((a * stage(child, j) for j, a in enumerate(matrix[i])), Exact(0))
        return product

    return sum((b * stage(tree, i) for i, b in enumerate(weights)), Exact(0))


@calm
@given(methods(), st.integers(0, 36))
def test_scaled_integers_give_the_definition(
    method: tuple[list[list[Exact]], list[Exact]], which: int
) -> None:
    matrix, weights = method
    tree = trees_up_to(6)[which]
    arithmetic = ScaledIntegers(matrix)
    stages = ElementaryWeights(arithmetic).stages(tree.index)
    target = Fraction(1, tree.density)
    residual = arithmetic.residual(arithmetic.vector(weights), tree, stages, target)
    assert residual == by_recursion(tree, matrix, weights) - target


@calm
@given(methods(surds=True), st.integers(0, 16))
def test_scaled_surds_give_the_definition(method: tuple[list[list[Exact]], list[Exact]], which: int) -> None:
    matrix, weights = method
    tree = trees_up_to(5)[which]
    arithmetic = ScaledSurds(matrix, 5)
    stages = ElementaryWeights(arithmetic).stages(tree.index)
    target = Fraction(1, tree.density)
    residual = arithmetic.residual(arithmetic.vector(weights), tree, stages, target)
    assert residual == by_recursion(tree, matrix, weights) - target


@calm
@given(methods(surds=True), st.integers(0, 36), st.integers(1, 40))
def test_an_interval_in_fixed_point_holds_the_true_residual_however_few_its_bits(
    method: tuple[list[list[Exact]], list[Exact]], which: int, bits: int
) -> None:
    matrix, weights = method
    tree = trees_up_to(6)[which]
    arithmetic = FixedPoint(matrix, bits)
    stages = ElementaryWeights(arithmetic).stages(tree.index)
    target = Fraction(1, tree.density)
    interval = arithmetic.residual(arithmetic.vector(weights), stages, target)
    true = by_recursion(tree, matrix, weights) - target
    assert interval.middle - interval.radius <= true * 2**bits <= interval.middle + interval.radius
    assert Fraction(interval.least) <= abs(true) <= Fraction(interval.magnitude)
    if interval.excludes_zero:
        assert true


def test_an_interval_narrows_as_bits_are_added() -> None:
    matrix = [[Exact(0), Exact(0)], [Exact.of("1/3"), Exact(0)]]
    weights = [Exact.of("1/7"), Exact.of("6/7")]
    for bits in (16, 64, 256):
        arithmetic = FixedPoint(matrix, bits)
        vectors = ElementaryWeights(arithmetic)
        interval = arithmetic.residual(arithmetic.vector(weights), vectors.stages(1), Fraction(1, 2))
        assert interval.radius < 20
        assert abs(Fraction(interval.middle, 2**bits) + Fraction(3, 14)) < Fraction(20, 2**bits)
        assert float(interval) == pytest.approx(-3 / 14, abs=2.0 ** (5 - bits) + 1e-16)


@calm
@given(methods(), st.integers(2, 5))
def test_gradients_are_the_derivatives_of_the_residuals(
    method: tuple[list[list[Exact]], list[Exact]], order: int
) -> None:
    """Against central differences in exact arithmetic, whose error is of second order in the step 1e-9."""
    matrix, weights = method
    step = Fraction(1, 10**9)
    floats = np.array([[float(x) for x in row] for row in matrix])
    row = np.array([[float(x) for x in weights]])
    found = Sensitivities(floats).matrix_gradients(trees(order), row)[0]
    scale = np.abs(found).max() + float(sum(map(abs, weights))) * (1 + np.abs(floats).sum()) ** order
    s = len(weights)
    i, j = order % s, (order + 1) % s
    for which, tree in enumerate(trees(order)):
        values = []
        for sign in (1, -1):
            moved = [list(entries) for entries in matrix]
            moved[i][j] = moved[i][j] + sign * step
            values.append(by_recursion(tree, moved, weights))
        derivative = float((values[0] - values[1]) / (2 * step))
        assert found[which, i, j] == pytest.approx(derivative, abs=1e-10 * scale)


def test_a_residual_that_is_a_pure_root_is_not_zero() -> None:
    arithmetic = ScaledSurds([[Exact(0), Exact(0)], [Exact(0, 1, 5), Exact(0)]], 5)
    weights = arithmetic.vector([Exact(Fraction(1, 2), 1, 5), Exact(Fraction(1, 2))])
    residual = arithmetic.residual(weights, trees(1)[0], arithmetic.ones(), Fraction(1))
    assert residual == Exact(0, 1, 5)


def test_the_bound_of_a_vector_counts_its_negative_entries() -> None:
    arithmetic = FixedPoint([[Exact(-3), Exact(0)], [Exact(1), Exact(0)]], 8)
    assert arithmetic.apply(arithmetic.ones()).largest == 3 << 8


def test_stage_vectors_in_float64_follow_the_trees() -> None:
    matrix = np.array([[0.25, -1.0], [0.5, 2.0]])
    c = matrix.sum(axis=1)
    found = Sensitivities(matrix).stage_vectors(trees(4))
    expected = [c**3, c * (matrix @ c), matrix @ c**2, matrix @ matrix @ c]
    assert np.allclose(found, expected, rtol=1e-15)


def test_gradients_come_in_pieces_that_cover_all_trees() -> None:
    same = trees(7)
    sensitivities = Sensitivities(np.tril(np.ones((300, 300)), -1))
    pieces = list(sensitivities.in_pieces(same, 2))
    assert [len(piece) for piece in pieces] == [21, 21, 6]  # 2·300·307 numbers a tree, 4 million at once
    assert [tree for piece in pieces for tree in piece] == list(same)
