"""The command line as data: subcommands, options, and words for what does not fit."""

from __future__ import annotations

import argparse
import contextlib
import re
from collections.abc import Sequence
from difflib import get_close_matches
from importlib import import_module
from io import StringIO
from typing import TYPE_CHECKING, Any, NoReturn

from newel.errors import BadRequest

if TYPE_CHECKING:
    from newel.console.screen import Screen

__all__ = ["SUBCOMMANDS", "Parser", "add_common", "build", "parse"]

SUBCOMMANDS = (
    "list",
    "inspect",
    "check",
    "recover",
    "identify",
    "draft",
    "export",
    "march",
    "examine",
    "plugins",
    "guide",
)
"""Each stands in a module of the same name, with `add(parser)` and `run(options, screen) -> int`."""

_MARCH = "newel march example:lock --method dormand-prince-5-4 --rel-tol 1e-6 --abs-tol 1e-9"


class Parser(argparse.ArgumentParser):
    """A parser that raises newel's own error, with the nearest option or subcommand.

    Args:
        what: one sentence on what the command does.
        paste: two commands that can be pasted, shown at the end of the help.
    """

    def __init__(self, prog: str, what: str, paste: tuple[str, str], **settings: Any) -> None:
        epilog = "\n".join(["try:", *(f"  {command}" for command in paste)])
        super().__init__(
            prog=prog,
            description=what,
            epilog=epilog,
            allow_abbrev=False,
            formatter_class=_Help,
            **settings,
        )
        self.paste = paste

    def error(self, message: str) -> NoReturn:
        """Raise BadRequest with the command's own help as the remedy."""
        chosen = re.search(r"argument COMMAND: invalid choice: '(.*?)'", message, re.DOTALL)
        if chosen is not None:
            near = _near(chosen[1], SUBCOMMANDS)
            known = f"Commands: {', '.join(SUBCOMMANDS)}."
            raise BadRequest(f"no command {chosen[1][:60]!r}{near}\n  {known}     newel --help")
        hint = ""
        if "expected one argument" in message or "expected at least one argument" in message:
            option = re.search(r"argument (--[a-z-]+)", message)
            hint = f"\n  A value that begins with a minus is joined: {option[1]}=-1,2" if option else ""
        raise BadRequest(f"{message}{hint}\n  {self.prog} --help")

    def refuse(self, extra: Sequence[str]) -> NoReturn:
        """Raise BadRequest for words that no option takes."""
        word = next((each for each in extra if each.startswith("-")), extra[0]).partition("=")[0]
        if not word.startswith("-"):
            raise BadRequest(f"{word[:60]!r} is one word too many\n  {self.prog} --help")
        raise BadRequest(
            f"no option {word[:60]}{_near(word, self._option_string_actions)}\n  {self.prog} --help"
        )


class _Help(argparse.RawDescriptionHelpFormatter):
    """Eighty columns, whatever the terminal; the last lines stay as they are written."""

    def __init__(self, prog: str) -> None:
        super().__init__(prog, max_help_position=26, width=80)


def _near(word: str, known: Sequence[str] | dict[str, argparse.Action]) -> str:
    near = get_close_matches(word[:60], list(known), n=1, cutoff=0.5)
    return f"; the nearest is {near[0]}" if near else ""


def build() -> tuple[Parser, dict[str, Parser]]:
    """Return the parser of `newel`, and those of its subcommands by name."""
    from newel import __version__

    parser = Parser(
        "newel",
        "Explicit Runge-Kutta methods as proven data, and one engine to march with.",
        ("newel list", f"{_MARCH} --to lock.csv"),
    )
    parser.add_argument("--version", action="version", version=f"newel {__version__}")
    _add_tableaux(parser, "tableaux_before", default=[])
    made: dict[str, Parser] = {}
    commands = parser.add_subparsers(metavar="COMMAND", dest="command")
    for name in SUBCOMMANDS:
        module = import_module(f"newel.console.{name}")
        made[name] = commands.add_parser(name, what=module.WHAT, paste=module.PASTE, help=module.WHAT)
        module.add(made[name])
        add_common(made[name])
    return parser, made


def add_common(parser: argparse.ArgumentParser) -> None:
    """Add the options that every subcommand has."""
    parser.add_argument("--json", action="store_true", help="one JSON document in place of text")
    _add_tableaux(parser, "tableaux", default=[])


def _add_tableaux(parser: argparse.ArgumentParser, dest: str, default: list[str]) -> None:
    parser.add_argument(
        "--tableaux",
        action="append",
        metavar="DIR",
        dest=dest,
        default=default,
        help="a folder of tableau files of your own (repeatable)",
    )


def parse(words: Sequence[str], screen: Screen) -> argparse.Namespace:
    """Return the options of a command line; `--help` and `--version` write to a screen and raise SystemExit.

    Raises:
        BadRequest: if the words fit no command; the text names the nearest.
    """
    parser, made = build()
    printed = StringIO()
    try:
        with contextlib.redirect_stdout(printed):
            options, extra = parser.parse_known_args(words)
    finally:
        if printed.getvalue():
            screen.write(printed.getvalue())
    if options.command is None:
        if extra:
            parser.refuse(extra)
        raise BadRequest(f"no command\n  Commands: {', '.join(SUBCOMMANDS)}.     newel --help")
    if extra:
        made[options.command].refuse(extra)
    options.tableaux = [*options.tableaux_before, *options.tableaux]
    return options
