"""Methods and models as a command line names them."""

from __future__ import annotations

import contextlib
import os
import time
from argparse import ArgumentParser, Namespace
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import TYPE_CHECKING

from newel.console.ranges import settings
from newel.errors import BadRequest, UnknownMethod

if TYPE_CHECKING:
    from newel.catalogue.registry import Registry
    from newel.console.screen import Screen
    from newel.models.model import Model

__all__ = ["add_model", "method_name", "model_of", "proof_progress", "registry_of"]

_PATIENCE = 0.7
"""A proof that takes no longer than this many seconds shows no bar."""


def registry_of(options: Namespace) -> Registry:
    """Return the registry that `--tableaux` asks for, else the usual one, which a model's file may fill."""
    from newel.catalogue.folders import named_folders
    from newel.catalogue.registry import Registry, default_registry

    if not options.tableaux:
        return default_registry()
    return Registry(folders=[*named_folders(), *map(Path, options.tableaux)])


def method_name(text: str, registry: Registry) -> str:
    """Return what names a method as it is, with words of their own for files that are no tableaux.

    Raises:
        BadRequest: for a folder. UnknownMethod: for a file of another kind.
    """
    if text.endswith(".toml") or text in registry.names():
        return text
    if os.path.isdir(text):
        remedy = f"For the tableaux in it: newel check --all --tableaux {text}"
        raise BadRequest(f"{text} is a folder, not a tableau.\n  {remedy}", argument="method")
    if os.path.isfile(text) and not text.endswith(".py"):
        raise UnknownMethod(f"{text} is no tableau file.\n  The name of one ends in .toml.", slug=text)
    return text


def add_model(parser: ArgumentParser) -> None:
    """Add the arguments that name a model."""
    what = "file.py, file.py:name, package.module:name or example:name"
    parser.add_argument("model", metavar="MODEL", help=what)
    parser.add_argument(
        "--set",
        action="append",
        default=[],
        metavar="NAME=VALUE",
        help="an argument of the function that makes the model, in TOML's grammar (repeatable)",
    )


def model_of(options: Namespace, screen: Screen) -> Model:
    """Return the model that is named, made with its settings."""
    from newel import load_model

    chosen = settings(options.set)
    with screen.model_prints_aside():
        return load_model(options.model, **chosen)


@contextlib.contextmanager
def proof_progress(screen: Screen, what: str = "proving") -> Iterator[Callable[[int, int], None] | None]:
    """Give a function that shows how far something is, or None where stderr is no terminal."""
    if not screen.err.isatty():
        yield None
        return
    from rich.console import Console
    from rich.progress import BarColumn, Progress, TextColumn

    columns = (TextColumn(f"{what} {{task.description}}", markup=False), BarColumn(bar_width=24))
    counts = TextColumn("{task.completed:.0f} of {task.total:.0f}")
    bars = Progress(*columns, counts, console=Console(file=screen.err), transient=True, auto_refresh=False)
    task = bars.add_task("", total=None, visible=False)
    begun, drawn = time.monotonic(), False

    def show(done: int, total: int) -> None:
        nonlocal drawn
        if not drawn and time.monotonic() - begun > _PATIENCE:
            drawn = True
            bars.start()
        if drawn:
            bars.update(task, completed=done, total=total, visible=True, refresh=True)

    try:
        yield show
    finally:
        if drawn:
            bars.stop()
