"""`recover`: the method in somebody's own step function, proved, recognised, repaired where it is wrong."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import TYPE_CHECKING, Any

import attrs

from newel.catalogue.identify import Identity, identities
from newel.catalogue.registry import Registry, default_registry
from newel.errors import BadRequest, NotRecovered

if TYPE_CHECKING:
    from newel.methods.misprints import Search
    from newel.methods.order_conditions import Verdict
    from newel.methods.recovery import Reading
    from newel.methods.repairs import Repair
    from newel.methods.tableau import Tableau

__all__ = ["Recovered", "recover"]

TRUSTED_DIGITS = 15
"""Of a coefficient that is no short fraction; a float64 has between 15 and 17."""

_WRITE = "Write it as step(rate, t, y, h) that calls rate(t, y) and returns the new state."
_NO_METHOD = "It is no explicit Runge–Kutta step, and no tableau says what it does."
_ADVICE = {
    "memory": f"{_NO_METHOD} Multistep methods are none; give a fresh function if it counts or keeps.",
    "branch": f"{_NO_METHOD} Take out what looks at the data: limits belong to the model.",
    "overwritten": f"{_NO_METHOD} Copy y before it is changed: y = y.copy().",
    "raises": "Try it on a state of zeros; length=2 tells the length of the state that it needs, 0 a number.",
    "never calls": _WRITE,
    "calls": _WRITE,
    "signature": _WRITE,
    "shape": "Give the length of the state that it works on: length=2, or 0 for a plain number.",
    "no state": _WRITE,
    "not finite": "Its coefficients must be finite.",
}
"""By reason, what to do."""

_MOST_STAGES = 9
"""Up to so many stages a coefficient that is wrong together with its node is looked for."""

_HIGHEST = (0, 1, 2, 3, 4, 4, 5, 6, 6, 7, 7, 8, 8)
"""By number of stages the highest order that is aimed at (the barriers of J. C. Butcher, from memory)."""


@attrs.frozen(kw_only=True)
class Recovered:
    """What a step function turned out to be.

    Attributes:
        tableau: its coefficients; the order is the proven one, or the one that a repair would give.
        verdict: the proof of that, with the repairs; its `order` is the proven one.
        same_as: the slug of the known method that it is, or None.
        repairs: the smallest changes that make every condition hold, where it falls short.
        becomes: the slug of the known method that the first repair makes of it, or None.
        remarks: what else was seen, such as that it prints.
        length: the length of the state that it was read with, 0 for a plain number.
    """

    tableau: Tableau
    verdict: Verdict
    same_as: str | None
    repairs: tuple[Repair, ...]
    becomes: str | None
    remarks: tuple[str, ...]
    length: int
    identity: Identity | None = attrs.field(repr=False)

    def __bool__(self) -> bool:
        return bool(self.verdict)

    def __str__(self) -> str:
        return "\n  ".join([self._sentence(), *self.remarks])

    def _sentence(self) -> str:
        if not self.verdict:
            short = f"your loop is of order {self.verdict.order}, not {self.tableau.order}"
            if not self.repairs:
                return f"{short}; no small change was found that makes every condition hold"
            then = f"; it is {self.becomes} then" if self.becomes else ""
            return f"{short}: {self.repairs[0].text}{then}"
        proof = f"{self.verdict.outcome}: order {self.verdict.order}, {_counted(self.tableau.stages)}"
        if self.identity is None:
            return f"your loop is a method that newel does not know ({proof})"
        if self.identity.relation == "other embedded weights":
            return f"your loop carries on the solution of {self.same_as} ({proof})"
        also = ", its stages in another order" if self.identity.relation == "reordered" else ""
        return f"your loop is {self.same_as}{also} ({proof})"


def recover(
    step_function: Callable[..., Any],
    *,
    order: int | None = None,
    length: int | None = None,
    registry: Registry | None = None,
) -> Recovered:
    """Read the method out of a step function, prove it, and say which known method it is.

    The function is called as `step(rate, t, y, h)`. It calls `rate(t, y)`, or `rate(t, y, out)`, and returns
    the new state, or changes y in place and returns None. What is compiled is wrapped in Python. Floats
    become fractions where one with a small denominator fits to 2 units in the last place; other numbers stay
    decimals of which 15 digits are trusted.

    Args:
        step_function: the function; it is called some ten times, with numbers of newel's own.
        order: the order that it is meant to have; by default the proven one, or the highest that a single
            change of a coefficient gives.
        length: the length of the state that it works on, 0 for a plain float; by default any is tried.
        registry: where known methods are looked up; by default the default registry.

    Raises:
        NotRecovered: it is no explicit Runge–Kutta step; the text says what broke.
        BadRequest: it cannot be called, or `order` or `length` is out of range.

    Example:
        >>> def step(rate, t, y, h):
        ...     k1 = rate(t, y)
        ...     k2 = rate(t + h, y + h * k1)
        ...     return y + h / 2 * (k1 + k2)
        >>> print(recover(step, registry=Registry(folders=[], plugins=False, cache=None)))
        your loop is heun-2 (exact: order 2, 2 stages)
    """
    from newel.methods.recovery import read_step

    if order is not None and (isinstance(order, bool) or not 1 <= order <= 16):
        raise BadRequest(f"order={order!r} is not between 1 and 16", argument="order")
    where = default_registry() if registry is None else registry
    name = str(getattr(step_function, "__name__", type(step_function).__name__))
    try:
        reading = read_step(step_function, length)
    except NotRecovered as error:
        raise NotRecovered(f"{name}: {error}\n  {_ADVICE[error.reason]}", reason=error.reason) from error
    tableau, remarks = _tableau(reading, name)
    tableau, verdict, search = _judged(tableau, order)
    found = identities(tableau, where)
    if verdict and not found and order is None:
        tableau, verdict, search = _without_nodes(tableau, verdict)
    becomes = _becomes(tableau, search.repairs, where)
    return Recovered(
        tableau=tableau.with_proof(verdict),
        verdict=attrs.evolve(verdict, repairs=search.repairs, undecided=search.undecided),
        same_as=found[0].slug if found else None,
        repairs=search.repairs,
        becomes=becomes,
        remarks=(*reading.remarks, *remarks),
        length=reading.length,
        identity=found[0] if found else None,
    )


def _tableau(reading: Reading, name: str) -> tuple[Tableau, list[str]]:
    from newel.methods.tableau import Tableau

    remarks = []
    arrays: dict[str, Any] = {
        "nodes": list(map(_number, reading.nodes.tolist())),
        "matrix": [list(map(_number, row[:i])) for i, row in enumerate(reading.matrix.tolist())],
        "weights": list(map(_number, reading.weights.tolist())),
    }
    digits = {array: TRUSTED_DIGITS for array, values in arrays.items() if "." in str(values)}
    if not reading.nodes.any() and reading.matrix.any():
        remarks.append(
            "every stage is called with the time of the start of the step: right only for rates without t"
        )
        arrays["nodes"] = None
        digits.pop("nodes", None)
    tableau = Tableau(
        "recovered",
        name=f"Recovered from {name}",
        order=1,
        source=f"read off the step function {name}",
        numbers="derived: read off a step function in float64",
        digits=digits or None,
        **arrays,
    )
    return tableau, remarks


def _number(x: float) -> str:
    from newel.methods.near_fractions import near_fraction

    fraction = near_fraction(x)
    return repr(x) if fraction is None else str(fraction)


def _judged(tableau: Tableau, order: int | None) -> tuple[Tableau, Verdict, Search]:
    """Prove the order that was asked for, or else the highest that holds or that one change would give."""
    from newel.methods.misprints import Search, find_repairs
    from newel.methods.order_conditions import prove

    first = prove(tableau)
    proven = max(1, first.order)
    claims: Sequence[int] = [order] if order is not None else [proven]
    if order is None and not first:
        claims = range(max(_highest(tableau.stages), proven), proven - 1, -1)
    for claim in claims:
        claimed = attrs.evolve(tableau, order=claim)
        verdict = prove(claimed)
        if verdict:
            return claimed, verdict, Search()
        search = find_repairs(claimed)
        if search.repairs or len(claims) == 1:
            return claimed, verdict, search
    return claimed, verdict, search


def _without_nodes(tableau: Tableau, verdict: Verdict) -> tuple[Tableau, Verdict, Search]:
    """Look for one wrong coefficient whose node is as wrong, as where both come from one constant.

    Only what would bring order 3 or more is worth telling: two conditions are met by many a number.
    """
    from newel.methods.misprints import Search, find_repairs
    from newel.methods.order_conditions import prove

    if tableau.stages <= _MOST_STAGES:
        for claim in range(_highest(tableau.stages), max(3, verdict.order + 1) - 1, -1):
            claimed = attrs.evolve(tableau, order=claim, nodes=None)
            search = find_repairs(claimed)
            if search.repairs and len(search.repairs[0].changes) == 1:
                return claimed, prove(claimed), search
    return tableau, verdict, Search()


def _highest(stages: int) -> int:
    return _HIGHEST[stages] if stages < len(_HIGHEST) else min(stages - 4, 10)


def _becomes(tableau: Tableau, repairs: Sequence[Repair], registry: Registry) -> str | None:
    from newel.methods.misprints import repaired

    if not repairs:
        return None
    found = identities(repaired(tableau, repairs[0]), registry)
    return found[0].slug if found else None


def _counted(stages: int) -> str:
    return f"{stages} stage{'' if stages == 1 else 's'}"
