"""`main`: parse, run one subcommand, and turn whatever happens into words and an exit status.

0 all is well; 1 the thing examined fell short; 2 the request was wrong; 3 stopped early on request.
"""

from __future__ import annotations

import os
import sys
import traceback
from collections.abc import Sequence
from importlib import import_module

from newel.console.parser import parse
from newel.console.screen import NobodyReads, Screen
from newel.errors import NewelError

__all__ = ["main"]

WELL, FELL_SHORT, STOPPED = 0, 1, 3


def main(argv: Sequence[str] | None = None, screen: Screen | None = None) -> int:
    """Run the command `newel` and return its exit status; nothing but that comes out.

    Args:
        argv: the words after `newel`; by default those of this process.
        screen: where it speaks; by default stdout and stderr.

    Example:
        >>> main(["list", "--sort", "sizes"], screen=Screen(sys.stdout, sys.stdout))
        sort='sizes' is none of order, stages, slug, year, floor
        2
    """
    screen = Screen.standard() if screen is None else screen
    try:
        status = _answer(sys.argv[1:] if argv is None else argv, screen)
        screen.flush()
    except NobodyReads:
        return WELL
    except NewelError as error:
        screen.notice(_told(str(error)))
        return error.exit_status
    except KeyboardInterrupt:
        screen.notice(_told("stopped by Ctrl-C\n  There is nothing to resume: give the command again."))
        return STOPPED
    except (Exception, SystemExit) as error:
        screen.notice(_told(_unexpected(error)))
        return FELL_SHORT
    return status


def _answer(argv: Sequence[str], screen: Screen) -> int:
    try:
        options = parse(argv, screen)
    except SystemExit:  # after --help and --version
        return WELL
    with screen.notices():
        status: int = import_module(f"newel.console.{options.command}").run(options, screen)
    return status


def _unexpected(error: BaseException) -> str:
    """Return one line for what should not happen, and what can be done about it."""
    if isinstance(error, SystemExit):
        return (
            f"the model's code called sys.exit({error.code!r})\n  A model only computes; take that call out."
        )
    text = " ".join(str(error).split())
    frames = traceback.extract_tb(error.__traceback__)
    place = f" ({os.path.basename(frames[-1].filename)}:{frames[-1].lineno})" if frames else ""
    return (
        f"unexpected {type(error).__name__}: {text[:300]}{place}\n"
        "  This is a defect of newel; a report is welcome. NEWEL_TRACEBACK=1 shows where it happened."
    )


def _told(text: str) -> str:
    """Return a text, after the traceback where the variable NEWEL_TRACEBACK asks for one."""
    if os.environ.get("NEWEL_TRACEBACK", "") in ("", "0"):
        return text
    return traceback.format_exc() + text
