"""Order conditions by explicit tree formulas in mpmath: code of its own, which never imports newel.

A method has order p when, for every rooted tree t with at most p nodes, the sum over stages of
b_i Phi_i(t) is 1/gamma(t) (J. C. Butcher, Numerical Methods for Ordinary Differential Equations, section 31;
Hairer, Nørsett and Wanner, Solving Ordinary Differential Equations I, section II.2; places from memory).
Phi_i(t) is the product over the branches u at the root of sum_j a_ij Phi_j(u), and gamma(t) is the number of
nodes times the densities of the branches. For continuous weights b_i(theta) the right side is
theta^n/gamma(t), compared power by power.

Trees come from their level sequences (T. Beyer and S. M. Hedetniemi, SIAM J. Comput. 9 (1980) 706-712).

    python -m tests.independent.tree_formulas FILE...

prints, for each weight vector of each file, the order attained and the largest residual of each order.
"""

from __future__ import annotations

import re
import sys
import tomllib
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from functools import cache
from itertools import takewhile
from math import factorial
from pathlib import Path
from typing import Any

import mpmath

NestedTree = tuple[Any, ...]
"""A rooted tree as the sorted tuple of the trees that hang at its root; a single node is ()."""
TOKEN = re.compile(r"\d+\.?\d*(?:[eE][+-]?\d+)?|\.\d+|sqrt|\*\*|[-+*/^()]|\S")


def level_sequences(nodes: int) -> Iterator[tuple[int, ...]]:
    """Each rooted tree with that many nodes once, as the depths of its nodes in preorder."""
    levels = list(range(1, nodes + 1))
    while True:
        yield tuple(levels)
        above_second = [place for place, level in enumerate(levels) if level > 2]
        if not above_second:
            return
        last = above_second[-1]
        parent = max(place for place in range(last) if levels[place] == levels[last] - 1)
        period = last - parent
        for place in range(last, nodes):
            levels[place] = levels[place - period]


def nest(levels: Sequence[int]) -> NestedTree:
    """The nested tuple of a level sequence."""
    branches: list[NestedTree] = []
    start = 1
    for place in range(2, len(levels) + 1):
        if place == len(levels) or levels[place] == levels[0] + 1:
            branches.append(nest(levels[start:place]))
            start = place
    return tuple(sorted(branches))


@cache
def rooted_trees(nodes: int) -> tuple[NestedTree, ...]:
    """All rooted trees with that many nodes."""
    return tuple(nest(levels) for levels in level_sequences(nodes))


@cache
def size(tree: NestedTree) -> int:
    """The number of nodes."""
    return 1 + sum(size(branch) for branch in tree)


@cache
def density(tree: NestedTree) -> int:
    """gamma(t)."""
    product = size(tree)
    for branch in tree:
        product *= density(branch)
    return product


@cache
def symmetry(tree: NestedTree) -> int:
    """sigma(t): the number of ways to permute equal branches."""
    product = 1
    for branch in set(tree):
        product *= factorial(tree.count(branch)) * symmetry(branch) ** tree.count(branch)
    return product


def evaluate(text: str | int) -> mpmath.mpf:
    """The number that a text such as "35/384", "0.1" or "(5 - sqrt(5))/10" stands for."""
    tokens = TOKEN.findall(str(text).replace("−", "-"))

    def take(*allowed: str) -> str | None:
        return tokens.pop(0) if tokens and tokens[0] in allowed else None

    def addition() -> mpmath.mpf:
        value = product()
        while sign := take("+", "-"):
            value = value + product() if sign == "+" else value - product()
        return value

    def product() -> mpmath.mpf:
        value = signed()
        while sign := take("*", "/"):
            value = value * signed() if sign == "*" else value / signed()
        return value

    def signed() -> mpmath.mpf:
        if sign := take("+", "-"):
            return signed() if sign == "+" else -signed()
        value = atom()
        return value ** int(signed()) if take("^", "**") else value

    def atom() -> mpmath.mpf:
        if take("sqrt"):
            return mpmath.sqrt(atom())
        if take("("):
            value = addition()
            assert take(")"), f"unclosed parenthesis in {text!r}"
            return value
        return mpmath.mpf(tokens.pop(0))

    value = addition()
    assert not tokens, f"cannot read {text!r} from {tokens[0]!r} on"
    return value


def load(path: Path | str, dps: int = 60) -> dict[str, Any]:
    """A tableau file as mpmath numbers (`matrix` square, absent weight vectors None) with its claims."""
    return from_document(tomllib.loads(Path(path).read_text(encoding="utf-8")), dps)


def from_document(document: Mapping[str, Any], dps: int = 60) -> dict[str, Any]:
    """The same from parsed TOML; rows of the matrix are filled up with zeros to a square."""
    stages = len(document["weights"])
    embedded, continuous = document.get("embedded", {}), document.get("continuous", {})
    with mpmath.workdps(dps + 15):
        matrix = [[evaluate(entry) for entry in row] for row in document["matrix"]]
        for row in matrix:
            row.extend([mpmath.mpf(0)] * (stages - len(row)))
        weights = [evaluate(entry) for entry in document["weights"]]
        sums = [mpmath.fsum(row) for row in matrix]
        nodes = [evaluate(entry) for entry in document["nodes"]] if "nodes" in document else sums
        return {
            "slug": document.get("slug"),
            "order": document["order"],
            "digits": document.get("digits"),
            "nodes": nodes,
            "matrix": matrix,
            "weights": weights,
            "embedded": [evaluate(entry) for entry in embedded.get("weights", ())] or None,
            "embedded_order": embedded.get("order"),
            "continuous": [[evaluate(entry) for entry in row] for row in continuous.get("weights", ())]
            or None,
            "continuous_order": continuous.get("order"),
        }


