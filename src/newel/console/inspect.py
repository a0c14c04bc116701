"""`newel inspect`: one method in full, several side by side, and pictures of their stability regions."""

from __future__ import annotations

from argparse import ArgumentParser, Namespace
from collections.abc import Iterator, Sequence
from typing import TYPE_CHECKING, Any

from newel.console.lookup import method_name, proof_progress, registry_of
from newel.console.screen import Screen
from newel.console.words import OUTCOME_STYLES, claims, filled, float_floor, value
from newel.errors import BadRequest

if TYPE_CHECKING:
    from newel.catalogue.inspection import Inspection
    from newel.methods.tableau import Tableau
    from newel.results.pictures import RegionPicture

__all__ = ["PASTE", "WHAT", "add", "draw", "draw_table", "run"]

WHAT = "Show a method in full, or several side by side at equal cost."
PASTE = (
    "newel inspect kutta-4 --picture",
    "newel inspect kutta-4 dormand-prince-5-4 verner-1978-6-5",
)

_NOTES = ("strengths", "weaknesses", "known_failures", "remarks")


def add(parser: ArgumentParser) -> None:
    """Add the methods and the pictures."""
    parser.add_argument("methods", nargs="+", metavar="METHOD", help="a slug, or a file that ends in .toml")
    parser.add_argument("--picture", action="store_true", help="draw the stability regions")
    parser.add_argument(
        "--picture-to", metavar="FILE", help="write that picture to a file that ends in .svg or .png"
    )
    parser.add_argument(
        "--per-call", action="store_true", help="in pictures, divide by the rate calls of a step: equal cost"
    )
    parser.add_argument("--force", action="store_true", help="replace the picture's file if it is there")


def run(options: Namespace, screen: Screen) -> int:
    """Show each method; the status is 1 if a proof fails."""
    from newel import inspect

    if (options.per_call or options.force) and not (options.picture or options.picture_to):
        raise BadRequest(
            "--per-call and --force are about a picture\n  Add --picture or --picture-to FILE.",
            argument="picture",
        )
    registry = registry_of(options)
    methods = [method_name(text, registry) for text in options.methods]
    with proof_progress(screen) as progress:
        found = inspect(*methods, registry=registry, progress=progress)
    picture = _picture(options, found) if options.picture or options.picture_to else None
    if picture is not None and options.picture_to:
        picture.write(options.picture_to, overwrite=options.force)
        screen.notice(f"written: {options.picture_to}")
    if options.json:
        _document(screen, found, picture)
    else:
        if len(found) == 1:
            draw(screen, found[0])
        else:
            draw_table(screen, found)
        if picture is not None and options.picture:
            screen.write("\n" + picture.text(screen.console.width))
    return 1 if any(each.verdict is not None and not each.verdict for each in found) else 0


def _picture(options: Namespace, found: Sequence[Inspection]) -> RegionPicture:
    from newel.results.pictures import stability_region

    return stability_region(*(each.tableau for each in found), per_call=options.per_call)


def _document(screen: Screen, found: Sequence[Inspection], picture: RegionPicture | None) -> None:
    import attrs

    from newel.catalogue.side_by_side import side_by_side

    data: dict[str, object] = {"methods": [each.to_data() for each in found]}
    if len(found) > 1:
        data["side_by_side"] = [attrs.asdict(row) for row in side_by_side(found)]
    if picture is not None:
        data["picture"] = picture.to_data()
    screen.document("newel-inspection/1", data)


def draw_table(screen: Screen, found: Sequence[Inspection]) -> None:
    """Draw several methods side by side, in as many columns as fit, and then in a further table."""
    from newel.catalogue.side_by_side import side_by_side

    rows = side_by_side(found)
    for number, each in enumerate(found, 1):
        screen.write(f"{number:>3}  {each.tableau.slug}")
    shown = [[_cell(x, k in row.best) for k, x in enumerate(row.values)] for row in rows]
    fit = max(1, (screen.console.width - _TITLES) // _CELL)
    for first in range(0, len(found), fit):
        here = range(first, min(first + fit, len(found)))
        screen.write("\n" + " " * _TITLES + "".join(f"{k + 1:>{_CELL - 1}} " for k in here).rstrip())
        for row, cells in zip(rows, shown, strict=True):
            if any(x is not None for x in row.values):
                screen.write(f"  {row.title:<{_TITLES - 2}}" + "".join(cells[k] for k in here).rstrip())
    screen.write("\n* best of its row.  A call: divided by the rate calls of a step (equal cost).")
    screen.write("In full: newel inspect SLUG")


_TITLES, _CELL = 39, 10


def _cell(found: Any, best: bool) -> str:
    """Return a value in the width of a column, with a star where it is the best of its row."""
    text = "" if found is None else value(found)
    if len(text) > _CELL - 2 and hasattr(found, "__float__"):
        text = f"{float(found):.4g}"
        text = text if len(text) <= _CELL - 2 else f"{float(found):.2e}"
    return f"{text:>{_CELL - 1}}{'*' if best else ' '}"


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
        screen.draw(filled(text, width, f"  {title:<36} ", " " * 39))
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
            yield each.title, value(found.properties[each.name], each.digits) + unit


def _draw_verdict(screen: Screen, found: Inspection) -> None:
    from rich.text import Text

    from newel.console.check import draw_details

    verdict = found.verdict
    if verdict is None:
        head = Text.assemble("\n  proof  ", ("unproven", OUTCOME_STYLES["unproven"]), ": taken on trust")
        screen.draw(head)
        return
    said = f": order {claims(verdict)}{float_floor(verdict, ';')}"
    screen.draw(Text.assemble("\n  proof  ", (verdict.outcome, OUTCOME_STYLES[verdict.outcome]), said))
    draw_details(screen, verdict)
