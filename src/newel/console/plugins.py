"""`newel plugins`: what came from where, and what was left out."""

from __future__ import annotations

import warnings
from argparse import ArgumentParser, Namespace
from typing import TYPE_CHECKING

from newel.console.lookup import registry_of
from newel.console.screen import Screen
from newel.console.words import count, filled
from newel.errors import NewelWarning

if TYPE_CHECKING:
    from newel.catalogue.plugins import PluginReport

__all__ = ["PASTE", "WHAT", "add", "draw", "run"]

WHAT = "Show what came from where: newel itself, folders, installed packages."
PASTE = ("newel plugins", "newel plugins --json")

_KINDS = ("tableaux", "families", "controllers", "sinks")
_MOST_NAMES = 40


def add(parser: ArgumentParser) -> None:
    """Add no options of its own."""


def run(options: Namespace, screen: Screen) -> int:
    """Show each origin; the status is 1 if anything was left out."""
    from newel import plugins

    with warnings.catch_warnings():
        warnings.simplefilter("ignore", NewelWarning)  # the report says the same
        reports = plugins(registry_of(options))
    if options.json:
        import attrs

        screen.document("newel-plugins/1", {"origins": [attrs.asdict(report) for report in reports]})
    else:
        draw(screen, reports)
    return 1 if any(report.problems for report in reports) else 0


def draw(screen: Screen, reports: tuple[PluginReport, ...]) -> None:
    """Draw a block for each origin."""
    from rich.text import Text

    for report in reports:
        where = "" if report.origin.where in ("", report.origin.name) else f"   {report.origin.where}"
        screen.draw(Text.assemble((str(report.origin), "bold"), where))
        for kind in _KINDS:
            names = getattr(report, kind)
            if names:
                listed = ", ".join(names) if len(names) <= _MOST_NAMES else f"{len(names)}, see newel list"
                screen.draw(filled(listed, screen.console.width, f"  {kind:<12} ", " " * 15))
        if not any(getattr(report, kind) for kind in _KINDS):
            screen.draw("  brings nothing")
        for problem in report.problems:
            for number, line in enumerate(problem.splitlines()):
                head = "  left out     " if number == 0 else " " * 15
                lines = filled(" ".join(line.split()), screen.console.width, head, " " * 15)
                screen.draw(Text(lines, style="red" if number == 0 else ""))
    problems = sum(len(report.problems) for report in reports)
    what = f"{count(problems, 'problem')}" if problems else "no problems"
    screen.write(f"{count(len(reports), 'origin')}, {what}.")
