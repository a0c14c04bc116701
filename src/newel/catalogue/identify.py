"""Which known method is this? Found by its numbers, whatever its name and the order of its stages.

Three degrees of sameness, the closest first: the same numbers stage by stage; the same with the stages
reordered; the same solution carried on, with other embedded weights or none. Stages that nothing uses count
for nothing.
"""

from __future__ import annotations

from collections.abc import Iterator
from fractions import Fraction
from functools import cached_property
from pathlib import Path
from typing import TYPE_CHECKING, Literal, TypeAlias

import attrs
import numpy as np

from newel.catalogue.registry import Registry, default_registry
from newel.errors import BadNumber, NewelError

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from newel.methods.exact import Exact
    from newel.methods.tableau import Tableau

__all__ = ["Identity", "compared", "identify", "identities"]

Relation = Literal["same", "reordered", "other embedded weights"]
Known: TypeAlias = "tuple[Exact, Fraction]"
"""A number, and half a unit of its last trusted digit."""

NEAR = 1e-6


@attrs.frozen
class Identity:
    """A known method that a tableau is.

    Attributes:
        slug: the known method.
        relation: "same" numbers, "reordered" stages, or "other embedded weights".
        text: one line for people.
    """

    slug: str
    relation: Relation
    text: str


def identify(method: str | Path | Tableau, registry: Registry | None = None) -> str | None:
    """Return the slug of the known method that a tableau is, or None.

    The same under another name counts, with its stages reordered too, and last the one that differs only in
    the embedded weights; `newel identify` says which.

    Args:
        method: a Tableau, a path that ends in `.toml`, or a slug; it needs no proof.
        registry: where known methods are looked up; by default the default registry.

    Raises:
        BadTableau: its file is wrong. UnknownMethod: no method has this slug.

    Example:
        >>> from newel.methods.tableau import Tableau
        >>> mine = Tableau("mine-2", order=2, matrix=[[], ["1/2"]], weights=[0, 1])
        >>> identify(mine, registry=Registry(folders=[], plugins=False, cache=None))
        'midpoint-2'
    """
    found = identities(method, registry)
    return found[0].slug if found else None


def identities(method: str | Path | Tableau, registry: Registry | None = None) -> tuple[Identity, ...]:
    """Return every known method that a tableau is, the closest first; arguments and errors as `identify`."""
    where = default_registry() if registry is None else registry
    tableau = where.load(method)
    found = []
    for slug in where.names():
        try:
            other = where.load(slug)
        except NewelError:  # one that cannot be read is nobody
            continue
        relation = compared(tableau, other)
        if relation is not None:
            found.append(Identity(slug, relation, _told(tableau, other, relation)))
    closest = ("same", "reordered", "other embedded weights")
    return tuple(sorted(found, key=lambda each: (closest.index(each.relation), _unlike(tableau, each.slug))))


def compared(one: Tableau, other: Tableau) -> Relation | None:
    """Return how two tableaux are the same method, or None where they are not."""
    if one.stages == other.stages and one.digest == other.digest:
        return "same"
    pair, other_pair = _Used(one, embedded=True), _Used(other, embedded=True)
    if (one.embedded_weights is None) == (other.embedded_weights is None):
        order = _matched(pair, other_pair)
        if order is not None:
            return "same" if order == sorted(order) else "reordered"
    if _matched(_Used(one, embedded=False), _Used(other, embedded=False)) is not None:
        return "other embedded weights"
    return None


class _Used:
    """The stages of a method that its weights use, with their numbers."""

    def __init__(self, tableau: Tableau, embedded: bool) -> None:
        self.tableau = tableau
        self.arrays = ["nodes", "weights"]
        floats = [tableau.c, tableau.b]
        if embedded and tableau.b_embedded is not None:
            self.arrays.append("embedded")
            floats.append(tableau.b_embedded)
        self.kept = _kept(tableau.A != 0, np.any(np.array(floats[1:]) != 0, axis=0))
        self.floats = np.array(floats)[:, self.kept]

    def __len__(self) -> int:
        return len(self.kept)

    @cached_property
    def matrix(self) -> list[list[Known]]:
        """The rows and columns of these stages."""
        values, halves = self.tableau.matrix, self.tableau.half_units("matrix")
        return [[(values[i][j], halves[i][j]) for j in self.kept] for i in self.kept]

    @cached_property
    def stages(self) -> list[list[Known]]:
        """Node and weights of each of these stages."""
        named = {"embedded": "embedded_weights"}
        columns = [
            list(
                zip(
                    getattr(self.tableau, named.get(array, array)),
                    self.tableau.half_units(array),
                    strict=True,
                )
            )
            for array in self.arrays
        ]
        return [[column[i] for column in columns] for i in self.kept]


def _kept(uses: NDArray[np.bool_], wanted: NDArray[np.bool_]) -> list[int]:
    kept = wanted.copy()
    for i in reversed(range(len(kept))):
        if kept[i]:
            kept |= uses[i]
    return [int(i) for i in np.flatnonzero(kept)]


def _matched(one: _Used, other: _Used) -> list[int] | None:
    """Return the stage of `other` for each of `one`, or None where they do not match."""
    if len(one) != len(other) or one.floats.shape != other.floats.shape:
        return None
    columns = zip(one.floats, other.floats, strict=True)
    if not all(np.allclose(np.sort(a), np.sort(b), rtol=NEAR, atol=NEAR) for a, b in columns):
        return None
    return next(_assignments(one, other, []), None)


def _assignments(one: _Used, other: _Used, chosen: list[int]) -> Iterator[list[int]]:
    i = len(chosen)
    if i == len(one):
        yield chosen
        return
    for k in range(len(other)):
        if k not in chosen and _fits(one, other, i, k, [*chosen, k]):
            yield from _assignments(one, other, [*chosen, k])


def _fits(one: _Used, other: _Used, i: int, k: int, chosen: list[int]) -> bool:
    if not all(_agree(x, y) for x, y in zip(one.stages[i], other.stages[k], strict=True)):
        return False
    return all(
        _agree(one.matrix[i][j], other.matrix[k][m]) and _agree(one.matrix[j][i], other.matrix[m][k])
        for j, m in enumerate(chosen)
    )


def _agree(one: Known, other: Known) -> bool:
    (x, half_x), (y, half_y) = one, other
    if x == y:
        return True
    slack = half_x + half_y
    if not slack:
        return False
    try:
        return abs(x - y) <= slack
    except BadNumber:  # two different roots, never equal
        return Fraction(abs(float(x) - float(y))) <= slack


def _unlike(tableau: Tableau, slug: str) -> tuple[bool, str]:
    return slug != tableau.slug, slug


def _told(tableau: Tableau, other: Tableau, relation: Relation) -> str:
    if relation == "same":
        return f"the same method as {other.slug}"
    if relation == "reordered":
        return f"the same method as {other.slug}, with its stages in another order"
    has = [_embedded(each) for each in (tableau, other)]
    return f"the same solution as {other.slug}, other embedded weights: here {has[0]}, there {has[1]}"


def _embedded(tableau: Tableau) -> str:
    return "none" if tableau.embedded_order is None else f"of order {tableau.embedded_order}"
