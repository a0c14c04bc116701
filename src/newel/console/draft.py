"""`newel draft`: begin a tableau file, or let it be completed."""

from __future__ import annotations

from argparse import ArgumentParser, Namespace
from pathlib import Path

from newel.console.screen import Screen
from newel.console.words import filled
from newel.errors import BadRequest

__all__ = ["PASTE", "WHAT", "add", "run"]

WHAT = "Begin a tableau file: a skeleton, pasted rows, or weights solved for."
PASTE = (
    "newel draft mine.toml --stages 7 --order 5 --embedded 4",
    "newel draft four-stages.toml --stages 4 --json",
)

_MOST_BYTES = 1_000_000


def add(parser: ArgumentParser) -> None:
    """Add the file and what to do with it."""
    parser.add_argument("path", metavar="FILE", help="the tableau file, named after the slug: mine.toml")
    parser.add_argument("--stages", type=int, metavar="N", help="write a skeleton of N stages")
    parser.add_argument("--order", type=int, metavar="N", help="the order that the weights claim")
    parser.add_argument("--embedded", type=int, metavar="N", help="the order of an embedded formula")
    parser.add_argument(
        "--from", dest="pasted", metavar="TEXT", help="read rows from a text file as they come out of a PDF"
    )
    parser.add_argument(
        "--complete", action="store_true", help="solve for weights that are still ? and show the file"
    )
    parser.add_argument(
        "--force", action="store_true", help="replace FILE if it is there; write what --complete found"
    )


def run(options: Namespace, screen: Screen) -> int:
    """Draft, and say what was understood; the status is 1 where rows do not hold together."""
    from newel import draft

    made = draft(
        options.path,
        stages=options.stages,
        order=options.order,
        embedded=options.embedded,
        pasted=None if options.pasted is None else _text(options.pasted),
        complete=options.complete,
        overwrite=options.force,
    )
    if options.json:
        facts = {"path": made.path, "written": made.written, "text": made.text}
        facts |= {"understood": made.understood, "passed_over": made.passed_over}
        facts["misfits"] = made.misfits
        screen.document("newel-draft/1", facts)
        return 1 if made.misfits else 0
    if not made.written:
        screen.write(made.text)
    width = screen.console.width
    say = screen.draw if made.written else screen.notice
    say(f"wrote {made.path}" if made.written else "nothing was written; --force writes it")
    for line in made.understood:
        say(filled(line, width, "  - ", "    "))
    for line in made.passed_over:
        say(filled(line, width, "  ? ", "    "))
    for line in made.misfits:
        say(filled(line, width, "  ! ", "    "))
    return 1 if made.misfits else 0


def _text(name: str) -> str:
    try:
        with Path(name).open("rb") as stream:
            data = stream.read(_MOST_BYTES + 1)
    except (OSError, ValueError) as error:
        why = getattr(error, "strerror", None) or error
        raise BadRequest(f"--from {name}: cannot be read: {why}", argument="pasted") from None
    if len(data) > _MOST_BYTES:
        raise BadRequest(
            f"--from {name}: more than {_MOST_BYTES:,} bytes; paste the rows alone", argument="pasted"
        )
    return data.decode("utf-8", errors="replace")
