"""The registry: every method, controller and sink under one name, whatever it comes from.

Asking for names reads no file. A method is loaded, compared with others of its slug, and proved when it is
asked for; a proof that is remembered is not made twice.
"""

from __future__ import annotations

import threading
from collections.abc import Callable, Iterator, Sequence
from functools import cache
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

from newel.catalogue.proofs import Progress, Proofs, user_cache_folder
from newel.errors import BadRequest, BadTableau, NewelError, NotProved, SlugTaken, UnknownMethod

if TYPE_CHECKING:
    from newel.catalogue.equipment import Equipment
    from newel.catalogue.method_shelf import Methods
    from newel.catalogue.plugins import PluginReport
    from newel.catalogue.shelves import Shelves
    from newel.catalogue.summaries import Summary
    from newel.methods.order_conditions import Verdict
    from newel.methods.tableau import Tableau
    from newel.protocols import Controller, Sink

__all__ = ["USER_CACHE", "Registry", "default_registry"]

USER_CACHE: Final = Path("<user cache>")
"""Stands for the folder that `NEWEL_CACHE` names, or the platform's own."""


class Registry:
    """Methods, controllers and sinks from newel itself, folders, installed packages and Python calls.

    Args:
        folders: folders of tableau files; by default those that the variable `NEWEL_TABLEAUX` lists.
        plugins: whether installed packages are asked.
        cache: a folder that remembers proofs, None for none; by default `NEWEL_CACHE` or the platform's.

    Example:
        >>> registry = Registry(folders=[], plugins=False, cache=None)
        >>> registry.find("kutta-4").order
        4
    """

    def __init__(
        self,
        folders: Sequence[str | Path] | None = None,
        plugins: bool = True,
        cache: str | Path | None = USER_CACHE,
    ) -> None:
        self._folders = None if folders is None else tuple(Path(folder).expanduser() for folder in folders)
        self._ask_packages = plugins
        self.cache = _folder(cache)
        self._proofs = Proofs(self.cache)
        self._lock = threading.RLock()
        self._gathered: tuple[Shelves, Methods, Equipment] | None = None
        self._found: dict[str, Tableau] = {}

    def names(self) -> tuple[str, ...]:
        """Return every slug, the built-in ones by order first; no file is read; `families()` are apart."""
        return self._shelves.names("tableau")

    def families(self) -> tuple[str, ...]:
        """Return the slugs with a word in braces, such as `"doubled-{method}"`."""
        return tuple(self._shelves.families)

    def controllers(self) -> tuple[str, ...]:
        """Return the names of all controllers."""
        return self._shelves.names("controller")

    def sinks(self) -> tuple[str, ...]:
        """Return the names of all sinks."""
        return self._shelves.names("sink")

    def find(self, method: str | Path | Tableau, progress: Progress | None = None) -> Tableau:
        """Return a method whose claims are proved; its `proof` is the verdict, or None where it is trusted.

        Args:
            method: a slug, a path that ends in `.toml`, or a Tableau.
            progress: called while a proof runs, with the numbers of conditions done and in all.

        Raises:
            UnknownMethod: if no method has this slug.
            BadTableau: if its file or loader is wrong.
            NotProved: if a claim does not hold.
            SlugTaken: if two origins outside newel offer different methods under this slug.
            BadRequest: if this names no method at all, or a size is out of range.
        """
        if isinstance(method, str) and method in self._found:
            return self._found[method]
        tableau = self.load(method)
        proven = self._prove(tableau, progress)
        if isinstance(method, str) and not method.endswith(".toml"):
            self._found[method] = proven
        return proven

    def load(self, method: str | Path | Tableau) -> Tableau:
        """Return a method as it is offered, without a proof; arguments and errors are those of `find`."""
        from newel.methods.tableau import Tableau

        if isinstance(method, Tableau):
            return method
        if not isinstance(method, str | Path):
            raise BadRequest(
                f"a method is a slug, a path that ends in .toml, or a Tableau, not {type(method).__name__}",
                argument="method",
            )
        text = str(method)
        if text.endswith(".toml"):
            from newel.methods.tableau_file import load_tableau

            return load_tableau(Path(text))
        if isinstance(method, Path) or ":" in text or text.endswith(".py"):
            raise _no_tableau(text)
        with self._lock:
            return self._methods.load(text)

    def read(self, path: str | Path, trust: bool = False, progress: Progress | None = None) -> Tableau:
        """Return the tableau in a file, proved; with `trust` unproven, and never proved by this registry.

        Raises:
            BadTableau: if the file breaks a rule of the format.
            NotProved: if a claim does not hold.
        """
        tableau = self.load(Path(path))
        if trust:
            self._methods.trust(tableau)
        return self._prove(tableau, progress)

    def verdict(
        self, tableau: Tableau, progress: Progress | None = None, *, listed: bool = True, anew: bool = False
    ) -> Verdict:
        """Return the verdict on a tableau: a remembered one, unless `anew`, or else by a proof.

        Without `listed`, the list that ships with newel does not count.
        """
        return self._proofs.verdict(tableau, progress, listed=listed, anew=anew)

    def tableaux(self, progress: Progress | None = None) -> Iterator[Tableau]:
        """Yield every method that stands; one that does not is left out with a PluginWarning."""
        for slug in self.names():
            found = self._standing(slug, progress)
            if found is not None:
                yield found

    def _standing(self, slug: str, progress: Progress | None) -> Tableau | None:
        try:
            return self.find(slug, progress)
        except (BadTableau, NotProved, SlugTaken) as error:
            self._shelves.leave_out(self._shelves.offers("tableau", slug)[-1], error)
            return None

    def summaries(self, progress: Progress | None = None) -> tuple[Summary, ...]:
        """Return one line for every method that stands, as `tableaux`, but quick for the built-in ones."""
        from newel.catalogue.summaries import Summary, listed_summary

        found = []
        for slug in self.names():
            offer = self._shelves.offers("tableau", slug)[0]
            summary = listed_summary(slug, offer.loader) if offer.origin.kind == "built-in" else None
            if summary is None and (tableau := self._standing(slug, progress)) is not None:
                summary = Summary.of(tableau)
            found += [] if summary is None else [summary]
        return tuple(found)

    def register(self, tableau: Tableau, trust: bool = False, progress: Progress | None = None) -> Tableau:
        """Prove a tableau and make it known under its slug; return it with its proof.

        Args:
            tableau: the method; its slug must be free, or name the same numbers already.
            trust: skip the proof; the method is then shown as unproven.
            progress: as for `find`.

        Raises:
            SlugTaken: if the slug names another method.
            NotProved: if a claim does not hold; nothing is registered then.
        """
        from newel.methods.tableau import Tableau

        if not isinstance(tableau, Tableau):
            raise BadRequest(f"register takes a Tableau, not {type(tableau).__name__}", argument="tableau")
        with self._lock:
            self._methods.refuse_taken(tableau)
        kept = tableau.with_proof(None) if trust else self._prove(tableau, progress)
        with self._lock:
            self._methods.refuse_taken(tableau)
            self._methods.add(kept, trust)
        return self.find(kept.slug)

    def controller(self, spec: str | Controller, /, **arguments: Any) -> Controller:
        """Return the controller of a name, made with keyword arguments, or the given controller itself.

        Raises:
            UnknownName: if no controller has this name, or its plugin is broken.
            SlugTaken: if two packages offer different controllers under this name.
            BadRequest: if it does not take these arguments, or is no controller.
        """
        with self._lock:
            return self._equipment.controller(spec, arguments)

    def sink(self, name: str) -> Callable[..., Sink]:
        """Return the factory of the sink of a name.

        Raises:
            UnknownName: if no sink has this name, or its plugin is broken.
            SlugTaken: if two packages offer different sinks under this name.
        """
        with self._lock:
            return self._equipment.sink(name)

    def sink_for(self, target: str | Path) -> Callable[..., Sink]:
        """Return the factory of the sink that writes files of this ending; the built-in ones come first.

        Raises:
            UnknownName: if no sink has this ending.
            BadRequest: if two packages offer it.
        """
        with self._lock:
            return self._equipment.sink_for(target)

    def plugins(self) -> tuple[PluginReport, ...]:
        """Return what came from where, with what was left out and why; every clash is looked for."""
        for slug in self._shelves.contested():
            try:
                self.load(slug)
            except NewelError as error:
                self._shelves.leave_out(self._shelves.offers("tableau", slug)[-1], error)
        self._equipment.look_for_clashes()
        return self._shelves.reports()

    @property
    def _shelves(self) -> Shelves:
        return self._gather()[0]

    @property
    def _methods(self) -> Methods:
        return self._gather()[1]

    @property
    def _equipment(self) -> Equipment:
        return self._gather()[2]

    def _gather(self) -> tuple[Shelves, Methods, Equipment]:
        with self._lock:
            if self._gathered is None:
                from newel.catalogue.equipment import Equipment
                from newel.catalogue.method_shelf import Methods
                from newel.catalogue.shelves import gather

                shelves = gather(self._folders, self._ask_packages)
                self._gathered = shelves, Methods(shelves), Equipment(shelves)
                shelves.warn_of_all()
            return self._gathered

    def _prove(self, tableau: Tableau, progress: Progress | None) -> Tableau:
        if self._methods.is_trusted(tableau):
            return tableau if tableau.proof is None else tableau.with_proof(None)
        verdict = self._proofs.verdict(tableau, progress)
        if not verdict:
            raise _not_proved(tableau, verdict)
        return tableau if tableau.proof == verdict else tableau.with_proof(verdict)


def _folder(cache: str | Path | None) -> Path | None:
    if cache is USER_CACHE:
        return user_cache_folder()
    return None if cache is None else Path(cache).expanduser()


def _no_tableau(text: str) -> UnknownMethod:
    if text.endswith(".py") or ":" in text:
        said = f"{text} is a model, not a tableau. For a model: newel examine {text}"
        return UnknownMethod(said, slug=text)
    return UnknownMethod(f"{text} is no tableau file\n  The name of a tableau file ends in .toml.", slug=text)


def _not_proved(tableau: Tableau, verdict: Verdict) -> NotProved:
    shown = [f"  {failure.message}" for failure in verdict.failures[:3]]
    more = len(verdict.failures) - len(shown)
    lines = [f"{tableau.slug}: a claim does not hold ({tableau.origin})", *shown]
    lines += [f"  and {more} more"] if more else []
    lines.append("  It is not used. See all with newel.check; correct it, or register it with trust=True.")
    return NotProved("\n".join(lines), slug=tableau.slug, verdict=verdict)


@cache
def _one_default() -> Registry:
    return Registry()


_default_lock = threading.Lock()


def default_registry() -> Registry:
    """Return the registry that is used wherever none is given; there is one in a process."""
    with _default_lock:
        return _one_default()
