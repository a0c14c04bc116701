"""newel's own file format, exact or with every number rounded to so many digits."""

from __future__ import annotations

import attrs

from newel.methods.digits import ARRAYS, Digits, Trust
from newel.methods.exact import Exact
from newel.methods.exports.numbers import rounded_decimal
from newel.methods.tableau import Row, Tableau
from newel.methods.tableau_file import format_tableau

__all__ = ["export_toml"]


def export_toml(tableau: Tableau, digits: int | None = None) -> str:
    """Return the text of a tableau file. Rounded numbers come with `digits`, `numbers` says so, and a
    storage form, which is exact, is left out.

    >>> t = Tableau("third-1", order=1, matrix=[[], ["1/3"]], weights=["1/3", "2/3"])
    >>> print(export_toml(t, digits=4).splitlines()[-2:])
    ['weights = ["0.3333", "0.6667"]', 'digits = 4']
    """
    if digits is None:
        return format_tableau(tableau)
    t = tableau
    how, _, more = t.numbers.partition(":")
    words = f"{more.strip()}, rounded" if more.strip() else "rounded"
    return format_tableau(
        attrs.evolve(
            t,
            nodes=_row(t.nodes, digits),
            matrix=[_row(row, digits) for row in t.matrix],
            weights=_row(t.weights, digits),
            embedded_weights=t.embedded_weights and _row(t.embedded_weights, digits),
            continuous_weights=t.continuous_weights and [_row(row, digits) for row in t.continuous_weights],
            numbers=f"{how.strip()}: {words} to {digits} digits",
            digits=_trusted(t, digits),
            storage=None,
            proof=None,
        )
    )


def _row(row: Row, digits: int) -> list[str]:
    return [str(x) if _whole(x) else rounded_decimal(x, digits) for x in row]


def _whole(x: Exact) -> bool:
    return not x.surd and x.rational.denominator == 1 and x.form != "decimal"


def _trusted(t: Tableau, digits: int) -> int | dict[str, Trust]:
    """No digit is trusted that was not trusted before; what was exact has as many as are written."""
    stated = t.digits
    if not isinstance(stated, Digits):
        return digits if stated is None else min(stated, digits)
    absent = {"embedded": t.embedded_weights, "continuous": t.continuous_weights}
    kept: dict[str, Trust] = {name: digits for name in ARRAYS if absent.get(name, ()) is not None}
    kept |= {key: min(trust, digits) for key, trust in stated.items() if trust != "exact"}
    return kept
