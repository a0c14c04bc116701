"""A method as data: the Butcher tableau with exact numbers, its claims, and where it comes from.

Nothing here is believed: the claims are proved in `order_conditions`. This module sees to the form alone:
shapes, explicitness, and which digits of which entry are to be trusted.
"""

from __future__ import annotations

import hashlib
import json
import re
from collections.abc import Iterable, Iterator, Mapping, Sequence
from difflib import get_close_matches
from fractions import Fraction
from functools import cached_property
from html import escape
from typing import TYPE_CHECKING, Any, Literal, TypeAlias

import attrs
import numpy as np
from numpy.typing import NDArray

from newel.errors import BadNumber, BadTableau
from newel.methods.exact import Exact

if TYPE_CHECKING:
    from newel.methods.order_conditions import Verdict

__all__ = ["ARRAYS", "HIGHEST_ORDER", "MOST_STAGES", "NUMBERS", "Digits", "Notes", "Tableau", "shown"]

ARRAYS = ("nodes", "matrix", "weights", "embedded", "continuous")
"""The arrays of a tableau, by the names that `digits` and `half_units` know them."""

NUMBERS = ("published", "derived", "from memory")
"""How numbers reach a tableau; further words may follow after a colon."""

HIGHEST_ORDER = 16
MOST_STAGES = 512
MOST_DIGITS_STATED = 1000
_MOST_BITS = 4096
_LONG_DENOMINATOR = 10**6

Row: TypeAlias = tuple[Exact, ...]
ArrayName: TypeAlias = Literal["nodes", "matrix", "weights", "embedded", "continuous"]
_SLUG = re.compile(r"[a-z0-9]+(-[a-z0-9]+)*")
_ENTRY = re.compile(r"(nodes|matrix|weights|embedded|continuous)\[(\d{1,4})\](?:\[(\d{1,4})\])?")
_ZERO = Exact(Fraction(0))


def shown(value: object) -> str:
    """Return `value` as it is named in an error: its repr, cut to 60 characters.

    >>> shown("x" * 100)[-5:]
    'xxxx…'
    """
    try:
        text = repr(value)
    except ValueError:  # Python refuses to print integers of more than some thousand digits
        text = f"a {type(value).__name__} with thousands of digits"
    return text if len(text) <= 60 else text[:59] + "…"


@attrs.frozen(eq=False, slots=False)
class Digits(Mapping[str, "int | Literal['exact']"]):
    """How many significant digits are trusted, by array (`matrix`) or entry (`matrix[5][2]`, from 1).

    An immutable, hashable mapping whose keys stand in the order of the arrays, entries after their array.

    >>> dict(Digits.of({"weights[1]": "exact", "weights": 18}))
    {'weights': 18, 'weights[1]': 'exact'}
    """

    pairs: tuple[tuple[str, int | Literal["exact"]], ...]

    @classmethod
    def of(cls, given: Mapping[Any, Any]) -> Digits:
        """Check the keys and values of `given`; raises BadTableau for a bad one."""
        return cls(
            tuple(sorted(((_digits_key(k), _digits_value(k, v)) for k, v in given.items()), key=_place))
        )

    def __getitem__(self, key: str) -> int | Literal["exact"]:
        return self._found[key]

    def __iter__(self) -> Iterator[str]:
        return (key for key, _ in self.pairs)

    def __len__(self) -> int:
        return len(self.pairs)

    def __hash__(self) -> int:
        return hash(self.pairs)

    @cached_property
    def _found(self) -> dict[str, int | Literal["exact"]]:
        return dict(self.pairs)


def _place(pair: tuple[str, Any]) -> tuple[int, ...]:
    array, *indices = re.split(r"[\[\]]+", pair[0].rstrip("]"))
    return (ARRAYS.index(array), *map(int, indices))


