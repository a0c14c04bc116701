"""Any order on any nodes: Picard iteration and deferred correction, stopped when the order is reached.

Interpolate the rate at nodes c_1, …, c_s and integrate: y(c_i) = y₀ + h Σ_j a_ij F(y(c_j)). That is an
implicit collocation method; what makes it explicit is to put in the values of the sweep before. Each sweep
gains one order, up to that of the quadrature. Picard iteration starts from the constant y₀, deferred
correction from Euler steps between the nodes, which it repeats with the error of the sweep before taken out.

Sources: E. Picard, J. Math. Pures Appl. 6 (1890) 145-210; A. Dutt, L. Greengard and V. Rokhlin, BIT 40 (2000)
241-266; Hairer, Nørsett and Wanner, Solving Ordinary Differential Equations I, section II.7.
"""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction
from itertools import pairwise
from typing import Any, TypeAlias

from newel.errors import BadRequest
from newel.methods.exact import Exact, ExactLike
from newel.methods.families.enclosures import DIGITS, Enclosure, decimal
from newel.methods.families.nodes import equidistant_nodes, gauss_nodes, lobatto_nodes, radau_nodes
from newel.methods.tableau import MOST_STAGES, Notes, Tableau

__all__ = [
    "deferred_correction",
    "deferred_correction_equidistant",
    "deferred_correction_lobatto",
    "picard",
    "picard_equidistant",
    "picard_gauss",
    "picard_lobatto",
    "picard_radau",
]

HIGHEST = 10
Number: TypeAlias = Any
"""An Exact, or an Enclosure of an irrational number."""

_ZERO = Fraction(0)


def picard(nodes: Sequence[ExactLike | Enclosure], order: int, slug: str) -> Tableau:
    """Return Picard iteration on some nodes: `order` evaluations at each of them, the first shared by all.

    Args:
        nodes: s different numbers, exact or enclosed; the quadrature on them has at least the order.
        order: the number of sweeps, the first of which is the rate at the start alone.
        slug: the name of the tableau.

    Returns:
        The pair of this order, with the sweep before embedded.

    Raises:
        BadRequest: the nodes are not different, or the tableau would be too large.

    >>> picard(["0", "1/2", "1"], 4, "three-nodes-4")
    <Tableau three-nodes-4: order 4(3), 7 stages>
    """
    c = _numbers(nodes, order, slug)
    integrals = _integrals(c, [*c, _one(c)])
    places = [0] * len(c)
    rows: list[list[Number]] = [[]]
    before: list[int] = []
    for _ in range(order - 1):
        before, places = places, _sweep(c, integrals, places, rows)
    weights = _gathered(integrals[-1], places, len(rows))
    embedded = _gathered(integrals[-1], before, len(rows)) if order > 1 else None
    described = f"Picard iteration on {len(c)} nodes"
    return _tableau(slug, described, order, rows, weights, embedded, _PICARD)


def _sweep(
    c: Sequence[Number],
    integrals: Sequence[Sequence[Number]],
    places: Sequence[int],
    rows: list[list[Number]],
) -> list[int]:
    """Add a stage for each node but 0 from the stages at `places`; return where the nodes' stages are now."""
    found = []
    made = [_gathered(integrals[i], places, len(rows)) for i in range(len(c))]
    for node, row in zip(c, made, strict=True):
        if _is_zero(node):
            found.append(0)
        else:
            found.append(len(rows))
            rows.append(row + [_ZERO] * (len(rows) - len(row)))
    return found


def _gathered(factors: Sequence[Number], places: Sequence[int], width: int) -> list[Number]:
    row: list[Number] = [_ZERO] * width
    for place, factor in zip(places, factors, strict=True):
        row[place] = factor if row[place] is _ZERO else row[place] + factor
    return row


