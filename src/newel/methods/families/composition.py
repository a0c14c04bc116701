"""Methods made from others: several steps as one, two methods in turn, and Richardson's table of any method.

A step of h made of parts of h·θ₁, h·θ₂, … is one Runge–Kutta method whose matrix has the parts' matrices,
scaled, on its diagonal, and their weights below. Sources: Butcher, Numerical Methods for Ordinary
Differential Equations, section 38; L. F. Richardson, Phil. Trans. R. Soc. A 226 (1927) 299-349.

Numbers are exact where those of the parts are; a rounded one hands its rounding on, scaled as the number is.
"""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction

from newel.errors import BadRequest
from newel.methods.families.carried import ZERO, Rounded, carried, digits_of, scaled, values
from newel.methods.tableau import HIGHEST_ORDER, MOST_STAGES, Notes, Tableau

__all__ = ["composed", "repeated", "richardson"]

Part = tuple[Tableau, Fraction]
_LONGEST_SLUG = 80


def repeated(times: int, method: Tableau) -> Tableau:
    """Return `repeated-<times>-<slug>`: so many equal steps of a method as one step.

    Raises:
        BadRequest: the number of steps is not from 2 on, or the tableau would be too large.

    >>> euler = Tableau("euler-1", order=1, matrix=[[]], weights=[1])
    >>> repeated(3, euler)
    <Tableau repeated-3-euler-1: order 1, 3 stages>
    """
    slug = f"repeated-{times}-{method.slug}"
    if times < 2 or times * method.stages > MOST_STAGES or len(slug) > _LONGEST_SLUG:
        raise BadRequest(
            f"{slug[:60]}: {times} steps of {method.stages} stages\n"
            f"  From 2 steps on, with {MOST_STAGES} stages and a slug of {_LONGEST_SLUG} characters at most.",
            argument="times",
        )
    return composed([(method, Fraction(1, times))] * times, slug)


def composed(parts: Sequence[tuple[Tableau, Fraction | int | str]], slug: str) -> Tableau:
    """Return the method that takes steps of several methods in turn, each over its fraction of the step.

    Args:
        parts: methods with their fractions θ, exact numbers that sum to 1; a negative one steps back.
        slug: the name of the tableau.

    Returns:
        The tableau; its order is claimed to be the lowest of the parts. Where all of them are pairs it is a
        pair, whose error estimate is the sum of theirs.

    Raises:
        BadRequest: the fractions do not sum to 1, one is 0, or the tableau would be too large.

    >>> euler = Tableau("euler-1", order=1, matrix=[[]], weights=[1])
    >>> [str(c) for c in composed([(euler, "1/3"), (euler, "2/3")], "two-steps-1").nodes]
    ['0', '1/3']
    """
    taken = [(method, Fraction(fraction)) for method, fraction in parts]
    if not taken or sum(fraction for _, fraction in taken) != 1 or not all(fraction for _, fraction in taken):
        listed = ", ".join(str(fraction) for _, fraction in taken)
        raise BadRequest(f"{slug}: fractions {listed} do not sum to 1, or one is 0", argument="parts")
    stages = sum(method.stages for method, _ in taken)
    if stages > MOST_STAGES:
        raise BadRequest(f"{slug}: {stages} stages; at most {MOST_STAGES} are allowed", argument="parts")
    nodes, matrix, weights = _in_turn(taken)
    arrays = {"nodes": nodes, "weights": weights}
    arrays |= {f"matrix[{i}]": row for i, row in enumerate(matrix, 1)}
    pair = all(method.embedded_order is not None for method, _ in taken)
    embedded = [x for method, fraction in taken for x in scaled(_embedded(method), fraction)] if pair else []
    if pair:
        arrays["embedded"] = embedded
    names = ", ".join(dict.fromkeys(method.slug for method, _ in taken))
    return Tableau(
        slug,
        name=f"{len(taken)} steps in turn of {names}",
        order=min(method.order for method, _ in taken),
        matrix=[values(row) for row in matrix],
        weights=values(weights),
        nodes=values(nodes),
        embedded_weights=values(embedded) if pair else None,
        embedded_order=min(method.embedded_order or 1 for method, _ in taken) if pair else None,
        source="; ".join(dict.fromkeys(method.source for method, _ in taken)),
        numbers=f"derived: by composition from {names}",
        digits=digits_of(taken[0][0], arrays),
        notes=Notes(
            remarks=[f"Steps of {' and '.join(str(fraction) for _, fraction in taken[:8])} in turn."]
        ),
    )


def _in_turn(parts: Sequence[Part]) -> tuple[list[Rounded], list[list[Rounded]], list[Rounded]]:
    """Return nodes, rows without their zeros, and weights."""
    nodes: list[Rounded] = []
    matrix: list[list[Rounded]] = []
    weights: list[Rounded] = []
    start = Fraction(0)
    for method, fraction in parts:
        nodes += [
            (start + x, unit)
            for x, unit in scaled(carried(method.nodes, method.half_units("nodes")), fraction)
        ]
        for i, (row, units) in enumerate(zip(method.matrix, method.half_units("matrix"), strict=True)):
            matrix.append(weights + scaled(carried(row[:i], units[:i]), fraction))
        weights = weights + scaled(carried(method.weights, method.half_units("weights")), fraction)
        start += fraction
    return nodes, matrix, weights


