"""The stability polynomial: what one step does to y' = λy."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from fractions import Fraction
from math import factorial, lcm
from operator import mul

from newel.methods.exact import Exact
from newel.methods.tableau import Row, Tableau

__all__ = ["growth_polynomial", "stability_polynomial"]

_BITS = 512
_KEPT = 256
_CLOSE = Fraction(1, 10**9)


def stability_polynomial(tableau: Tableau, embedded: bool = False) -> tuple[Exact, ...] | None:
    """Return the coefficients r₀, r₁, … of R(z) = 1 + Σ_k (bᵀ A^{k−1} 1) z^k, exactly.

    A step of length h takes y' = λy from y to R(hλ)·y. A method of order p has r_k = 1/k! up to k = p.
    Source: J. D. Lambert, Computational Methods in Ordinary Differential Equations (1973), chapter 4.

    Args:
        tableau: the method.
        embedded: whether the embedded weights are meant.

    Returns:
        At most s + 1 exact numbers (unitless), the last of them not zero; None where the tableau mixes two
        square roots, or has no embedded weights to go by.

    >>> heun = Tableau("heun-2", order=2, matrix=[[], [1]], weights=["1/2", "1/2"])
    >>> [str(r) for r in stability_polynomial(heun)]
    ['1', '1', '1/2']
    """
    weights = tableau.embedded_weights if embedded else tableau.weights
    if weights is None:
        return None
    radicands = {x.radicand for row in (*tableau.matrix, weights) for x in row} - {1}
    if len(radicands) > 1:
        return None
    coefficients = [Exact(1), *_moments(tableau.matrix, weights, max(radicands, default=1))]
    while not coefficients[-1]:
        coefficients.pop()
    return tuple(coefficients)


def growth_polynomial(tableau: Tableau, embedded: bool = False) -> tuple[Exact, ...] | None:
    """Return the stability polynomial as it is meant, where the printed numbers are rounded.

    Rounded coefficients meet r_k = 1/k! up to the order p only to their digits, and a limit would hang on the
    last of them: up to the claimed order 1/k! itself is taken where it is met to 9 digits, beyond it r_k to
    256 + 16k bits. Exact methods are left as they are, but for those that mix two square roots, which are
    computed to 512 bits in the same way.

    Args:
        tableau: the method.
        embedded: whether the embedded weights are meant.

    Returns:
        Exact numbers (unitless) as in `stability_polynomial`; None where there are no embedded weights.

    >>> euler = Tableau("euler-1", order=1, matrix=[[]], weights=["0.9999999999"], digits=10)
    >>> [str(r) for r in growth_polynomial(euler)]
    ['1', '1']
    """
    weights = tableau.embedded_weights if embedded else tableau.weights
    if weights is None:
        return None
    exact = stability_polynomial(tableau, embedded)
    if exact is not None and tableau.is_exact:
        return exact
    found = _fixed_point(tableau.matrix, weights) if exact is None else exact
    order = (tableau.embedded_order if embedded else tableau.order) or 0
    meant = [_meant(r, k, order) for k, r in enumerate(found)]
    while not meant[-1]:
        meant.pop()
    return tuple(meant)


def _meant(r: Exact, k: int, order: int) -> Exact:
    series = Fraction(1, factorial(k))
    if k <= order and abs(r - series) < _CLOSE * series:
        return Exact(series)
    # Long polynomials have coefficients down to (2s²)^−k: they need their bits behind those zeros.
    bits = _KEPT + 16 * k
    return Exact(Fraction(r.scaled_floor(bits), 1 << bits))


def _fixed_point(matrix: Sequence[Row], weights: Row) -> list[Exact]:
    """Return the coefficients to 512 bits, whatever square roots occur."""
    rows = [[x.scaled_floor(_BITS) for x in row[:i]] for i, row in enumerate(matrix)]
    b, x = [w.scaled_floor(_BITS) for w in weights], [1 << _BITS] * len(weights)
    found = [Exact(1)]
    for _ in weights:
        found.append(Exact(Fraction(sum(map(mul, b, x)), 1 << 2 * _BITS)))
        x = [sum(map(mul, row, x)) >> _BITS for row in rows]
    return found


def _moments(matrix: Sequence[Row], weights: Row, radicand: int) -> list[Exact]:
    """Return bᵀA^k 1 for k = 0, 1, …: integers over common denominators, so that no fraction is cancelled."""
    below, scale = _denominator(x for row in matrix for x in row), _denominator(weights)
    rows = [_pair(row[:i], below) for i, row in enumerate(matrix)]
    b = _pair(weights, scale)
    x, y = [1] * len(weights), [0] * len(weights)
    moments = []
    for _ in weights:
        rational, surd = _product(b, x, y, radicand)
        moments.append(Exact(Fraction(rational, scale), Fraction(surd, scale), radicand))
        products = [_product(row, x, y, radicand) for row in rows]
        x, y = [p for p, _ in products], [q for _, q in products]
        scale *= below
    return moments


def _denominator(numbers: Iterable[Exact]) -> int:
    return lcm(*(lcm(x.rational.denominator, x.surd.denominator) for x in numbers))


def _pair(row: Row, scale: int) -> tuple[list[int], list[int]]:
    return [int(x.rational * scale) for x in row], [int(x.surd * scale) for x in row]


def _product(row: tuple[list[int], list[int]], x: list[int], y: list[int], radicand: int) -> tuple[int, int]:
    a, b = row
    rational = sum(map(mul, a, x)) + radicand * sum(map(mul, b, y))
    return rational, sum(map(mul, a, y)) + sum(map(mul, b, x))
