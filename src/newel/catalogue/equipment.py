"""Controllers and sinks by name or file ending, out of the shelves."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Any

from newel.catalogue.offers import call_with, load_named
from newel.catalogue.suggestions import unknown_name
from newel.errors import BadRequest, SlugTaken, UnknownName

if TYPE_CHECKING:
    from newel.catalogue.plugins import Offer
    from newel.catalogue.shelves import Shelves
    from newel.protocols import Controller, Sink

__all__ = ["Equipment"]


class Equipment:
    """The controllers and sinks on the shelves of one registry; a loaded factory is kept."""

    def __init__(self, shelves: Shelves) -> None:
        self._shelves = shelves
        self._factories: dict[tuple[str, str], Any] = {}

    def controller(self, spec: str | Controller, arguments: dict[str, Any]) -> Controller:
        """Return a controller by name, or the ready one that was given; see `Registry.controller`."""
        from newel.protocols import Controller  # with NumPy, which a list of names does without

        if isinstance(spec, str):
            what = f"controller {spec!r}"
            made = call_with(self._factory("controller", spec), what, arguments)
        else:
            made, what = spec, f"{spec!r} as a controller"
            if arguments:
                raise BadRequest(
                    f"{', '.join(arguments)}: arguments go with a controller's name, not with a ready one",
                    argument="controller",
                )
        if isinstance(made, type) or not isinstance(made, Controller):
            raise BadRequest(
                f"{what}: a {type(made).__name__} lacks name, start() or decide(error, step, order, memory)\n"
                f"  Give an object with these, or a name: {', '.join(self._shelves.names('controller'))}",
                argument="controller",
            )
        return made

    def sink(self, name: str) -> Callable[..., Sink]:
        """Return the factory of a sink by name; see `Registry.sink`."""
        factory: Callable[..., Sink] = self._factory("sink", name)
        return factory

    def sink_for(self, target: str | Path) -> Callable[..., Sink]:
        """Return the factory of the sink for a file's ending; see `Registry.sink_for`."""
        name = Path(target).name.lower()
        by_ending = self._endings()
        for ending in sorted(by_ending, key=len, reverse=True):
            if name.endswith(ending) and len(name) > len(ending):
                return self._first(ending, by_ending[ending])
        raise unknown_name(
            "file ending",
            Path(name).suffix or name,
            by_ending,
            remedy=f"Rename {target}, or pass a sink itself.",
        )

    def look_for_clashes(self) -> None:
        """Report every name that is offered twice; who else is left out is known then."""
        for kind in ("controller", "sink"):
            for name in self._shelves.names(kind):
                first, *others = self._shelves.offers(kind, name)
                if first.origin.kind == "built-in":
                    self._report_clashes(first, others)

    def _factory(self, kind: str, name: str) -> Any:
        if (kind, name) not in self._factories:
            self._factories[kind, name] = load_named(self._in_force(kind, name))
        return self._factories[kind, name]

    def _in_force(self, kind: str, name: str) -> Offer:
        offers = self._shelves.offers(kind, name)
        if not offers:
            raise unknown_name(kind, name, self._shelves.names(kind))
        first, *others = offers
        if first.origin.kind == "built-in":
            self._report_clashes(first, others)
        elif any(other.loader != first.loader for other in others):
            origins = tuple(offer.from_text for offer in offers)
            raise SlugTaken(
                f"{kind} {name!r} is offered by {' and by '.join(origins)}\n"
                "  Neither is used. Pass the object itself, or remove one.",
                slug=name,
                origins=origins,
            )
        return first

    def _report_clashes(self, first: Offer, others: list[Offer]) -> None:
        for other in others:
            if other.loader != first.loader:
                self._shelves.clash(first, other)

    def _endings(self) -> dict[str, list[tuple[Offer, Any]]]:
        """Return who writes each ending; a sink that cannot be loaded is left out."""
        found: dict[str, list[tuple[Offer, Any]]] = {}
        for name in self._shelves.names("sink"):
            try:
                factory, offer = self._factory("sink", name), self._shelves.offers("sink", name)[0]
            except (UnknownName, SlugTaken) as error:
                self._shelves.leave_out(self._shelves.offers("sink", name)[-1], error)
                continue
            for ending in self._endings_of(offer, factory):
                found.setdefault(ending, []).append((offer, factory))
        return found

    def _endings_of(self, offer: Offer, factory: object) -> tuple[str, ...]:
        endings = getattr(factory, "endings", ())
        if isinstance(endings, tuple) and all(isinstance(end, str) and end[:1] == "." for end in endings):
            return tuple(end.lower() for end in endings)
        self._shelves.leave_out(offer, f"its endings are {endings!r}, not a tuple of texts such as ('.csv',)")
        return ()

    def _first(self, ending: str, writers: list[tuple[Offer, Any]]) -> Callable[..., Sink]:
        (first, factory), *others = writers
        if others and first.origin.kind != "built-in":
            names = " and ".join(f"{offer.name!r} of {offer.from_text}" for offer, _ in writers)
            raise BadRequest(
                f"files that end in {ending} are written by two sinks: {names}\n"
                "  Pass the sink itself, or remove one.",
                argument="sinks",
            )
        result: Callable[..., Sink] = factory
        return result
