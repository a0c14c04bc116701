"""Exporting on request: any method that can be found, in the language of the program that will use it."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from newel.catalogue.registry import Registry, default_registry
from newel.methods.exports.languages import export_tableau

if TYPE_CHECKING:
    from newel.methods.tableau import Tableau

__all__ = ["export"]


def export(
    method: str | Path | Tableau,
    language: str,
    digits: int | None = None,
    with_step: bool = False,
    registry: Registry | None = None,
) -> str:
    """Return a proven method as the text of another language.

    Args:
        method: a slug, a path that ends in `.toml`, or a Tableau.
        language: "latex" (formulas, no package needed), "toml", "c" (a C99 header), "fortran" (a Fortran 2008
            module), "python" (a module of lists), or "bibtex" (the citation).
        digits: significant digits, 1 to 100, correctly rounded; None for exact numbers: fractions and roots.
        with_step: add one step as a routine that needs nothing else, with the error estimate of a pair; for
            "c", "fortran" and "python".
        registry: where the slug is looked up; by default the usual registry.

    Raises:
        BadRequest: no such language, digits out of range, or what the language does not take.
        UnknownMethod: no method has this slug.
        NotProved: a claim does not hold.

    Example:
        >>> export("euler-1", "c").splitlines()[-3]
        'static const double euler_1_weights[1] = {1.0};'
    """
    where = default_registry() if registry is None else registry
    return export_tableau(where.find(method), language, digits, with_step)
