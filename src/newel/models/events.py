"""Events: times, found during the march, at which something happens."""

from __future__ import annotations

import attrs

from newel.models.checks import bad, flag
from newel.protocols import Indicator

__all__ = ["StateEvent"]

CROSSINGS = ("rising", "falling", "both")


def _label(value: str) -> str:
    if not isinstance(value, str) or not value.strip() or value != value.strip() or not value.isprintable():
        raise bad("label", f"an event's label is {value!r}", 'Give a printable text, such as "full".')
    return value


def _indicator(value: Indicator) -> Indicator:
    if not callable(value):
        raise bad("indicator", f"indicator is {value!r}", "Give a function: indicator(t, y) -> float.")
    return value


def _crossing(value: str) -> str:
    if value not in CROSSINGS:
        raise bad("crossing", f"crossing is {value!r}", f"Give one of: {', '.join(CROSSINGS)}.")
    return value


def _ends(value: bool) -> bool:
    return flag(value, "ends")


def _cuts(value: bool) -> bool:
    return flag(value, "cuts")


@attrs.frozen
class StateEvent:
    """A sign change of a function of the state, located during the march.

    Args:
        label: names the event in `run.events` and in the output; a model's labels differ from each other.
        indicator: `indicator(t, y[, params]) -> float`, in any unit. It must cross zero, not only touch it.
        crossing: which sign changes count along the march: "rising" (from below zero to zero or above),
            "falling", or "both".
        ends: the march ends at the first one.
        cuts: a step ends at the event, so that the state there is a row of the output.

    Raises:
        BadModel: an argument is not one of these; an event that ends the march but cuts no step.

    Example:
        >>> StateEvent("full", lambda t, y: y[0] - 2.5, crossing="rising", ends=True).label
        'full'
    """

    label: str = attrs.field(converter=_label)
    indicator: Indicator = attrs.field(converter=_indicator)
    crossing: str = attrs.field(default="both", converter=_crossing, kw_only=True)
    ends: bool = attrs.field(default=False, converter=_ends, kw_only=True)
    cuts: bool = attrs.field(default=True, converter=_cuts, kw_only=True)

    def __attrs_post_init__(self) -> None:
        if self.ends and not self.cuts:
            what = f"event {self.label!r} has ends=True and cuts=False"
            raise bad("cuts", what, "A march ends at the end of a step: leave out cuts=False.")
