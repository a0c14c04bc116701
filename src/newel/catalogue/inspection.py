"""Everything that is known of a method, as data."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any

import attrs

from newel.catalogue.registry import Registry, default_registry
from newel.catalogue.values import Values
from newel.errors import NotProved

if TYPE_CHECKING:
    from newel.catalogue.proofs import Progress
    from newel.methods.order_conditions import Verdict
    from newel.methods.tableau import Tableau

__all__ = ["Inspection", "inspect"]


@attrs.frozen(repr=False)
class Inspection:
    """What `inspect` found of one method.

    Attributes:
        tableau: the method, with its numbers, claims, source, notes and origin.
        properties: the values of `newel.methods.analysis.properties.PROPERTIES` by name.
        verdict: of the proof, which may be "fails"; None for a method that is taken on trust.
    """

    tableau: Tableau
    properties: Mapping[str, Any]
    verdict: Verdict | None

    def to_data(self) -> dict[str, Any]:
        """Return dicts, lists, texts and numbers, fit for JSON; exact numbers are texts as printed."""
        t = self.tableau
        return {
            "slug": t.slug,
            "name": t.name,
            "also_called": list(t.also_called),
            "authors": list(t.authors),
            "year": t.year,
            "source": t.source,
            "numbers": t.numbers,
            "origin": t.origin,
            "digest": t.digest,
            "order": t.order,
            "embedded_order": t.embedded_order,
            "continuous_order": t.continuous_order,
            "nodes": _texts(t.nodes),
            "matrix": [_texts(row[:i]) for i, row in enumerate(t.matrix)],
            "weights": _texts(t.weights),
            "embedded_weights": None if t.embedded_weights is None else _texts(t.embedded_weights),
            "continuous_weights": None
            if t.continuous_weights is None
            else [*map(_texts, t.continuous_weights)],
            "digits": self.verdict.digits if self.verdict is not None else None,
            "properties": {name: _plain(value) for name, value in self.properties.items()},
            "outcome": "unproven" if self.verdict is None else self.verdict.outcome,
            "verdict": None if self.verdict is None else self.verdict.to_data(),
            "notes": {name: list(texts) for name, texts in attrs.asdict(t.notes).items()},
        }

    def __repr__(self) -> str:
        return f"{self.tableau}\n  {self.tableau.source or 'no source is given'}"

    def _repr_html_(self) -> str:
        return self.tableau._repr_html_()


def inspect(
    *methods: str | Path | Tableau, registry: Registry | None = None, progress: Progress | None = None
) -> tuple[Inspection, ...]:
    """Return what is known of each method; one whose proof fails is shown too, with its verdict.

    Args:
        methods: slugs, paths that end in `.toml`, or Tableaux.
        registry: where slugs are looked up; by default the usual registry.
        progress: called while a proof runs, with the numbers of conditions done and in all.

    Raises:
        UnknownMethod: no method has this slug.
        BadTableau: a file or loader is wrong.

    Example:
        >>> kutta, = inspect("kutta-4")
        >>> kutta.verdict.outcome, kutta.properties["computed_stages"]
        ('exact', 4)
    """
    where = default_registry() if registry is None else registry
    return tuple(_inspected(method, where, progress) for method in methods)


def _inspected(method: str | Path | Tableau, registry: Registry, progress: Progress | None) -> Inspection:
    from newel.methods.analysis.properties import PROPERTIES
    from newel.methods.order_conditions import proof_key

    try:
        tableau = registry.find(method, progress)
    except NotProved as error:
        tableau = registry.load(method).with_proof(error.verdict)
    values = Values(registry.cache)
    properties = values.of(proof_key(tableau), lambda: tableau, [each.name for each in PROPERTIES])
    return Inspection(tableau, properties, tableau.proof)


def _texts(row: tuple[Any, ...]) -> list[str]:
    return [str(number) for number in row]


def _plain(value: Any) -> Any:
    """Return a property as JSON has it: exact numbers as texts."""
    if isinstance(value, tuple):
        return [_plain(item) for item in value]
    return value if value is None or isinstance(value, (bool, int, float, str)) else str(value)
