"""Folders of tableau files that belong to the user."""

from __future__ import annotations

import os
from collections.abc import Iterable
from pathlib import Path

from newel.catalogue.plugins import Offer, Origin, Problem
from newel.errors import BadRequest

__all__ = ["named_folders", "offers_in"]

VARIABLE = "NEWEL_TABLEAUX"


def named_folders() -> tuple[Path, ...]:
    """Return the folders that `NEWEL_TABLEAUX` lists, separated as in PATH."""
    return tuple(Path(part).expanduser() for part in os.environ.get(VARIABLE, "").split(os.pathsep) if part)


def offers_in(
    folders: Iterable[Path], *, from_variable: bool
) -> tuple[list[Offer], list[Origin], list[Problem]]:
    """Return the tableau files in folders and in the folders directly in them, by file name, unread.

    Raises:
        BadRequest: if a folder that was given by argument is none. One that only `NEWEL_TABLEAUX` names is a
            problem to be reported, because it must not stop a program that never asks for it.
    """
    offers: list[Offer] = []
    origins: list[Origin] = []
    problems: list[Problem] = []
    for folder in dict.fromkeys(each.absolute() for each in folders):
        origin = Origin("folder", str(folder), where=str(folder))
        origins.append(origin)
        try:
            files = sorted(_tableau_files(folder))
        except OSError as error:
            reason = f"{folder}: no folder of tableaux: {error.strerror}"
            if not from_variable:
                remedy = "Give a folder that holds files such as my-method-3.toml."
                raise BadRequest(f"{reason}\n  {remedy}", argument="folders") from None
            remedy = f"Left out: this folder. Everything else works.  Correct {VARIABLE}."
            problems.append(Problem(origin, f"{reason}\n  {remedy}"))
            continue
        offers += [Offer("tableau", file.stem, file, origin, str(file)) for file in files]
    return offers, origins, problems


def _tableau_files(folder: Path) -> Iterable[Path]:
    """Yield the TOML files in a folder and one level below; hidden ones are none."""
    for entry in folder.iterdir():
        below = entry.iterdir() if entry.is_dir() and not entry.name.startswith(".") else [entry]
        yield from (file for file in below if file.suffix == ".toml" and not file.name.startswith("."))
