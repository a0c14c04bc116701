"""Hook specifications, and the isolation that lets one broken plugin harm nothing else.

The built-ins and every installed package answer the same three hooks with *names and loaders*; nothing that a
loader names is imported before it is used. A plugin that breaks a rule is left out, and the text says which
plugin, which hook, the signature offered, the rule that it breaks, and the author's own file and line.
"""

from __future__ import annotations

import importlib
import inspect
import re
from collections.abc import Callable, Iterable, Iterator, Mapping
from importlib.metadata import EntryPoint, distributions, entry_points
from pathlib import Path
from types import ModuleType
from typing import Any, Literal

import attrs
import pluggy

from newel.catalogue.blame import blame, place_of, said, shown
from newel.errors import NewelWarning, PluginWarning

__all__ = [
    "Loader",
    "Offer",
    "Origin",
    "PluginReport",
    "Problem",
    "Specifications",
    "ask",
    "installed",
    "load_object",
]

GROUP = "newel"
KINDS: Mapping[str, str] = {
    "newel_tableaux": "tableau",
    "newel_controllers": "controller",
    "newel_sinks": "sink",
}
CALLED_AS = "is called without arguments and returns a mapping of names to loaders"
LOADER_RULE = 'a loader is a callable, a text "module:name", or a path to a TOML file'

Loader = Callable[..., Any] | str | Path
"""What a hook hands over for each name: a callable, `"module:name"`, or a path to a tableau file."""

hookspec = pluggy.HookspecMarker(GROUP)


class Specifications:
    """The three hooks. A plugin marks its functions with `pluggy.HookimplMarker("newel")`.

    These bodies are never run: pluggy reads names and arguments off them.
    """

    @hookspec
    def newel_tableaux(self) -> Mapping[str, Loader]:
        """Return slugs with loaders; a loader is called without arguments and returns a Tableau.

        A slug with a word in braces, as in `"extrapolated-midpoint-{order}"`, is a family: its loader gets
        what stands in the place of each word, in that order: a whole number, or for `{method}` a Tableau.
        """
        return {}

    @hookspec
    def newel_controllers(self) -> Mapping[str, Loader]:
        """Return names with loaders; what is loaded, called with keyword arguments, returns a Controller."""
        return {}

    @hookspec
    def newel_sinks(self) -> Mapping[str, Loader]:
        """Return names with loaders; what is loaded makes a Sink, and its `endings` name file endings."""
        return {}


@attrs.frozen
class Origin:
    """Where something comes from: `kind`, a `name` fit for a message, and `where` (a folder or a module)."""

    kind: Literal["built-in", "folder", "package", "python"]
    name: str
    where: str = ""

    def __str__(self) -> str:
        return self.name if self.kind in ("built-in", "python") else f"{self.kind} {self.name}"


@attrs.frozen
class Offer:
    """One name with its loader: of `kind` "tableau", "controller" or "sink"; `place` is a file and line."""

    kind: str
    name: str
    loader: Loader = attrs.field(repr=False)
    origin: Origin
    place: str

    @property
    def from_text(self) -> str:
        """The origin and the place, for messages."""
        return f"{self.origin} ({self.place})" if self.place else str(self.origin)


@attrs.frozen
class Problem:
    """A rule broken by an origin: what a warning says, and `plugins()` shows."""

    origin: Origin
    text: str
    category: type[NewelWarning] = PluginWarning


@attrs.frozen
class PluginReport:
    """What came from one origin: the built-ins, a folder, an installed package, or Python calls.

    Attributes:
        origin: its kind, name and place.
        tableaux, families, controllers, sinks: the names that it offers.
        problems: what was left out and why, as text.
    """

    origin: Origin
    tableaux: tuple[str, ...] = ()
    families: tuple[str, ...] = ()
    controllers: tuple[str, ...] = ()
    sinks: tuple[str, ...] = ()
    problems: tuple[str, ...] = ()


def installed() -> list[tuple[Origin, EntryPoint]]:
    """Return the entry points of the group `newel`, each with its package, by package name."""
    try:
        points: Iterable[EntryPoint] = entry_points(group=GROUP)
    except Exception:  # the metadata of some unrelated package cannot be read: ask each by itself
        points = _readable_entry_points()
    found = []
    for point in points:
        name, version = _package(point)
        found.append((Origin("package", f"{name} {version}".strip(), where=point.value), point))
    found.sort(key=lambda pair: (pair[0].name, pair[1].name))
    return found


def _readable_entry_points() -> Iterator[EntryPoint]:
    for distribution in distributions():
        try:
            points = list(distribution.entry_points)
        except Exception:  # a damaged package, most likely none of ours
            continue
        yield from (point for point in points if point.group == GROUP)


def _package(point: EntryPoint) -> tuple[str, str]:
    try:
        return str(point.dist.metadata["Name"]), str(point.dist.version)  # type: ignore[union-attr]  # see except
    except Exception:  # no readable METADATA: the entry point's own name must do
        return point.name, ""


