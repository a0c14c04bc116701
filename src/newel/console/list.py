"""`newel list`: the methods that there are."""

from __future__ import annotations

from argparse import ArgumentParser, BooleanOptionalAction, Namespace
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from newel.console.lookup import registry_of
from newel.console.ranges import whole_numbers
from newel.console.screen import Screen

if TYPE_CHECKING:
    from rich.table import Table

    from newel.catalogue.summaries import Summary

__all__ = ["PASTE", "WHAT", "add", "draw", "run"]

WHAT = "List the methods that there are."
PASTE = (
    "newel list --order 5 --embedded",
    'newel list --needs "order>=3, ssp>0" --columns "ssp/calls, real/calls, registers"',
)

_ROOM_FOR_NAMES = 110


def add(parser: ArgumentParser) -> None:
    """Add the options."""
    parser.add_argument("--order", metavar="N", help="only these orders: 5, or 4,5, or 4..6")
    parser.add_argument("--stages", metavar="N", help="only these numbers of stages: 7, or 4..7")
    parser.add_argument(
        "--text", metavar="WORDS", help="only where these words occur in slug, names or authors"
    )
    parser.add_argument(
        "--embedded",
        action=BooleanOptionalAction,
        default=None,
        help="only pairs, or only methods without an error estimate of their own",
    )
    parser.add_argument(
        "--needs",
        metavar="NEEDS",
        help="only what has these: 'order>=4, ssp>0, imag/stages>0.7, embedded, exact'",
    )
    parser.add_argument(
        "--columns",
        metavar="NAMES",
        help="properties to show, by the names that inspect --json has: 'ssp, imag/calls'",
    )
    parser.add_argument(
        "--sort", default="order", metavar="BY", help="order (the default), stages, slug, year or floor"
    )


def run(options: Namespace, screen: Screen) -> int:
    """List the methods that fit."""
    from newel import names

    registry = registry_of(options)
    found = names(
        order=None if options.order is None else whole_numbers(options.order, "--order"),
        stages=None if options.stages is None else whole_numbers(options.stages, "--stages"),
        text=options.text,
        embedded=options.embedded,
        needs=options.needs,
        columns=options.columns,
        sort=options.sort,
        details=True,
        registry=registry,
    )
    if options.json:
        import attrs

        methods = [_plain(attrs.asdict(summary)) for summary in found]
        screen.document("newel-list/1", {"methods": methods, "families": registry.families()})
    else:
        draw(screen, found, len(registry.names()), registry.families())
    return 0


def _plain(summary: dict[str, Any]) -> dict[str, Any]:
    """Return a summary as JSON has it: without the key of its proof, and values only where asked for."""
    return {name: x for name, x in summary.items() if name != "proof_key" and (name != "values" or x)}


def draw(screen: Screen, found: Sequence[Summary], known: int, families: Sequence[str]) -> None:
    """Draw the table, where the methods of others come from, and how many there are."""
    if found:
        screen.draw(_table(found, screen.console.width >= _ROOM_FOR_NAMES))
        screen.draw("")
    foreign = [summary for summary in found if summary.origin != "built-in"]
    for summary in foreign:
        screen.write(f"* {summary.slug}: {summary.origin}")
    count = f"{len(found)} method{'' if len(found) == 1 else 's'}"
    of = "" if len(found) == known else f" of {known}"
    screen.write(f"{count}{of}.  In full: newel inspect SLUG")
    if len(found) == known and families:
        from newel.console.words import filled

        screen.write(filled(", ".join(families), screen.console.width, "Families: ", "  "))


def _table(found: Sequence[Summary], with_names: bool) -> Table:
    from rich import box
    from rich.table import Table

    table = Table(box=box.SIMPLE_HEAD, pad_edge=False, padding=(0, 1, 0, 0), show_edge=False)
    table.add_column("slug", style="bold", overflow="fold")
    asked = list(found[0].values)
    if with_names and not asked:
        table.add_column("name", overflow="fold")
    for title in asked or ("order", "stages", "year"):
        table.add_column(title, justify="right", no_wrap=not asked, overflow="fold")
    if not asked:
        table.add_column("proof", no_wrap=True)
        table.add_column("floor", justify="right", no_wrap=True)
    for summary in found:
        table.add_row(*(_asked_cells(summary) if asked else _cells(summary, with_names)))
    return table


def _marked(summary: Summary) -> str:
    return summary.slug + ("" if summary.origin == "built-in" else " *")


def _asked_cells(summary: Summary) -> list[str]:
    from newel.console.words import value

    return [_marked(summary), *("" if x is None else value(x) for x in summary.values.values())]


def _cells(summary: Summary, with_names: bool) -> list[Any]:
    from rich.text import Text

    from newel.console.words import OUTCOME_STYLES

    pair = "" if summary.embedded_order is None else f"({summary.embedded_order})"
    floor = "" if summary.working_floor is None else f"{summary.working_floor:.1e}"
    names = [summary.name] if with_names else []
    return [
        _marked(summary),
        *names,
        f"{summary.order}{pair}",
        str(summary.stages),
        "" if summary.year is None else str(summary.year),
        Text(summary.outcome, style=OUTCOME_STYLES[summary.outcome]),
        floor,
    ]