def _digits_key(key: Any) -> str:
    if isinstance(key, str) and (key in ARRAYS or _ENTRY.fullmatch(key)):
        return key
    near = get_close_matches(str(key).split("[")[0], ARRAYS, 1, 0.5)
    hint = f" (near: {near[0]})" if near else ""
    raise BadTableau(
        f"unknown key {shown(key)}{hint}; allowed are {', '.join(ARRAYS)} and entries such as matrix[5][2]",
        key="digits",
    )


def _digits_value(key: Any, value: Any) -> int | Literal["exact"]:
    if value == "exact":
        return "exact"
    if isinstance(value, int) and not isinstance(value, bool) and 1 <= value <= MOST_DIGITS_STATED:
        return int(value)
    place = "digits" if key is None else f"digits[{str(key)!r}]"
    kind = "an integer" if key is None else 'an integer or "exact"'
    raise BadTableau(
        f"{shown(value)} is no number of digits; write {kind} from 1 to {MOST_DIGITS_STATED}, the "
        "significant digits that are to be trusted",
        key=place,
    )


def _digits(given: Any) -> int | Digits | None:
    if given is None:
        return None
    if isinstance(given, Mapping):
        return Digits.of(given) if given else None
    number = _digits_value(None, given)
    if number == "exact":
        raise BadTableau(
            '"exact" is for one array or entry; leave digits out where all is exact', key="digits"
        )
    return number


def _text(value: Any, key: str, line: bool = False) -> str:
    if not isinstance(value, str):
        raise BadTableau(f"{shown(value)} is no text", key=key)
    if any("\ud800" <= character <= "\udfff" for character in value):
        raise BadTableau(f"{shown(value)} holds half a surrogate pair, which no file can hold", key=key)
    if line and (not value.strip() or not value.isprintable()):
        raise BadTableau(f"{shown(value)} is not one line of printable text", key=key)
    return value


def _texts(key: str) -> Any:
    def convert(value: Any) -> tuple[str, ...]:
        if isinstance(value, str) or not isinstance(value, Iterable):
            raise BadTableau(f"{shown(value)} is no list of texts; write [{shown(value)}]", key=key)
        return tuple(_text(item, f"{key}[{i}]") for i, item in enumerate(value, 1))

    return convert


@attrs.frozen(kw_only=True)
class Notes:
    """What is known of a method beyond its numbers: tuples of texts, shown by `inspect`.

    >>> Notes(strengths=["one call a step"]).strengths
    ('one call a step',)
    """

    strengths: tuple[str, ...] = attrs.field(default=(), converter=_texts("notes.strengths"))
    weaknesses: tuple[str, ...] = attrs.field(default=(), converter=_texts("notes.weaknesses"))
    known_failures: tuple[str, ...] = attrs.field(default=(), converter=_texts("notes.known_failures"))
    remarks: tuple[str, ...] = attrs.field(default=(), converter=_texts("notes.remarks"))


def _number(value: Any, key: str) -> Exact:
    if type(value) is str and value == "0":
        return _PRINTED_ZERO
    try:
        number = Exact.of(value.item() if isinstance(value, np.generic) else value)
    except BadNumber as error:
        raise BadTableau(str(error), key=key) from None
    except ValueError:
        raise BadTableau(f"{shown(value)} is no exact number", key=key) from None
    parts = (number.rational, number.surd)
    if max(max(part.numerator.bit_length(), part.denominator.bit_length()) for part in parts) > _MOST_BITS:
        raise BadTableau(f"a number of more than {_MOST_BITS} bits; shorten it", key=key)
    return number


_PRINTED_ZERO = Exact(Fraction(0), text="0")


def _row(values: Any, key: str) -> Row:
    if isinstance(values, str) or not isinstance(values, Iterable):
        raise BadTableau(f"{shown(values)} is no list of numbers", key=key)
    return tuple(_number(value, f"{key}[{i}]") for i, value in enumerate(values, 1))


def _rows(values: Any, key: str) -> tuple[Row, ...]:
    if isinstance(values, str) or not isinstance(values, Iterable):
        raise BadTableau(f"{shown(values)} is no list of rows", key=key)
    return tuple(_row(row, f"{key}[{i}]") for i, row in enumerate(values, 1))


