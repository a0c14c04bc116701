"""Norms of the leading local error: how accurate a method is beside others of its order."""

from __future__ import annotations

from collections.abc import Iterable
from fractions import Fraction
from functools import lru_cache
from math import isqrt
from operator import mul

from newel.methods.tableau import Row, Tableau
from newel.methods.trees import trees, trees_up_to

__all__ = ["HIGHEST", "error_norm", "error_terms", "largest_error_term", "norm_of"]

HIGHEST = 13
"""The highest order of trees that is summed over: 12,486 trees, some seconds at most."""

_BITS = 512


def error_terms(tableau: Tableau, order: int, embedded: bool = False) -> list[Fraction] | None:
    """Return the error coefficient τ(t) = (bᵀΦ(t) − 1/γ(t))/σ(t) of every tree t of one order.

    The local error of a step h is the sum over the trees of τ(t)·h^n·F(t)(y), F(t) the elementary
    differential. Source: J. R. Dormand and P. J. Prince, J. Comput. Appl. Math. 6 (1980) 19-26.

    Args:
        tableau: the method.
        order: n, from 1 to 13.
        embedded: whether the embedded weights are meant.

    Returns:
        One number (unitless) a tree, in the order of `trees(n)`, right to more than 60 digits behind the
        point; None for a higher order, or where there are no embedded weights to go by.

    >>> euler = Tableau("euler-1", order=1, matrix=[[]], weights=[1])
    >>> [float(term) for term in error_terms(euler, 2)]
    [-0.5]
    """
    weights = tableau.embedded_weights if embedded else tableau.weights
    if weights is None or order > HIGHEST:
        return None
    return [Fraction(x, 1 << 2 * _BITS) for x in _scaled_terms(tableau.matrix, weights, order)]


@lru_cache(maxsize=8)
def _scaled_terms(matrix: tuple[Row, ...], weights: Row, order: int) -> tuple[int, ...]:
    """Return the error coefficients in units of 2^−(2·bits); integers, as fractions cancel all the time."""
    stages = _stage_vectors(matrix, order)
    b = [x.scaled_floor(_BITS) for x in weights]
    one = 1 << 2 * _BITS
    return tuple(
        (sum(map(mul, b, stages[tree.index])) - one // tree.density) // tree.symmetry for tree in trees(order)
    )


def norm_of(terms: Iterable[Fraction]) -> float:
    """Return the root of the sum of squares of numbers, right to float64 where it is above 10⁻¹⁰⁰.

    >>> norm_of([Fraction(3), Fraction(-4)])
    5.0
    """
    scaled = ((x.numerator << _BITS) // x.denominator for x in terms)
    return float(Fraction(isqrt(sum(x * x for x in scaled)), 1 << _BITS))


@lru_cache(maxsize=2)
def _stage_vectors(matrix: tuple[Row, ...], order: int) -> list[list[int]]:
    """Return Φ(t), in units of 2^−bits, of every tree of up to `order` vertices.

    Grafting `last` onto the root of `rest` multiplies: Φ(t) = Φ(rest)·(A Φ(last)), entry by entry.
    """
    rows = [[x.scaled_floor(_BITS) for x in row[:i]] for i, row in enumerate(matrix)]
    stages: list[list[int]] = []
    grafted: dict[int, list[int]] = {}
    for tree in trees_up_to(order):
        if tree.last < 0:
            stages.append([1 << _BITS] * len(matrix))
            continue
        if tree.last not in grafted:
            grafted[tree.last] = [sum(map(mul, row, stages[tree.last])) >> _BITS for row in rows]
        stages.append([x * y >> _BITS for x, y in zip(stages[tree.rest], grafted[tree.last], strict=True)])
    return stages


def error_norm(tableau: Tableau, order: int | None = None, embedded: bool = False) -> float | None:
    """Return A₂⁽ⁿ⁾, the root of the sum of τ(t)² over all trees of order n: the principal error norm.

    Args:
        tableau: the method.
        order: n; one more than the order that the weights claim where it is left out.
        embedded: whether the embedded weights are meant.

    Returns:
        A number (unitless), smaller is better; None where `error_terms` is.

    >>> error_norm(Tableau("euler-1", order=1, matrix=[[]], weights=[1]))
    0.5
    """
    terms = error_terms(tableau, _asked(tableau, order, embedded), embedded)
    if terms is None:
        return None
    return norm_of(terms)


def largest_error_term(tableau: Tableau, order: int | None = None, embedded: bool = False) -> float | None:
    """Return the largest |τ(t)| over all trees of order n; arguments and None are those of `error_norm`.

    >>> largest_error_term(Tableau("euler-1", order=1, matrix=[[]], weights=[1]))
    0.5
    """
    terms = error_terms(tableau, _asked(tableau, order, embedded), embedded)
    return None if terms is None else float(max(abs(term) for term in terms))


def _asked(tableau: Tableau, order: int | None, embedded: bool) -> int:
    if order is not None:
        return order
    claimed = tableau.embedded_order if embedded else tableau.order
    return (claimed or 0) + 1
