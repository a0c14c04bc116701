"""The properties of a method as data, each defined once.

What `inspect`, `list` and their JSON show of a method comes from this table.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import attrs

from newel.methods.analysis.error_norms import error_norm
from newel.methods.analysis.stability import stability_polynomial
from newel.methods.analysis.structure import (
    computed_stages,
    estimator,
    has_monotone_nodes,
    largest_coefficient,
    precision,
)
from newel.methods.tableau import Tableau

__all__ = ["PROPERTIES", "Property"]


@attrs.frozen
class Property:
    """One property of a method.

    Args:
        name: how programs call it, the key in JSON.
        title: how people call it, a few words.
        unit: its unit, or "" where it has none.
        source: where its definition stands, or "" where it needs none.
        function: takes a tableau and returns the value: int, float, bool, str, `Exact`, a tuple of `Exact`,
            or None where the method has no such thing.

    >>> [each.name for each in PROPERTIES][:3]
    ['stages', 'order', 'embedded_order']
    """

    name: str
    title: str
    unit: str
    source: str
    function: Callable[[Tableau], Any]


_ERROR_NORMS = "Dormand and Prince, J. Comput. Appl. Math. 6 (1980) 19-26"

PROPERTIES: tuple[Property, ...] = (
    Property("stages", "stages", "", "", lambda t: t.stages),
    Property("order", "order", "", "", lambda t: t.order),
    Property("embedded_order", "embedded order", "", "", lambda t: t.embedded_order),
    Property("continuous_order", "continuous order", "", "", lambda t: t.continuous_order),
    Property("first_same_as_last", "first same as last", "", "", lambda t: t.first_same_as_last),
    Property("computed_stages", "rate calls a step", "", "", computed_stages),
    Property("estimator", "error estimate", "", "", estimator),
    Property("precision", "numbers", "", "", precision),
    Property("monotone_nodes", "nodes never go back", "", "", has_monotone_nodes),
    Property(
        "largest_coefficient",
        "largest coefficient",
        "",
        "Kennedy, Carpenter and Lewis, Appl. Numer. Math. 35 (2000) 177-219",
        largest_coefficient,
    ),
    Property(
        "stability_polynomial",
        "stability polynomial",
        "",
        "Lambert, Computational Methods in Ordinary Differential Equations (1973)",
        stability_polynomial,
    ),
    Property("principal_error_norm", "principal error norm", "", _ERROR_NORMS, error_norm),
    Property(
        "embedded_error_norm",
        "principal error norm, embedded",
        "",
        _ERROR_NORMS,
        lambda t: error_norm(t, embedded=True),
    ),
)
