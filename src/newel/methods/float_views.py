"""What float64 leaves of the order conditions of an exact method of high order.

With A' and b' the float64 views of A and b, and w = A Φ(last), each stage vector obeys
Φ'(t) − Φ(t) = Δ(rest)·w' + Φ'(rest)·(w' − w) − Δ(rest)·(w' − w), and w' − w = (A' − A) Φ'(last) + A Δ(last).
Where the exact conditions hold, the residual of the views is (b' − b)ᵀΦ' + bᵀΔ: a small number made of small
numbers, that float64 finds to nearly all its digits. The error of that is bounded a priori: by the number of
roundings on any way through the formula, times the same formula with moduli in place of all numbers
(N. J. Higham, Accuracy and Stability of Numerical Algorithms, section 3.1).
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from fractions import Fraction
from typing import TYPE_CHECKING

import attrs
import numpy as np

from newel.methods.exact import Exact
from newel.methods.trees import grafts

if TYPE_CHECKING:
    from numpy.typing import NDArray

    Floats = NDArray[np.float64]

__all__ = ["largest_float_residual"]

MOST_NUMBERS = 2_000_000
UNIT = 2.0**-53


@attrs.frozen
class _Stages:
    """Φ' and Δ of some trees, and the moduli that bound both; each of shape (trees, s)."""

    views: Floats
    deltas: Floats
    view_sizes: Floats
    delta_sizes: Floats

    def part(self, indices: NDArray[np.intp]) -> _Stages:
        return _Stages(*(array[indices] for array in attrs.astuple(self, recurse=False)))

    @classmethod
    def joined(cls, pieces: Sequence[_Stages]) -> _Stages:
        columns = zip(*(attrs.astuple(piece, recurse=False) for piece in pieces), strict=True)
        return cls(*(np.concatenate(column) for column in columns))


def largest_float_residual(
    matrix: Sequence[Sequence[Exact]],
    weights: Sequence[Exact],
    views: Floats,
    weight_views: Floats,
    order: int,
) -> float:
    """Return an upper bound of |b'ᵀΦ'(t) − 1/γ(t)| over all trees up to an order that is proved exactly.

    Args:
        matrix, weights: the exact numbers, which meet every condition up to `order`.
        views, weight_views: the same in float64, shapes (s, s) and (s,).
        order: the highest order of the trees.

    >>> A = [[Exact.of(0), Exact.of(0)], [Exact.of("1/2"), Exact.of(0)]]
    >>> b = [Exact.of(0), Exact.of(1)]
    >>> largest_float_residual(A, b, np.array([[0.0, 0.0], [0.5, 0.0]]), np.array([0.0, 1.0]), 2)
    0.0
    """
    s = len(weights)
    step = _Step(views, np.array([_differences(a, x) for a, x in zip(views, matrix, strict=True)]))
    b, db = weight_views, _differences(weight_views, weights)
    roundings = 2 * order * (s + 8) * UNIT
    largest = 0.0
    for stages in step.by_order(order):
        residual = np.abs(stages.views @ db + stages.deltas @ (b - db))
        size = stages.view_sizes @ np.abs(db) + stages.delta_sizes @ (np.abs(b) + np.abs(db))
        largest = max(largest, float((residual + roundings * size).max()))
    return largest


def _differences(views: Floats, exact: Sequence[Exact]) -> Floats:
    return np.array([float(Fraction(v) - x) for v, x in zip(views.tolist(), exact, strict=True)])


class _Step:
    """One matrix, its float64 view A', and A' − A; the formulas of the module's head."""

    def __init__(self, views: Floats, differences: Floats) -> None:
        self.views, self.differences = views.T, differences.T
        self.exact = self.views - self.differences
        self.view_sizes, self.difference_sizes = np.abs(self.views), np.abs(self.differences)
        self.exact_sizes = self.view_sizes + self.difference_sizes

    def by_order(self, order: int) -> Iterator[_Stages]:
        """Yield the stage vectors of all trees, lowest order first, in pieces."""
        s = len(self.views)
        one, zero = np.ones((1, s)), np.zeros((1, s))
        known = _Stages(one, zero, one, zero)
        applied = self.applied(known)
        yield known
        piece = max(1, MOST_NUMBERS // s)
        for n in range(2, order + 1):
            grown = []
            rest, last, _ = grafts(n)
            for start in range(0, len(rest), piece):
                some = slice(start, start + piece)
                grown.append(self.grafted(known.part(rest[some]), applied.part(last[some])))
                yield grown[-1]
                if n == order:
                    grown.clear()
            if grown:
                known = _Stages.joined([known, *grown])
                applied = _Stages.joined([applied, *map(self.applied, grown)])

    def applied(self, v: _Stages) -> _Stages:
        """Return w' and w' − w."""
        return _Stages(
            v.views @ self.views,
            v.views @ self.differences + v.deltas @ self.exact,
            v.view_sizes @ self.view_sizes,
            v.view_sizes @ self.difference_sizes + v.delta_sizes @ self.exact_sizes,
        )

    @staticmethod
    def grafted(rest: _Stages, w: _Stages) -> _Stages:
        """Return Φ' and Δ of the trees that are grafted from `rest` and those that gave w."""
        return _Stages(
            rest.views * w.views,
            rest.deltas * (w.views - w.deltas) + rest.views * w.deltas,
            rest.view_sizes * w.view_sizes,
            rest.delta_sizes * (w.view_sizes + w.delta_sizes) + rest.view_sizes * w.delta_sizes,
        )