def deferred_correction(nodes: Sequence[ExactLike | Enclosure], order: int, slug: str) -> Tableau:
    """Return deferred correction by Euler steps between some nodes: one sweep for each order.

    Args:
        nodes: from 0 to 1, increasing, exact or enclosed; the quadrature on them has at least the order.
        order: the number of sweeps.
        slug: the name of the tableau.

    Returns:
        The pair of this order, with the sweep before embedded.

    Raises:
        BadRequest: the nodes do not run from 0 to 1, or the tableau would be too large.

    >>> deferred_correction(["0", "1/2", "1"], 4, "three-nodes-4")
    <Tableau three-nodes-4: order 4(3), 8 stages>
    """
    c = _numbers(nodes, order, slug)
    if not _is_zero(c[0]) or not _is_zero(c[-1] - 1):
        raise BadRequest(f"{slug}: the nodes of a deferred correction run from 0 to 1", argument="nodes")
    integrals = _integrals(c, c)
    lengths = [after - node for node, after in pairwise(c)]
    rows: list[list[Number]] = [[]]
    state: list[Number] = []
    ends: list[list[Number]] = []
    before: list[int] = []
    for sweep in range(order):
        state, now = [], [0]
        for m, length in enumerate(lengths):
            state = _add(state, now[m], length)
            if sweep:
                state = _add(state, before[m], -length)
                for j, place in enumerate(before):
                    state = _add(state, place, integrals[m + 1][j] - integrals[m][j])
            last = m == len(lengths) - 1
            if not last or sweep < order - 1:
                now.append(len(rows))
                rows.append(state + [_ZERO] * (len(rows) - len(state)))
        before = now
        ends.append(state)
    full = [end + [_ZERO] * (len(rows) - len(end)) for end in ends]
    described = f"Deferred correction on {len(c)} nodes"
    return _tableau(slug, described, order, rows, full[-1], full[-2] if order > 1 else None, _DUTT)


def _add(row: list[Number], place: int, value: Number) -> list[Number]:
    grown = row + [_ZERO] * (place + 1 - len(row))
    grown[place] = value if grown[place] is _ZERO else grown[place] + value
    return grown


def _numbers(nodes: Sequence[ExactLike | Enclosure], order: int, slug: str) -> list[Number]:
    s = len(nodes)
    if not 1 <= order <= HIGHEST:
        raise BadRequest(
            f"{slug}: order {order} is not of this family\n  Give an order from 1 to {HIGHEST}.",
            argument="order",
        )
    if not 1 <= s <= MOST_STAGES // order:
        raise BadRequest(f"{slug}: {s} nodes; give from 1 to {MOST_STAGES // order}", argument="nodes")
    if any(isinstance(node, Enclosure) for node in nodes):
        return [x if isinstance(x, Enclosure) else Enclosure.of(Exact.of(x).rational) for x in nodes]
    exact = [Exact.of(x) for x in nodes if not isinstance(x, Enclosure)]
    if len(set(exact)) < s:
        raise BadRequest(f"{slug}: two nodes are equal", argument="nodes")
    return exact


def _one(c: Sequence[Number]) -> Number:
    return Enclosure.of(1) if isinstance(c[0], Enclosure) else Exact(1)


def _is_zero(x: Number) -> bool:
    return x.low == x.high == 0 if isinstance(x, Enclosure) else not x


def _integrals(c: Sequence[Number], ends: Sequence[Number]) -> list[list[Number]]:
    """Return ∫ from 0 to each end of each Lagrange polynomial on the nodes."""
    rows: list[list[Number]] = [[] for _ in ends]
    for j, node in enumerate(c):
        others = [x for i, x in enumerate(c) if i != j]
        polynomial, below = [_one(c)], _one(c)
        for x in others:
            shifted = [*polynomial, _ZERO]
            lowered = [_ZERO, *(-(x * a) for a in polynomial)]
            polynomial = [b if a is _ZERO else a + b for a, b in zip(shifted, lowered, strict=True)]
            below = below * (node - x)
        # Highest power first; its integral has one power more.
        primitive = [a / (len(polynomial) - k) for k, a in enumerate(polynomial)]
        for row, end in zip(rows, ends, strict=True):
            value = primitive[0]
            for a in primitive[1:]:
                value = value * end + a
            row.append(value * end / below)
    return rows


