"""A text to a file: all of it or nothing, and never over another file unasked."""

from __future__ import annotations

import os
import secrets
from pathlib import Path

from newel.errors import OutputExists, OutputFailed

__all__ = ["write_text"]


def write_text(text: str, path: str | os.PathLike[str], overwrite: bool = False) -> None:
    """Write a text to a file, as UTF-8.

    Args:
        text: what to write.
        path: the file; its folder exists.
        overwrite: whether a file that is there already may be replaced.

    Raises:
        OutputExists: the file is there already, and `overwrite` is False.
        OutputFailed: the folder is missing or cannot be written, or the disk is full.

    >>> write_text("", "no/such/folder.c")
    Traceback (most recent call last):
      ...
    newel.errors.OutputFailed: no/such/folder.c: there is no folder no/such; make it first
    """
    place = Path(path)
    if place.is_dir():
        raise OutputFailed(str(place), "is a folder; name a file in it")
    if not overwrite and os.path.lexists(place):
        raise OutputExists(str(place))
    if not place.parent.is_dir():
        raise OutputFailed(str(place), f"there is no folder {place.parent}; make it first")
    beside = place.with_name(f".{place.name}.{secrets.token_hex(4)}.part")
    try:
        with beside.open("x", encoding="utf-8", newline="\n") as stream:
            stream.write(text)
            stream.flush()
            os.fsync(stream.fileno())
        _put(beside, place, overwrite)
    except OutputExists:
        raise
    except (OSError, ValueError) as error:
        why = getattr(error, "strerror", None) or error
        raise OutputFailed(str(place), f"{why}; nothing was written") from error
    finally:
        beside.unlink(missing_ok=True)


def _put(beside: Path, place: Path, overwrite: bool) -> None:
    if overwrite:
        beside.replace(place)
        return
    # A hard link is refused where the name is taken, so that a file which came meanwhile is never lost.
    try:
        place.hardlink_to(beside)
    except FileExistsError:
        raise OutputExists(str(place)) from None
    except OSError:
        beside.replace(place)  # this file system has no hard links
