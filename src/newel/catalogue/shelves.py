"""Everything that is offered, by kind and name, before any of it is loaded."""

from __future__ import annotations

import sys
import warnings
from collections.abc import Sequence
from pathlib import Path
from typing import Final

from newel.catalogue import shipped
from newel.catalogue.folders import named_folders, offers_in
from newel.catalogue.plugins import Offer, Origin, PluginReport, Problem, ask, installed
from newel.errors import ClashWarning, PluginWarning

__all__ = ["PYTHON", "Shelves", "gather"]

BUILT_IN: Final = Origin("built-in", "built-in", where="newel.catalogue.shipped")
PYTHON: Final = Origin("python", "python")
_PACKAGE = str(Path(__file__).parents[1])


class Shelves:
    """Offers by kind and name in the order of their precedence: newel, folders, packages, Python calls."""

    def __init__(
        self, offers: Sequence[Offer], origins: Sequence[Origin], problems: Sequence[Problem]
    ) -> None:
        self.families: dict[str, list[Offer]] = {}
        self._named: dict[str, dict[str, list[Offer]]] = {"tableau": {}, "controller": {}, "sink": {}}
        self._origins = list(origins)
        self._problems = list(problems)
        for offer in offers:
            self.add(offer)

    def add(self, offer: Offer) -> None:
        """Put one more offer behind those of the same name."""
        shelf = self.families if "{" in offer.name else self._named[offer.kind]
        shelf.setdefault(offer.name, []).append(offer)
        if offer.origin not in self._origins:
            self._origins.append(offer.origin)

    def names(self, kind: str) -> tuple[str, ...]:
        """Return the names of one kind, in the order of precedence."""
        return tuple(self._named[kind])

    def offers(self, kind: str, name: str) -> tuple[Offer, ...]:
        """Return who offers a name, first who has precedence; nothing if nobody does."""
        return tuple(self._named[kind].get(name, ()))

    def contested(self) -> tuple[str, ...]:
        """Return the slugs that more than one origin offers."""
        return tuple(slug for slug, offers in self._named["tableau"].items() if len(offers) > 1)

    def report(self, problem: Problem) -> None:
        """Keep a problem for `plugins()` and warn of it, once."""
        if problem not in self._problems:
            self._problems.append(problem)
            warn(problem)

    def clash(self, kept: Offer, left: Offer) -> None:
        """Report that an outside offer was left out because newel has its name already."""
        text = (
            f"{left.kind} {left.name!r} is offered by newel itself, and otherwise by {left.from_text}\n"
            f"  The {kept.origin} one is used, the other left out. All else works.  Give it another name."
        )
        self.report(Problem(left.origin, text, ClashWarning))

    def leave_out(self, offer: Offer, reason: object) -> None:
        """Report that an offer could not be used."""
        what = f"{offer.kind} {offer.name!r} of {offer.from_text} is left out"
        self.report(Problem(offer.origin, f"{what}: {reason}", PluginWarning))

    def warn_of_all(self) -> None:
        """Warn of what was wrong when the offers were gathered."""
        for problem in tuple(self._problems):
            warn(problem)

    def reports(self) -> tuple[PluginReport, ...]:
        """Return what each origin brought, and its problems."""
        return tuple(self._report_of(origin) for origin in self._origins)

    def _report_of(self, origin: Origin) -> PluginReport:
        def brought(shelf: dict[str, list[Offer]]) -> tuple[str, ...]:
            return tuple(name for name, offers in shelf.items() if origin in [each.origin for each in offers])

        return PluginReport(
            origin=origin,
            tableaux=brought(self._named["tableau"]),
            families=brought(self.families),
            controllers=brought(self._named["controller"]),
            sinks=brought(self._named["sink"]),
            problems=tuple(problem.text for problem in self._problems if problem.origin == origin),
        )


def warn(problem: Problem) -> None:
    """Give the warning at the line outside newel that led to it."""
    depth, frame = 1, sys._getframe(0)
    while frame.f_back is not None and frame.f_code.co_filename.startswith(_PACKAGE):
        depth, frame = depth + 1, frame.f_back
    warnings.warn(problem.text, problem.category, stacklevel=depth)


def gather(folders: Sequence[Path] | None, packages: bool) -> Shelves:
    """Ask newel itself, the folders (by default those of `NEWEL_TABLEAUX`) and the installed packages.

    Raises:
        BadRequest: if one of `folders` is no folder.
    """
    offers, problems = ask([(BUILT_IN, lambda: shipped)])
    origins = [BUILT_IN]
    listed = named_folders() if folders is None else folders
    more_offers, more_origins, more_problems = offers_in(listed, from_variable=folders is None)
    offers, origins, problems = offers + more_offers, origins + more_origins, problems + more_problems
    if packages:
        found = installed()
        more_offers, more_problems = ask([(origin, point.load) for origin, point in found])
        origins += dict.fromkeys(origin for origin, _ in found)
        offers, problems = offers + more_offers, problems + more_problems
    return Shelves(offers, origins, problems)
