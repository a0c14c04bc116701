"""A long negative axis: stabilised methods of orders 1 and 2 with any number of stages, from recursions.

The stability polynomial is a shifted Chebyshev or Legendre polynomial of degree s, bounded by 1 on an
interval [−β, 0] whose length grows with s². The recursion of the polynomials becomes that of the stages,
so that a program needs a few registers only, and rounding errors do not build up inside a step.

With y₀ the state and F_j the rate at stage j, all rules here read
y₁ = y₀ + μ̃₁ h F₀ and y_j = (1 − μ_j − ν_j) y₀ + μ_j y_{j−1} + ν_j y_{j−2} + μ̃_j h F_{j−1} + γ̃_j h F₀.

Sources: P. J. van der Houwen and B. P. Sommeijer, Z. Angew. Math. Mech. 60 (1980) 479-485; J. G. Verwer,
W. H. Hundsdorfer and B. P. Sommeijer, Numer. Math. 57 (1990) 157-178; C. D. Meyer, D. S. Balsara and
T. D. Aslam, Mon. Not. R. Astron. Soc. 422 (2012) 2102-2115, and J. Comput. Phys. 257 (2014) 594-626.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from fractions import Fraction
from typing import Any, TypeAlias

import attrs

from newel.errors import BadRequest
from newel.methods.exact import Exact
from newel.methods.families.enclosures import DIGITS, Enclosure, decimal
from newel.methods.tableau import Notes, Tableau

__all__ = ["chebyshev_1", "chebyshev_2", "legendre_1", "legendre_2"]

Number: TypeAlias = Any
"""A Fraction, or an Enclosure where exact numbers would be too long."""

MOST_STAGES = 256
MOST_EXACT = 16
"""Up to so many stages the numbers are written exactly; beyond, they would have hundreds of digits each."""

DAMPING_1 = Fraction(1, 20)
DAMPING_2 = Fraction(2, 13)


@attrs.frozen
class _Term:
    """The factors of one stage."""

    mu: Number
    nu: Number
    rate: Number
    first: Number


Terms: TypeAlias = Callable[[int, Callable[[Fraction], Number]], Iterator[_Term]]


def chebyshev_1(stages: int) -> Tableau:
    """Return `chebyshev-1-stages-<s>`: order 1, R(z) = T_s(w₀ + w₁z)/T_s(w₀), damping ε = 1/20.

    w₀ = 1 + ε/s² and w₁ = T_s(w₀)/T_s′(w₀); the real stability interval is about (2 − 4ε/3)·s², 1.93 s².

    Raises:
        BadRequest: the number of stages is not from 1 to 256.

    >>> chebyshev_1(5)
    <Tableau chebyshev-1-stages-5: order 1, 5 stages>
    """
    return _made("chebyshev", 1, stages, _chebyshev_1, _HOUWEN, "about 1.93 s²")


def chebyshev_2(stages: int) -> Tableau:
    """Return `chebyshev-2-stages-<s>`: order 2, damping ε = 2/13.

    w₀ = 1 + ε/s² and w₁ = T_s′(w₀)/T_s″(w₀); the real stability interval is about 0.65 (s² − 1).

    Raises:
        BadRequest: the number of stages is not from 2 to 256.

    >>> chebyshev_2(10)
    <Tableau chebyshev-2-stages-10: order 2, 10 stages>
    """
    return _made("chebyshev", 2, stages, _chebyshev_2, _VERWER, "about 0.65 (s² − 1)")


def legendre_1(stages: int) -> Tableau:
    """Return `legendre-1-stages-<s>`: order 1, R(z) = P_s(1 + 2z/(s² + s)).

    The real stability interval is s² + s; inside it |R| < 1 without any damping.

    Raises:
        BadRequest: the number of stages is not from 1 to 256.

    >>> legendre_1(3)
    <Tableau legendre-1-stages-3: order 1, 3 stages>
    """
    return _made("legendre", 1, stages, _legendre_1, _MEYER_2012, "s² + s")


def legendre_2(stages: int) -> Tableau:
    """Return `legendre-2-stages-<s>`: order 2; the real stability interval is (s² + s − 2)/2.

    Raises:
        BadRequest: the number of stages is not from 2 to 256.

    >>> legendre_2(3)
    <Tableau legendre-2-stages-3: order 2, 3 stages>
    """
    return _made("legendre", 2, stages, _legendre_2, _MEYER_2014, "(s² + s − 2)/2")


_HOUWEN = (
    "P. J. van der Houwen and B. P. Sommeijer, On the internal stability of explicit, m-stage Runge-Kutta "
    "methods for large m-values, Z. Angew. Math. Mech. 60 (1980) 479-485"
)
_VERWER = (
    "J. G. Verwer, W. H. Hundsdorfer and B. P. Sommeijer, Convergence properties of the "
    "Runge-Kutta-Chebyshev method, Numer. Math. 57 (1990) 157-178"
)
_MEYER_2012 = (
    "C. D. Meyer, D. S. Balsara and T. D. Aslam, A second-order accurate Super TimeStepping formulation for "
    "anisotropic thermal conduction, Mon. Not. R. Astron. Soc. 422 (2012) 2102-2115"
)
_MEYER_2014 = (
    "C. D. Meyer, D. S. Balsara and T. D. Aslam, A stabilized Runge-Kutta-Legendre method for explicit super "
    "time-stepping of parabolic and mixed equations, J. Comput. Phys. 257 (2014) 594-626"
)


def _made(kind: str, order: int, s: int, terms: Terms, source: str, interval: str) -> Tableau:
    slug = f"{kind}-{order}-stages-{s}"
    if not order <= s <= MOST_STAGES:
        raise BadRequest(
            f"{slug}: {s} stages are not of this family\n"
            f"  From {order} to {MOST_STAGES} stages are made; beyond, take shorter steps.",
            argument="stages",
        )
    exact = s <= MOST_EXACT
    rows = _rows(terms(s, Fraction if exact else Enclosure.of))
    totals = [sum(row, Fraction(0)) for row in rows]
    written: Callable[[Number], Exact | Fraction] = (lambda x: x) if exact else _decimal
    return Tableau(
        slug,
        name=f"Runge–Kutta–{kind.title()} of order {order} with {s} stages",
        order=order,
        matrix=[[written(x) for x in row] for row in rows[:-1]],
        weights=[written(x) for x in rows[-1]],
        nodes=[written(x) for x in totals[:-1]],
        source=source,
        numbers="derived: from the published recursion",
        digits=None if exact else DIGITS,
        notes=Notes(
            strengths=[f"For diffusion: the real stability interval is {interval} long."],
            weaknesses=["Little of the imaginary axis is stable: not for waves without damping."],
        ),
    )


def _decimal(value: Enclosure | Fraction) -> Exact:
    return decimal(value) if isinstance(value, Enclosure) else Exact(value)


def _rows(terms: Iterator[_Term]) -> list[list[Number]]:
    """Return what each stage adds up of h·F₀, h·F₁, …, and at last what the step does."""
    zero = Fraction(0)
    rows: list[list[Number]] = [[]]
    for j, term in enumerate(terms, 1):
        if j == 1:
            rows.append([term.rate])
            continue
        before, last = rows[-2] + [zero], rows[-1]
        row = [term.mu * a + term.nu * b if b else term.mu * a for a, b in zip(last, before, strict=True)]
        row[0] = row[0] + term.first
        rows.append([*row, term.rate])
    return rows


def _chebyshev_1(s: int, number: Callable[[Fraction], Number]) -> Iterator[_Term]:
    """μ_j = 2w₀ b_j/b_{j−1}, ν_j = −b_j/b_{j−2}, μ̃_j = 2w₁ b_j/b_{j−1}, with b_j = 1/T_j(w₀)."""
    w0 = number(1 + DAMPING_1 / s**2)
    T, first, _ = _polynomials(w0, s)
    w1 = T[s] / first[s]
    yield _Term(None, None, w1 / w0, None)
    for j in range(2, s + 1):
        share = T[j - 1] / T[j]
        yield _Term(2 * w0 * share, -(T[j - 2] / T[j]), 2 * w1 * share, Fraction(0))


def _chebyshev_2(s: int, number: Callable[[Fraction], Number]) -> Iterator[_Term]:
    """μ_j = 2w₀ b_j/b_{j−1}, ν_j = −b_j/b_{j−2}, μ̃_j = 2w₁ b_j/b_{j−1}, γ̃_j = −a_{j−1}μ̃_j.

    Here b_j = T_j″(w₀)/T_j′(w₀)², but b₀ = b₁ = b₂, and a_j = 1 − b_j T_j(w₀).
    """
    w0 = number(1 + DAMPING_2 / s**2)
    T, first, second = _polynomials(w0, s)
    w1 = first[s] / second[s]
    b = [second[max(j, 2)] / (first[max(j, 2)] * first[max(j, 2)]) for j in range(s + 1)]
    yield _Term(None, None, b[1] * w1, None)
    for j in range(2, s + 1):
        rate = 2 * w1 * b[j] / b[j - 1]
        yield _Term(2 * w0 * b[j] / b[j - 1], -(b[j] / b[j - 2]), rate, -((1 - b[j - 1] * T[j - 1]) * rate))


def _legendre_1(s: int, number: Callable[[Fraction], Number]) -> Iterator[_Term]:
    """μ_j = (2j−1)/j, ν_j = (1−j)/j, μ̃_j = μ_j·2/(s²+s)."""
    w1 = number(Fraction(2, s * s + s))
    yield _Term(None, None, w1, None)
    for j in range(2, s + 1):
        mu = number(Fraction(2 * j - 1, j))
        yield _Term(mu, number(Fraction(1 - j, j)), mu * w1, Fraction(0))


def _legendre_2(s: int, number: Callable[[Fraction], Number]) -> Iterator[_Term]:
    """b_j = (j²+j−2)/(2j(j+1)), b₀ = b₁ = b₂ = 1/3, a_j = 1 − b_j, w₁ = 4/(s²+s−2)."""
    w1 = number(Fraction(4, s * s + s - 2))
    b = [Fraction(j * j + j - 2, 2 * j * (j + 1)) if j > 1 else Fraction(1, 3) for j in range(s + 1)]
    yield _Term(None, None, b[1] * w1, None)
    for j in range(2, s + 1):
        mu = Fraction(2 * j - 1, j) * b[j] / b[j - 1]
        nu = Fraction(1 - j, j) * b[j] / b[j - 2]
        yield _Term(number(mu), number(nu), mu * w1, (b[j - 1] - 1) * mu * w1)


def _polynomials(x: Number, degree: int) -> tuple[list[Number], list[Number], list[Number]]:
    """Return T_j(x), T_j′(x) and T_j″(x) for j from 0 to `degree`, by T_{j+1} = 2x T_j − T_{j−1}."""
    zero = x * 0
    T, first, second = [zero + 1, x], [zero, zero + 1], [zero, zero]
    for _ in range(degree - 1):
        T.append(2 * x * T[-1] - T[-2])
        first.append(2 * T[-2] + 2 * x * first[-1] - first[-2])
        second.append(4 * first[-2] + 2 * x * second[-1] - second[-2])
    return T, first, second
