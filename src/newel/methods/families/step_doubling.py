"""Step doubling as a tableau: two half steps, one full step, and the value extrapolated from both."""

from __future__ import annotations

from fractions import Fraction

from newel.errors import BadRequest
from newel.methods.families.carried import ZERO, Rounded, carried, digits_of, scaled, values
from newel.methods.tableau import HIGHEST_ORDER, MOST_STAGES, Notes, Tableau

__all__ = ["doubled"]

_HALF = Fraction(1, 2)


def doubled(tableau: Tableau) -> Tableau:
    """Return the pair that two half steps and one full step of a method make together.

    A method of order p gives y₂ after two steps of h/2 and y₁ after one step of h. The extrapolated value
    y₂ + (y₂ − y₁)/(2^p − 1) is of order p + 1 and is carried on; y₂ is embedded, so that the error estimate
    is (y₂ − y₁)/(2^p − 1). The full step shares its first stage with the first half step: 3s − 1 stages.
    Source: L. F. Richardson, Phil. Trans. R. Soc. A 210 (1911) 307-357; Hairer, Nørsett and Wanner, Solving
    Ordinary Differential Equations I, section II.4.

    Numbers are exact where those of `tableau` are. A rounded one hands its rounding on, scaled as the number
    is, and the digits stated for each such entry are the most that still cover it.

    Args:
        tableau: the method; embedded and continuous weights of its own play no part.

    Returns:
        The pair `doubled-<slug>` of order p + 1, embedded order p.

    Raises:
        BadRequest: the order or the stages would be beyond what a tableau may have, or so few digits of the
            method are trusted that none is left.

    >>> euler = Tableau("euler-1", order=1, matrix=[[]], weights=[1])
    >>> pair = doubled(euler)
    >>> pair, [str(b) for b in pair.weights]
    (<Tableau doubled-euler-1: order 2(1), 2 stages>, ['0', '1'])
    """
    p, s = tableau.order, tableau.stages
    if p >= HIGHEST_ORDER or 3 * s - 1 > MOST_STAGES or len(tableau.slug) > 72:
        size = f"order {p + 1} and {3 * s - 1} stages"
        raise BadRequest(
            f"{tableau.slug} cannot be doubled: the pair would have {size}\n"
            f"  At most order {HIGHEST_ORDER}, {MOST_STAGES} stages and a slug of 80 characters are allowed.",
            argument="method",
        )
    nodes, matrix, weights, embedded = _arrays(tableau)
    arrays = {"nodes": nodes, "weights": weights, "embedded": embedded}
    arrays |= {f"matrix[{i}]": row for i, row in enumerate(matrix, 1)}
    return Tableau(
        f"doubled-{tableau.slug}",
        name=f"{tableau.name}, doubled",
        order=p + 1,
        matrix=[values(row) for row in matrix],
        weights=values(weights),
        nodes=values(nodes),
        embedded_weights=values(embedded),
        embedded_order=p,
        authors=tableau.authors,
        source=f"step doubling of {tableau.slug}: {tableau.source}",
        numbers=f"derived: by step doubling from {tableau.slug}",
        digits=digits_of(tableau, arrays),
        notes=Notes(
            remarks=["Two half steps and one full step; the value extrapolated from both is carried on."]
        ),
    )


def _arrays(t: Tableau) -> tuple[list[Rounded], list[list[Rounded]], list[Rounded], list[Rounded]]:
    """Return nodes, matrix, weights and embedded weights of the pair.

    The columns are the shared first stage, the other stages of the first half step, those of the second half
    step, and the other stages of the full step.
    """
    s, p = t.stages, t.order
    c, b = (
        carried(t.nodes, t.half_units("nodes")),
        carried(t.weights, t.half_units("weights")),
    )
    A = [carried(x, u) for x, u in zip(t.matrix, t.half_units("matrix"), strict=True)]
    none, fewer = [ZERO] * s, [ZERO] * (s - 1)
    half = scaled(b, _HALF)
    first = [scaled(A[i], _HALF) + none + fewer for i in range(s)]
    second = [half + scaled(A[i], _HALF) + fewer for i in range(s)]
    full = [A[i][:1] + fewer + none + A[i][1:] for i in range(1, s)]
    shifted = [(_HALF + x, unit) for x, unit in scaled(c, _HALF)]
    gain = Fraction(1, 2**p - 1)
    one = scaled(b, -gain)
    two = scaled(half, 1 + gain)
    # The first stage serves both y₂ and y₁; what is rounded in b₁ enters it once, by the sum of both factors.
    shared = scaled(b[:1], _HALF * (1 + gain) - gain)
    return (
        scaled(c, _HALF) + shifted + c[1:],
        first + second + full,
        shared + two[1:] + two + one[1:],
        half + half + fewer,
    )
