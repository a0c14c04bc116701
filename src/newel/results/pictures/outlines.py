"""Contour lines of a field on a grid, joined to polylines."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

__all__ = ["Line", "outlines"]

Line = tuple[tuple[float, float], ...]
"""A polyline as points (x, y)."""

_Edge = tuple[int, int, int]


def outlines(x: NDArray[np.float64], y: NDArray[np.float64], field: NDArray[np.float64]) -> tuple[Line, ...]:
    """Return the lines where a field is 0, by marching over the cells of a grid.

    Each cell is crossed where its corners differ in sign; the place on an edge is linear. Source: G. Wyvill,
    C. McPheeters and B. Wyvill, The Visual Computer 2 (1986) 227-234, in two dimensions.

    Args:
        x: ascending, shape (n,).
        y: ascending, shape (m,).
        field: shape (m, n); negative inside. A point of exactly 0 counts as inside.

    >>> x = y = np.array([-1.0, 0.0, 1.0])
    >>> sorted(outlines(x, y, x[None, :] ** 2 + y[:, None] ** 2 - 0.5)[0])[0]
    (-0.5, 0.0)
    """
    inside = field <= 0.0
    corners = inside[:-1, :-1].astype(int) + inside[:-1, 1:] + inside[1:, :-1] + inside[1:, 1:]
    links: dict[_Edge, list[_Edge]] = {}
    for i, j in zip(*np.nonzero((corners > 0) & (corners < 4)), strict=True):
        for one, other in _crossed(inside, field, int(i), int(j)):
            links.setdefault(one, []).append(other)
            links.setdefault(other, []).append(one)
    places = {edge: _place(x, y, field, edge) for edge in links}
    return tuple(tuple(places[edge] for edge in chain) for chain in _chains(links))


def _crossed(
    inside: NDArray[np.bool_], field: NDArray[np.float64], i: int, j: int
) -> Iterator[tuple[_Edge, _Edge]]:
    """Yield the pairs of edges that the line joins in one cell; an edge is (0 along x or 1 along y, i, j)."""
    bottom, right, top, left = (0, i, j), (1, i, j + 1), (0, i + 1, j), (1, i, j)
    a, b = inside[i, j], inside[i, j + 1]
    c, d = inside[i + 1, j + 1], inside[i + 1, j]
    cut = [
        edge for edge, is_cut in ((bottom, a != b), (right, b != c), (top, c != d), (left, d != a)) if is_cut
    ]
    if len(cut) == 2:
        yield cut[0], cut[1]
        return
    # A saddle: the mean of the corners decides which two corners hang together.
    joined = bool(field[i : i + 2, j : j + 2].mean() <= 0.0) == bool(a)
    yield (bottom, right) if joined else (bottom, left)
    yield (top, left) if joined else (top, right)


def _place(
    x: NDArray[np.float64], y: NDArray[np.float64], field: NDArray[np.float64], edge: _Edge
) -> tuple[float, float]:
    along_y, i, j = edge
    here, there = field[i, j], field[i + along_y, j + 1 - along_y]
    part = float(here / (here - there))
    if along_y:
        return float(x[j]), float(y[i] + part * (y[i + 1] - y[i]))
    return float(x[j] + part * (x[j + 1] - x[j])), float(y[i])


def _chains(links: dict[_Edge, list[_Edge]]) -> Iterator[list[_Edge]]:
    """Yield each line as the edges that it crosses: open ones from an end, closed ones back to the start."""
    left = {edge: list(ends) for edge, ends in links.items()}
    starts = [edge for edge, ends in links.items() if len(ends) == 1]
    for start in [*starts, *links]:
        if not left[start]:
            continue
        chain = [start]
        while left[chain[-1]]:
            following = left[chain[-1]].pop()
            left[following].remove(chain[-1])
            chain.append(following)
        yield chain
