"""Rooted trees by order: the index set of the order conditions.

A rooted tree of order n stands for one elementary differential, and for one condition that the coefficients
of a method of order n must meet (Cayley 1857 counted the trees; Butcher 1963 tied them to the methods). The
trees are kept in one flat list, lowest order first, in which each tree also names two earlier ones, `rest`
and `last`: grafting the tree `last` onto the root of `rest` gives the tree. Everything that is computed on
trees is therefore one pass over that list.
"""

from __future__ import annotations

from functools import cached_property, lru_cache
from itertools import groupby
from math import factorial, prod
from threading import Lock
from typing import TYPE_CHECKING

import attrs
import numpy as np

if TYPE_CHECKING:
    from collections.abc import Iterator

    from numpy.typing import NDArray

__all__ = ["Tree", "grafts", "tree_at", "tree_count", "trees", "trees_up_to"]


@attrs.frozen(eq=False, slots=False)
class Tree:
    """A rooted tree, one object for each (compare with `is` or `==`).

    `index` is its place in the list of all trees, from 0; `order` the number of its vertices; `children` the
    trees left when the root is cut off, by increasing index; `rest` and `last` are the index of the tree
    without its last child and of that child, both −1 for the single vertex. Unitless integers throughout.

    >>> tree = trees(4)[1]
    >>> tree.bracket, tree.symmetry, tree.density, tree.orderings
    ('[τ,[τ]]', 1, 8, 3)
    """

    index: int
    order: int
    children: tuple[Tree, ...] = attrs.field(repr=False)
    rest: int = attrs.field(repr=False)
    last: int = attrs.field(repr=False)

    @cached_property
    def symmetry(self) -> int:
        """The order σ of the symmetry group of the tree (Butcher, Numerical Methods for ODEs, §30)."""
        runs = ((child, len(list(same))) for child, same in groupby(self.children))
        return prod(factorial(count) * child.symmetry**count for child, count in runs)

    @cached_property
    def density(self) -> int:
        """The product γ of the orders of all subtrees; the condition asks for 1/γ."""
        return self.order * prod(child.density for child in self.children)

    @property
    def orderings(self) -> int:
        """The number α = n!/(σγ) of ways to label the vertices so that labels grow away from the root."""
        return factorial(self.order) // (self.symmetry * self.density)

    @cached_property
    def bracket(self) -> str:
        """The tree in bracket notation: `τ` is the single vertex, `[t1,t2]` has t1 and t2 on its root."""
        return f"[{','.join(child.bracket for child in self.children)}]" if self.children else "τ"

    def __str__(self) -> str:
        return self.bracket


class _Forest:
    """All trees made so far; grows by whole orders and never shrinks."""

    def __init__(self) -> None:
        self.all: list[Tree] = [Tree(0, 1, (), -1, -1)]
        self.by_order: list[tuple[Tree, ...]] = [(), (self.all[0],)]
        self.found: dict[tuple[int, ...], int] = {(): 0}
        self.lock = Lock()

    def grow(self, order: int) -> None:
        with self.lock:
            while len(self.by_order) <= order:
                self._add_order(len(self.by_order))

    def _add_order(self, order: int) -> None:
        start = len(self.all)
        for children in list(self._families(order - 1, 0)):
            self.found[children] = len(self.all)
            rest = self.found[children[:-1]]
            grown = tuple(self.all[child] for child in children)
            self.all.append(Tree(len(self.all), order, grown, rest, children[-1]))
        self.by_order.append(tuple(self.all[start:]))

    def _families(self, vertices: int, lowest: int) -> Iterator[tuple[int, ...]]:
        """Yield each multiset of trees from index `lowest` on with so many vertices, in lexical order."""
        if vertices == 0:
            yield ()
            return
        for index in range(lowest, len(self.all)):
            order = self.all[index].order
            if order > vertices:
                return
            for others in self._families(vertices - order, index):
                yield (index, *others)


_FOREST = _Forest()


def trees(order: int) -> tuple[Tree, ...]:
    """Return all rooted trees with `order` vertices, the bushiest first.

    Their number is 1, 1, 2, 4, 9, 20, 48, 115, 286, 719, … (OEIS A000081); they are made once and kept.

    Raises:
        ValueError: `order` is below 1.

    >>> [tree.bracket for tree in trees(4)]
    ['[τ,τ,τ]', '[τ,[τ]]', '[[τ,τ]]', '[[[τ]]]']
    """
    if order < 1:
        raise ValueError(f"order {order}: trees have at least one vertex")
    _FOREST.grow(order)
    return _FOREST.by_order[order]


def trees_up_to(order: int) -> list[Tree]:
    """Return all trees with at most `order` vertices; entry i has index i.

    >>> len(trees_up_to(8))
    200
    """
    trees(order)
    return _FOREST.all[: sum(len(same) for same in _FOREST.by_order[: order + 1])]


def tree_at(index: int) -> Tree:
    """Return the tree with this index in the list of all trees.

    >>> tree_at(3).bracket
    '[[τ]]'
    """
    while index >= len(_FOREST.all):
        _FOREST.grow(len(_FOREST.by_order))
    return _FOREST.all[index]


@lru_cache(maxsize=32)
def grafts(order: int) -> tuple[NDArray[np.intp], NDArray[np.intp], NDArray[np.int64]]:
    """Return `rest`, `last` and `density` of all trees with `order` vertices as arrays, read-only.

    >>> [array.tolist() for array in grafts(3)]
    [[1, 0], [0, 1], [3, 6]]
    """
    some = trees(order)
    arrays = (
        np.array([tree.rest for tree in some], dtype=np.intp),
        np.array([tree.last for tree in some], dtype=np.intp),
        np.array([tree.density for tree in some], dtype=np.int64),
    )
    for array in arrays:
        array.setflags(write=False)
    return arrays


def tree_count(order: int) -> int:
    """Return the number of trees with `order` vertices without making them.

    By Cayley's recurrence n·a(n+1) = Σ_{k=1..n} (Σ_{d|k} d·a(d))·a(n−k+1).

    >>> tree_count(20)
    12826228
    """
    counts = [0, 1]
    divisors = [0]
    for n in range(1, order):
        divisors.append(sum(d * counts[d] for d in range(1, n + 1) if n % d == 0))
        counts.append(sum(divisors[k] * counts[n - k + 1] for k in range(1, n + 1)) // n)
    return counts[order]
