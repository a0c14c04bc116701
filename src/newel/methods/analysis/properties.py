"""The properties of a method as data, each defined once.

What `inspect`, `list` and their JSON show of a method comes from this table.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import attrs

from newel.methods.analysis.error_norms import error_norm
from newel.methods.analysis.monotonicity import linear_threshold, ssp_coefficient
from newel.methods.analysis.pair_quality import (
    embedded_error_ratio,
    estimate_error_ratio,
    solution_error_ratio,
)
from newel.methods.analysis.stability import stability_polynomial
from newel.methods.analysis.stability_limits import imaginary_limit, real_limit
from newel.methods.analysis.stability_region import internal_growth, stability_area
from newel.methods.analysis.storage_needs import low_storage_form, registers, slab_bytes
from newel.methods.analysis.structure import (
    computed_stages,
    dominant_stage_order,
    estimator,
    has_monotone_nodes,
    largest_coefficient,
    precision,
    stage_order,
)
from newel.methods.analysis.waves import (
    dispersion_coefficient,
    dispersion_order,
    dissipation_coefficient,
    dissipation_order,
    resolved_wave_number,
)
from newel.methods.analysis.work import calls_for_digits
from newel.methods.tableau import Tableau

__all__ = ["ANALYSIS_VERSION", "PROPERTIES", "Property", "property_named"]

ANALYSIS_VERSION = 1
"""Goes up when a function changes what it returns, so that values remembered from before are not found."""


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
        short: a shorter name for searches and columns, or "".
        kept: whether the value may be remembered under the key of the method's proof.
        kind: "number", "yes or no", "word" or "polynomial".
        digits: how many are shown to people, of a float.

    >>> [each.name for each in PROPERTIES][:3]
    ['stages', 'order', 'embedded_order']
    """

    name: str
    title: str
    unit: str
    source: str
    function: Callable[[Tableau], Any]
    short: str = ""
    kept: bool = True
    kind: str = "number"
    digits: int = 4


_ERROR_NORMS = "Dormand and Prince, J. Comput. Appl. Math. 6 (1980) 19-26"
_REGISTERS = "Kennedy, Carpenter and Lewis, Appl. Numer. Math. 35 (2000) 177-219"
_LAMBERT = "Lambert, Computational Methods in Ordinary Differential Equations (1973)"
_KRAAIJEVANGER = "Kraaijevanger, BIT 31 (1991) 482-528"
_WAVES = "van der Houwen and Sommeijer, SIAM J. Numer. Anal. 24 (1987) 595-617"
_STAGES = "Hairer and Wanner, Solving Ordinary Differential Equations II, section IV.5"
_A_UNIT = "a unit of time"

_STRUCTURE: tuple[Property, ...] = (
    Property("stages", "stages", "", "", lambda t: t.stages, kept=False),
    Property("order", "order", "", "", lambda t: t.order, kept=False),
    Property("embedded_order", "embedded order", "", "", lambda t: t.embedded_order, "embedded", False),
    Property(
        "continuous_order", "continuous order", "", "", lambda t: t.continuous_order, "continuous", False
    ),
    Property(
        "first_same_as_last", "first same as last", "", "", lambda t: t.first_same_as_last, kind="yes or no"
    ),
    Property("computed_stages", "rate calls a step", "", "", computed_stages, "calls"),
    Property("estimator", "error estimate", "", "", estimator, kept=False, kind="word"),
    Property("precision", "numbers", "", "", precision, kind="word"),
    Property("monotone_nodes", "nodes never go back", "", "", has_monotone_nodes, kind="yes or no"),
    Property("largest_coefficient", "largest coefficient", "", _REGISTERS, largest_coefficient, kept=False),
    Property("stage_order", "stage order", "", _STAGES, stage_order),
    Property("dominant_stage_order", "stage order of weighted stages", "", _STAGES, dominant_stage_order),
)

_STABILITY: tuple[Property, ...] = (
    Property(
        "stability_polynomial",
        "stability polynomial",
        "",
        _LAMBERT,
        stability_polynomial,
        kept=False,
        kind="polynomial",
    ),
    Property("real_limit", "real stability limit", "", _LAMBERT, real_limit, "real", digits=13),
    Property(
        "imaginary_limit", "imaginary stability limit", "", _LAMBERT, imaginary_limit, "imag", digits=13
    ),
    Property("stability_area", "area of the stability region", "", _LAMBERT, stability_area, "area"),
    Property(
        "internal_growth",
        "error growth within a step",
        "",
        "Ketcheson, Lóczi and Parsani, SIAM J. Numer. Anal. 52 (2014) 2227-2249",
        internal_growth,
    ),
    Property("ssp_coefficient", "strong-stability coefficient", "", _KRAAIJEVANGER, ssp_coefficient, "ssp"),
    Property("linear_threshold", "strong stability, linear models", "", _KRAAIJEVANGER, linear_threshold),
    Property("dissipation_order", "dissipation order", "", _WAVES, dissipation_order),
    Property("dissipation_coefficient", "dissipation coefficient", "", _WAVES, dissipation_coefficient),
    Property("dispersion_order", "dispersion order", "", _WAVES, dispersion_order),
    Property("dispersion_coefficient", "dispersion coefficient", "", _WAVES, dispersion_coefficient),
    Property(
        "resolved_wave_number",
        "waves resolved to 0.001",
        "radians a step",
        "Hu, Hussaini and Manthey, J. Comput. Phys. 124 (1996) 177-191",
        resolved_wave_number,
        "waves",
    ),
)

_ACCURACY: tuple[Property, ...] = (
    Property("principal_error_norm", "principal error norm", "", _ERROR_NORMS, error_norm, "error"),
    Property(
        "embedded_error_norm",
        "principal error norm, embedded",
        "",
        _ERROR_NORMS,
        lambda t: error_norm(t, embedded=True),
    ),
    Property(
        "embedded_error_ratio", "error ratio of the embedded solution", "", _ERROR_NORMS, embedded_error_ratio
    ),
    Property("estimate_error_ratio", "error ratio of the estimate", "", _ERROR_NORMS, estimate_error_ratio),
    Property(
        "solution_error_ratio", "error of the solution over embedded", "", _REGISTERS, solution_error_ratio
    ),
    Property("calls_for_3_digits", "rate calls for 3 digits", _A_UNIT, "", lambda t: calls_for_digits(t, 3)),
    Property("calls_for_6_digits", "rate calls for 6 digits", _A_UNIT, "", lambda t: calls_for_digits(t, 6)),
    Property("calls_for_9_digits", "rate calls for 9 digits", _A_UNIT, "", lambda t: calls_for_digits(t, 9)),
)

_STORAGE: tuple[Property, ...] = (
    Property(
        "low_storage_form", "low-storage form", "", _REGISTERS, low_storage_form, "low_storage", kind="word"
    ),
    Property("registers", "registers", "", _REGISTERS, registers),
    Property("slab_bytes", "memory of newel's stages", "bytes a component", "", slab_bytes),
)

PROPERTIES: tuple[Property, ...] = (*_STRUCTURE, *_STABILITY, *_ACCURACY, *_STORAGE)


def property_named(name: str) -> Property | None:
    """Return the property of a name or short name, or None.

    >>> property_named("imag").name
    'imaginary_limit'
    """
    return next((each for each in PROPERTIES if name in (each.name, each.short)), None)
