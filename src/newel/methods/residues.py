"""Exact zeros of many order conditions at once, by residues modulo primes.

Scaled by the common denominator D of A, the stage vector of a tree of order n is an integer vector,
D^(n−1)·Φ, and so is γ·bᵀΦ − 1 after scaling by the denominator of b. An integer of modulus at most B that
vanishes modulo primes whose product exceeds B is zero; one that does not vanish modulo one of
them is not. Both are proofs.
In Q(√d) the primes are such that d has a root r modulo them: √d → r and √d → −r are two homomorphisms, and
a + b√d vanishes under both exactly where a and b vanish (the usual Chinese remainder argument; D. E. Knuth,
The Art of Computer Programming 2, section 4.3.2).

The primes are small enough for the sums of products of an s×s matrix to stay below 2^53, where float64 is
exact whatever the order of summation, so that all trees of one order are one matrix product.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from functools import lru_cache
from math import factorial, isqrt, lcm
from typing import TYPE_CHECKING, Any, TypeAlias

import numpy as np

from newel.methods.trees import grafts, trees

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from newel.methods.elementary_weights import Matrix, Row
    from newel.methods.exact import Exact

__all__ = ["Residues"]

MOST_NUMBERS = 4_000_000
LARGEST_INTEGER = 2**53
IntegerPairs: TypeAlias = list[tuple[int, int]]


class Residues:
    """The order conditions of one exact matrix, decided modulo primes.

    Args:
        matrix: s rows of s exact numbers of Q(√radicand).
        radicand: d, or 1 where all are rational.

    >>> from newel.methods.exact import Exact
    >>> A = [[Exact.of(0), Exact.of(0)], [Exact.of("1/2"), Exact.of(0)]]
    >>> midpoint = Exact.of(0), Exact.of(1)
    >>> Residues(A, 1).zeros([(midpoint, None)], 3)
    array([[ True,  True, False, False]])
    """

    def __init__(self, matrix: Matrix, radicand: int) -> None:
        self.radicand = radicand
        self.denominator = _common_denominator([x for row in matrix for x in row])
        self.rows = [_pairs(row, self.denominator) for row in matrix]
        self.row_sum = max(self._size(row) for row in self.rows)

    def zeros(self, formulas: Sequence[tuple[Row, int | None]], order: int) -> NDArray[np.bool_]:
        """Return which conditions hold exactly.

        Args:
            formulas: weights, and the power k of θ that they belong to, or None for the end of the step.
            order: the highest order of the trees.

        Returns:
            Shape (number of formulas, number of trees up to `order`); True where the residual is zero.
        """
        below = [_common_denominator(weights) for weights, _ in formulas]
        vectors = [_pairs(weights, d) for (weights, _), d in zip(formulas, below, strict=True)]
        powers = [power for _, power in formulas]
        holds = np.ones((len(formulas), trees(order)[-1].index + 1), dtype=bool)
        for prime, root in self._homomorphisms(vectors, below, order):
            field = _Field(prime, root, self.rows, self.denominator)
            targets = [(field.row(v), d, k) for v, d, k in zip(vectors, below, powers, strict=True)]
            for start, residual in field.residuals(targets, order):
                holds[:, start : start + residual.shape[1]] &= residual == 0
        return holds

    def _homomorphisms(
        self, vectors: Sequence[IntegerPairs], below: Sequence[int], order: int
    ) -> Iterator[tuple[int, int]]:
        """Yield primes, each with a root of d modulo it, until their product exceeds every integer."""
        total = max(map(self._size, vectors))
        bound = max(
            factorial(n) * total * self.row_sum ** (n - 1) + max(below) * self.denominator ** (n - 1)
            for n in range(1, order + 1)
        )
        product = 1
        largest = 2 * isqrt(LARGEST_INTEGER // max(len(self.rows), 4)) - 8
        for prime in _primes_below(largest):
            roots = [0] if self.radicand == 1 else _square_roots(self.radicand, prime)
            if not roots:
                continue
            yield from ((prime, root) for root in roots)
            product *= prime
            if product > bound:
                return
        raise ArithmeticError("the primes of one word do not suffice")  # beyond any allowed size of numbers

    def _size(self, row: IntegerPairs) -> int:
        """Return an upper bound of the sum of moduli, in both real embeddings."""
        root = isqrt(self.radicand) + 1
        return sum(abs(a) + root * abs(b) for a, b in row)


class _Field:
    """The stage vectors of all trees modulo one prime, as float64 integers of least modulus."""

    def __init__(self, prime: int, root: int, rows: Sequence[IntegerPairs], denominator: int) -> None:
        self.prime, self.root, self.denominator = prime, root, denominator
        self.matrix = np.array([self.row(row) for row in rows])

    def row(self, pairs: IntegerPairs) -> NDArray[np.float64]:
        """Return the image of a row of integers a + b√d."""
        p, r = self.prime, self.root
        return np.array([_least((a + b * r) % p, p) for a, b in pairs], dtype=np.float64)

    def residuals(
        self, targets: Sequence[tuple[NDArray[np.float64], int, int | None]], order: int
    ) -> Iterator[tuple[int, NDArray[np.float64]]]:
        """Yield an index and the residuals of the trees from there on, shape (formulas, trees)."""
        s = len(self.matrix)
        weights = np.array([row for row, _, _ in targets]).T
        stages = np.ones((1, s))
        applied = self._reduced(stages @ self.matrix.T)
        yield 0, self._against(stages @ weights, 1, np.ones(1), targets)
        piece = max(1, MOST_NUMBERS // s)
        for n in range(2, order + 1):
            grown = []
            rest, last, density = grafts(n)
            for start in range(0, len(rest), piece):
                some = slice(start, start + piece)
                found = self._reduced(stages[rest[some]] * applied[last[some]])
                residual = self._against(found @ weights, n, density[some] % self.prime, targets)
                yield trees(n)[start].index, residual
                if n < order:
                    grown.append(found)
            if grown:
                new = np.concatenate(grown)
                stages = np.concatenate([stages, new])
                applied = np.concatenate([applied, self._reduced(new @ self.matrix.T)])

    def _against(
        self,
        sums: NDArray[np.float64],
        n: int,
        density: NDArray[Any],
        targets: Sequence[tuple[NDArray[np.float64], int, int | None]],
    ) -> NDArray[np.float64]:
        p = self.prime
        residual = self._reduced(self._reduced(sums.T) * density.astype(np.float64))
        scale = pow(self.denominator, n - 1, p)
        wanted = [_least(below * scale % p, p) if power in (None, n) else 0.0 for _, below, power in targets]
        return self._reduced(residual - np.array(wanted)[:, None])

    def _reduced(self, values: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return integers below 2^53 modulo the prime; zero comes out as zero, whatever the quotient."""
        quotient = values * (1.0 / self.prime)
        np.rint(quotient, out=quotient)
        quotient *= -self.prime
        quotient += values
        return quotient


