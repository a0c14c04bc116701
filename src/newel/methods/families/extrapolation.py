"""Any order: a simple base method with ever more sub-steps, extrapolated to none at all.

With n₁ < n₂ < … < n_k sub-steps a base method gives T₁, …, T_k. Their errors are powers of the sub-step, and
Neville's table removes one power a column. What stands at its corner is a fixed combination of the T_j, so
that the whole is one Runge–Kutta method, whose first stage is shared by all rows.

Sources: L. F. Richardson, Phil. Trans. R. Soc. A 226 (1927) 299-349; W. B. Gragg, SIAM J. Numer. Anal. 2
(1965) 384-403; R. Bulirsch and J. Stoer, Numer. Math. 8 (1966) 1-13; P. Deuflhard, SIAM Review 27 (1985)
505-535; Hairer, Nørsett and Wanner, Solving Ordinary Differential Equations I, section II.9.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from fractions import Fraction
from itertools import count, pairwise
from math import prod

from newel.errors import BadRequest
from newel.methods.tableau import HIGHEST_ORDER, MOST_STAGES, Notes, Tableau

__all__ = [
    "extrapolated",
    "extrapolated_euler",
    "extrapolated_euler_bulirsch",
    "extrapolated_euler_romberg",
    "extrapolated_midpoint",
    "extrapolated_midpoint_bulirsch",
    "extrapolated_midpoint_romberg",
    "extrapolated_midpoint_smoothed",
    "step_numbers",
]

Row = list[Fraction]
_POWERS = {"euler": 1, "midpoint": 2}
_SMOOTHED = (Fraction(1, 4), Fraction(1, 2), Fraction(1, 4))


def step_numbers(sequence: str, rows: int, even: bool = False) -> tuple[int, ...]:
    """Return the first numbers of sub-steps of a usual sequence, all doubled where `even`.

    `harmonic` is 1, 2, 3, 4, …; `romberg` 1, 2, 4, 8, …; `bulirsch` 1, 2, 3, 4, 6, 8, 12, ….

    Raises:
        BadRequest: there is no such sequence.

    >>> step_numbers("bulirsch", 7), step_numbers("harmonic", 3, even=True)
    ((1, 2, 3, 4, 6, 8, 12), (2, 4, 6))
    """
    if sequence == "harmonic":
        numbers = list(range(1, rows + 1))
    elif sequence == "romberg":
        numbers = [2**k for k in range(rows)]
    elif sequence == "bulirsch":
        numbers = sorted([1, *(2**k for k in range(1, rows)), *(3 * 2**k for k in range(rows))])[:rows]
    else:
        raise BadRequest(
            f"{sequence!r} is no sequence of sub-steps; harmonic, romberg and bulirsch are known, and any "
            "tuple of numbers may be given",
            argument="steps",
        )
    return tuple(2 * n if even else n for n in numbers)


def extrapolated(base: str, steps: Sequence[int], smoothed: bool = False, slug: str | None = None) -> Tableau:
    """Return the method at the corner of the extrapolation table, with its left neighbour embedded.

    Args:
        base: `euler`, whose table gains one order a row, or `midpoint`, the explicit midpoint rule after one
            Euler step, whose table gains two.
        steps: numbers of sub-steps, increasing; even ones for `midpoint`.
        smoothed: whether each midpoint row ends in Gragg's smoothing step, which costs one more stage.
        slug: the name; by default made of base and sub-steps.

    Returns:
        The tableau of order k (Euler) or 2k (midpoint) for k rows, exact.

    Raises:
        BadRequest: the base or the sub-steps are not allowed, or the tableau would be too large.

    >>> extrapolated("midpoint", (2, 4))
    <Tableau extrapolated-midpoint-steps-2-4: order 4(2), 5 stages>
    """
    _check(base, steps, smoothed)
    power = _POWERS[base]
    order = power * len(steps)
    rows, ends = _rows(base, steps, smoothed)
    whole = _combined(ends, _corner(steps, power), len(rows))
    before = _combined(ends[1:], _corner(steps[1:], power), len(rows)) if len(steps) > 1 else None
    numbers = "-".join(map(str, steps))
    listed = ", ".join(map(str, steps))
    ending = ", smoothed" if smoothed else ""
    return Tableau(
        slug or f"extrapolated-{base}{'-smoothed' if smoothed else ''}-steps-{numbers}",
        name=f"Extrapolated {base.title() if base == 'euler' else base} with {listed} sub-steps{ending}",
        order=order,
        matrix=rows,
        weights=whole,
        embedded_weights=before,
        embedded_order=None if before is None else order - power,
        source=_SOURCE[base],
        numbers="derived: by Neville's table, exactly",
        notes=Notes(
            strengths=["Any order by one rule; rational numbers; an embedded solution comes with the table."],
            weaknesses=[f"{len(rows)} stages for order {order}: pairs found for one order need fewer."],
        ),
    )


_SOURCE = {
    "euler": "P. Deuflhard, Recent progress in extrapolation methods for ordinary differential equations, "
    "SIAM Review 27 (1985) 505-535",
    "midpoint": "W. B. Gragg, On extrapolation algorithms for ordinary initial value problems, "
    "SIAM J. Numer. Anal. 2 (1965) 384-403",
}


def _check(base: str, steps: Sequence[int], smoothed: bool) -> None:
    if base not in _POWERS:
        raise BadRequest(f"{base!r} is no base method; euler and midpoint are known", argument="base")
    listed = ", ".join(map(str, steps[:8]))
    if not steps or steps[0] < 1 or any(b <= a for a, b in pairwise(steps)):
        raise BadRequest(f"sub-steps {listed} do not increase from 1 on", argument="steps")
    if base == "midpoint" and any(n % 2 for n in steps):
        raise BadRequest(f"sub-steps {listed}: the midpoint rule needs even ones", argument="steps")
    if smoothed and base != "midpoint":
        raise BadRequest("smoothing belongs to the midpoint rule", argument="smoothed")
    order, stages = _POWERS[base] * len(steps), sum(steps) - len(steps) + 1 + smoothed * len(steps)
    if order > HIGHEST_ORDER or stages > MOST_STAGES:
        raise BadRequest(
            f"sub-steps {listed}: the method would be of order {order} with {stages} stages\n"
            f"  At most order {HIGHEST_ORDER} and {MOST_STAGES} stages are allowed.",
            argument="steps",
        )


def _rows(base: str, steps: Sequence[int], smoothed: bool) -> tuple[list[Row], list[Row]]:
    """Return the rows of the matrix, and for each number of sub-steps the row that gives its T."""
    matrix: list[Row] = [[]]
    ends: list[Row] = []
    for n in steps:
        h = Fraction(1, n)
        states: list[Row] = [[], [h]]
        stages = [0]
        for i in range(1, n + smoothed):
            stages.append(len(matrix))
            matrix.append(states[-1])
            step_from, length = (states[-1], h) if base == "euler" else (states[-2], 2 * h)
            states.append(_plus(step_from, {stages[i]: length}))
        if smoothed:
            ends.append(_mixed(states[-3:], _SMOOTHED))
        else:
            ends.append(states[-1])
    return [row + [Fraction(0)] * (i - len(row)) for i, row in enumerate(matrix)], ends


def _plus(row: Row, added: dict[int, Fraction]) -> Row:
    grown = row + [Fraction(0)] * (max(added) + 1 - len(row))
    for place, value in added.items():
        grown[place] += value
    return grown


def _mixed(rows: Sequence[Row], factors: Sequence[Fraction]) -> Row:
    width = max(map(len, rows))
    padded = [row + [Fraction(0)] * (width - len(row)) for row in rows]
    mixed = [Fraction(0)] * width
    for factor, row in zip(factors, padded, strict=True):
        mixed = [x + factor * y for x, y in zip(mixed, row, strict=True)]
    return mixed


def _combined(ends: Sequence[Row], factors: Sequence[Fraction], stages: int) -> Row:
    row = _mixed(ends, factors)
    return row + [Fraction(0)] * (stages - len(row))


def _corner(steps: Sequence[int], power: int) -> list[Fraction]:
    """Return the share of each T in the last corner of Neville's table: Lagrange's factors at h = 0."""
    return [
        prod((Fraction(n**power, n**power - m**power) for m in steps if m != n), start=Fraction(1))
        for n in steps
    ]


def _of_order(base: str, sequence: str, order: int, smoothed: bool = False) -> Tableau:
    words = [base, *([sequence] if sequence != "harmonic" else []), *(["smoothed"] if smoothed else [])]
    slug = f"extrapolated-{'-'.join(words)}-{order}"
    power = _POWERS[base]
    allowed = list(_orders(base, sequence, smoothed))
    if order not in allowed:
        steps = "every second" if power == 2 else "every"
        raise BadRequest(
            f"{slug}: order {order} is not of this family\n"
            f"  Give {steps} order from {allowed[0]} to {allowed[-1]}.",
            argument="order",
        )
    steps_taken = step_numbers(sequence, order // power, even=base == "midpoint")
    return extrapolated(base, steps_taken, smoothed, slug)


def _orders(base: str, sequence: str, smoothed: bool) -> Iterator[int]:
    """Yield the orders of a family that a tableau can have."""
    for rows in count(1):
        steps = step_numbers(sequence, rows, even=base == "midpoint")
        stages = sum(steps) - rows + 1 + smoothed * rows
        if _POWERS[base] * rows > HIGHEST_ORDER or stages > MOST_STAGES:
            return
        yield _POWERS[base] * rows


def extrapolated_euler(order: int) -> Tableau:
    """Return the member `extrapolated-euler-<order>`: sub-steps 1, 2, 3, …; see `extrapolated`.

    Raises:
        BadRequest: the order is out of range.

    >>> extrapolated_euler(4).stages
    7
    """
    return _of_order("euler", "harmonic", order)


def extrapolated_euler_romberg(order: int) -> Tableau:
    """Return `extrapolated-euler-romberg-<order>`: sub-steps 1, 2, 4, …; see `extrapolated_euler`."""
    return _of_order("euler", "romberg", order)


def extrapolated_euler_bulirsch(order: int) -> Tableau:
    """Return `extrapolated-euler-bulirsch-<order>`: 1, 2, 3, 4, 6, …; see `extrapolated_euler`."""
    return _of_order("euler", "bulirsch", order)


def extrapolated_midpoint(order: int) -> Tableau:
    """Return the member `extrapolated-midpoint-<order>`: sub-steps 2, 4, 6, …, no smoothing.

    Raises:
        BadRequest: the order is odd or out of range.

    >>> extrapolated_midpoint(8)
    <Tableau extrapolated-midpoint-8: order 8(6), 17 stages>
    """
    return _of_order("midpoint", "harmonic", order)


def extrapolated_midpoint_romberg(order: int) -> Tableau:
    """Return `extrapolated-midpoint-romberg-<order>`: sub-steps 2, 4, 8, …; see `extrapolated_midpoint`."""
    return _of_order("midpoint", "romberg", order)


def extrapolated_midpoint_bulirsch(order: int) -> Tableau:
    """Return `extrapolated-midpoint-bulirsch-<order>`: 2, 4, 6, 8, 12, …; see `extrapolated_midpoint`."""
    return _of_order("midpoint", "bulirsch", order)


def extrapolated_midpoint_smoothed(order: int) -> Tableau:
    """Return `extrapolated-midpoint-smoothed-<order>`: Gragg's smoothing in each row of 2, 4, 6, …."""
    return _of_order("midpoint", "harmonic", order, smoothed=True)
