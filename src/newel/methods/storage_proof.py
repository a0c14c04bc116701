"""The proof that a storage form is the method: multiplied out, it has the same matrix and weights.

Where all numbers are exact the difference must be zero; where some carry a rounding it must be within twice
the bound that their half units leave, and within 1e-12.
"""

from __future__ import annotations

from collections.abc import Iterator
from fractions import Fraction
from typing import TYPE_CHECKING

from newel.methods.conditions import allowed, readable
from newel.methods.verdict import Failure

if TYPE_CHECKING:
    from newel.methods.exact import Exact
    from newel.methods.tableau import Tableau

__all__ = ["storage_failures"]


def storage_failures(tableau: Tableau) -> Iterator[Failure]:
    """Yield each coefficient that the storage form of a tableau gives otherwise; nothing where it has none.

    >>> from newel.methods.storage import Storage
    >>> from newel.methods.tableau import Tableau
    >>> form = Storage("van-der-houwen", subdiagonal=["1/2"], weights=[0, 1])
    >>> midpoint = Tableau("midpoint-2", order=2, matrix=[[], ["1/2"]], weights=[0, 1], storage=form)
    >>> list(storage_failures(midpoint))
    []
    """
    if tableau.storage is None:
        return
    rows = [*(row[:i] for i, row in enumerate(tableau.matrix)), tableau.weights]
    units = [*tableau.half_units("matrix"), tableau.half_units("weights")]
    for i, row in enumerate(tableau.storage.bounded()):
        for j, (value, bound) in enumerate(row):
            place = f"weights[{j + 1}]" if i == tableau.stages else f"matrix[{i + 1}][{j + 1}]"
            excused = allowed(float(bound + units[i][j]))
            if abs(value - rows[i][j]) > Fraction(excused):
                yield _failure(place, value, rows[i][j], excused)


def _failure(place: str, value: Exact, wanted: Exact, bound: float) -> Failure:
    residual = value - wanted
    excuse = f", and the stated digits excuse {bound:.2g}" if bound else ""
    return Failure(
        part="storage",
        condition=place,
        residual=float(residual),
        residual_text=readable(residual),
        bound=bound,
        message=f"storage: {place} comes out as {readable(value)}, the tableau has {readable(wanted)}"
        f"; they differ by {float(residual):.3g}{excuse}",
    )
