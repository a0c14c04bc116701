"""How strongly each residual of the order conditions answers to each coefficient, in float64.

The proof of a rounded tableau needs, for every tree t, the gradient of bᵀΦ(t) with respect to the entries of
A and b. It is found backwards over the tree, for all trees of one order at once: a vertex whose subtree
carries the multiplier μ hands μ·Φ(rest) to the edge above `last`, and passes μ·(A Φ(last)) to `rest` and
Aᵀ(μ·Φ(rest)) to `last`. A tree of n vertices has n − 1 edges; each adds the outer product of its multiplier
and Φ(last).
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from newel.methods.trees import trees

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    from numpy.typing import NDArray

    from newel.methods.trees import Tree

    Floats = NDArray[np.float64]

__all__ = ["Sensitivities"]

MOST_NUMBERS = 4_000_000


class Sensitivities:
    """Stage vectors and gradients in float64 for one matrix.

    Args:
        matrix: shape (s, s), float64, unitless.

    >>> gradients = Sensitivities(np.array([[0.0, 0.0], [0.5, 0.0]]))
    >>> gradients.matrix_gradients(trees(2), np.array([[0.0, 1.0]]))[0, 0]
    array([[0., 0.],
           [1., 1.]])
    """

    def __init__(self, matrix: Floats) -> None:
        self.matrix = matrix
        self.stages = np.ones((1, len(matrix)))
        self.applied = self.stages @ matrix.T
        self.order = 1
        self.rest = np.array([-1])
        self.last = np.array([-1])

    def stage_vectors(self, wanted: Sequence[Tree]) -> Floats:
        """Return Φ of each tree, shape (number of trees, s): also the gradient with respect to b."""
        self._reach(max(tree.order for tree in wanted))
        return self.stages[[tree.index for tree in wanted]]

    def matrix_gradients(self, wanted: Sequence[Tree], weights: Floats) -> Floats:
        """Return ∂(bᵀΦ(t))/∂A for trees of one order and several weight vectors.

        Args:
            wanted: trees, all of one order.
            weights: shape (f, s).

        Returns:
            Shape (f, number of trees, s, s), float64.
        """
        self._reach(wanted[0].order)
        formulas, s = weights.shape
        edges = wanted[0].order - 1
        if not edges:
            return np.zeros((formulas, len(wanted), s, s))
        tree = np.tile([tree.index for tree in wanted], formulas)
        multiplier = np.repeat(weights, len(wanted), axis=0)
        owner = np.arange(len(tree))
        owners, above, below = [], [], []
        while len(tree):
            rest, last = self.rest[tree], self.last[tree]
            edge = multiplier * self.stages[rest]
            owners.append(owner)
            above.append(edge)
            below.append(self.stages[last])
            tree = np.concatenate([rest, last])
            multiplier = np.concatenate([multiplier * self.applied[last], edge @ self.matrix])
            owner = np.concatenate([owner, owner])
            inner = tree > 0
            tree, multiplier, owner = tree[inner], multiplier[inner], owner[inner]
        place = np.argsort(np.concatenate(owners), kind="stable")
        left = np.concatenate(above)[place].reshape(-1, edges, s)
        right = np.concatenate(below)[place].reshape(-1, edges, s)
        gradients: Floats = left.transpose(0, 2, 1) @ right
        return gradients.reshape(formulas, len(wanted), s, s)

    def in_pieces(self, wanted: Sequence[Tree], formulas: int) -> Iterator[Sequence[Tree]]:
        """Yield the trees in runs whose gradients stay below 32 MB."""
        s = len(self.matrix)
        length = max(1, MOST_NUMBERS // max(1, formulas * s * (s + wanted[0].order)))
        for start in range(0, len(wanted), length):
            yield wanted[start : start + length]

    def _reach(self, order: int) -> None:
        while self.order < order:
            self.order += 1
            new = trees(self.order)
            rest, last = np.array([t.rest for t in new]), np.array([t.last for t in new])
            stages = self.stages[rest] * self.applied[last]
            self.stages = np.concatenate([self.stages, stages])
            self.applied = np.concatenate([self.applied, stages @ self.matrix.T])
            self.rest, self.last = np.concatenate([self.rest, rest]), np.concatenate([self.last, last])