def _least(residue: int, prime: int) -> float:
    return float(residue - prime if 2 * residue > prime else residue)


@lru_cache(maxsize=8)
def _primes_below(limit: int) -> tuple[int, ...]:
    """Return the 1,000 largest primes below a limit of some millions, the largest first."""
    small = np.ones(isqrt(limit) + 2, dtype=bool)
    small[:2] = False
    for n in range(2, isqrt(len(small)) + 1):
        small[n * n :: n] = False
    start = limit - 24_000
    sieve = np.ones(24_000, dtype=bool)
    for prime in np.flatnonzero(small).tolist():
        sieve[-start % prime :: prime] = False
    return tuple((np.flatnonzero(sieve) + start)[::-1][:1000].tolist())


def _square_roots(d: int, prime: int) -> list[int]:
    """Return both roots of d modulo a prime ≡ 3 mod 4; none for another prime, or where there is no root."""
    if prime % 4 != 3 or d % prime == 0:
        return []
    root = pow(d, (prime + 1) // 4, prime)
    return [root, prime - root] if root * root % prime == d % prime else []


def _common_denominator(row: Sequence[Exact]) -> int:
    return lcm(*(lcm(x.rational.denominator, x.surd.denominator) for x in row))


def _pairs(row: Sequence[Exact], scale: int) -> IntegerPairs:
    return [(int(x.rational * scale), int(x.surd * scale)) for x in row]