def _embedded(method: Tableau) -> list[Rounded]:
    return carried(method.embedded_weights or (), method.half_units("embedded"))


def richardson(levels: int, method: Tableau) -> Tableau:
    """Return `richardson-<levels>-<slug>`: 1, 2, …, k steps of a method over one step, extrapolated.

    A method of order p whose errors are powers h^p, h^(p+1), … of the step loses one of them a level. All
    levels share the first stage. The table without its first row is embedded.

    Raises:
        BadRequest: the levels are not from 2 on, or the tableau would be too large.

    >>> euler = Tableau("euler-1", order=1, matrix=[[]], weights=[1])
    >>> richardson(3, euler)
    <Tableau richardson-3-euler-1: order 3(2), 4 stages>
    """
    slug = f"richardson-{levels}-{method.slug}"
    s, order = method.stages, method.order + levels - 1
    stages = s * levels * (levels + 1) // 2 - levels + 1
    if levels < 2 or order > HIGHEST_ORDER or stages > MOST_STAGES or len(slug) > _LONGEST_SLUG:
        raise BadRequest(
            f"{slug[:60]}: order {order} with {stages} stages\n"
            f"  From 2 levels on, with order {HIGHEST_ORDER}, {MOST_STAGES} stages and a slug of "
            f"{_LONGEST_SLUG} characters at most.",
            argument="levels",
        )
    nodes, matrix, ends = _levels(levels, method)
    whole = _extrapolated(method, range(1, levels + 1), ends, stages)
    before = _extrapolated(method, range(2, levels + 1), ends[1:], stages)
    arrays = {"nodes": nodes, "weights": whole, "embedded": before}
    arrays |= {f"matrix[{i}]": row for i, row in enumerate(matrix, 1)}
    return Tableau(
        slug,
        name=f"{method.name}, extrapolated from {levels} levels",
        order=order,
        matrix=[values(row) for row in matrix],
        weights=values(whole),
        nodes=values(nodes),
        embedded_weights=values(before),
        embedded_order=order - 1,
        authors=method.authors,
        source=f"Richardson extrapolation of {method.slug}: {method.source}",
        numbers=f"derived: by Richardson extrapolation from {method.slug}",
        digits=digits_of(method, arrays),
        notes=Notes(weaknesses=[f"{stages} stages for order {order}: pairs found for one order need fewer."]),
    )


def _levels(levels: int, method: Tableau) -> tuple[list[Rounded], list[list[Rounded]], list[list[int]]]:
    """Return nodes and rows of all levels, and the places of the stages of each level, step by step."""
    s = method.stages
    nodes, matrix, ends = [(method.nodes[0], Fraction(0))], [[ZERO][:0]], []
    for level in range(1, levels + 1):
        part = [(method, Fraction(1, level))] * level
        own_nodes, own_rows, _ = _in_turn(part)
        first = len(matrix) - 1
        places = [0, *range(first + 1, first + s * level)]
        for i in range(1, s * level):
            row = [*own_rows[i][:1], *[ZERO] * first, *own_rows[i][1:]]
            matrix.append(row)
            nodes.append(own_nodes[i])
        ends.append(places)
    return nodes, matrix, ends


def _extrapolated(
    method: Tableau, numbers: Sequence[int], ends: Sequence[Sequence[int]], stages: int
) -> list[Rounded]:
    """Return the weights of Σ w_j T_j; what is rounded in b₁ enters the shared stage once."""
    factors = [Fraction(0)] * stages
    source = [0] * stages
    for number, share, places in zip(numbers, _shares(numbers, method.order), ends, strict=True):
        for k, place in enumerate(places):
            factors[place] += share / number
            source[place] = k % method.stages
    weights = carried(method.weights, method.half_units("weights"))
    return [scaled([weights[k]], factor)[0] for k, factor in zip(source, factors, strict=True)]


def _shares(numbers: Sequence[int], order: int) -> list[Fraction]:
    """Solve Σ w_j = 1 and Σ w_j/n_j^q = 0 for q = p, p + 1, …, as many as there are numbers."""
    size = len(numbers)
    powers = [0, *range(order, order + size - 1)]
    rows = [[Fraction(1, n**q) for n in numbers] + [Fraction(int(q == 0))] for q in powers]
    for k in range(size):
        pivot = next(i for i in range(k, size) if rows[i][k])
        rows[k], rows[pivot] = rows[pivot], rows[k]
        rows[k] = [x / rows[k][k] for x in rows[k]]
        for i in range(size):
            if i != k and rows[i][k]:
                rows[i] = [x - rows[i][k] * y for x, y in zip(rows[i], rows[k], strict=True)]
    return [row[-1] for row in rows]
