"""Pasted rows as a tableau: which decimals are rounded, and which orders can be proved of the weights."""

from __future__ import annotations

from collections.abc import Sequence

import attrs

from newel.methods.digits import Trust
from newel.methods.exact import Exact
from newel.methods.order_conditions import prove
from newel.methods.pasted import Pasted
from newel.methods.tableau import Tableau

__all__ = ["tableau_of_rows"]

HIGHEST_TRIED = 9

_SHORT = 6
"""A decimal of no more significant digits than this is taken as exact: 0.4 is two fifths."""

_DROPPED = 2
"""So many of the printed digits may be wrong before the rows count as wrong."""

_Row = Sequence[Exact]


def tableau_of_rows(
    slug: str, found: Pasted, order: int | None = None, embedded: int | None = None
) -> tuple[Tableau, list[str], list[str]]:
    """Return a tableau of pasted rows, lines on what it holds, and lines on claims that do not.

    Orders that are not given are the highest that can be proved, at least 1.

    >>> from newel.methods.pasted import read_pasted
    >>> tableau_of_rows("midpoint-2", read_pasted("0 | \\n .5 | .5 \\n | 0 1"))[:2]
    (<Tableau midpoint-2: order 2, 2 stages>, ['weights: order 2 is proved'])
    """
    lines, misfits = [], []
    reached, dropped, tableau = _highest(slug, found, found.weights[0])
    tableau = attrs.evolve(tableau, order=order or max(reached, 1))
    lines.append(f"weights: order {reached} is proved" if reached else "weights: no order can be proved")
    if reached < tableau.order:
        misfits.append(f"order {tableau.order} is claimed, order {reached} is proved")
    if dropped:
        which = "digit of each is" if dropped == 1 else f"{dropped} digits of each are"
        lines.append(f"long decimals: the last {which} not trusted")
    if len(found.weights) == 2:
        below, more, _ = _highest(slug, found, found.weights[1])
        most, second = max(dropped, more), embedded or max(below, 1)
        made = _tableau(slug, found, found.weights[0], most, found.weights[1], second)
        tableau = attrs.evolve(made, order=tableau.order)
        lines.append(f"embedded weights: order {below} is proved")
        if embedded is not None and below < embedded:
            misfits.append(f"embedded order {embedded} is claimed, order {below} is proved")
    return tableau, lines, misfits


def _highest(slug: str, found: Pasted, weights: _Row) -> tuple[int, int, Tableau]:
    """Return the highest order that can be proved of weights, and how many printed digits that leaves out."""
    outcomes: list[tuple[int, int, Tableau]] = []
    for dropped in range(_DROPPED + 1):
        tableau, reached = _tableau(slug, found, weights, dropped), 0
        while reached < HIGHEST_TRIED:
            tried = attrs.evolve(tableau, order=reached + 1)
            if any(failure.part in ("weights", "claim") for failure in prove(tried).failures):
                break
            reached += 1
        outcomes.append((reached, dropped, tableau))
        if tableau.digits is None:
            break
    return max(outcomes, key=lambda outcome: outcome[0])


def _tableau(
    slug: str,
    found: Pasted,
    weights: _Row,
    dropped: int,
    embedded: _Row | None = None,
    embedded_order: int | None = None,
) -> Tableau:
    digits: dict[str, Trust] = {}
    rows = [_row(row, "matrix", f"[{i}]", dropped, digits) for i, row in enumerate(found.matrix, 1)]
    nodes = None if found.nodes is None else _row(found.nodes, "nodes", "", dropped, digits)
    b = _row(weights, "weights", "", dropped, digits)
    second = None if embedded is None else _row(embedded, "embedded", "", dropped, digits)
    return Tableau(
        slug,
        order=1,
        matrix=rows,
        nodes=nodes,
        weights=b,
        embedded_weights=second,
        embedded_order=embedded_order,
        numbers="published",
        digits=_gathered(digits) or None,
    )


def _row(values: _Row, name: str, place: str, dropped: int, digits: dict[str, Trust]) -> list[Exact]:
    """Return a row with short decimals as fractions, and note how far the long ones are trusted."""
    kept = []
    for i, x in enumerate(values, 1):
        figures = _figures(x)
        if figures > _SHORT:
            digits[f"{name}{place}[{i}]"] = figures - dropped
        kept.append(Exact(x.rational, x.surd, x.radicand) if 0 < figures <= _SHORT else x)
    return kept


def _gathered(digits: dict[str, Trust]) -> dict[str, Trust]:
    """Return one statement for each array whose decimals are of nearly one length."""
    found: dict[str, Trust] = {}
    for name in ("nodes", "matrix", "weights", "embedded"):
        own = {key: n for key, n in digits.items() if key.startswith(f"{name}[") and isinstance(n, int)}
        if own and max(own.values()) - min(own.values()) <= _DROPPED:
            found[name] = min(own.values())
        else:
            found |= own
    return found


def _figures(x: Exact) -> int:
    """Return how many significant digits a decimal was printed with; 0 for what is no decimal."""
    if x.form != "decimal":
        return 0
    mantissa = str(x).lower().partition("e")[0]
    return max(1, len("".join(c for c in mantissa if c.isdigit()).lstrip("0")))
