"""How much memory a method asks for, and whether its coefficients allow for little."""

from __future__ import annotations

from fractions import Fraction
from typing import Literal

from newel.methods.exact import Exact
from newel.methods.tableau import Tableau

__all__ = ["low_storage_form", "registers", "slab_bytes"]

LowStorage = Literal["williamson", "van-der-houwen"]


def slab_bytes(tableau: Tableau, components: int = 1, itemsize: int = 8) -> int:
    """Return the bytes of newel's slab: the state and the rate of each stage, (s + 1)·n·itemsize.

    Args:
        tableau: the method.
        components: n, the number of entries of the state.
        itemsize: bytes of one entry; 8 for float64.

    >>> slab_bytes(Tableau("midpoint-2", order=2, matrix=[[], ["1/2"]], weights=[0, 1]), 1_000_000)
    24000000
    """
    return (tableau.stages + 1) * components * itemsize


def registers(tableau: Tableau) -> int:
    """Return how many arrays of the size of the state an implementation by hand must hold at once.

    The state counts as one. A rate is written over its own argument; a rate is held until its last use; the
    new state is either summed up as the rates come, or at the end, whichever holds less. A low-storage form
    holds two. An embedded solution adds one. Source of the count: C. A. Kennedy, M. H. Carpenter and
    R. M. Lewis, Appl. Numer. Math. 35 (2000) 177-219.

    >>> registers(Tableau("kutta-4", order=4, matrix=[[], ["1/2"], [0, "1/2"], [0, 0, 1]],
    ...                   weights=["1/6", "1/3", "1/3", "1/6"]))
    3
    """
    extra = tableau.embedded_weights is not None
    if low_storage_form(tableau) is not None:
        return 2 + extra
    summed = 2 + extra + max(_held(tableau, i, False) for i in range(tableau.stages))
    return min(summed, 1 + max(_held(tableau, i, True) for i in range(tableau.stages)))


def _held(tableau: Tableau, stage: int, until_the_end: bool) -> int:
    """Return how many rates are held while a stage is evaluated, its own included."""
    later: tuple[tuple[Exact, ...], ...] = tableau.matrix[stage + 1 :]
    if until_the_end:
        later += (tableau.weights, tableau.embedded_weights or ())
    return 1 + sum(any(len(row) > j and row[j] for row in later) for j in range(stage))


def low_storage_form(tableau: Tableau) -> LowStorage | None:
    """Return the form in which the method runs in two registers, or None; told by the numbers alone.

    Van der Houwen: each row repeats the weights but for its last entry. Williamson: the differences of
    neighbouring rows stand in the same ratios, S ← A_i S + h F(u), u ← u + B_i S. Rounded numbers are
    compared to 9 digits. Sources: J. H. Williamson, J. Comput. Phys. 35 (1980) 48-56; P. J. van der Houwen,
    Construction of Integration Formulas for Initial Value Problems (1977).

    >>> low_storage_form(Tableau("midpoint-2", order=2, matrix=[[], ["1/2"]], weights=[0, 1]))
    'williamson'
    """
    numbers = {x.radicand for row in (*tableau.matrix, tableau.weights) for x in row} - {1}
    if len(numbers) > 1:
        return None
    near = Fraction(0) if tableau.is_exact else Fraction(1, 10**9)
    if _is_williamson(tableau, near):
        return "williamson"
    if all(
        abs(tableau.matrix[i][j] - tableau.weights[j]) <= near
        for i in range(tableau.stages)
        for j in range(i - 1)
    ):
        return "van-der-houwen"
    return None


def _is_williamson(tableau: Tableau, near: Fraction) -> bool:
    rows, s = (*tableau.matrix, tableau.weights), tableau.stages
    steps = [[rows[i + 1][j] - rows[i][j] for j in range(s)] for i in range(s)]
    for j in range(s - 1):
        # A_{j+2} is the one ratio of column j+1 to column j+2 in every row from j+2 on.
        pairs = [(steps[i][j], steps[i][j + 1]) for i in range(j + 1, s)]
        known = max(pairs, key=lambda pair: abs(pair[1]))
        if abs(known[1]) <= near:
            if any(abs(x) > near for x, _ in pairs):
                return False
            continue
        if any(abs(x * known[1] - known[0] * y) > near for x, y in pairs):
            return False
    return True
