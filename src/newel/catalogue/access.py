"""The public functions that look methods up: one line each over a registry, by default the usual one."""

from __future__ import annotations

import re
from collections.abc import Collection, Iterable
from pathlib import Path
from typing import TYPE_CHECKING, Literal, overload

from newel.catalogue.registry import Registry, default_registry
from newel.catalogue.suggestions import folded, near_names
from newel.errors import BadRequest

if TYPE_CHECKING:
    from newel.catalogue.plugins import PluginReport
    from newel.catalogue.summaries import Summary
    from newel.methods.tableau import Tableau

__all__ = ["SORTS", "find", "names", "plugins", "read_tableau", "register"]

SORTS = ("order", "stages", "slug", "year", "floor")
"""By what a list of methods can be sorted."""


_KIND = re.compile(r"runge\W*kutta", re.IGNORECASE)


def find(method: str | Path | Tableau, registry: Registry | None = None) -> Tableau:
    """Return a method whose claims are proved; its `proof` is the verdict, or None where it is trusted.

    Args:
        method: a slug, a path that ends in `.toml`, or a Tableau.
        registry: where the slug is looked up; by default the usual registry.

    Raises:
        UnknownMethod: no method has this slug; the text names near ones.
        BadTableau: its file or loader is wrong.
        NotProved: a claim does not hold.
        SlugTaken: two origins outside newel offer different methods under this slug.

    Example:
        >>> find("kutta-4").stages
        4
    """
    return _in(registry).find(method)


def register(tableau: Tableau, trust: bool = False, registry: Registry | None = None) -> Tableau:
    """Prove a tableau and make it known under its slug; return it with its proof.

    Args:
        tableau: the method; its slug must be free, or name the same numbers already.
        trust: skip the proof; the method is then shown as unproven.
        registry: where it is put; by default the usual registry.

    Raises:
        SlugTaken: the slug names another method.
        NotProved: a claim does not hold; nothing is registered then.

    Example:
        >>> from newel import Tableau
        >>> own = Tableau("two-thirds-2", order=2, matrix=[[], ["2/3"]], weights=["1/4", "3/4"])
        >>> register(own, registry=Registry(cache=None)).proof.outcome
        'exact'
    """
    return _in(registry).register(tableau, trust=trust)


def read_tableau(path: str | Path, trust: bool = False, registry: Registry | None = None) -> Tableau:
    """Return the tableau in a file, proved; nothing is registered.

    Args:
        path: a file that ends in `.toml`; `tableaux/README.md` documents the format.
        trust: skip the proof; the method is then shown as unproven.
        registry: which registry proves it, and remembers that it is trusted; by default the usual one.

    Raises:
        BadTableau: the file breaks a rule of the format.
        NotProved: a claim does not hold.

    Example:
        >>> read_tableau("mine.toml")
        Traceback (most recent call last):
        newel.errors.BadTableau: mine.toml: there is no such file
    """
    return _in(registry).read(path, trust=trust)


def plugins(registry: Registry | None = None) -> tuple[PluginReport, ...]:
    """Return what came from where: newel itself, folders, packages, Python; with what was left out and why.

    Example:
        >>> report = plugins(Registry(folders=[], plugins=False, cache=None))[0]
        >>> str(report.origin), report.sinks
        ('built-in', ('memory', 'csv', 'json-lines', 'call'))
    """
    return _in(registry).plugins()


@overload
def names(
    *,
    order: int | Collection[int] | None = ...,
    stages: int | Collection[int] | None = ...,
    text: str | None = ...,
    embedded: bool | None = ...,
    needs: str | None = ...,
    sort: str | None = ...,
    columns: str | Collection[str] | None = ...,
    details: Literal[False] = ...,
    registry: Registry | None = ...,
) -> tuple[str, ...]: ...