def _order(key: str) -> Any:
    def convert(value: Any) -> int:
        if (
            isinstance(value, (int, np.integer))
            and not isinstance(value, bool)
            and 1 <= value <= HIGHEST_ORDER
        ):
            return int(value)
        raise BadTableau(
            f"{shown(value)} is no order; an order is an integer from 1 to {HIGHEST_ORDER}", key=key
        )

    return convert


def _slug(value: Any) -> str:
    if isinstance(value, str) and len(value) <= 80 and _SLUG.fullmatch(value):
        return value
    raise BadTableau(
        f"{shown(value)} is no slug; write lower-case letters and digits in words joined by hyphens, "
        "at most 80 characters, such as bogacki-shampine-3-2",
        key="slug",
    )


def _year(value: Any) -> int | None:
    if value is None or (isinstance(value, int) and not isinstance(value, bool) and 1600 <= value <= 2200):
        return value
    raise BadTableau(
        f"{shown(value)} is no year; write it as an integer, such as 1989, or leave it out", key="year"
    )


def _numbers(value: Any) -> str:
    if _text(value, "numbers").split(":")[0].strip() in NUMBERS:
        return str(value)
    raise BadTableau(
        f"{shown(value)} is not one of {', '.join(NUMBERS)}; more words may follow after a colon",
        key="numbers",
    )


def _optional(convert: Any, *arguments: Any) -> Any:
    return lambda value: None if value is None else convert(value, *arguments)


def _required(convert: Any, *arguments: Any) -> Any:
    return lambda value: convert(value, *arguments)


