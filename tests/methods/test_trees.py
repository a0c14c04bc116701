"""Rooted trees: complete, without repetition, and tied together by `rest` and `last`."""

from __future__ import annotations

import pytest

from newel.methods.trees import Tree, tree_at, tree_count, trees, trees_up_to

pytestmark = pytest.mark.core


def test_trees_of_one_order_are_all_different_as_unordered_trees() -> None:
    def shape(tree: Tree) -> tuple[object, ...]:
        return tuple(sorted((shape(child) for child in tree.children), key=repr))

    for order in range(1, 10):
        assert len({shape(tree) for tree in trees(order)}) == len(trees(order)) == tree_count(order)


def test_every_tree_has_as_many_vertices_as_its_order_says() -> None:
    for order in range(1, 9):
        assert all(tree.bracket.count("τ") + tree.bracket.count("[") == order for tree in trees(order))
        assert {tree.order for tree in trees(order)} == {order}


def test_a_tree_is_its_last_child_grafted_onto_the_rest() -> None:
    for tree in trees_up_to(8)[1:]:
        rest, last = tree_at(tree.rest), tree_at(tree.last)
        assert (*rest.children, last) == tree.children
        assert rest.order + last.order == tree.order
        assert max(tree.rest, tree.last) < tree.index


def test_the_list_of_trees_is_indexed_by_index_across_orders() -> None:
    for index, tree in enumerate(trees_up_to(7)):
        assert tree.index == index
        assert tree_at(index) is tree


def test_the_first_tree_of_an_order_is_the_bush_and_the_last_the_tall_one() -> None:
    for order in range(2, 9):
        assert trees(order)[0].bracket == "[" + ",".join(["τ"] * (order - 1)) + "]"
        assert trees(order)[-1].bracket == "[" * (order - 1) + "τ" + "]" * (order - 1)


def test_an_order_below_one_is_refused() -> None:
    with pytest.raises(ValueError, match="order 0"):
        trees(0)
