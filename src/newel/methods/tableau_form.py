"""The form of a tableau: what may stand where, before anything is proved.

Each function takes what was given, in any of the allowed ways, and returns it in the one way that a tableau
holds it, or raises `BadTableau` with the key, the value, and what is allowed.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable
from fractions import Fraction
from typing import TYPE_CHECKING, Any, TypeAlias, TypeVar

import numpy as np

from newel.errors import BadNumber, BadTableau
from newel.methods.digits import shown
from newel.methods.exact import Exact

if TYPE_CHECKING:
    from newel.methods.tableau import Tableau

__all__ = ["HIGHEST_ORDER", "MOST_STAGES", "NUMBERS", "Row"]

NUMBERS = ("published", "derived", "from memory")
"""How numbers reach a tableau; further words may follow after a colon."""

HIGHEST_ORDER = 16
MOST_STAGES = 512
MOST_BITS = 4096

Kind = TypeVar("Kind")
Row: TypeAlias = tuple[Exact, ...]
ZERO = Exact(0)
_PRINTED_ZERO = Exact(0, text="0")
_SLUG = re.compile(r"[a-z0-9]+(-[a-z0-9]+)*")


def optional(convert: Callable[[Any, str], Kind], value: Any, key: str) -> Kind | None:
    """Return what `convert` makes of `value`, or None where there is none."""
    return None if value is None else convert(value, key)


def text(value: Any, key: str) -> str:
    """Return a text that a file can hold."""
    if not isinstance(value, str):
        raise BadTableau(f"{shown(value)} is no text", key=key)
    if any("\ud800" <= character <= "\udfff" for character in value):
        raise BadTableau(f"{shown(value)} holds half a surrogate pair, which no file can hold", key=key)
    return value


def texts(value: Any, key: str) -> tuple[str, ...]:
    """Return a list of texts as a tuple."""
    if isinstance(value, str) or not isinstance(value, Iterable):
        raise BadTableau(f"{shown(value)} is no list of texts; write [{shown(value)}]", key=key)
    return tuple(text(item, f"{key}[{i}]") for i, item in enumerate(value, 1))


def name(value: Any) -> str:
    """Return a usual name: one line."""
    if not text(value, "name").strip() or not value.isprintable():
        raise BadTableau(f"{shown(value)} is not one line of printable text", key="name")
    return str(value)


def slug(value: Any) -> str:
    """Return a slug."""
    if isinstance(value, str) and len(value) <= 80 and _SLUG.fullmatch(value):
        return value
    raise BadTableau(
        f"{shown(value)} is no slug\n  Write lower-case letters and digits in words joined by hyphens, at "
        "most 80 characters, such as bogacki-shampine-3-2.",
        key="slug",
    )


def order(value: Any, key: str) -> int:
    """Return an order."""
    whole = isinstance(value, (int, np.integer)) and not isinstance(value, bool)
    if whole and 1 <= value <= HIGHEST_ORDER:
        return int(value)
    raise BadTableau(f"{shown(value)} is no order; an order is an integer from 1 to {HIGHEST_ORDER}", key=key)


def year(value: Any) -> int | None:
    """Return a year or None."""
    if value is None:
        return None
    if isinstance(value, int) and not isinstance(value, bool) and 1600 <= value <= 2200:
        return value
    raise BadTableau(
        f"{shown(value)} is no year; write it as an integer, such as 1989, or leave it out", key="year"
    )


def numbers(value: Any) -> str:
    """Return how the numbers reached the tableau."""
    if text(value, "numbers").split(":")[0].strip() in NUMBERS:
        return str(value)
    raise BadTableau(
        f"{shown(value)} is not one of {', '.join(NUMBERS)}; more words may follow after a colon",
        key="numbers",
    )


def number(value: Any, key: str) -> Exact:
    """Return one coefficient, of bounded size."""
    if type(value) is str and value == "0":
        return _PRINTED_ZERO
    if isinstance(value, int) and value.bit_length() > MOST_BITS:
        raise BadTableau(f"an integer of {value.bit_length()} bits; at most {MOST_BITS} are read", key=key)
    try:
        made = Exact.of(value.item() if isinstance(value, np.generic) else value)
    except BadNumber as error:
        raise BadTableau(str(error), key=key) from None
    if max(_bits(made.rational), _bits(made.surd)) > MOST_BITS:
        raise BadTableau(f"a number of more than {MOST_BITS} bits; shorten it", key=key)
    return made


def row(values: Any, key: str) -> Row:
    """Return a list of coefficients as a tuple."""
    if isinstance(values, str) or not isinstance(values, Iterable):
        raise BadTableau(f"{shown(values)} is no list of numbers", key=key)
    return tuple(number(value, f"{key}[{i}]") for i, value in enumerate(values, 1))


def rows(values: Any, key: str) -> tuple[Row, ...]:
    """Return a list of lists of coefficients as a tuple of tuples."""
    if isinstance(values, str) or not isinstance(values, Iterable):
        raise BadTableau(f"{shown(values)} is no list of rows", key=key)
    return tuple(row(line, f"{key}[{i}]") for i, line in enumerate(values, 1))


def square(matrix: tuple[Row, ...], s: int) -> tuple[Row, ...]:
    """Return the matrix as s rows of s; raises BadTableau where it is not that of an explicit method."""
    if not 1 <= s <= MOST_STAGES:
        raise BadTableau(f"{s} weights; a tableau has from 1 to {MOST_STAGES} stages", key="weights")
    if len(matrix) != s:
        first = "; the first stage has a row too: []" if len(matrix) == s - 1 else ""
        raise BadTableau(
            f"{_counted(matrix, 'row', 'rows')}, but {s} weights; write one a stage{first}", key="matrix"
        )
    for i, line in enumerate(matrix, 1):
        _check_row(line, i, s)
    return tuple(line + (ZERO,) * (s - len(line)) for line in matrix)


def row_sums(matrix: tuple[Row, ...]) -> Row:
    """Return the nodes of a method whose paper leaves them to the reader."""
    sums = []
    for i, line in enumerate(matrix, 1):
        try:
            total = sum((x for x in line if x), ZERO)
        except BadNumber as error:
            raise BadTableau(f"no row sum: {error.reason}", key=f"matrix[{i}]") from None
        sums.append(number(total, f"nodes[{i}]"))
    return tuple(sums)


def check_shapes(tableau: Tableau) -> None:
    """Raise BadTableau where rows are too long or too short, or one part lacks another that it needs."""
    s = tableau.stages
    of_stages = {"nodes": tableau.nodes, "embedded.weights": tableau.embedded_weights}
    for key, line in of_stages.items():
        if line is not None and len(line) != s:
            raise BadTableau(f"{_counted(line)}; {s} are needed, one a stage", key=key)
    _check_claim("embedded", tableau.embedded_weights, tableau.embedded_order)
    _check_claim("continuous", tableau.continuous_weights, tableau.continuous_order)
    if tableau.embedded_weights == tableau.weights:
        raise BadTableau(
            "equal to the weights, so that the error estimate is always zero", key="embedded.weights"
        )
    if tableau.continuous_weights is not None:
        _check_continuous(tableau.continuous_weights, s)


def check_storage(storage: Any, kind: type[Any], s: int) -> None:
    """Raise BadTableau where a storage form is none, or has another number of stages."""
    if storage is not None and not isinstance(storage, kind):
        raise BadTableau(f"{shown(storage)} is no Storage; write Storage(form, …)", key="storage")
    if storage is not None and storage.stages != s:
        raise BadTableau(f"{storage.stages} stages, but {s} weights", key="storage")


def _check_claim(part: str, weights: object, claimed: int | None) -> None:
    if weights is not None and claimed is None:
        raise BadTableau(f"missing: {part}.weights come with the order that they claim", key=f"{part}.order")
    if weights is None and claimed is not None:
        raise BadTableau(f"missing: {part}.order comes with its weights", key=f"{part}.weights")


def _check_row(line: Row, i: int, s: int) -> None:
    if len(line) not in (i - 1, s):
        reach = " with the diagonal" if len(line) == i else ""
        raise BadTableau(
            f"{_counted(line)}{reach}; write the {i - 1} left of the diagonal, or all {s}\n"
            "  newel is for explicit methods, with zeros on and above the diagonal.",
            key=f"matrix[{i}]",
        )
    for j, x in enumerate(line[i - 1 :], i):
        if x:
            place = "on" if j == i else "above"
            raise BadTableau(
                f"{shown(str(x))} stands {place} the diagonal: this tableau is implicit\n"
                "  newel is for explicit methods, where each stage uses earlier stages alone.",
                key=f"matrix[{i}][{j}]",
            )


def _check_continuous(lines: tuple[Row, ...], s: int) -> None:
    key = "continuous.weights"
    if len(lines) != s:
        raise BadTableau(f"{_counted(lines, 'row', 'rows')}; {s} are needed, one a stage", key=key)
    width = len(lines[0])
    if not 1 <= width <= 64:
        raise BadTableau(
            f"{_counted(lines[0])}; write from 1 to 64, the coefficients of theta, theta^2, …",
            key=f"{key}[1]",
        )
    for i, line in enumerate(lines, 1):
        if len(line) != width:
            raise BadTableau(
                f"{_counted(line)}, but {width} in the first row; fill up with zeros",
                key=f"{key}[{i}]",
            )


def _counted(items: tuple[Any, ...], one: str = "entry", many: str = "entries") -> str:
    return f"{len(items)} {one if len(items) == 1 else many}"


def _bits(part: Fraction) -> int:
    return max(part.numerator.bit_length(), part.denominator.bit_length())
