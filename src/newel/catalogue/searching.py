"""Needs and columns over many methods: what is cheap to know is asked first."""

from __future__ import annotations

from collections.abc import Collection, Iterable
from typing import TYPE_CHECKING, Any

import attrs

from newel.catalogue.needs import FACTS, Lookup, parse_columns, parse_needs
from newel.catalogue.values import Values

if TYPE_CHECKING:
    from newel.catalogue.registry import Registry
    from newel.catalogue.summaries import Summary

__all__ = ["searched"]


def searched(
    summaries: Iterable[Summary],
    registry: Registry,
    needs: str | None,
    columns: str | Collection[str] | None,
) -> list[Summary]:
    """Return the summaries that fit the needs, with the values of the columns.

    Raises:
        BadRequest: as for `parse_needs` and `parse_columns`.
    """
    wanted = () if needs is None else parse_needs(needs)
    shown = () if columns is None else parse_columns(columns)
    cheap_first = sorted(wanted, key=lambda need: not need.quantity.is_fact)
    values = Values(registry.cache)
    found = []
    for summary in summaries:
        lookup = _lookup(summary, registry, values)
        if all(need.fits(lookup) for need in cheap_first):
            row = {column.text: column.value(lookup) for column in shown}
            found.append(attrs.evolve(summary, values=row) if row else summary)
    return found


def _lookup(summary: Summary, registry: Registry, values: Values) -> Lookup:
    """Return the function that looks up facts and properties of one method."""

    def lookup(name: str) -> Any:
        if name in FACTS:
            return getattr(summary, name)
        key = summary.proof_key
        if key is None:
            from newel.methods.order_conditions import proof_key

            key = proof_key(registry.find(summary.slug))
        return values.of(key, lambda: registry.find(summary.slug), [name])[name]

    return lookup
