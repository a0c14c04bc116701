"""What a proof returns: the verdict and the conditions that failed, as plain data."""

from __future__ import annotations

from collections.abc import Mapping
from math import isfinite
from typing import Any, Literal

import attrs

from newel.errors import BadRequest
from newel.methods.repairs import Repair

__all__ = ["Failure", "Verdict"]

Outcome = Literal["exact", "rounded", "fails"]
Part = Literal["weights", "embedded", "continuous", "row sum", "claim", "storage"]


@attrs.frozen(kw_only=True)
class Failure:
    """One condition that does not hold; every number is unitless.

    `part` is "weights", "embedded", "continuous", "row sum", "claim" or "storage"; `condition` the tree in
    bracket notation (for continuous weights followed by the power of θ), `row 3`, the claim, or the place in
    the matrix; `residual` what is left over, `residual_text` the same, exactly where it is known exactly;
    `bound` the largest modulus that would have been accepted, 0 for exact coefficients; `message` one line
    for people.
    """

    part: Part
    condition: str
    residual: float
    residual_text: str
    bound: float
    message: str

    def to_data(self) -> dict[str, Any]:
        """Return a dict of texts and numbers; what is not finite is a text."""
        data = attrs.asdict(self)
        return {**data, "residual": _plain(self.residual), "bound": _plain(self.bound)}

    @classmethod
    def from_data(cls, data: Mapping[str, Any]) -> Failure:
        """Return the failure that `to_data` wrote; raises BadRequest for anything else."""
        failure: Failure = _rebuilt(
            cls, {**data, "residual": float(data["residual"]), "bound": float(data["bound"])}
        )
        return failure


@attrs.frozen(kw_only=True)
class Verdict:
    """The outcome of a proof; true unless it is "fails".

    Attributes:
        outcome: "exact" (every condition of every claim holds exactly), "rounded" (each residual is within
            twice its first-order rounding bound for the stated digits, and within 1e-12) or "fails".
        digits: the least number of trusted significant digits that the tableau states, or None.
        order: the order proven for the weights; 0 where not even their sum is 1.
        embedded_order, continuous_order: the same for these weights, None where there are none.
        working_floor: an upper bound of the largest residual of the conditions of the proven order, with
            the coefficients as float64 and the row sums among the conditions; unitless.
        failures: the conditions of the first order that fails, at most five for each part, and the claims.
        remarks: what a reader would trip over.
        undetermined: coefficients, such as `matrix[3][1]` (from 1), that no order condition of the claims
            sees, so that no proof can vouch for them.
        repairs: where the proof fails and `newel.check` has looked for them, the smallest changes that make
            every condition of the claims hold, the one nearest to the printed text first.
        undecided: what that search says where it found none, or could not look.

    >>> verdict = Verdict(outcome="exact", order=4, working_floor=5e-17)
    >>> bool(verdict), Verdict.from_data(verdict.to_data()) == verdict
    (True, True)
    """

    outcome: Outcome
    digits: int | None = None
    order: int
    embedded_order: int | None = None
    continuous_order: int | None = None
    working_floor: float
    failures: tuple[Failure, ...] = ()
    remarks: tuple[str, ...] = ()
    undetermined: tuple[str, ...] = ()
    repairs: tuple[Repair, ...] = ()
    undecided: tuple[str, ...] = ()

    def __bool__(self) -> bool:
        return self.outcome != "fails"

    def __str__(self) -> str:
        pair = "" if self.embedded_order is None else f"({self.embedded_order})"
        dense = "" if self.continuous_order is None else f", continuous {self.continuous_order}"
        digits = "" if self.digits is None else f", {self.digits} digits trusted"
        head = f"{self.outcome}: order {self.order}{pair}{dense}{digits}, float64 to {self.working_floor:.1e}"
        lines = [failure.message for failure in self.failures] + list(self.remarks)
        lines += [repair.text for repair in self.repairs] + list(self.undecided)
        return "\n  ".join([head, *lines])

    def to_data(self) -> dict[str, Any]:
        """Return dicts, lists, texts and numbers, for JSON or TOML; what there is not is left out."""
        data = {field.name: getattr(self, field.name) for field in attrs.fields(Verdict)}
        data["working_floor"] = _plain(self.working_floor)
        data["failures"] = [failure.to_data() for failure in self.failures]
        data["remarks"], data["undetermined"] = list(self.remarks), list(self.undetermined)
        data["repairs"] = [repair.to_data() for repair in self.repairs] or None
        data["undecided"] = list(self.undecided) or None
        return {key: value for key, value in data.items() if value is not None}

    @classmethod
    def from_data(cls, data: Mapping[str, Any]) -> Verdict:
        """Return the verdict that `to_data` wrote.

        Raises:
            BadRequest: `data` is no such mapping: a key is missing, unknown, or of another type.
        """
        try:
            values = {
                **data,
                "working_floor": float(data["working_floor"]),
                "failures": tuple(Failure.from_data(failure) for failure in data.get("failures", ())),
                "remarks": tuple(map(str, data.get("remarks", ()))),
                "undetermined": tuple(map(str, data.get("undetermined", ()))),
                "repairs": tuple(Repair.from_data(repair) for repair in data.get("repairs", ())),
                "undecided": tuple(map(str, data.get("undecided", ()))),
            }
        except (KeyError, TypeError, ValueError, AttributeError) as error:
            raise BadRequest(f"no stored verdict: {error!r}", argument="data") from None
        if values.get("outcome") not in ("exact", "rounded", "fails") or type(values.get("order")) is not int:
            raise BadRequest(f"no stored verdict: outcome {values.get('outcome')!r}", argument="data")
        verdict: Verdict = _rebuilt(cls, values)
        return verdict


def _rebuilt(cls: type[Any], values: dict[str, Any]) -> Any:
    try:
        return cls(**values)
    except TypeError as error:
        raise BadRequest(f"no stored {cls.__name__.lower()}: {error}", argument="data") from None


def _plain(value: float) -> float | str:
    return value if isfinite(value) else str(value)
