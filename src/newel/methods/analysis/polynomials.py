"""Real roots of integer polynomials, isolated exactly: no sampling, no floating point."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from fractions import Fraction
from functools import reduce
from itertools import pairwise
from math import gcd

import attrs

__all__ = ["Root", "first_descent", "positive_roots", "sign_at", "square_free"]

# Mersenne primes 2^n − 1: the first settles most questions, a longer one holds any common divisor.
_MERSENNE = (127, 521, 1279, 2203, 4423, 9689, 21701, 44497, 110503, 216091)
_PRIMES = (65537, 65539, 65543, 65551, 65557)
_FINE = 72


@attrs.frozen
class Root:
    """One real root, alone in the open interval low < x < high; both ends are dyadic fractions."""

    low: Fraction
    high: Fraction


def sign_at(polynomial: Sequence[int], x: Fraction) -> int:
    """Return the sign of a polynomial, given by its coefficients from the constant on, at a fraction.

    >>> sign_at([-2, 0, 1], Fraction(3, 2))
    1
    """
    total, power = 0, 1
    for coefficient in reversed(polynomial):
        total = total * x.numerator + coefficient * power
        power *= x.denominator
    return (total > 0) - (total < 0)


def square_free(polynomial: Sequence[int]) -> list[int]:
    """Return the polynomial that has the same roots, each of them once.

    The common divisor of p and p′ is computed modulo a prime that is longer than any coefficient a divisor
    can have (the bound of Mignotte, Math. Comp. 28 (1974) 1153-1157), and proved by exact division.

    >>> square_free([-1, 1, 1, -1])
    [-1, 0, 1]
    """
    p = _primitive(polynomial)
    slope = _primitive([k * c for k, c in enumerate(p)][1:]) if len(p) > 1 else [1]
    factor = gcd(p[-1], slope[-1])
    needed = max(abs(c) for c in p).bit_length() + 2 * len(p) + factor.bit_length() + 8
    for bits in _MERSENNE:
        prime = (1 << bits) - 1
        if p[-1] % prime == 0 or slope[-1] % prime == 0:
            continue
        common = _gcd_modulo(p, slope, prime)
        if len(common) == 1:
            return _upright(p)
        if bits < needed:
            continue
        lifted = [c * factor % prime for c in common]
        divisor = _primitive([c - prime if c > prime >> 1 else c for c in lifted])
        quotient = _quotient(p, divisor)
        if quotient is not None and _quotient(slope, divisor) is not None:
            return _upright(quotient)
    raise ArithmeticError("a polynomial with too many digits")


def positive_roots(polynomial: Sequence[int]) -> Iterator[Root]:
    """Yield the positive roots of a square-free polynomial, the smallest first, each alone in an interval.

    Descartes' rule of signs under bisection. Source: G. E. Collins and A. G. Akritas, Polynomial real root
    isolation using Descarte's rule of signs, Proc. SYMSAC (1976) 272-275.

    >>> [(float(r.low) < 2**0.5 < float(r.high)) for r in positive_roots([-2, 0, 1])]
    [True]
    """
    p = list(polynomial)
    while p and not p[0]:
        p.pop(0)
    for prime in _PRIMES:
        found = _isolated(p, _bound(p) * Fraction(prime, 1 << 16))
        if found is not None:
            yield from found
            return
    raise ArithmeticError("no grid misses the roots")


def first_descent(polynomial: Sequence[int]) -> Fraction | None:
    """Return the smallest x ≥ 0 right of which a polynomial is negative, to a relative 2⁻⁷⁰; None if none is.

    Its lowest coefficient decides whether that is 0; a root that is only touched from above does not count.

    >>> first_descent([0, -1, 1]), float(first_descent([0, 2, -1])), float(first_descent([1, -2, 1, -1]))
    (Fraction(0, 1), 2.0, 0.5698402909980532)
    """
    p = list(polynomial)
    while p and not p[-1]:
        p.pop()
    while p and not p[0]:
        p.pop(0)
    if not p:
        return None
    if p[0] < 0:
        return Fraction(0)
    simple = square_free(p)
    for root in positive_roots(simple):
        if sign_at(p, root.high) < 0:
            return _refined(simple, root)
    return None


def _refined(p: Sequence[int], root: Root) -> Fraction:
    low, high, at_low = root.low, root.high, sign_at(p, root.low)
    while (high - low) * (1 << _FINE) > high:
        middle = (low + high) / 2
        sign = sign_at(p, middle)
        if not sign:
            return middle
        low, high = (middle, high) if sign == at_low else (low, middle)
    return (low + high) / 2


def _isolated(p: list[int], bound: Fraction) -> list[Root] | None:
    """Return the roots in (0, bound); None where a point of the grid is a root itself."""
    n = len(p) - 1
    scaled = [c * bound.numerator**k * bound.denominator ** (n - k) for k, c in enumerate(p)]
    todo = [(scaled, Fraction(0), bound)]
    found = []
    while todo:
        q, low, width = todo.pop()
        if not q[0]:
            return None
        changes = _changes(_shifted(q[::-1]))
        if changes == 1:
            found.append(Root(low, low + width))
        elif changes:
            left = [c << (n - k) for k, c in enumerate(q)]
            half = width / 2
            todo.append((_shifted(left), low + half, half))
            todo.append((left, low, half))
    return found


def _bound(p: Sequence[int]) -> Fraction:
    """Return a power of two above every root. Source: M. Fujiwara, Tôhoku Math. J. 10 (1916) 167-171."""
    top, n = abs(p[-1]), len(p) - 1
    bits = 1
    for k, c in enumerate(p[:-1]):
        if c:
            bits = max(bits, 2 + -(-(abs(c).bit_length() - top.bit_length() + 1) // (n - k)))
    return Fraction(1 << bits)


def _shifted(p: Sequence[int]) -> list[int]:
    """Return p(x + 1)."""
    q = list(p)
    for first in range(len(q) - 1):
        for k in range(len(q) - 2, first - 1, -1):
            q[k] += q[k + 1]
    return q


def _changes(p: Sequence[int]) -> int:
    signs = [c > 0 for c in p if c]
    return sum(x != y for x, y in pairwise(signs))


def _upright(p: list[int]) -> list[int]:
    return p if p[-1] > 0 else [-c for c in p]


def _primitive(p: Sequence[int]) -> list[int]:
    content = reduce(gcd, p) or 1
    return [c // content for c in p]


def _gcd_modulo(p: Sequence[int], q: Sequence[int], prime: int) -> list[int]:
    """Return the monic common divisor modulo a prime."""
    a, b = [c % prime for c in p], [c % prime for c in q]
    while b:
        inverse = pow(b[-1], -1, prime)
        while len(a) >= len(b):
            factor, gap = a[-1] * inverse % prime, len(a) - len(b)
            for k, c in enumerate(b):
                a[gap + k] = (a[gap + k] - factor * c) % prime
            while a and not a[-1]:
                a.pop()
        a, b = b, a
    inverse = pow(a[-1], -1, prime)
    return [c * inverse % prime for c in a]


def _quotient(p: Sequence[int], divisor: Sequence[int]) -> list[int] | None:
    """Return p / divisor, or None where that is no integer polynomial."""
    rest, result = list(p), [0] * (len(p) - len(divisor) + 1)
    for gap in range(len(result) - 1, -1, -1):
        factor, left = divmod(rest[gap + len(divisor) - 1], divisor[-1])
        if left:
            return None
        result[gap] = factor
        for k, c in enumerate(divisor):
            rest[gap + k] -= factor * c
    return None if any(rest) else result