def _tableau(
    slug: str,
    described: str,
    order: int,
    rows: Sequence[Sequence[Number]],
    weights: Sequence[Number],
    embedded: Sequence[Number] | None,
    source: str,
) -> Tableau:
    rounded = any(isinstance(x, Enclosure) for x in weights)
    sums = [sum(row[1:], row[0]) if row else _ZERO for row in rows]
    return Tableau(
        slug,
        name=f"{described} to order {order}",
        order=order,
        matrix=[[_written(x) for x in row] for row in rows],
        weights=[_written(x) for x in weights],
        nodes=[_written(x) for x in sums],
        embedded_weights=None if embedded is None else [_written(x) for x in embedded],
        embedded_order=None if embedded is None else order - 1,
        digits=DIGITS if rounded else None,
        source=source,
        numbers="derived: " + ("by interval arithmetic, to 40 digits" if rounded else "exactly"),
        notes=Notes(
            strengths=["Any order on any nodes by one rule; the sweep before is embedded."],
            weaknesses=[f"{len(rows)} stages for order {order}: pairs found for one order need fewer."],
            known_failures=["Where y' = f(t) does not depend on y, all sweeps agree and no error is seen."],
        ),
    )


def _written(x: Number) -> Exact | Fraction:
    return decimal(x) if isinstance(x, Enclosure) else x


_PICARD = (
    "E. Picard, Mémoire sur la théorie des équations aux dérivées partielles, J. Math. Pures Appl. 6 (1890)"
)
_DUTT = (
    "A. Dutt, L. Greengard and V. Rokhlin, Spectral deferred correction methods for ordinary differential "
    "equations, BIT 40 (2000) 241-266"
)


def picard_gauss(order: int) -> Tableau:
    """Return `picard-gauss-<order>`: Picard iteration on the fewest Gauss nodes; see `picard`.

    >>> picard_gauss(4)
    <Tableau picard-gauss-4: order 4(3), 7 stages>
    """
    return picard(gauss_nodes(_bounded(order + 1) // 2), order, f"picard-gauss-{order}")


def picard_radau(order: int) -> Tableau:
    """Return `picard-radau-<order>`: on the fewest Radau nodes with 1 among them; see `picard_gauss`."""
    return picard(radau_nodes(_bounded(order + 2) // 2), order, f"picard-radau-{order}")


def picard_lobatto(order: int) -> Tableau:
    """Return `picard-lobatto-<order>`: on the fewest Lobatto nodes; see `picard_gauss`."""
    return picard(lobatto_nodes(max(2, _bounded(order + 3) // 2)), order, f"picard-lobatto-{order}")


def picard_equidistant(order: int) -> Tableau:
    """Return `picard-equidistant-<order>`: on the fewest equidistant nodes; see `picard_gauss`."""
    return picard(equidistant_nodes(_fewest(order)), order, f"picard-equidistant-{order}")


def deferred_correction_lobatto(order: int) -> Tableau:
    """Return `deferred-correction-lobatto-<order>`: on the fewest Lobatto nodes; see `deferred_correction`.

    >>> deferred_correction_lobatto(6)
    <Tableau deferred-correction-lobatto-6: order 6(5), 18 stages>
    """
    nodes = lobatto_nodes(max(2, _bounded(order + 3) // 2))
    return deferred_correction(nodes, order, f"deferred-correction-lobatto-{order}")


def deferred_correction_equidistant(order: int) -> Tableau:
    """Return `deferred-correction-equidistant-<order>`; see `deferred_correction_lobatto`."""
    nodes = equidistant_nodes(_fewest(order))
    return deferred_correction(nodes, order, f"deferred-correction-equidistant-{order}")


def _fewest(order: int) -> int:
    """Return the fewest equidistant nodes whose quadrature has an order: an odd number gains one."""
    fewest = order if order % 2 else order - 1
    return max(2, _bounded(fewest))


def _bounded(size: int) -> int:
    """Keep a size that is refused later from being computed with."""
    return min(max(size, 2), HIGHEST + 3)