@attrs.frozen(slots=False, repr=False)
class Tableau:
    """An explicit Runge–Kutta method of s stages, with what it claims and where it comes from; immutable.

    Numbers are given as texts, ints, Fractions, Exacts or floats (a float counts as the decimal that Python
    prints), and are held exactly with the text that they were given as. All are unitless.

    Args:
        slug: the name that is typed, such as `bogacki-shampine-3-2`.
        name: the usual name, one line; the slug where it is left out.
        order: the claimed order of `weights`, from 1 to 16.
        matrix: s rows; row i holds its i−1 entries left of the diagonal, or all s.
        weights: s numbers, those of the solution that is carried on.
        nodes: s numbers; the row sums of the matrix where left out.
        embedded_weights: s numbers that give the second solution of a pair, used for the error estimate.
        embedded_order: the claimed order of these; needed exactly with them.
        continuous_weights: s rows of coefficients of θ, θ², …, for the solution at the fraction θ of a step.
        continuous_order: the claimed order of these, the same for all θ; needed exactly with them.
        also_called: other names, for search.
        authors: who published it.
        year: when.
        source: where, as a citation.
        numbers: `published`, `derived` or `from memory`; more words may follow after a colon.
        digits: significant digits to be trusted: None, an int for all arrays, or a mapping by array (`nodes`,
            `matrix`, `weights`, `embedded`, `continuous`) or entry (`matrix[5][2]`) to an int or "exact".
        notes: strengths, weaknesses, known failures, remarks.
        origin: a file, a plugin, or "python"; takes no part in `==`.
        proof: the verdict of the proof, None while there is none; takes no part in `==`.

    Raises:
        BadTableau: a value breaks a rule of the format; `key` names it, such as `matrix[5][2]`.

    >>> midpoint = Tableau("midpoint-2", name="Midpoint", order=2, matrix=[[], ["1/2"]], weights=[0, 1])
    >>> midpoint
    <Tableau midpoint-2: order 2, 2 stages>
    >>> [str(c) for c in midpoint.nodes], midpoint.A
    (['0', '1/2'], array([[0. , 0. ], [0.5, 0. ]]))
    """

    slug: str = attrs.field(converter=_slug)
    name: str = attrs.field(
        default=attrs.Factory(lambda self: self.slug, takes_self=True),
        converter=_required(_text, "name", True),
        kw_only=True,
    )
    order: int = attrs.field(converter=_order("order"), kw_only=True)
    matrix: tuple[Row, ...] = attrs.field(converter=_required(_rows, "matrix"), kw_only=True)
    weights: Row = attrs.field(converter=_required(_row, "weights"), kw_only=True)
    nodes: Row = attrs.field(default=None, converter=_optional(_row, "nodes"), kw_only=True)
    embedded_weights: Row | None = attrs.field(
        default=None, converter=_optional(_row, "embedded.weights"), kw_only=True
    )
    embedded_order: int | None = attrs.field(
        default=None, converter=_optional(_order("embedded.order")), kw_only=True
    )
    continuous_weights: tuple[Row, ...] | None = attrs.field(
        default=None, converter=_optional(_rows, "continuous.weights"), kw_only=True
    )
    continuous_order: int | None = attrs.field(
        default=None, converter=_optional(_order("continuous.order")), kw_only=True
    )
    also_called: tuple[str, ...] = attrs.field(default=(), converter=_texts("also_called"), kw_only=True)
    authors: tuple[str, ...] = attrs.field(default=(), converter=_texts("authors"), kw_only=True)
    year: int | None = attrs.field(default=None, converter=_year, kw_only=True)
    source: str = attrs.field(default="", converter=_required(_text, "source"), kw_only=True)
    numbers: str = attrs.field(default="derived", converter=_numbers, kw_only=True)
    digits: int | Digits | None = attrs.field(default=None, converter=_digits, kw_only=True)
    notes: Notes = attrs.field(factory=Notes, validator=attrs.validators.instance_of(Notes), kw_only=True)
    origin: str = attrs.field(default="python", eq=False, kw_only=True)
    proof: Verdict | None = attrs.field(default=None, eq=False, kw_only=True)

    def __attrs_post_init__(self) -> None:
        _check_shapes(self)
        object.__setattr__(self, "matrix", tuple(_full(row, self.stages) for row in self.matrix))
        if self.nodes is None:
            _fill_nodes(self)
        _check_digits(self)

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
        return self.digits is None or not any(
            any(unit if isinstance(unit, tuple) else (unit,))
            for name in ARRAYS
            for unit in self.half_units(name)
        )

    def half_units(self, array: ArrayName | str) -> tuple[Any, ...]:
        """Return how far each entry of an array may be from the number that was meant.

        Half a unit in the last trusted significant digit of a rounded entry, zero for an exact one. In an
        array with stated digits, integers, surds and fractions with a denominator of at most six digits are
        exact; an entry's own statement goes before its array's.

        Args:
            array: "nodes", "matrix", "weights", "embedded" or "continuous".

        Returns:
            Fractions in the shape of the array; () for an array that the tableau does not have.

        >>> t = Tableau("a", order=1, matrix=[[], ["0.333"]], weights=["1/4", "3/4"], digits=3)
        >>> t.half_units("matrix")[1][0], t.half_units("weights")[1]
        (Fraction(1, 2000), Fraction(0, 1))
        """
        values = self._array(array)
        if values and isinstance(values[0], tuple):
            return tuple(
                tuple(self._half_unit(array, x, f"[{i}][{j}]") for j, x in enumerate(row, 1))
                for i, row in enumerate(values, 1)
            )
        return tuple(self._half_unit(array, x, f"[{i}]") for i, x in enumerate(values, 1))

    def with_proof(self, verdict: Verdict | None) -> Tableau:
        """Return the same tableau with the outcome of its proof."""
        return attrs.evolve(self, proof=verdict)

    def _array(self, array: str) -> tuple[Any, ...]:
        if array not in ARRAYS:
            raise BadTableau(f"no array {shown(array)}; allowed are {', '.join(ARRAYS)}", file=self.slug)
        name = array if array in ("nodes", "matrix", "weights") else f"{array}_weights"
        return getattr(self, name) or ()

    def _half_unit(self, array: str, value: Exact, place: str) -> Fraction:
        if self.digits is None or not value:
            return Fraction(0)
        own = stated = None
        if isinstance(self.digits, int):
            stated = self.digits
        else:
            own, stated = self.digits.get(array + place), self.digits.get(array)
        trusted = own if own is not None else stated if _looks_rounded(value) else None
        if trusted is None or trusted == "exact":
            return Fraction(0)
        return Fraction(10) ** (decimal_exponent(value) - trusted + 1) / 2

    def __repr__(self) -> str:
        return f"<Tableau {self.slug}: {self._claims()}>"

    def __str__(self) -> str:
        proof = "not proved yet" if self.proof is None else f"proof: {self.proof.outcome}"
        exact = "exact numbers" if self.is_exact else "rounded numbers"
        who = ", ".join(self.authors) + (f" {self.year}" if self.year else "")
        return (
            f"{self.name} ({self.slug})\n"
            f"  {self._claims()}{', first same as last' if self.first_same_as_last else ''}\n"
            f"  {exact}, {self.numbers.splitlines()[0]}{', ' + who if who else ''}; {proof}"
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


def _looks_rounded(value: Exact) -> bool:
    if value.form == "decimal":
        return True
    return not value.surd and value.rational.denominator >= _LONG_DENOMINATOR


def decimal_exponent(value: Exact) -> int:
    """Return the integer e with 10^e ≤ |value| < 10^(e+1), exactly; `value` is not zero.

    >>> decimal_exponent(Exact.of("0.0123")), decimal_exponent(Exact.of("sqrt(101)"))
    (-2, 1)
    """
    size = abs(value)
    bits = 256
    while (floor := size.scaled_floor(bits)) < 2**64:
        bits *= 2
    # 0.30103 is log10(2); the two loops put right an estimate that is off by at most one or two.
    exponent = int((floor.bit_length() - bits) * 0.30103)
    while size < Fraction(10) ** exponent:
        exponent -= 1
    while size >= Fraction(10) ** (exponent + 1):
        exponent += 1
    return exponent


def _check_shapes(tableau: Tableau) -> None:
    s = tableau.stages
    if not 1 <= s <= MOST_STAGES:
        raise BadTableau(f"{s} weights; a tableau has from 1 to {MOST_STAGES} stages", key="weights")
    if len(tableau.matrix) != s:
        first = "; the row of the first stage is there too, as []" if len(tableau.matrix) == s - 1 else ""
        raise BadTableau(
            f"{len(tableau.matrix)} rows for {s} weights; write one row a stage{first}", key="matrix"
        )
    for i, row in enumerate(tableau.matrix, 1):
        _check_row(row, i, s)
    for key, row in (("nodes", tableau.nodes), ("embedded.weights", tableau.embedded_weights)):
        if row is not None and len(row) != s:
            raise BadTableau(f"{len(row)} entries; {s} are needed, one a stage", key=key)
    for key, weights, order in (
        ("embedded", tableau.embedded_weights, tableau.embedded_order),
        ("continuous", tableau.continuous_weights, tableau.continuous_order),
    ):
        if (weights is None) != (order is None):
            missing, there = ("order", "weights") if order is None else ("weights", "order")
            raise BadTableau(
                f"missing; {key}.{there} is given, and needs its {missing}", key=f"{key}.{missing}"
            )
    if tableau.embedded_weights == tableau.weights:
        raise BadTableau(
            "equal to the weights, so that the error estimate is always zero", key="embedded.weights"
        )
    if tableau.continuous_weights is not None:
        _check_continuous(tableau.continuous_weights, s)


def _check_row(row: Row, i: int, s: int) -> None:
    key = f"matrix[{i}]"
    if len(row) not in (i - 1, s):
        reach = ", and one of them stands on the diagonal" if len(row) == i else ""
        raise BadTableau(
            f"{len(row)} entries{reach}; write the {i - 1} left of the diagonal, or all {s}\n"
            "  newel is for explicit methods, with zeros on and above the diagonal.",
            key=key,
        )
    for j, x in enumerate(row[i - 1 :], i):
        if x:
            place = "on" if j == i else "above"
            raise BadTableau(
                f"{shown(str(x))} stands {place} the diagonal: this tableau is implicit\n"
                "  newel is for explicit methods, where each stage uses earlier stages alone.",
                key=f"{key}[{j}]",
            )


def _check_continuous(rows: tuple[Row, ...], s: int) -> None:
    key = "continuous.weights"
    if len(rows) != s:
        raise BadTableau(f"{len(rows)} rows; {s} are needed, one a stage", key=key)
    width = len(rows[0])
    if not 1 <= width <= 64:
        raise BadTableau(
            f"{width} coefficients; write from 1 to 64, those of theta, theta^2, …", key=f"{key}[1]"
        )
    for i, row in enumerate(rows, 1):
        if len(row) != width:
            raise BadTableau(
                f"{len(row)} coefficients, but {width} in the first row; fill up with zeros",
                key=f"{key}[{i}]",
            )


def _full(row: Row, s: int) -> Row:
    return row + (_ZERO,) * (s - len(row))


def _fill_nodes(tableau: Tableau) -> None:
    nodes = []
    for i, row in enumerate(tableau.matrix, 1):
        try:
            total = sum((x for x in row if x), _ZERO)
        except BadNumber as error:
            raise BadTableau(f"the row sum: {error.reason}", key=f"matrix[{i}]") from None
        nodes.append(_number(total, f"nodes[{i}]"))
    object.__setattr__(tableau, "nodes", tuple(nodes))
    if isinstance(tableau.digits, Digits):
        object.__setattr__(tableau, "digits", _with_node_digits(tableau.digits))


def _with_node_digits(digits: Digits) -> Digits:
    """Let nodes that are row sums be trusted as far as the least trusted entry of their row."""
    added: dict[str, int | Literal["exact"]] = {}
    if "matrix" in digits:
        added["nodes"] = digits["matrix"]
    for key, value in digits.items():
        entry = _ENTRY.fullmatch(key)
        if entry and entry[1] == "matrix" and isinstance(value, int):
            node = f"nodes[{int(entry[2])}]"
            before = added.get(node, value)
            added[node] = min(value, before) if isinstance(before, int) else value
    return Digits.of({**added, **digits})


def _check_digits(tableau: Tableau) -> None:
    digits = tableau.digits
    if isinstance(digits, int):
        return
    stated: Mapping[str, Any] = {} if digits is None else digits
    shapes = {name: tableau._array(name) for name in ARRAYS}
    for key in stated:
        _check_digits_place(key, shapes)
    for name, values in shapes.items():
        if name in stated:
            continue
        for i, value in enumerate(values, 1):
            entries = enumerate(value, 1) if isinstance(value, tuple) else ((None, value),)
            for j, x in entries:
                place = f"{name}[{i}]" + ("" if j is None else f"[{j}]")
                if x.form == "decimal" and place not in stated:
                    raise BadTableau(
                        f"{shown(str(x))} is a decimal, and no digits are stated for {name}\n"
                        "  Write it as a fraction or with sqrt(n) where it is exact, or state how many "
                        f"significant digits are to be trusted: digits = {{ {name} = 16 }}",
                        key=place,
                    )


def _check_digits_place(key: str, shapes: Mapping[str, tuple[Any, ...]]) -> None:
    array, *indices = re.split(r"[\[\]]+", key.rstrip("]"))
    values: Any = shapes[array]
    if not values:
        raise BadTableau(f"this tableau has no {array} array", key=f"digits[{key!r}]")
    for index in map(int, indices):
        if not isinstance(values, tuple) or not 1 <= index <= len(values):
            raise BadTableau(f"there is no entry {key}; indices count from 1", key=f"digits[{key!r}]")
        values = values[index - 1]
    if indices and isinstance(values, tuple):
        raise BadTableau(f"{key} is a row; name an entry, such as {key}[1]", key=f"digits[{key!r}]")