@dataclass(frozen=True)
class Attained:
    """What one weight vector attains: `residuals[n]` is the largest residual over the trees with n nodes."""

    order: int
    residuals: dict[int, mpmath.mpf]
    claimed: int | None

    @property
    def worst(self) -> mpmath.mpf:
        """The largest residual up to the attained order."""
        return max((self.residuals[order] for order in range(1, self.order + 1)), default=mpmath.mpf(0))


@dataclass(frozen=True)
class Report:
    """The orders of a tableau, and the largest difference between a node and its row sum."""

    weights: Attained
    embedded: Attained | None
    continuous: Attained | None
    row_sums: mpmath.mpf
    tolerance: float


def stage_values(matrix: Sequence[Sequence[Any]]) -> Callable[[NestedTree], list[Any]]:
    """A function that gives Phi_1(t), ..., Phi_s(t) for a tree."""
    rows = [[(column, entry) for column, entry in enumerate(row) if entry != 0] for row in matrix]

    @cache
    def through_matrix(tree: NestedTree) -> list[Any]:
        below = phi(tree)
        return [sum((entry * below[column] for column, entry in row), start=mpmath.mpf(0)) for row in rows]

    def phi(tree: NestedTree) -> list[Any]:
        values = [mpmath.mpf(1)] * len(matrix)
        for branch in tree:
            values = [value * factor for value, factor in zip(values, through_matrix(branch), strict=True)]
        return values

    return phi


def error_norm(data: Mapping[str, Any], weights: Sequence[Any], order: int, dps: int = 40) -> mpmath.mpf:
    """The 2-norm over the trees of that order of (b Phi - 1/gamma)/sigma: the usual principal error norm."""
    with mpmath.workdps(dps):
        phi = stage_values(data["matrix"])
        residuals = (
            (mpmath.fdot(weights, phi(tree)) - mpmath.mpf(1) / density(tree)) / symmetry(tree)
            for tree in rooted_trees(order)
        )
        return mpmath.sqrt(mpmath.fsum(residual**2 for residual in residuals))


def orders(
    data: Mapping[str, Any], dps: int = 60, up_to: int | None = None, tolerance: float | None = None
) -> Report:
    """The order that each weight vector attains, looked for up to `up_to` (default: each claim plus one).

    A residual counts as zero up to `tolerance`: 1e-40 where the file states no digits, else 1e-12.
    """
    allowed = tolerance if tolerance is not None else (1e-12 if data["digits"] is not None else 1e-40)
    with mpmath.workdps(dps):
        phi = stage_values(data["matrix"])
        sums = [mpmath.fsum(row) for row in data["matrix"]]

        def attained(part: str, claim: int | None) -> Attained | None:
            if data[part] is None:
                return None
            vector = data[part] if part == "continuous" else [[entry] for entry in data[part]]
            worst: dict[int, mpmath.mpf] = {}
            for order in range(1, (up_to or (claim or 0) + 1) + 1):
                trees = rooted_trees(order)
                worst[order] = max(power_residual(phi, vector, tree, part == "continuous") for tree in trees)
            held = takewhile(lambda order: worst[order] <= allowed, worst)
            return Attained(max(held, default=0), worst, claim)

        weights = attained("weights", data["order"])
        assert weights is not None
        return Report(
            weights=weights,
            embedded=attained("embedded", data["embedded_order"]),
            continuous=attained("continuous", data["continuous_order"]),
            row_sums=max(abs(node - total) for node, total in zip(data["nodes"], sums, strict=True)),
            tolerance=allowed,
        )


def power_residual(
    phi: Callable[[NestedTree], list[Any]],
    vector: Sequence[Sequence[Any]],
    tree: NestedTree,
    continuous: bool,
) -> mpmath.mpf:
    """The largest absolute residual over the powers of theta; plain weights count as one power alone."""
    values, order = phi(tree), size(tree)
    wanted = [mpmath.mpf(0)] * max(order, *map(len, vector)) if continuous else [mpmath.mpf(0)]
    wanted[order - 1 if continuous else 0] = mpmath.mpf(1) / density(tree)
    columns = [[row[power] if power < len(row) else 0 for row in vector] for power in range(len(wanted))]
    return max(abs(mpmath.fdot(column, values) - want) for column, want in zip(columns, wanted, strict=True))


def main(files: Sequence[str]) -> int:
    """Print one line a weight vector; the exit status is 1 if a claim is missed."""
    missed = False
    for file in files:
        data = load(file)
        report = orders(data)
        print(f"{data['slug']}  row sums {mpmath.nstr(report.row_sums, 3)}")
        for part in ("weights", "embedded", "continuous"):
            result: Attained | None = getattr(report, part)
            if result is None:
                continue
            texts = " ".join(f"{order}:{mpmath.nstr(value, 3)}" for order, value in result.residuals.items())
            verdict = "as claimed" if result.order == result.claimed else f"BUT CLAIMED {result.claimed}"
            missed = missed or result.order != result.claimed
            print(f"  {part}: order {result.order} {verdict}  {texts}")
        missed = missed or report.row_sums > report.tolerance
    return int(missed)


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
