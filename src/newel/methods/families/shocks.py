"""Shocks: the optimal strong-stability-preserving methods that exist in closed form.

A method is strong-stability-preserving with coefficient C when every step of length up to C·h keeps each
convex bound (monotonicity, positivity, total variation) that forward Euler keeps for steps up to h. The two
rules here reach the largest C that their order and stages allow.

Sources: R. J. Spiteri and S. J. Ruuth, SIAM J. Numer. Anal. 40 (2002) 469-491, for order 2;
D. I. Ketcheson, SIAM J. Sci. Comput. 30 (2008) 2113-2136, for order 3 with n² stages.
"""

from __future__ import annotations

from collections.abc import Iterable
from fractions import Fraction
from math import isqrt

from newel.errors import BadRequest
from newel.methods.exact import ExactLike
from newel.methods.storage import Storage
from newel.methods.tableau import Notes, Tableau

__all__ = ["ssp_2", "ssp_3"]

MOST_STAGES = 256
_LOW_STORAGE = "Two registers suffice in Shu–Osher form."


def ssp_2(stages: int) -> Tableau:
    """Return `ssp-2-stages-<s>`: s − 1 Euler steps of h/(s − 1), and a mean with the start; C = s − 1.

    Raises:
        BadRequest: the number of stages is not from 2 to 256.

    >>> tableau = ssp_2(3)
    >>> [str(x) for x in tableau.matrix[2]], [str(x) for x in tableau.weights]
    (['1/2', '1/2', '0'], ['1/3', '1/3', '1/3'])
    """
    s = stages
    slug = f"ssp-2-stages-{s}"
    if not 2 <= s <= MOST_STAGES:
        raise BadRequest(f"{slug}: give from 2 to {MOST_STAGES} stages", argument="stages")
    h = Fraction(1, s - 1)
    alpha = [[Fraction(0)] * i + [Fraction(1)] for i in range(s)]
    alpha[-1] = [Fraction(1, s)] + [Fraction(0)] * (s - 2) + [Fraction(s - 1, s)]
    beta = [[Fraction(0)] * i + [h] for i in range(s)]
    beta[-1][-1] = Fraction(1, s)
    return _made(
        slug,
        2,
        [[h] * i for i in range(s)],
        [Fraction(1, s)] * s,
        Storage("shu-osher", alpha=alpha, beta=beta),
        s - 1,
        "R. J. Spiteri and S. J. Ruuth, A new class of optimal high-order strong-stability-preserving time "
        "discretization methods, SIAM J. Numer. Anal. 40 (2002) 469-491",
    )


def ssp_3(stages: int) -> Tableau:
    """Return `ssp-3-stages-<s>` for a square number s = n² of stages; C = n² − n.

    Raises:
        BadRequest: the number of stages is no square from 4 to 256.

    >>> ssp_3(9)
    <Tableau ssp-3-stages-9: order 3, 9 stages>
    """
    s = stages
    slug = f"ssp-3-stages-{s}"
    n = isqrt(max(s, 0))
    if not 4 <= s <= MOST_STAGES or n * n != s:
        raise BadRequest(
            f"{slug}: the closed form has n² stages\n"
            f"  Give a square number from 4 to {MOST_STAGES}: 4, 9, 16, 25, …",
            argument="stages",
        )
    alpha, beta = _square_form(n)
    storage = Storage("shu-osher", alpha=alpha, beta=beta)
    matrix, weights = storage.butcher()
    return _made(
        slug,
        3,
        matrix,
        weights,
        storage,
        s - n,
        "D. I. Ketcheson, Highly efficient strong stability-preserving Runge-Kutta methods with low-storage "
        "implementations, SIAM J. Sci. Comput. 30 (2008) 2113-2136",
    )


def _square_form(n: int) -> tuple[list[list[Fraction]], list[list[Fraction]]]:
    """Return α and β: Euler steps of h/(n² − n), but for one mean with the stage before (n−1)(n−2)/2 more."""
    s, h = n * n, Fraction(1, n * n - n)
    alpha = [[Fraction(0)] * i + [Fraction(1)] for i in range(s)]
    beta = [[Fraction(0)] * i + [h] for i in range(s)]
    back, mean = (n - 1) * (n - 2) // 2, n * (n + 1) // 2
    share = Fraction(n - 1, 2 * n - 1)
    alpha[mean - 1][mean - 1], beta[mean - 1][mean - 1] = share, share * h
    alpha[mean - 1][back] += 1 - share
    return alpha, beta


def _made(
    slug: str,
    order: int,
    matrix: Iterable[Iterable[ExactLike]],
    weights: Iterable[ExactLike],
    storage: Storage,
    coefficient: int,
    source: str,
) -> Tableau:
    stages = slug.rsplit("-", 1)[1]
    return Tableau(
        slug,
        name=f"SSP of order {order} with {stages} stages",
        order=order,
        matrix=matrix,
        weights=weights,
        storage=storage,
        source=source,
        numbers="derived: from the published closed form",
        notes=Notes(
            strengths=[f"SSP coefficient {coefficient}, the largest of its order and stages.", _LOW_STORAGE],
            weaknesses=["No embedded solution: steps are fixed, or judged by doubling."],
        ),
    )
