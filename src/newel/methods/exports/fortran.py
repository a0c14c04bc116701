"""Fortran 2008: a module of named constants, and on request one step as a subroutine."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from newel.methods.exports.numbers import Numerals
from newel.methods.exports.words import about, comment_lines, identifier
from newel.methods.tableau import Row, Tableau

__all__ = ["export_fortran"]

_WIDTH = 100
_LONGEST_LINE = 128

_INTERFACE = """\
  abstract interface
    !> The rate of change: dydt at (t, y); `user` is what was handed to the step.
    subroutine rate_of_change(t, y, dydt, user)
      import :: real64
      real(real64), intent(in) :: t, y(:)
      real(real64), intent(out) :: dydt(:)
      class(*), intent(inout) :: user
    end subroutine rate_of_change
  end interface
  public :: rate_of_change, step
"""

_STEP = """\
contains

  !> One step of length h (negative: backward) from (t, y) to y_new, of the size of y and another array.
{error_words}  subroutine step(rate, user, t, h, y, y_new{error_argument})
    procedure(rate_of_change) :: rate
    class(*), intent(inout) :: user
    real(real64), intent(in) :: t, h, y(:)
    real(real64), intent(out) :: y_new(:)
{error_declared}    real(real64) :: rates(size(y), stages), state(size(y)), total(size(y))
    integer :: stage, j
    do stage = 1, stages
      total = 0.0_real64
      do j = 1, stage - 1
        if (abs(matrix(stage, j)) > 0.0_real64) total = total + matrix(stage, j)*rates(:, j)
      end do
      state = y + h*total
      call rate(t + h*nodes(stage), state, rates(:, stage), user)
    end do
    total = 0.0_real64
    do j = 1, stages
      total = total + weights(j)*rates(:, j)
    end do
    y_new = y + h*total
{error_computed}  end subroutine step
"""

_ERROR = {
    "error_words": "  !> `error` takes y_new less the embedded solution, where it is wanted.\n",
    "error_argument": ", error",
    "error_declared": "    real(real64), intent(out), optional :: error(:)\n",
    "error_computed": """\
    if (present(error)) then
      total = 0.0_real64
      do j = 1, stages
        total = total + (weights(j) - embedded_weights(j))*rates(:, j)
      end do
      error = h*total
    end if
""",
}


def export_fortran(tableau: Tableau, digits: int | None = None, with_step: bool = False) -> str:
    """Return a Fortran 2008 module `<name>_method` with the tableau as constants of kind `real64`.

    A fraction is a quotient such as `35.0_real64/384.0_real64`, evaluated by the compiler. Row i of `matrix`
    is stage i. No line is longer than the 132 characters of the standard.

    >>> t = Tableau("midpoint-2", order=2, matrix=[[], ["1/2"]], weights=[0, 1])
    >>> export_fortran(t).splitlines()[4]
    'module midpoint_2_method'
    """
    numerals = Numerals(lambda n: f"{n}.0_real64", _decimal, lambda d: f"sqrt({d}.0_real64)", digits)
    numerals.check(tableau)
    return "\n".join(_lines(tableau, numerals, with_step)) + "\n"


def _decimal(text: str) -> str:
    return f"{text}_real64"


def _lines(t: Tableau, numerals: Numerals, with_step: bool) -> Iterator[str]:
    module = f"{identifier(t)}_method"
    yield from (f"! {line}" for line in comment_lines(about(t, numerals.digits)))
    yield from (f"module {module}", "  use, intrinsic :: iso_fortran_env, only: real64", "  implicit none")
    yield "  private"
    yield f"  integer, parameter, public :: stages = {t.stages}, order = {t.order}"
    if t.embedded_order is not None:
        yield f"  integer, parameter, public :: embedded_order = {t.embedded_order}"
    yield from _row("nodes", t.nodes, numerals)
    yield from _table("matrix", t.matrix, numerals)
    yield from _row("weights", t.weights, numerals)
    if t.embedded_weights is not None:
        yield from _row("embedded_weights", t.embedded_weights, numerals)
    if t.continuous_weights is not None:
        yield f"  integer, parameter, public :: continuous_order = {t.continuous_order}"
        yield "  ! by stage: the coefficients of theta, theta**2, ... of the solution at t + theta*h"
        yield from _table("continuous_weights", t.continuous_weights, numerals)
    if with_step:
        words = {key: text if t.embedded_weights is not None else "" for key, text in _ERROR.items()}
        yield from (_INTERFACE + _STEP.format(**words)).rstrip("\n").split("\n")
    yield f"end module {module}"


def _row(name: str, row: Row, numerals: Numerals, public: str = ", public") -> Iterator[str]:
    head = f"  real(real64), parameter{public} :: {name}({len(row)}) = [ "
    yield from _continued(head, [numerals.text(x) for x in row], " ]")


def _table(name: str, rows: Sequence[Row], numerals: Numerals) -> Iterator[str]:
    """A constant for each row keeps every statement within the standard's 255 continuation lines."""
    names = [f"{name}_row_{i}" for i in range(1, len(rows) + 1)]
    for each, row in zip(names, rows, strict=True):
        yield from _row(each, row, numerals, public="")
    size = f"{len(rows)}, {len(rows[0])}"
    head = f"  real(real64), parameter, public :: {name}({size}) = reshape([ "
    yield from _continued(head, names, f" ], [{size}], order=[2, 1])")


def _continued(head: str, items: Sequence[str], end: str) -> Iterator[str]:
    """Yield one statement, continued over lines; an item longer than a line is continued inside."""
    line = head
    for number, item in enumerate(items, 1):
        piece = item + ("" if number == len(items) else ", ")
        if len(line) + len(piece) > _WIDTH and line.strip("& "):
            yield line.rstrip() + " &"
            line = "    "
        while len(line) + len(piece) > _LONGEST_LINE:
            room = _LONGEST_LINE - len(line)
            yield line + piece[:room] + "&"
            line, piece = "    &", piece[room:]
        line += piece
    if len(line) + len(end) > _LONGEST_LINE:
        yield line.rstrip() + " &"
        line = "    "
    yield line + end
