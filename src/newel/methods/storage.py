"""Storage forms as data: the same method written so that a program holds few vectors.

With u the state, F_i the rate at stage i, and h the step:

- `williamson` (2N): S ← A_i S + h F_i, u ← u + B_i S, with A_1 = 0. J. H. Williamson, J. Comput. Phys. 35
  (1980) 48-56. Two registers.
- `van-der-houwen`: row i of the matrix is b_1, …, b_{i−2}, a_{i,i−1}, so that what the weights add up is
  added as it comes, and only the number next to the diagonal is held for one stage more.
  P. J. van der Houwen, Construction of Integration Formulas for Initial Value Problems (1977), section 2.3;
  C. A. Kennedy, M. H. Carpenter and R. M. Lewis, Appl. Numer. Math. 35 (2000) 177-219. Two registers.
- `shu-osher`: y_i = Σ_{j<i} (α_ij y_j + h β_ij F_j), y_0 the state, the last one the result; each row of α
  sums to 1. C.-W. Shu and S. Osher, J. Comput. Phys. 77 (1988) 439-471.
  Convex where α and β are not negative.

None is believed: the proof multiplies a form out and holds it against the tableau (`storage_proof`).
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from fractions import Fraction
from typing import Any, TypeAlias

import attrs

from newel.errors import BadTableau
from newel.methods import tableau_form as form
from newel.methods.digits import half_unit, read_digits, shown
from newel.methods.exact import Exact, ExactLike
from newel.methods.tableau_form import Row

__all__ = ["ARRAYS_OF", "FORMS", "Storage"]

ARRAYS_OF = {
    "williamson": ("A", "B"),
    "van-der-houwen": ("subdiagonal", "weights"),
    "shu-osher": ("alpha", "beta"),
}
"""The arrays of each form, by the keys of a file."""

FORMS = tuple(ARRAYS_OF)
Bounded: TypeAlias = tuple[Exact, Fraction]
"""A number, and how far it may be from the one that was meant."""

_NONE: Bounded = (Exact(0), Fraction(0))


@attrs.frozen(init=False)
class Storage:
    """A storage form of a method; immutable, all numbers unitless.

    Args:
        form: "williamson", "van-der-houwen" or "shu-osher".
        A, B: for `williamson`, s numbers each.
        subdiagonal, weights: for `van-der-houwen`, s − 1 and s numbers.
        alpha, beta: for `shu-osher`, s rows; row i has i numbers.
        digits: significant digits to be trusted in all of them, None where they are exact.

    Raises:
        BadTableau: the form is unknown, or its arrays are missing, of another form, or of the wrong length.

    >>> heun = Storage("shu-osher", alpha=[[1], ["1/2", "1/2"]], beta=[[1], [0, "1/2"]])
    >>> matrix, weights = heun.butcher()
    >>> [str(x) for x in weights]
    ['1/2', '1/2']
    """

    form: str
    A: Row | None
    B: Row | None
    subdiagonal: Row | None
    weights: Row | None
    alpha: tuple[Row, ...] | None
    beta: tuple[Row, ...] | None
    digits: int | None

    def __init__(
        self,
        form: str,
        *,
        A: Iterable[ExactLike] | None = None,
        B: Iterable[ExactLike] | None = None,
        subdiagonal: Iterable[ExactLike] | None = None,
        weights: Iterable[ExactLike] | None = None,
        alpha: Iterable[Iterable[ExactLike]] | None = None,
        beta: Iterable[Iterable[ExactLike]] | None = None,
        digits: int | None = None,
    ) -> None:
        given: dict[str, Any] = {
            "A": _row(A, "A"),
            "B": _row(B, "B"),
            "subdiagonal": _row(subdiagonal, "subdiagonal"),
            "weights": _row(weights, "weights"),
            "alpha": _rows(alpha, "alpha"),
            "beta": _rows(beta, "beta"),
        }
        _check_form(form, given)
        self.__attrs_init__(form=form, **given, digits=_digits(digits))
        self._check_lengths()
        if digits is None:
            _refuse_decimals(given)

    @property
    def stages(self) -> int:
        """The number of stages s."""
        return len(self.B or self.weights or self.beta or ())

    def arrays(self) -> dict[str, Any]:
        """Return the arrays of this form by their keys: rows of numbers, or rows of such rows."""
        return {key: getattr(self, key) for key in ARRAYS_OF[self.form]}

    def butcher(self) -> tuple[list[list[Exact]], list[Exact]]:
        """Return matrix and weights, multiplied out; row i has i − 1 numbers."""
        rows = [[value for value, _ in row] for row in self.bounded()]
        return rows[:-1], rows[-1]

    def bounded(self) -> list[list[Bounded]]:
        """Return the rows of the matrix and the weights, each number with a bound of its rounding."""
        if self.form == "williamson":
            return self._williamson()
        return self._van_der_houwen() if self.form == "van-der-houwen" else self._shu_osher()

    def _williamson(self) -> list[list[Bounded]]:
        rows: list[list[Bounded]] = [[]]
        summed: list[Bounded] = []
        pairs = zip(self._bounded(self.A or ()), self._bounded(self.B or ()), strict=True)
        for a, b in pairs:
            summed = [_times(a, x) for x in summed] + [(Exact(1), Fraction(0))]
            before = rows[-1] + [_NONE]
            rows.append([_plus(x, _times(b, y)) for x, y in zip(before, summed, strict=True)])
        return rows

    def _van_der_houwen(self) -> list[list[Bounded]]:
        weights = self._bounded(self.weights or ())
        below = self._bounded(self.subdiagonal or ())
        return [[], *([*weights[:i], x] for i, x in enumerate(below)), weights]

    def _shu_osher(self) -> list[list[Bounded]]:
        rows: list[list[Bounded]] = [[]]
        for alpha, beta in zip(self.alpha or (), self.beta or (), strict=True):
            row = self._bounded(beta)
            for share, before in zip(self._bounded(alpha), rows, strict=True):
                if share[0]:
                    row[: len(before)] = [
                        _plus(x, _times(share, y)) for x, y in zip(row, before, strict=False)
                    ]
            rows.append(row)
        return rows

    def _bounded(self, row: Sequence[Exact]) -> list[Bounded]:
        return [(x, half_unit(self.digits, "weights", "", x)) for x in row]

    def _check_lengths(self) -> None:
        s = self.stages
        if s == 0:
            raise BadTableau("no stages; write a number for each", key=f"storage.{ARRAYS_OF[self.form][1]}")
        if self.form == "shu-osher":
            for key in ("alpha", "beta"):
                _check_triangle(f"storage.{key}", getattr(self, key), s)
            for i, row in enumerate(self.alpha or (), 1):
                total = sum(row, Exact(0))
                if total != 1 and self.digits is None:
                    raise BadTableau(f"sums to {total}; a row of alpha sums to 1", key=f"storage.alpha[{i}]")
            return
        first = ARRAYS_OF[self.form][0]
        wanted = s - 1 if first == "subdiagonal" else s
        if len(getattr(self, first)) != wanted:
            raise BadTableau(
                f"{len(getattr(self, first))} numbers; {wanted} are needed", key=f"storage.{first}"
            )
        if self.A is not None and self.A[0]:
            raise BadTableau(f"{shown(str(self.A[0]))} at the first stage; write 0", key="storage.A[1]")


def _check_form(name: Any, given: dict[str, Any]) -> None:
    if name not in FORMS:
        reason = f"{shown(name)} is no storage form; allowed are {', '.join(FORMS)}"
        raise BadTableau(reason, key="storage.form")
    both = f"the form {name} has {' and '.join(ARRAYS_OF[name])}"
    for key, value in given.items():
        belongs = key in ARRAYS_OF[name]
        if belongs and value is None:
            raise BadTableau(f"missing: {both}", key=f"storage.{key}")
        if not belongs and value is not None:
            raise BadTableau(f"not of this form: {both}", key=f"storage.{key}")


def _row(values: Any, key: str) -> Row | None:
    return form.optional(form.row, values, f"storage.{key}")


def _rows(values: Any, key: str) -> tuple[Row, ...] | None:
    return form.optional(form.rows, values, f"storage.{key}")


def _digits(value: Any) -> int | None:
    try:
        read = read_digits(value)
    except BadTableau as error:
        raise BadTableau(error.reason, key="storage.digits") from None
    if read is None or isinstance(read, int):
        return read
    raise BadTableau(f"{shown(value)}; one integer for all numbers of the form", key="storage.digits")


def _refuse_decimals(given: dict[str, Any]) -> None:
    for key, values in given.items():
        for value in values or ():
            for x in value if isinstance(value, tuple) else (value,):
                if x.form == "decimal":
                    raise BadTableau(
                        f"{shown(str(x))} is a decimal, and no digits are stated\n"
                        "  State how many significant digits are to be trusted: digits = 16",
                        key=f"storage.{key}",
                    )


def _check_triangle(key: str, rows: Sequence[Row], s: int) -> None:
    if len(rows) != s:
        raise BadTableau(f"{len(rows)} rows; {s} are needed", key=key)
    for i, row in enumerate(rows, 1):
        if len(row) != i:
            raise BadTableau(f"{len(row)} numbers; row {i} has {i}", key=f"{key}[{i}]")


def _plus(x: Bounded, y: Bounded) -> Bounded:
    return x[0] + y[0], x[1] + y[1]


def _times(x: Bounded, y: Bounded) -> Bounded:
    value = x[0] * y[0]
    if not (x[1] or y[1]):
        return value, Fraction(0)
    return value, _size(x[0]) * y[1] + _size(y[0]) * x[1] + x[1] * y[1]


def _size(x: Exact) -> Fraction:
    """Return an upper bound of the modulus."""
    return abs(x.rational) if not x.surd else Fraction(abs(x).scaled_floor(64) + 1, 1 << 64)
