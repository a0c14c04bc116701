"""`newel recover`: which method is in this step function?"""

from __future__ import annotations

import os
import runpy
import sys
import traceback
from argparse import ArgumentParser, Namespace
from importlib import import_module
from pathlib import Path
from typing import TYPE_CHECKING, Any

import attrs

from newel.console.check import draw_details
from newel.console.lookup import registry_of
from newel.console.screen import Screen
from newel.console.words import filled
from newel.errors import BadRequest, OutputExists

if TYPE_CHECKING:
    from collections.abc import Callable

    from newel.catalogue.recognition import Recovered

__all__ = ["PASTE", "WHAT", "add", "draw", "run", "step_function"]

WHAT = "Read the method out of a step function of your own, and say what it is."
PASTE = (
    "newel recover newel.examples:midpoint_step",
    "newel recover newel.examples:midpoint_step --order 2 --json",
)

FORMS = "A step function is file.py:name or package.module:name."


def add(parser: ArgumentParser) -> None:
    """Add the step function and what is known of it."""
    parser.add_argument("step", metavar="FILE:NAME", help="a function step(rate, t, y, h) -> new y")
    parser.add_argument("--order", type=int, help="the order that it is meant to have")
    parser.add_argument("--length", type=int, help="the length of its state; 0 for a plain number")
    parser.add_argument("--to", metavar="FILE", help="write the tableau to a new .toml file")
    parser.add_argument("--force", action="store_true", help="overwrite that file")


def run(options: Namespace, screen: Screen) -> int:
    """Recover the method; the status is 1 where it falls short of its order, or is no such method."""
    from newel.catalogue.recognition import recover

    target = _target(options)
    registry = registry_of(options)
    with screen.model_prints_aside():
        found = recover(
            step_function(options.step), order=options.order, length=options.length, registry=registry
        )
    if target is not None:
        _write(found, target, options.force)
    if options.json:
        screen.document("newel-recover/1", _data(options.step, found))
    else:
        draw(screen, options.step, found)
        if target is not None:
            screen.draw(f"  written to {target}")
    return 0 if found else 1


def step_function(text: str) -> Callable[..., Any]:
    """Return the function that a text names.

    Raises:
        BadRequest: there is no such file, module or name, it does not run, or it cannot be called.
    """
    place, colon, name = text.rpartition(":")
    if not colon or not name.isidentifier() or not place:
        raise BadRequest(f"{text!r} names no step function\n  {FORMS}", argument="step")
    names = _run_file(place) if place.endswith(".py") else _module(place)
    if name not in names:
        has = [key for key, value in names.items() if callable(value) and not key.startswith("_")]
        listed = f"It has: {', '.join(has)}." if has else "It has no functions."
        raise BadRequest(f"{place} has no {name!r}\n  {listed}", argument="step")
    if not callable(names[name]):
        raise BadRequest(f"{text} is a {type(names[name]).__name__}, no function\n  {FORMS}", argument="step")
    function: Callable[..., Any] = names[name]
    return function


def _run_file(place: str) -> dict[str, Any]:
    if not os.path.isfile(place):
        raise BadRequest(f"there is no file {place}\n  {FORMS}", argument="step")
    folder = str(Path(place).resolve().parent)
    sys.path.insert(0, folder)
    try:
        return runpy.run_path(place, run_name="loop")
    except (Exception, SystemExit) as error:
        raise _does_not_run(place, error) from error
    finally:
        if folder in sys.path:
            sys.path.remove(folder)


def _module(place: str) -> dict[str, Any]:
    sys.path.insert(0, os.getcwd())
    try:
        return vars(import_module(place))
    except (Exception, SystemExit) as error:
        raise _does_not_run(place, error) from error
    finally:
        if os.getcwd() in sys.path:
            sys.path.remove(os.getcwd())


def _does_not_run(place: str, error: BaseException) -> BadRequest:
    frames = [each for each in traceback.extract_tb(error.__traceback__) if each.filename == place]
    line = f":{frames[-1].lineno}" if frames else ""
    if isinstance(error, SyntaxError):
        line = f":{error.lineno}"
    what = " ".join(str(error).split())[:200]
    said = f"{place}{line}: {type(error).__name__}: {what}\n  {place} does not run."
    return BadRequest(said, argument="step")


def _target(options: Namespace) -> Path | None:
    """Return where to write; a file that is in the way is found before anything is run."""
    if options.to is None:
        return None
    target = Path(options.to)
    if target.suffix != ".toml":
        raise BadRequest(f"--to {options.to}: a tableau file ends in .toml", argument="to")
    if target.exists() and not options.force:
        raise OutputExists(str(target))
    return target


def _write(found: Recovered, target: Path, force: bool) -> None:
    from newel import write_tableau

    write_tableau(attrs.evolve(found.tableau, slug=target.stem), target, overwrite=force)


def draw(screen: Screen, named: str, found: Recovered) -> None:
    """Draw what it is, what is wrong with it, and what else was seen."""
    from rich.text import Text

    first, *remarks = str(found).split("\n  ")
    screen.draw(Text(filled(f"{named}: {first}", screen.console.width, "", "  "), style="bold"))
    for line in remarks:
        screen.draw(filled(line, screen.console.width, "  - ", "    "))
    if not found:
        draw_details(screen, found.verdict)


def _data(named: str, found: Recovered) -> dict[str, Any]:
    tableau = found.tableau
    return {
        "step": named,
        "same_as": found.same_as,
        "relation": None if found.identity is None else found.identity.relation,
        "becomes": found.becomes,
        "order": tableau.order,
        "length": found.length,
        "nodes": list(map(str, tableau.nodes)),
        "matrix": [list(map(str, row[:i])) for i, row in enumerate(tableau.matrix)],
        "weights": list(map(str, tableau.weights)),
        "verdict": found.verdict.to_data(),
        "remarks": list(found.remarks),
    }
