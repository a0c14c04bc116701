"""The numbers of a tableau as the proof takes them: exact, with their rounding, and in float64.

The matrix may be any square one here, so that a permutation of the stages can be proved like the original.
"""

from __future__ import annotations

from collections.abc import Sequence
from math import inf
from typing import TYPE_CHECKING, Any

import attrs
import numpy as np
from numpy.typing import NDArray

from newel.errors import BadTableau
from newel.methods.conditions import Formula, Part
from newel.methods.elementary_weights import Matrix, Row
from newel.methods.exact import Exact, ExactLike

if TYPE_CHECKING:
    from newel.methods.tableau import Tableau

__all__ = ["Coefficients"]

Floats = NDArray[np.float64]
LEAST_BITS = 256
LARGEST = 1e100


def _row(values: Sequence[ExactLike]) -> Row:
    return tuple(Exact.of(x) for x in values)


def _rows(values: Sequence[Sequence[ExactLike]]) -> Matrix:
    return tuple(_row(row) for row in values)


def _optional_row(values: Sequence[ExactLike] | None) -> Row | None:
    return None if values is None else _row(values)


def _optional_rows(values: Sequence[Sequence[ExactLike]] | None) -> Matrix | None:
    return None if values is None else _rows(values)


@attrs.frozen(kw_only=True, eq=False)
class Coefficients:
    """Arrays and claims to be proved, without a name; every number is unitless.

    Args:
        matrix: s rows of s numbers, not necessarily triangular.
        weights, order: s numbers and the order claimed for them.
        nodes: s numbers to be held against the row sums, or None.
        embedded, embedded_order: s numbers and their claim, or None.
        continuous, continuous_order: s rows of coefficients of θ, θ², … and their claim, or None.
        half_units: by array ("nodes", "matrix", "weights", "embedded", "continuous") what each entry may be
            away from the number that was meant, in the shape of the array; an absent array is exact.

    Raises:
        BadTableau: two different square roots, or a number beyond 1e100.

    >>> midpoint = Coefficients(matrix=[[0, 0], ["1/2", 0]], weights=[0, 1], order=2)
    >>> midpoint.floats("matrix")
    array([[0. , 0. ],
           [0.5, 0. ]])
    """

    matrix: Matrix = attrs.field(converter=_rows)
    weights: Row = attrs.field(converter=_row)
    order: int
    nodes: Row | None = attrs.field(default=None, converter=_optional_row)
    embedded: Row | None = attrs.field(default=None, converter=_optional_row)
    embedded_order: int | None = None
    continuous: Matrix | None = attrs.field(default=None, converter=_optional_rows)
    continuous_order: int | None = None
    half_units: dict[str, Any] = attrs.field(factory=dict)
    _floats: dict[str, Floats] = attrs.field(factory=dict, init=False)
    _slacks: dict[str, Floats] = attrs.field(factory=dict, init=False)

    @classmethod
    def of(cls, tableau: Tableau) -> Coefficients:
        """Take the numbers and claims of a tableau."""
        arrays = ("nodes", "matrix", "weights", "embedded", "continuous")
        return cls(
            matrix=tableau.matrix,
            weights=tableau.weights,
            order=tableau.order,
            nodes=tableau.nodes,
            embedded=tableau.embedded_weights,
            embedded_order=tableau.embedded_order,
            continuous=tableau.continuous_weights,
            continuous_order=tableau.continuous_order,
            half_units={}
            if tableau.digits is None
            else {array: tableau.half_units(array) for array in arrays},
        )

    def array(self, name: str) -> Any:
        """Return one of the five arrays, or None."""
        return getattr(self, name)

    def floats(self, name: str) -> Floats:
        """Return an array in float64, each entry rounded correctly."""
        if name not in self._floats:
            try:
                self._floats[name] = _nested_floats(self.array(name))
            except OverflowError:
                self._floats[name] = np.array([inf])
            if np.abs(self._floats[name]).max(initial=0.0) > LARGEST:
                raise BadTableau("a number beyond 1e100, which no float64 proof can follow", key=name)
        return self._floats[name]

    def slack(self, name: str) -> Floats:
        """Return the half units δ of an array in float64, zero where exact."""
        if name not in self._slacks:
            if self.array(name):
                self.floats(name)  # refuses what is too large before its half unit overflows
            given, values = self.half_units.get(name), self.array(name)
            width = () if not values or isinstance(values[0], Exact) else (len(values[0]),)
            self._slacks[name] = _nested_floats(given) if given else np.zeros((len(values or ()), *width))
        return self._slacks[name]

    @property
    def rounded(self) -> bool:
        """Whether any number carries a rounding."""
        return any(self.slack(name).any() for name in self.half_units)

    @property
    def radicand(self) -> int:
        """The d of the field Q(√d) that holds every number; 1 where all are rational."""
        found = {
            x.radicand
            for name in ("nodes", "matrix", "weights", "embedded", "continuous")
            for x in _flat(self.array(name))
        } - {1}
        if len(found) > 1:
            roots = " and ".join(f"sqrt({d})" for d in sorted(found))
            raise BadTableau(f"{roots} in one tableau; the proof takes one square root")
        return found.pop() if found else 1

    @property
    def bits(self) -> int:
        """Binary digits that leave residuals known to some 1e-70 after the growth of products with A."""
        size = max((sum(abs(x) for x in row) for row in np.abs(self.floats("matrix")).tolist()), default=0.0)
        return LEAST_BITS + 2 * (self.order + 1) * max(0, int(np.log2(max(size, 1.0))) + 1)

    def parts(self) -> list[Part]:
        """Return the formulas that make a claim: weights, embedded weights, continuous weights."""
        parts = [_part("weights", self.order, [self.weights], [self.slack("weights")])]
        if self.embedded is not None:
            slack = self.slack("embedded")
            parts.append(_part("embedded", self.embedded_order or 0, [self.embedded], [slack]))
        if self.continuous is not None:
            claimed = self.continuous_order or 0
            columns, slacks = list(zip(*self.continuous, strict=True)), list(self.slack("continuous").T)
            # Powers of θ that the claim needs and the weights lack are there with zeros, to be found wanting.
            while len(columns) < claimed:
                columns.append((Exact(0),) * len(self.weights))
                slacks.append(np.zeros(len(self.weights)))
            parts.append(_part("continuous", claimed, columns, slacks))
        return parts


def _part(name: Any, claimed: int, rows: Sequence[Row], slacks: Sequence[Floats]) -> Part:
    dense = name == "continuous"
    formulas = tuple(
        Formula(weights=row, slack=slack, power=power if dense else None)
        for power, (row, slack) in enumerate(zip(rows, slacks, strict=True), 1)
    )
    return Part(name=name, claimed=claimed, formulas=formulas)


def _flat(values: Any) -> list[Exact]:
    if not values:
        return []
    return list(values) if isinstance(values[0], Exact) else [x for row in values for x in row]


def _nested_floats(values: Sequence[Any]) -> Floats:
    rows = [[float(x) for x in v] if isinstance(v, (tuple, list)) else float(v) for v in values]
    return np.array(rows, dtype=np.float64)
