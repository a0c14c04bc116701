"""A method as data: the Butcher tableau with exact numbers, its claims, and where it comes from.

Nothing here is believed: the claims are proved in `order_conditions`.
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Iterable, Mapping, Sequence
from functools import cached_property
from html import escape
from typing import TYPE_CHECKING, Any

import attrs
import numpy as np
from numpy.typing import NDArray

from newel.errors import BadTableau
from newel.methods import tableau_form as form
from newel.methods.digits import (
    ARRAYS,
    Digits,
    Trust,
    check_digits,
    half_unit,
    read_digits,
    shown,
    with_node_digits,
)
from newel.methods.exact import ExactLike
from newel.methods.storage import Storage
from newel.methods.tableau_form import HIGHEST_ORDER, MOST_STAGES, NUMBERS, Row

if TYPE_CHECKING:
    from newel.methods.order_conditions import Verdict

__all__ = ["ARRAYS", "HIGHEST_ORDER", "MOST_STAGES", "NUMBERS", "Digits", "Notes", "Row", "Tableau"]


@attrs.frozen(init=False)
class Notes:
    """What is known of a method beyond its numbers: tuples of texts, shown by `inspect`.

    Raises:
        BadTableau: one of them is no list of texts.

    >>> Notes(strengths=["one call a step"]).strengths
    ('one call a step',)
    """

    strengths: tuple[str, ...]
    weaknesses: tuple[str, ...]
    known_failures: tuple[str, ...]
    remarks: tuple[str, ...]

    def __init__(
        self,
        *,
        strengths: Iterable[str] = (),
        weaknesses: Iterable[str] = (),
        known_failures: Iterable[str] = (),
        remarks: Iterable[str] = (),
    ) -> None:
        self.__attrs_init__(
            form.texts(strengths, "notes.strengths"),
            form.texts(weaknesses, "notes.weaknesses"),
            form.texts(known_failures, "notes.known_failures"),
            form.texts(remarks, "notes.remarks"),
        )


@attrs.frozen(init=False, slots=False, repr=False)
class Tableau:
    """An explicit Runge–Kutta method of s stages, with what it claims and where it comes from; immutable.

    Numbers are given as texts, ints, Fractions, Exacts or floats (a float counts as the decimal that Python
    prints), and are held exactly with the text that they were given as. All are unitless.

    Args:
        slug: the name that is typed, such as `bogacki-shampine-3-2`.
        order: the claimed order of `weights`, from 1 to 16.
        matrix: s rows; row i holds its i−1 entries left of the diagonal, or all s. Held as s rows of s.
        weights: s numbers, those of the solution that is carried on.
        nodes: s numbers; the row sums of the matrix where left out.
        embedded_weights: s numbers that give the second solution of a pair, used for the error estimate.
        embedded_order: the claimed order of these; needed exactly with them.
        continuous_weights: s rows of coefficients of θ, θ², …, for the solution at the fraction θ of a step.
        continuous_order: the claimed order of these, the same for all θ; needed exactly with them.
        name: the usual name, one line; the slug where it is left out.
        also_called: other names, for search.
        authors: who published it.
        year: when.
        source: where, as a citation.
        numbers: `published`, `derived` or `from memory`; more words may follow after a colon.
        digits: significant digits to be trusted: None, an int for all arrays, or a mapping by array (`nodes`,
            `matrix`, `weights`, `embedded`, `continuous`) or entry (`matrix[5][2]`) to an int or "exact".
        notes: strengths, weaknesses, known failures, remarks.
        storage: the same method in a form for few registers; the proof holds it against the matrix.
        origin: a file, a plugin, or "python"; takes no part in `==`.
        proof: the verdict of the proof, None while there is none; takes no part in `==`.

    Raises:
        BadTableau: a value breaks a rule of the format; its `key` names it, such as `matrix[5][2]`.

    >>> midpoint = Tableau("midpoint-2", name="Midpoint", order=2, matrix=[[], ["1/2"]], weights=[0, 1])
    >>> midpoint
    <Tableau midpoint-2: order 2, 2 stages>
    >>> [str(c) for c in midpoint.nodes], midpoint.A
    (['0', '1/2'], array([[0. , 0. ], [0.5, 0. ]]))
    """

    slug: str
    order: int
    matrix: tuple[Row, ...]
    weights: Row
    nodes: Row
    embedded_weights: Row | None
    embedded_order: int | None
    continuous_weights: tuple[Row, ...] | None
    continuous_order: int | None
    name: str
    also_called: tuple[str, ...]
    authors: tuple[str, ...]
    year: int | None
    source: str
    numbers: str
    digits: int | Digits | None
    notes: Notes
    storage: Storage | None
    origin: str = attrs.field(eq=False)
    proof: Verdict | None = attrs.field(eq=False)

    def __init__(
        self,
        slug: str,
        *,
        order: int,
        matrix: Iterable[Iterable[ExactLike]],
        weights: Iterable[ExactLike],
        nodes: Iterable[ExactLike] | None = None,
        embedded_weights: Iterable[ExactLike] | None = None,
        embedded_order: int | None = None,
        continuous_weights: Iterable[Iterable[ExactLike]] | None = None,
        continuous_order: int | None = None,
        name: str | None = None,
        also_called: Iterable[str] = (),
        authors: Iterable[str] = (),
        year: int | None = None,
        source: str = "",
        numbers: str = "derived",
        digits: int | Mapping[str, Trust] | None = None,
        notes: Notes | None = None,
        storage: Storage | None = None,
        origin: str = "python",
        proof: Verdict | None = None,
    ) -> None:
        slug, b = form.slug(slug), form.row(weights, "weights")
        A = form.square(form.rows(matrix, "matrix"), len(b))
        trusted = read_digits(digits)
        if notes is not None and not isinstance(notes, Notes):
            raise BadTableau(f"{shown(notes)} is no Notes; write Notes(strengths=[…])", key="notes")
        form.check_storage(storage, Storage, len(b))
        if nodes is None and isinstance(trusted, Digits):
            trusted = with_node_digits(trusted, len(b))
        self.__attrs_init__(
            slug=slug,
            order=form.order(order, "order"),
            matrix=A,
            weights=b,
            nodes=form.row_sums(A) if nodes is None else form.row(nodes, "nodes"),
            embedded_weights=form.optional(form.row, embedded_weights, "embedded.weights"),
            embedded_order=form.optional(form.order, embedded_order, "embedded.order"),
            continuous_weights=form.optional(form.rows, continuous_weights, "continuous.weights"),
            continuous_order=form.optional(form.order, continuous_order, "continuous.order"),
            name=slug if name is None else form.name(name),
            also_called=form.texts(also_called, "also_called"),
            authors=form.texts(authors, "authors"),
            year=form.year(year),
            source=form.text(source, "source"),
            numbers=form.numbers(numbers),
            digits=trusted,
            notes=Notes() if notes is None else notes,
            storage=storage,
            origin=form.text(origin, "origin"),
            proof=proof,
        )
        form.check_shapes(self)
        check_digits(trusted, {array: self._array(array) for array in ARRAYS})

    def __getstate__(self) -> dict[str, Any]:
        # Cached arrays stay behind: they would come back writable.
        return {field.name: self.__dict__[field.name] for field in attrs.fields(type(self))}

    @property
    def stages(self) -> int:
        """The number of stages s."""
        return len(self.weights)

    @cached_property
    def digest(self) -> str:
        """The SHA-256, in hex, of the exact numbers alone: names, claims, notes and digits take no part."""
        parts: dict[str, Any] = {
            "nodes": self.nodes,
            "matrix": [row[:i] for i, row in enumerate(self.matrix)],
            "weights": self.weights,
            "embedded": self.embedded_weights,
            "continuous": self.continuous_weights,
        }
        text = json.dumps(parts, default=lambda number: number.canonical, separators=(",", ":"))
        return hashlib.sha256(text.encode("ascii")).hexdigest()

    @cached_property
    def A(self) -> NDArray[np.float64]:
        """The matrix, shape (s, s), read-only; each entry is the float64 nearest to the exact one."""
        return _floats(self.matrix)

    @cached_property
    def b(self) -> NDArray[np.float64]:
        """The weights, shape (s,), read-only; each entry is the float64 nearest to the exact one."""
        return _floats(self.weights)

    @cached_property
    def c(self) -> NDArray[np.float64]:
        """The nodes, shape (s,), read-only; each entry is the float64 nearest to the exact one."""
        return _floats(self.nodes)

    @cached_property
    def b_embedded(self) -> NDArray[np.float64] | None:
        """The embedded weights, shape (s,), read-only, or None where there are none."""
        return None if self.embedded_weights is None else _floats(self.embedded_weights)

    @cached_property
    def first_same_as_last(self) -> bool:
        """Whether the last stage is the first of the next step: the last row is the weights, its node 1."""
        return self.stages > 1 and self.matrix[-1] == self.weights and self.nodes[-1] == 1

    @cached_property
    def is_exact(self) -> bool:
        """Whether no number carries a rounding."""
        if self.digits is None:
            return True
        units = (unit for array in ARRAYS for unit in self.half_units(array))
        return not any(any(unit) if isinstance(unit, tuple) else unit for unit in units)

    def half_units(self, array: str) -> tuple[Any, ...]:
        """Return how far each entry of an array may be from the number that was meant.

        Half a unit in the last trusted significant digit of a rounded entry, zero for an exact one. In an
        array with stated digits, integers, surds and fractions with a denominator of at most six digits are
        exact; an entry's own statement goes before its array's.

        Args:
            array: "nodes", "matrix", "weights", "embedded" or "continuous".

        Returns:
            Fractions in the shape of the array; () for an array that the tableau does not have.

        Raises:
            BadTableau: `array` is none of the five.

        >>> t = Tableau("a", order=1, matrix=[[], ["0.333"]], weights=["1/4", "3/4"], digits=3)
        >>> t.half_units("matrix")[1][0], t.half_units("weights")[1]
        (Fraction(1, 2000), Fraction(0, 1))
        """
        values, digits = self._array(array), self.digits
        if values and isinstance(values[0], tuple):
            return tuple(
                tuple(half_unit(digits, array, f"[{i}][{j}]", x) for j, x in enumerate(row, 1))
                for i, row in enumerate(values, 1)
            )
        return tuple(half_unit(digits, array, f"[{i}]", x) for i, x in enumerate(values, 1))

    def with_proof(self, verdict: Verdict | None) -> Tableau:
        """Return the same tableau with the outcome of its proof."""
        return attrs.evolve(self, proof=verdict)

    def _array(self, array: str) -> tuple[Any, ...]:
        if array not in ARRAYS:
            raise BadTableau(f"no array {shown(array)}; allowed are {', '.join(ARRAYS)}", file=self.slug)
        name = array if array in ("nodes", "matrix", "weights") else f"{array}_weights"
        return getattr(self, name) or ()

    def __repr__(self) -> str:
        return f"<Tableau {self.slug}: {self._claims()}>"

    def __str__(self) -> str:
        proof = "not proved yet" if self.proof is None else f"proof: {self.proof.outcome}"
        exact = "exact numbers" if self.is_exact else "rounded numbers"
        how = " ".join(self.numbers.split())
        who = " ".join((", ".join(self.authors) + (f" {self.year}" if self.year else "")).split())
        return (
            f"{self.name} ({self.slug})\n"
            f"  {self._claims()}{', first same as last' if self.first_same_as_last else ''}; {proof}\n"
            f"  {exact}, {how}{'; ' + who if who else ''}"
        )

    def _claims(self) -> str:
        pair = "" if self.embedded_order is None else f"({self.embedded_order})"
        return f"order {self.order}{pair}, {self.stages} stage{'s' if self.stages > 1 else ''}"

    def _repr_html_(self) -> str:
        rows = [(str(c), row[:i]) for i, (c, row) in enumerate(zip(self.nodes, self.matrix, strict=True))]
        rows += [("b", self.weights)]
        rows += [] if self.embedded_weights is None else [("b embedded", self.embedded_weights)]
        body = "".join(
            f"<tr><th>{escape(head)}</th>{''.join(f'<td>{escape(str(x))}</td>' for x in row)}</tr>"
            for head, row in rows
        )
        return f"<table><caption>{escape(self.name)}: {self._claims()}</caption>{body}</table>"


def _floats(values: Sequence[Any]) -> NDArray[np.float64]:
    rows = [[float(x) for x in v] if isinstance(v, tuple) else float(v) for v in values]
    array = np.array(rows, dtype=np.float64)
    array.setflags(write=False)
    return array
