"""Which tableau a march runs: the one asked for, or its step doubling where an estimate is wanted."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from newel.stepping.rules import Adaptive, StepRule

if TYPE_CHECKING:
    from newel.catalogue.registry import Registry
    from newel.methods.tableau import Tableau

__all__ = ["method_for"]


def method_for(
    method: str | Path | Tableau, rule: StepRule, registry: Registry
) -> tuple[Tableau, Tableau, str]:
    """Return the tableau to run, the one that was asked for, and the estimator.

    The estimator is "embedded", "step doubling" or "none". Both tableaux are proved, unless the one asked
    for was taken on trust.
    """
    original = registry.find(method)
    if not isinstance(rule, Adaptive):
        return original, original, "none"
    if original.embedded_weights is not None:
        return original, original, "embedded"
    if isinstance(method, str) and not method.endswith(".toml"):
        return registry.find(f"doubled-{original.slug}"), original, "step doubling"
    from newel.methods.families.step_doubling import doubled

    twice = doubled(original)
    return (twice if original.proof is None else registry.find(twice)), original, "step doubling"
