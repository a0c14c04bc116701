"""The proof of a method's claims.

Order conditions are taken from rooted trees, tree by tree and by increasing order; each is decided by
interval arithmetic in fixed point, and zeros are confirmed exactly (`conditions` has the rules). The outcome
is "exact", "rounded" or "fails", and the three are never mixed up: only a tableau that states digits can be
"rounded".
"""

from __future__ import annotations

import hashlib
import json
import math
from collections.abc import Callable, Iterator, Mapping
from fractions import Fraction
from typing import TYPE_CHECKING, Any, Literal

import attrs

from newel.methods.coefficients import Coefficients
from newel.methods.conditions import HANDFUL, LIMIT, MANY_TREES, Conditions, Part, allowed, readable
from newel.methods.elementary_weights import ElementaryWeights, FixedPoint
from newel.methods.exact import Exact
from newel.methods.float_views import largest_float_residual
from newel.methods.remarks import remarks, undetermined
from newel.methods.storage_proof import storage_failures
from newel.methods.trees import tree_count, trees
from newel.methods.verdict import Failure, Verdict

if TYPE_CHECKING:
    from newel.methods.storage import Storage
    from newel.methods.tableau import Tableau

__all__ = ["PROOF_VERSION", "Failure", "Verdict", "proof_key", "prove", "prove_coefficients"]

PROOF_VERSION = 1
"""Raised whenever the rules of the proof change, so that stored outcomes are not taken for new ones."""

FLOOR_BITS = 128
Progress = Callable[[int, int], None]


def prove(tableau: Tableau, progress: Progress | None = None) -> Verdict:
    """Prove what a tableau claims: orders of all its weights, row sums as nodes, and its storage form.

    Args:
        tableau: the method; its `proof` plays no part.
        progress: called as `progress(done, total)` with numbers of conditions, now and then.

    Returns:
        The verdict; "fails" is an outcome, not an error.

    Raises:
        BadTableau: the numbers need two different square roots, or exceed 1e100.

    >>> from newel.methods.tableau import Tableau
    >>> verdict = prove(Tableau("midpoint-2", order=2, matrix=[[], ["1/2"]], weights=[0, 1]))
    >>> verdict.outcome, verdict.order
    ('exact', 2)
    """
    verdict = prove_coefficients(Coefficients.of(tableau), _least_digits(tableau), progress)
    differing = tuple(storage_failures(tableau))
    if differing:
        return attrs.evolve(verdict, outcome="fails", failures=(*verdict.failures, *differing[:HANDFUL]))
    short = _too_few_digits(verdict)
    if short:
        verdict = attrs.evolve(verdict, remarks=(short, *verdict.remarks))
    rounded_form = tableau.storage is not None and tableau.storage.digits is not None
    if verdict.outcome == "exact" and rounded_form:
        return attrs.evolve(verdict, outcome="rounded", digits=_least_digits(tableau))
    return verdict


def _too_few_digits(verdict: Verdict) -> str:
    """Say how many digits would do, where what fails is no more than the rounding of the stated ones.

    A residual shrinks tenfold with each digit; one above a thousand units of the last digit is no rounding.
    """
    residuals = [abs(f.residual) for f in verdict.failures if f.part != "claim" and f.bound == LIMIT]
    conditions = sum(f.part != "claim" for f in verdict.failures)
    if verdict.digits is None or not residuals or len(residuals) < conditions:
        return ""
    worst = max(residuals)
    if not LIMIT < worst <= 10.0 ** (3 - verdict.digits):
        return ""
    needed = verdict.digits + math.ceil(math.log10(worst / LIMIT))
    return (
        f"{verdict.digits} trusted digits leave conditions off by up to {worst:.1g}, and {LIMIT:g} is the "
        f"limit: about {needed} digits are needed"
    )


def prove_coefficients(
    coefficients: Coefficients, digits: int | None = None, progress: Progress | None = None
) -> Verdict:
    """Prove claims on bare arrays, triangular or not; see `prove`.

    >>> permuted = Coefficients(matrix=[[0, "1/2"], [0, 0]], weights=[1, 0], order=2)
    >>> prove_coefficients(permuted).order
    2
    """
    parts = coefficients.parts()
    conditions = Conditions(
        coefficients.matrix,
        coefficients.slack("matrix"),
        coefficients.floats("matrix"),
        coefficients.radicand,
        coefficients.bits,
        _ticker(parts, progress),
    )
    conditions.decide(parts)
    failures = [*_row_sums(coefficients), *_ends(coefficients)]
    orders: dict[str, int] = {}
    for part in parts:
        orders[part.name], failing = conditions.proven_order(part)
        failures += failing
        if orders[part.name] < part.claimed:
            failures.append(_claim(part, orders[part.name]))
    return Verdict(
        outcome="fails" if failures else "rounded" if coefficients.rounded else "exact",
        digits=digits if coefficients.rounded else None,
        order=orders["weights"],
        embedded_order=orders.get("embedded"),
        continuous_order=orders.get("continuous"),
        working_floor=working_floor(coefficients, min(orders["weights"], coefficients.order)),
        failures=tuple(failures),
        remarks=remarks(coefficients, conditions, parts, list(orders.values())),
        undetermined=() if failures else undetermined(coefficients, conditions.sensitivities, parts),
    )