def ask(candidates: Iterable[tuple[Origin, Callable[[], object]]]) -> tuple[list[Offer], list[Problem]]:
    """Load each candidate, call its hooks, and return what holds and what is wrong; it never raises."""
    manager = pluggy.PluginManager(GROUP)
    manager.add_hookspecs(Specifications)
    offers: list[Offer] = []
    problems: list[Problem] = []
    for number, (origin, load) in enumerate(candidates):
        try:
            plugin = load()
        except (Exception, SystemExit) as error:
            problems.append(_problem(origin, f"cannot be imported: {said(error)}", place=blame(error)))
            continue
        wrong = _register(manager, plugin, f"{number} {origin.name}")
        if wrong is not None:
            rule, function = wrong
            problems.append(_problem(origin, rule, place=place_of(function) or _file_of(plugin)))
            continue
        for caller in manager.get_hookcallers(plugin) or []:
            for implementation in caller.get_hookimpls():
                if implementation.plugin is plugin:
                    _call(origin, caller.name, implementation.function, offers, problems)
    return offers, problems


def _register(manager: pluggy.PluginManager, plugin: object, name: str) -> tuple[str, object] | None:
    """Register a plugin whole, or not at all; return the rule that it breaks with the function concerned."""
    for hook in (each for each in dir(plugin) if each.startswith("newel_")):
        function = getattr(plugin, hook)
        if manager.parse_hookimpl_opts(plugin, hook) is None:
            if hook in KINDS and callable(function):
                mark = '@pluggy.HookimplMarker("newel")'
                return f"{_signature(hook, function)} is not marked: put {mark} above it", function
            continue
        if hook not in KINDS:
            return (
                f"{_signature(hook, function)} is no hook of newel; the hooks are {', '.join(KINDS)}",
                function,
            )
        if _wants_arguments(function):
            return f"{_signature(hook, function)} has a wrong signature: the hook {CALLED_AS}", function
    try:
        manager.register(plugin, name)
        manager.check_pending()
    except Exception as error:
        if manager.get_name(plugin) == name:  # what is left of it would be blamed on the next one
            manager.unregister(plugin)
        return f"was refused: {said(error)}", plugin
    if not manager.get_hookcallers(plugin):
        return f"answers no hook; the hooks are {', '.join(KINDS)}", plugin
    return None


def _call(
    origin: Origin, hook: str, function: Callable[[], object], offers: list[Offer], problems: list[Problem]
) -> None:
    signature, place = _signature(hook, function), place_of(function)
    try:
        answer = function()
    except (Exception, SystemExit) as error:
        rule, place = f"{signature} raised {said(error)}", blame(error) or place
        problems.append(_problem(origin, rule, place=place, left="what this hook offers"))
        return
    if not isinstance(answer, Mapping):
        rule = f"{signature} returned {shown(answer)}: the hook {CALLED_AS}"
        problems.append(_problem(origin, rule, place=place, left="what this hook offers"))
        return
    kind = KINDS[hook]
    for name, loader in answer.items():
        wrong = _wrong_entry(kind, name, loader)
        if wrong is None:
            offers.append(Offer(kind, name, loader, origin, str(loader) if _is_path(loader) else place))
        else:
            problems.append(_problem(origin, f"{signature}: {wrong}", place=place, left="this entry"))


def _wrong_entry(kind: str, name: object, loader: object) -> str | None:
    """Return the rule that one entry of a hook's mapping breaks, or None."""
    if not isinstance(name, str) or not _NAME.fullmatch(name):
        return f"{name!r} is no name; names are small letters and digits joined by hyphens, as in 'kutta-4'"
    if "{" in name and kind != "tableau":
        return f"{name!r}: only tableaux come in families"
    if _is_path(loader):
        fits = kind == "tableau" and "{" not in name
        return None if fits else f"{name!r}: a TOML file holds one tableau, nothing else"
    if isinstance(loader, str):
        return None if _REFERENCE.fullmatch(loader) else f"{name!r} has the loader {loader!r}; {LOADER_RULE}"
    return None if callable(loader) else f"{name!r} has the loader {shown(loader)}; {LOADER_RULE}"


_NAME = re.compile(r"(?:[a-z0-9]+|\{[a-z_]+\})(?:-(?:[a-z0-9]+|\{[a-z_]+\}))*")
_REFERENCE = re.compile(r"[^\W\d]\w*(?:\.[^\W\d]\w*)*:[^\W\d]\w*(?:\.[^\W\d]\w*)*")


def _is_path(loader: object) -> bool:
    return isinstance(loader, Path) or (isinstance(loader, str) and loader.endswith(".toml"))


def load_object(loader: Loader) -> Any:
    """Return what a loader that is no path stands for: itself, or the object that `"module:name"` names."""
    if not isinstance(loader, str):
        return loader
    module, _, name = loader.partition(":")
    found: Any = importlib.import_module(module)
    for part in name.split("."):
        found = getattr(found, part)
    return found


def _problem(origin: Origin, rule: str, *, place: str, left: str = "everything that it offers") -> Problem:
    text = (
        f"plugin {origin.name} [{origin.where}]: {rule}\n  Left out: {left}. Everything else works.  {place}"
    )
    return Problem(origin, text.rstrip())


def _signature(hook: str, function: object) -> str:
    try:
        return f"{hook}{inspect.signature(function)}"  # type: ignore[arg-type]  # what is not callable raises
    except (TypeError, ValueError):
        return hook


def _wants_arguments(function: Callable[..., object]) -> bool:
    try:
        inspect.signature(function).bind()
    except TypeError:
        return True
    except ValueError:
        return False
    return False


def _file_of(plugin: object) -> str:
    return f"{plugin.__file__}:1" if isinstance(plugin, ModuleType) and plugin.__file__ else ""
