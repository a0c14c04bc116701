"""Proving on request, and looking for the misprint where a proof fails."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import attrs

from newel.catalogue.registry import Registry, default_registry

if TYPE_CHECKING:
    from newel.catalogue.proofs import Progress
    from newel.methods.order_conditions import Verdict
    from newel.methods.tableau import Tableau

__all__ = ["check"]


def check(
    method: str | Path | Tableau,
    registry: Registry | None = None,
    progress: Progress | None = None,
    anew: bool = False,
    repairs: bool = True,
) -> Verdict:
    """Prove a method's claims and return the verdict, also where they fail or where the method is trusted.

    A proof that was made here of the same numbers, claims and digits is remembered and not made again; the
    list of proofs that ships with newel does not count. Where the proof fails, the smallest changes that make
    every condition hold are looked for: the verdict's `repairs`, and `undecided` where there are none. They
    are never remembered, as they depend on the printed texts.

    Args:
        method: a slug, a path that ends in `.toml`, or a Tableau.
        registry: where the slug is looked up; by default the default registry.
        progress: called while the proof runs, with the numbers of conditions done and in all.
        anew: prove even if a proof is remembered.
        repairs: whether to look for repairs where the proof fails.

    Raises:
        UnknownMethod: if no method has this slug.
        BadTableau: if its file or loader is wrong.
        BadRequest: if this names no method at all, or a size is out of range.

    Example:
        >>> check("kutta-4", registry=Registry(cache=None)).order
        4
    """
    where = default_registry() if registry is None else registry
    tableau = where.load(method)
    verdict = where.verdict(tableau, progress, listed=False, anew=anew)
    if verdict or not repairs:
        return verdict
    from newel.methods.misprints import find_repairs

    found = find_repairs(tableau)
    return attrs.evolve(verdict, repairs=found.repairs, undecided=found.undecided)