@overload
def names(
    *,
    order: int | Collection[int] | None = ...,
    stages: int | Collection[int] | None = ...,
    text: str | None = ...,
    embedded: bool | None = ...,
    needs: str | None = ...,
    sort: str | None = ...,
    columns: str | Collection[str] | None = ...,
    details: Literal[True],
    registry: Registry | None = ...,
) -> tuple[Summary, ...]: ...


def names(
    *,
    order: int | Collection[int] | None = None,
    stages: int | Collection[int] | None = None,
    text: str | None = None,
    embedded: bool | None = None,
    needs: str | None = None,
    sort: str | None = None,
    columns: str | Collection[str] | None = None,
    details: bool = False,
    registry: Registry | None = None,
) -> tuple[str, ...] | tuple[Summary, ...]:
    """Return the slugs of all methods, or of those that fit.

    Args:
        order: the claimed order of the solution that is carried on, or several to choose from.
        stages: the number of stages, or several to choose from.
        text: each word of it occurs in the slug, a name or an author; case, accents and hyphens do not count.
        embedded: True for pairs only, False for methods without an error estimate of their own.
        needs: what a method must have, such as `"order>=4, ssp>0, imag/stages>0.7, embedded, exact"`: facts
            and properties by the names that `inspect` has, their ratios, and comparisons.
        sort: "order", "stages", "slug", "year", "floor"; as they are offered where it is left out.
        columns: properties and ratios that go into `Summary.values`, such as `"imag/stages, ssp"`.
        details: return a `Summary` for each in place of its slug.
        registry: whose methods; by default those of the usual registry.

    Raises:
        BadRequest: `sort` is none of these, or `needs` or `columns` name no property or break the grammar.

    Example:
        >>> names(order=range(3, 5), text="Kutta", embedded=False)
        ('kutta-3', 'kutta-4', 'kutta-three-eighths-4')
        >>> "ssp-4-stages-10" in names(needs="order>=4, ssp/stages>0.5")
        True
    """
    if sort is not None and sort not in SORTS:
        near = near_names(sort, SORTS)
        hint = f"\n  Near: {near[0]}." if near else ""
        raise BadRequest(f"sort={sort!r} is none of {', '.join(SORTS)}{hint}", argument="sort")
    where = _in(registry)
    if not details and (order, stages, text, embedded, needs, sort) == (None,) * 6:
        return where.names()
    found: Iterable[Summary] = [
        summary
        for summary in where.summaries()
        if _fits(summary.order, order)
        and _fits(summary.stages, stages)
        and (embedded is None or embedded == (summary.embedded_order is not None))
        and _mentions(summary, text)
    ]
    if needs is not None or columns is not None:
        from newel.catalogue.searching import searched

        found = searched(found, where, needs, columns)
    if sort is not None:
        found = sorted(found, key=lambda summary: _rank(summary, sort))
    return tuple(found) if details else tuple(summary.slug for summary in found)


def _in(registry: Registry | None) -> Registry:
    return default_registry() if registry is None else registry


def _fits(value: int, wanted: int | Collection[int] | None) -> bool:
    return wanted is None or (value == wanted if isinstance(wanted, int) else value in wanted)


def _mentions(summary: Summary, text: str | None) -> bool:
    said: Iterable[str] = (summary.slug, summary.name, *summary.also_called, *summary.authors)
    # "Runge–Kutta" is the name of the whole kind: looking for Kutta must not find every one of them.
    everything = " ".join(folded(_KIND.sub("", each)) for each in said)
    return all(folded(word) in everything for word in _KIND.sub("", text or "").split())


def _rank(summary: Summary, sort: str) -> tuple[float | str, ...]:
    """Return what a list is sorted by; what is not known goes last."""
    unknown = float("inf")
    if sort == "slug":
        return (summary.slug,)
    if sort == "year":
        return (unknown if summary.year is None else summary.year, summary.slug)
    if sort == "floor":
        return (unknown if summary.working_floor is None else summary.working_floor, summary.slug)
    first, second = summary.order, summary.stages
    return (second, first, summary.slug) if sort == "stages" else (first, second, summary.slug)