def proof_key(tableau: Tableau) -> str:
    """Return a SHA-256 in hex of all that a proof rests on: numbers, claims, digits, and its own version.

    >>> from newel.methods.tableau import Tableau
    >>> euler = Tableau("euler", order=1, matrix=[[]], weights=[1])
    >>> proof_key(euler) == proof_key(Tableau("other-name", order=1, matrix=[[]], weights=[1]))
    True
    """
    digits = tableau.digits
    facts = {
        "digest": tableau.digest,
        "claims": [tableau.order, tableau.embedded_order, tableau.continuous_order],
        "digits": dict(digits) if isinstance(digits, Mapping) else digits,
        "version": PROOF_VERSION,
    }
    if tableau.storage is not None:
        facts["storage"] = _storage_facts(tableau.storage)
    return hashlib.sha256(json.dumps(facts, sort_keys=True).encode("ascii")).hexdigest()


def working_floor(coefficients: Coefficients, order: int) -> float:
    """Return a bound of the largest residual that the float64 coefficients leave.

    The residuals are those of the row sums and of the conditions of the weights up to `order`, evaluated on
    the float64 numbers themselves in fixed point with a proven error; unitless. Embedded and continuous
    weights, which carry nothing on, take no part.
    """
    matrix = [[Exact(Fraction(x)) for x in row] for row in coefficients.floats("matrix").tolist()]
    if order > MANY_TREES and not coefficients.rounded:
        views, weight_views = coefficients.floats("matrix"), coefficients.floats("weights")
        largest = largest_float_residual(
            coefficients.matrix, coefficients.weights, views, weight_views, order
        )
    else:
        largest = _largest_residual(coefficients, matrix, order)
    if coefficients.nodes is not None:
        for node, row in zip(coefficients.floats("nodes").tolist(), matrix, strict=True):
            exactly = sum((x.rational for x in row), Fraction(-node))
            largest = max(largest, abs(float(exactly)))
    return largest


def _largest_residual(coefficients: Coefficients, matrix: list[list[Exact]], order: int) -> float:
    """Return the largest residual of the float64 weights with this matrix, in fixed point, tree by tree."""
    weights = [Exact(Fraction(x)) for x in coefficients.floats("weights").tolist()]
    arithmetic = FixedPoint(matrix, coefficients.bits - 256 + FLOOR_BITS)
    vectors, vector = ElementaryWeights(arithmetic), arithmetic.vector(weights)
    residuals = (
        arithmetic.residual(vector, vectors.stages(tree.index), Fraction(1, tree.density))
        for n in range(1, order + 1)
        for tree in trees(n)
    )
    return max((residual.magnitude for residual in residuals), default=0.0)


def _row_sums(coefficients: Coefficients) -> Iterator[Failure]:
    if coefficients.nodes is None:
        return
    slack = coefficients.slack("nodes") + coefficients.slack("matrix").sum(axis=1)
    for stage, (node, row) in enumerate(zip(coefficients.nodes, coefficients.matrix, strict=True), 1):
        total = sum((x for x in row if x), Exact(0))
        bound = allowed(float(slack[stage - 1]))
        if abs(total - node) > Fraction(bound):
            message = f"row {stage}: the node is {readable(node)}, the sum of the row is {readable(total)}"
            message += _by_how_much(total - node, bound)
            yield _failure("row sum", f"row {stage}", total - node, bound, message)


def _ends(coefficients: Coefficients) -> Iterator[Failure]:
    """Hold the continuous weights at θ = 1 against the weights."""
    if coefficients.continuous is None:
        return
    slack = coefficients.slack("weights") + coefficients.slack("continuous").sum(axis=1)
    pairs = zip(coefficients.weights, coefficients.continuous, strict=True)
    for stage, (weight, row) in enumerate(pairs, 1):
        total = sum((x for x in row if x), Exact(0))
        bound = allowed(float(slack[stage - 1]))
        if abs(total - weight) > Fraction(bound):
            message = f"continuous: stage {stage} sums to {readable(total)}, its weight is {readable(weight)}"
            message += _by_how_much(total - weight, bound)
            yield _failure("continuous", f"end of the step, stage {stage}", total - weight, bound, message)


def _by_how_much(residual: Exact, bound: float) -> str:
    accepted = f", and the stated digits excuse {bound:.2g}" if bound else ""
    return f"; they differ by {float(residual):.3g}{accepted}"


def _failure(
    part: Literal["row sum", "continuous"], condition: str, residual: Exact, bound: float, message: str
) -> Failure:
    return Failure(
        part=part,
        condition=condition,
        residual=float(residual),
        residual_text=readable(residual),
        bound=bound,
        message=message,
    )


def _claim(part: Part, proven: int) -> Failure:
    text = f"order {part.claimed} is claimed, order {proven} is proved"
    return Failure(
        part="claim",
        condition=f"{part.name} of order {part.claimed}",
        residual=float(part.claimed - proven),
        residual_text=text,
        bound=0.0,
        message=f"{part.name}: {text}",
    )


def _least_digits(tableau: Tableau) -> int | None:
    digits = tableau.digits
    stated: list[Any] = list(digits.values()) if isinstance(digits, Mapping) else [digits]
    stated.append(None if tableau.storage is None else tableau.storage.digits)
    return min((value for value in stated if isinstance(value, int)), default=None)


def _storage_facts(storage: Storage) -> dict[str, Any]:
    arrays = {
        key: [[x.canonical for x in row] if isinstance(row, tuple) else row.canonical for row in rows]
        for key, rows in storage.arrays().items()
    }
    return {"form": storage.form, "digits": storage.digits, **arrays}


def _ticker(parts: list[Part], progress: Progress | None) -> Callable[[], None]:
    if progress is None:
        return lambda: None
    total = sum(tree_count(order) for part in parts for order in range(1, part.claimed + 1))
    done = 0

    def tick() -> None:
        nonlocal done
        done += 1
        if done % 64 == 0 or done == total:
            progress(min(done, total), total)

    return tick
