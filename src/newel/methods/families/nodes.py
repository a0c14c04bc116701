"""Quadrature nodes on [0, 1]: exact where they are rational or hold one square root, else enclosed.

Gauss nodes are the zeros of the shifted Legendre polynomial P_s, Radau nodes (with 1 among them) those of
P_s − P_{s−1}, Lobatto nodes 0, 1 and the zeros of P′_{s−1} (M. Abramowitz and I. A. Stegun, Handbook of
Mathematical Functions, 25.4.29-32). An irrational zero is enclosed between decimals where the polynomial, in
exact arithmetic, changes its sign.
"""

from __future__ import annotations

from collections.abc import Callable
from fractions import Fraction

from newel.methods.exact import Exact
from newel.methods.families.enclosures import Enclosure, root_between

__all__ = ["equidistant_nodes", "gauss_nodes", "lobatto_nodes", "radau_nodes"]

Node = Exact | Enclosure

_GAUSS = {
    1: ("1/2",),
    2: ("(3 - sqrt(3))/6", "(3 + sqrt(3))/6"),
    3: ("(5 - sqrt(15))/10", "1/2", "(5 + sqrt(15))/10"),
}
_RADAU = {1: ("1",), 2: ("1/3", "1"), 3: ("(4 - sqrt(6))/10", "(4 + sqrt(6))/10", "1")}
_LOBATTO = {
    2: ("0", "1"),
    3: ("0", "1/2", "1"),
    4: ("0", "(5 - sqrt(5))/10", "(5 + sqrt(5))/10", "1"),
    5: ("0", "(7 - sqrt(21))/14", "1/2", "(7 + sqrt(21))/14", "1"),
}


def gauss_nodes(s: int) -> list[Node]:
    """Return the s Gauss nodes, increasing; their quadrature has order 2s.

    >>> [str(x) for x in gauss_nodes(2)]
    ['(3 - sqrt(3))/6', '(3 + sqrt(3))/6']
    """
    if s in _GAUSS:
        return [Exact.of(x) for x in _GAUSS[s]]
    return [*_zeros(lambda x: _legendre(s, x)[0], s)]


def radau_nodes(s: int) -> list[Node]:
    """Return the s Radau nodes with 1 among them, increasing; their quadrature has order 2s − 1."""
    if s in _RADAU:
        return [Exact.of(x) for x in _RADAU[s]]
    return [*_zeros(lambda x: _legendre(s, x)[0] - _legendre(s - 1, x)[0], s - 1), Enclosure.of(1)]


def lobatto_nodes(s: int) -> list[Node]:
    """Return the s Lobatto nodes, 0 and 1 among them, increasing; their quadrature has order 2s − 2."""
    if s in _LOBATTO:
        return [Exact.of(x) for x in _LOBATTO[s]]
    inner = _zeros(lambda x: _legendre(s - 1, x)[1], s - 2)
    return [Enclosure.of(0), *inner, Enclosure.of(1)]


def equidistant_nodes(s: int) -> list[Node]:
    """Return s equidistant nodes from 0 to 1; their quadrature has order s, and s + 1 for an odd s.

    >>> [str(x) for x in equidistant_nodes(3)]
    ['0', '1/2', '1']
    """
    return [Exact(Fraction(i, s - 1)) for i in range(s)]


def _legendre(n: int, x: Fraction) -> tuple[Fraction, Fraction]:
    """Return P_n and its derivative at 2x − 1 (Bonnet's recursion)."""
    z = 2 * x - 1
    before, value = Fraction(1), z
    for k in range(1, n):
        before, value = value, ((2 * k + 1) * z * value - k * before) / (k + 1)
    return value, n * (before - z * value) / (1 - z * z) if abs(z) < 1 else Fraction(0)


def _zeros(polynomial: Callable[[Fraction], Fraction], expected: int) -> list[Enclosure]:
    """Return the zeros in (0, 1); as many changes of sign as zeros prove that none was missed."""
    cells = 32 * expected * expected + 1
    # An odd number of cells keeps the middle of the interval, which may be a zero, off the grid.
    grid = [Fraction(2 * k + 1, 2 * cells + 2) for k in range(cells + 1)]
    signs = [polynomial(x) > 0 for x in grid]
    found = [root_between(polynomial, grid[k], grid[k + 1]) for k in range(cells) if signs[k] != signs[k + 1]]
    if len(found) != expected:
        raise ArithmeticError(f"{len(found)} zeros where {expected} were to be found")
    return found
