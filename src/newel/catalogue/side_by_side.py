"""Several methods in one table: what decides between them, at equal cost."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from math import isfinite
from typing import TYPE_CHECKING, Any, Literal

import attrs

if TYPE_CHECKING:
    from newel.catalogue.inspection import Inspection

__all__ = ["ROWS", "Row", "side_by_side"]

Better = Literal["more", "less", ""]


@attrs.frozen
class Row:
    """One line of the table.

    Attributes:
        name: the property, or a ratio of two, as `needs` and `columns` write it.
        title: in words.
        better: whether "more" or "less" of it is better, all else equal; "" where that depends on the model.
        values: one for each method; None where a method has no such thing.
        best: the places, counted from 0, of the methods that have the best value; empty where all are equal.
    """

    name: str
    title: str
    better: Better
    values: tuple[Any, ...]
    best: tuple[int, ...]


ROWS: tuple[tuple[str, str, Better], ...] = (
    ("order", "order", ""),
    ("embedded_order", "embedded order", ""),
    ("continuous_order", "continuous order", ""),
    ("outcome", "proof", ""),
    ("working_floor", "floor in float64", "less"),
    ("stages", "stages", ""),
    ("computed_stages", "rate calls a step", ""),
    ("real_limit/computed_stages", "real stability limit a call", "more"),
    ("imaginary_limit/computed_stages", "imaginary stability limit a call", "more"),
    ("ssp_coefficient/computed_stages", "strong-stability coefficient a call", "more"),
    ("linear_threshold/computed_stages", "strong stability, linear, a call", "more"),
    ("resolved_wave_number/computed_stages", "waves resolved to 0.001, a call", "more"),
    ("dissipation_order", "dissipation order", ""),
    ("dispersion_order", "dispersion order", ""),
    ("calls_for_3_digits", "rate calls for 3 digits", "less"),
    ("calls_for_6_digits", "rate calls for 6 digits", "less"),
    ("calls_for_9_digits", "rate calls for 9 digits", "less"),
    ("embedded_error_ratio", "error ratio of the embedded solution", ""),
    ("estimate_error_ratio", "error ratio of the estimate", ""),
    ("dominant_stage_order", "stage order of weighted stages", "more"),
    ("internal_growth", "error growth within a step", "less"),
    ("largest_coefficient", "largest coefficient", "less"),
    ("monotone_nodes", "nodes never go back", ""),
    ("registers", "registers", "less"),
    ("slab_bytes", "bytes of stages a component", "less"),
)


def side_by_side(found: Sequence[Inspection]) -> tuple[Row, ...]:
    """Return the table of several inspections; limits are divided by the rate calls of a step: equal cost.

    >>> from newel.catalogue.inspection import inspect
    >>> rows = side_by_side(inspect("euler-1", "kutta-4"))
    >>> row = next(row for row in rows if row.name == "real_limit/computed_stages")
    >>> [round(x, 9) for x in row.values], row.best
    ([2.0, 0.696323391], (0,))
    """
    facts = [_facts(each) for each in found]
    return tuple(_row(name, title, better, facts) for name, title, better in ROWS)


def _facts(found: Inspection) -> Mapping[str, Any]:
    verdict = found.verdict
    return {
        **found.properties,
        "outcome": "unproven" if verdict is None else verdict.outcome,
        "working_floor": None if verdict is None else verdict.working_floor,
    }


def _row(name: str, title: str, better: Better, facts: Sequence[Mapping[str, Any]]) -> Row:
    above, _, below = name.partition("/")
    values = [each[above] for each in facts]
    if below:
        values = [
            None if x is None else float(x) / float(each[below])
            for x, each in zip(values, facts, strict=True)
        ]
    return Row(name, title, better, tuple(values), _best(values, better))


def _best(values: Sequence[Any], better: Better) -> tuple[int, ...]:
    known = {k: float(x) for k, x in enumerate(values) if x is not None} if better else {}
    known = {k: x for k, x in known.items() if isfinite(x)}
    if len(known) < 2 or len(set(known.values())) == 1:
        return ()
    best = max(known.values()) if better == "more" else min(known.values())
    return tuple(k for k, x in known.items() if x == best)
