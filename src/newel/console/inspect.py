"""`newel inspect`: one method in full."""

from __future__ import annotations

from argparse import ArgumentParser, Namespace
from collections.abc import Iterator
from typing import TYPE_CHECKING

from newel.console.lookup import method_name, proof_progress, registry_of
from newel.console.screen import Screen
from newel.console.words import OUTCOME_STYLES, claims, filled, value

if TYPE_CHECKING:
    from newel.catalogue.inspection import Inspection
    from newel.methods.tableau import Tableau

__all__ = ["PASTE", "WHAT", "add", "draw", "run"]

WHAT = "Show methods in full: coefficients, properties, proof, source and notes."
PASTE = ("newel inspect kutta-4", "newel inspect dormand-prince-5-4 --json")

_NOTES = ("strengths", "weaknesses", "known_failures", "remarks")


def add(parser: ArgumentParser) -> None:
    """Add the methods."""
    parser.add_argument("methods", nargs="+", metavar="METHOD", help="a slug, or a file that ends in .toml")


def run(options: Namespace, screen: Screen) -> int:
    """Show each method; the status is 1 if a proof fails."""
    from newel import inspect

    registry = registry_of(options)
    methods = [method_name(text, registry) for text in options.methods]
    with proof_progress(screen) as progress:
        found = inspect(*methods, registry=registry, progress=progress)
    if options.json:
        screen.document("newel-inspection/1", {"methods": [each.to_data() for each in found]})
    else:
        for number, each in enumerate(found):
            if number:
                screen.write("")
            draw(screen, each)
    return 1 if any(each.verdict is not None and not each.verdict for each in found) else 0


def draw(screen: Screen, found: Inspection) -> None:
    """Draw one method in blocks: whose it is, its numbers, properties, proof, notes."""
    from rich.text import Text

    from newel.console.triangle import as_text

    width, tableau = screen.console.width, found.tableau
    screen.draw(Text.assemble((tableau.slug, "bold"), f"\n  {tableau.name}"))
    for label, text in _whose(tableau):
        if text:
            screen.draw(filled(" ".join(text.split()), width, f"  {label:<14} ", " " * 17))
    screen.write("")
    # Not through rich: a number longer than a line is never broken.
    screen.write(as_text(tableau, width))
    screen.write("")
    for title, text in _properties(found):
        screen.draw(filled(text, width, f"  {title:<31} ", " " * 34))
    _draw_verdict(screen, found)
    for kind in _NOTES:
        notes = getattr(tableau.notes, kind)
        if notes:
            screen.draw(f"\n  {kind.replace('_', ' ')}")
        for note in notes:
            screen.draw(filled(" ".join(note.split()), width, "  - ", "    "))


def _whose(tableau: Tableau) -> Iterator[tuple[str, str]]:
    who = ", ".join(tableau.authors) + (f" ({tableau.year})" if tableau.year else "")
    yield "also called", ", ".join(tableau.also_called)
    yield "authors", who.strip()
    yield "source", tableau.source
    yield "numbers", tableau.numbers + ("" if tableau.is_exact else "; rounded")
    yield "comes from", tableau.origin


def _properties(found: Inspection) -> Iterator[tuple[str, str]]:
    from newel.methods.analysis.properties import PROPERTIES

    for each in PROPERTIES:
        if found.properties[each.name] is not None:
            unit = f" {each.unit}" if each.unit else ""
            yield each.title, value(found.properties[each.name]) + unit


def _draw_verdict(screen: Screen, found: Inspection) -> None:
    from rich.text import Text

    from newel.console.check import draw_details

    verdict = found.verdict
    if verdict is None:
        head = Text.assemble("\n  proof  ", ("unproven", OUTCOME_STYLES["unproven"]), ": taken on trust")
        screen.draw(head)
        return
    said = f": order {claims(verdict)}; in float64 to {verdict.working_floor:.1e}"
    screen.draw(Text.assemble("\n  proof  ", (verdict.outcome, OUTCOME_STYLES[verdict.outcome]), said))
    draw_details(screen, verdict)
