"""`newel examine`: what would spoil a march of a model."""

from __future__ import annotations

from argparse import ArgumentParser, Namespace
from typing import TYPE_CHECKING

from newel.console.lookup import add_model, model_of
from newel.console.screen import Screen
from newel.console.words import filled

if TYPE_CHECKING:
    from newel.models.findings import Examination
    from newel.models.model import Model

__all__ = ["PASTE", "WHAT", "add", "draw", "run"]

WHAT = "Call a model's functions a few times and say what would spoil a march."
PASTE = ("newel examine example:lock", "newel examine example:lock --set paddle=0.6 --json")

_STYLES = {"error": "bold red", "warning": "yellow", "note": "cyan"}


def add(parser: ArgumentParser) -> None:
    """Add the model."""
    add_model(parser)


def run(options: Namespace, screen: Screen) -> int:
    """Examine the model; the status is 1 if something would spoil a march."""
    from newel import examine

    model = model_of(options, screen)
    with screen.model_prints_aside():
        found = examine(model)
    if options.json:
        data = {"model": options.model, **found.to_data()}
        screen.document(data.pop("schema"), data)
    else:
        draw(screen, options.model, model, found)
    return 0 if found.ok else 1


def draw(screen: Screen, named: str, model: Model, found: Examination) -> None:
    """Draw what the model is, and each finding."""
    from rich.text import Text

    unit = f" {model.time_unit}" if model.time_unit else ""
    shape = " × ".join(f"{n:,}" for n in model.state.shape) or "one number"
    screen.draw(Text(named, style="bold"))
    screen.draw(f"  state     {shape} of {model.state.dtype}")
    screen.draw(f"  time      {model.start:g} to {model.stop:g}{unit}")
    if model.breaks:
        breaks = ", ".join(f"{t:g}" for t in model.breaks[:12]) + (", …" if len(model.breaks) > 12 else "")
        screen.draw(filled(breaks, screen.console.width, "  breaks    ", " " * 12))
    if model.events:
        labels = ", ".join(event.label for event in model.events)
        screen.draw(filled(labels, screen.console.width, "  events    ", " " * 12))
    if found.microseconds is not None:
        screen.draw(f"  rate      {found.microseconds:.3g} µs a call")
    for finding in found.findings:
        lines = filled(
            f"{finding.subject}: {finding.text}", screen.console.width, f"  {finding.severity:<9} ", " " * 12
        )
        screen.draw(Text(lines, style=_STYLES[finding.severity]))
    screen.draw(_conclusion(found))


def _conclusion(found: Examination) -> str:
    """The last line: whether a march can go on, and whether a person should look first."""
    if not found.ok:
        return "This would spoil a march."
    warnings = sum(finding.severity == "warning" for finding in found.findings)
    if not warnings:
        return "Nothing spoils a march."
    return f"Nothing is wrong for certain; look at the {'warning' if warnings == 1 else 'warnings'} first."
