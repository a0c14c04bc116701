"""Polish printed coefficients to many digits by solving the order conditions.

A paper prints a method's free numbers (of a storage form, say) with a few digits. The order conditions fix
some of them; the rest are free and are held at the printed value. Which ones are solved for is chosen by
pivoting, so that the change is well conditioned, unless the caller names those to hold.

Made with it, from the printed numbers: `allampalli-hixon-4-stages-6` and `-7`, `bernardini-pirozzoli-2`,
`calvo-franco-randez-4`, `kubatko-yeager-ketcheson-2-stages-3`, `stanescu-habashi-4-stages-5` and `-6`,
`toulorge-desmet-3-stages-7`, `toulorge-desmet-second-4-stages-8` and `tselios-simos-4`; from an optimisation
of the strong-stability coefficient in float64: `ssp-3-stages-6` to `-8` and `ssp-4-stages-6` to `-9`.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from itertools import combinations_with_replacement
from math import prod
from typing import Any

import numpy
from mpmath import mp, mpf
from scipy.linalg import qr

Tree = tuple["Tree", ...]
Rows = list[list[Any]]
Form = Callable[[Sequence[Any]], tuple[Rows, list[Any]]]
System = Callable[[Sequence[Any]], list[Any]]

MOST_STEPS = 40


def trees(order: int) -> list[Tree]:
    """Return the rooted trees of an order (1, 1, 2, 4, 9, …), each as the sorted tuple of its branches."""
    if order == 1:
        return [()]
    return sorted({tuple(sorted(branches)) for branches in _forests(order - 1)})


def _forests(count: int, largest: int | None = None) -> Iterator[tuple[Tree, ...]]:
    """Yield the multisets of trees of `count` vertices in all, each tree of at most `largest` vertices."""
    if count == 0:
        yield ()
    for size in range(min(count, count if largest is None else largest), 0, -1):
        for times in range(count // size, 0, -1):
            for rest in _forests(count - size * times, size - 1):
                yield from (same + rest for same in combinations_with_replacement(trees(size), times))


def vertices(tree: Tree) -> int:
    """Return the number of vertices of a tree."""
    return 1 + sum(map(vertices, tree))


def density(tree: Tree) -> int:
    """Return the density: the product over all vertices of the vertices above and including each."""
    return vertices(tree) * prod(map(density, tree))


def defects(rows: Rows, weights: Sequence[Any], order: int) -> list[Any]:
    """Return by how much each condition up to an order fails: the elementary weight less 1/density.

    Source: J. C. Butcher, Coefficients for the study of Runge–Kutta integration processes (1963).
    """
    known: dict[Tree, list[Any]] = {}

    def stages(tree: Tree) -> list[Any]:
        if tree not in known:
            above = [_times(rows, stages(branch)) for branch in tree]
            ones = [mpf(1)] * len(weights)
            known[tree] = [prod(values) for values in zip(ones, *above, strict=True)]
        return known[tree]

    wanted = [tree for size in range(1, order + 1) for tree in trees(size)]
    return [sum(b * v for b, v in zip(weights, stages(t), strict=True)) - mpf(1) / density(t) for t in wanted]


def _times(rows: Rows, values: Sequence[Any]) -> list[Any]:
    return [sum((a * v for a, v in zip(row, values, strict=False)), mpf(0)) for row in rows]


def two_registers(numbers: Sequence[Any]) -> tuple[Rows, list[Any]]:
    """Return matrix and weights of A₂ … A_s, B₁ … B_s (Williamson 1980: S ← A S + hF, u ← u + B S)."""
    stages = (len(numbers) + 1) // 2
    factors, steps = [mpf(0), *numbers[: stages - 1]], numbers[stages - 1 :]
    slope, state, rows = [mpf(0)] * stages, [mpf(0)] * stages, []
    for i, (factor, step) in enumerate(zip(factors, steps, strict=True)):
        rows.append(state[:i])
        slope = [factor * x for x in slope]
        slope[i] += 1
        state = [u + step * x for u, x in zip(state, slope, strict=True)]
    return rows, state


def weights_left(numbers: Sequence[Any]) -> tuple[Rows, list[Any]]:
    """Return matrix and weights of a₂₁ … a_{s,s−1}, b₁ … b_s: before its last entry a row repeats the b."""
    stages = (len(numbers) + 1) // 2
    last, weights = numbers[: stages - 1], list(numbers[stages - 1 :])
    return [[*weights[: max(i - 1, 0)], *last[max(i - 1, 0) : i]] for i in range(stages)], weights


def solve(
    system: System,
    printed: Sequence[Any],
    held: Sequence[int] = (),
    digits: int = 60,
) -> tuple[list[Any], list[int]]:
    """Solve a system near printed numbers by Newton's method; return the numbers and which were solved for.

    Those held are kept, and so are as many more as the system leaves free: the choice is by column pivoting.
    """
    with mp.workdps(digits + 15):
        values = [mpf(x) if isinstance(x, (str, int, float)) else x for x in printed]
        free = [i for i in range(len(values)) if i not in held]
        chosen = _chosen(system, values, free)
        for _ in range(MOST_STEPS):
            failing = system(values)
            worst = max(map(abs, failing))
            if worst < mpf(10) ** -(digits + 5):
                return values, chosen
            change = mp.lu_solve(_slopes(system, values, chosen), mp.matrix(failing))
            for i, by in zip(chosen, change, strict=True):
                values[i] -= by
    raise ArithmeticError(f"no convergence: the worst condition fails by {mp.nstr(worst, 3)}")


def _chosen(system: System, values: Sequence[Any], free: Sequence[int]) -> list[int]:
    """Return as many of the free places as the system determines, those that it answers to most."""
    slopes = _slopes(system, values, free)
    _, triangle, pivots = qr(numpy.array(slopes.tolist(), dtype=float), pivoting=True)
    size = numpy.abs(numpy.diag(triangle))
    rank = int((size > 1e-6 * size[0]).sum())
    return sorted(free[i] for i in pivots[:rank])


def _slopes(system: System, values: Sequence[Any], columns: Sequence[int]) -> Any:
    step = mpf(10) ** (-mp.dps // 2)
    sides = []
    for i in columns:
        moved = list(values)
        moved[i] += step
        ahead = system(moved)
        moved[i] -= 2 * step
        sides.append([(x - y) / (2 * step) for x, y in zip(ahead, system(moved), strict=True)])
    return mp.matrix(sides).T


def polish(
    form: Form, printed: Sequence[str], order: int, held: Sequence[int] = ()
) -> tuple[list[Any], list[int]]:
    """Return a form's numbers that meet all conditions of an order to 60 digits, and the solved ones."""
    return solve(lambda numbers: defects(*form(numbers), order), printed, held)


def contractive(places: Sequence[tuple[int, int]], stages: int) -> Form:
    """Return the form whose numbers are the nonzero combination weights α_ij and then the radius r.

    K = (I − α)⁻¹ α / r: the Shu–Osher form whose every Euler step has the length h/r.
    """

    def form(numbers: Sequence[Any]) -> tuple[Rows, list[Any]]:
        radius = numbers[-1]
        table: Rows = [[mpf(0)] * stages for _ in range(stages + 1)]
        for (i, j), value in zip(places, numbers, strict=False):
            table[i][j] = value
        rows: Rows = []
        for i in range(stages + 1):
            row = [table[i][j] / radius for j in range(stages)]
            for j in range(1, min(i, stages)):
                row = [x + table[i][j] * y for x, y in zip(row, rows[j], strict=True)]
            rows.append(row)
        return [row[:i] for i, row in enumerate(rows[:stages])], rows[stages]

    return form
