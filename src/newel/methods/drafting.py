"""A tableau file to begin with: a skeleton to fill in, rows that were pasted, or what a draft still lacks."""

from __future__ import annotations

import os
from pathlib import Path

import attrs

from newel.errors import BadRequest, BadTableau
from newel.methods.completion import Completion, complete_weights, continuous_weights, embedded_partner
from newel.methods.draft_file import read_draft
from newel.methods.pasted import read_pasted
from newel.methods.pasted_tableau import tableau_of_rows
from newel.methods.skeleton import skeleton
from newel.methods.tableau import HIGHEST_ORDER, Tableau
from newel.methods.tableau_text import format_tableau
from newel.methods.text_file import write_text

__all__ = ["Draft", "draft"]

MOST_STAGES = 64


@attrs.frozen(kw_only=True)
class Draft:
    """What was written: the file's path and text, and lines on what was understood or solved for.

    `passed_over` holds lines on what is no row of numbers, `misfits` what does not hold together.
    `written` is False where a completed draft was only shown. `tableau` is None for a skeleton.
    """

    path: str
    text: str = attrs.field(repr=False)
    understood: tuple[str, ...] = ()
    passed_over: tuple[str, ...] = ()
    misfits: tuple[str, ...] = ()
    tableau: Tableau | None = attrs.field(default=None, repr=False)
    written: bool = True


def draft(
    path: str | os.PathLike[str],
    *,
    stages: int | None = None,
    order: int | None = None,
    embedded: int | None = None,
    pasted: str | None = None,
    complete: bool = False,
    overwrite: bool = False,
) -> Draft:
    """Begin a tableau file, or go on with one.

    With `stages` a skeleton is written in which every number is "?". With `pasted` the rows of a text that
    was copied out of a document are read into a file. With `complete` a file is read in which the weights, or
    those of [embedded] or [continuous], are still "?" or left out, and these are solved for exactly.

    Args:
        path: the file, which ends in `.toml`; its name is the slug.
        stages: the number of stages of a skeleton, 1 to 64.
        order: the order that the weights will claim; of pasted rows the proven one where it is left out.
        embedded: the order of an embedded formula.
        pasted: the text itself.
        complete: solve for what is missing.
        overwrite: replace a file that is there; with `complete`, write the file and not only return it.

    Raises:
        BadRequest: none or several of `stages`, `pasted` and `complete`, or nothing can be made of them.
        BadTableau: the path is no tableau's, or the file breaks a rule of the format.
        OutputExists, OutputFailed: the file cannot be written.

    >>> draft("mine.toml")
    Traceback (most recent call last):
      ...
    newel.errors.BadRequest: mine.toml: what to draft?
      Give one of: stages (--stages 4), pasted (--from pasted.txt), complete (--complete).
    """
    place = Path(path)
    if place.suffix != ".toml":
        raise BadTableau(
            f"ends in {place.suffix or 'nothing'}; a tableau file ends in .toml", file=str(place)
        )
    if (stages is not None) + (pasted is not None) + bool(complete) != 1:
        raise BadRequest(
            f"{place}: what to draft?\n"
            "  Give one of: stages (--stages 4), pasted (--from pasted.txt), complete (--complete).",
            argument="stages",
        )
    if complete:
        made = _completed(place, overwrite)
    elif pasted is not None:
        made = _from_pasted(place, pasted, order, embedded)
    else:
        made = _skeleton(place, stages or 0, order, embedded)
    if made.written:
        write_text(made.text, place, overwrite)
    return made


def _within(value: int | None, name: str, most: int) -> None:
    if value is not None and not (
        isinstance(value, int) and not isinstance(value, bool) and 1 <= value <= most
    ):
        raise BadRequest(f"{name}={value!r}: a whole number from 1 to {most} is allowed", argument=name)


def _skeleton(place: Path, stages: int, order: int | None, embedded: int | None) -> Draft:
    _within(stages, "stages", MOST_STAGES)
    _within(order, "order", HIGHEST_ORDER)
    _within(embedded, "embedded", HIGHEST_ORDER)
    blank = Tableau(place.stem, order=1, matrix=[[0] * i for i in range(stages)], weights=[0] * stages)
    return Draft(path=str(place), text=skeleton(blank, order or 1, embedded))


def _from_pasted(place: Path, text: str, order: int | None, embedded: int | None) -> Draft:
    _within(order, "order", HIGHEST_ORDER)
    _within(embedded, "embedded", HIGHEST_ORDER)
    found = read_pasted(text)
    tableau, lines, misfits = tableau_of_rows(place.stem, found, order, embedded)
    return Draft(
        path=str(place),
        text=format_tableau(tableau),
        understood=(*found.understood, *lines),
        passed_over=found.passed_over,
        misfits=(*found.misfits, *misfits),
        tableau=tableau,
    )


def _completed(place: Path, overwrite: bool) -> Draft:
    given, missing = read_draft(place)
    if not missing:
        raise BadRequest(
            f'{place}: nothing is missing\n  Weights to be solved for are "?", or left out below [embedded].',
            argument="complete",
        )
    steps: list[Completion] = []
    tableau = given
    if "weights" in missing:
        steps.append(complete_weights(tableau.matrix, tableau.nodes, slug=tableau.slug))
        solved = steps[-1].tableau
        tableau = attrs.evolve(tableau, order=solved.order, weights=solved.weights)
    if "embedded" in missing:
        steps.append(embedded_partner(tableau, order=missing["embedded"]))
        solved = steps[-1].tableau
        tableau = attrs.evolve(
            tableau, embedded_weights=solved.embedded_weights, embedded_order=solved.embedded_order
        )
    if "continuous" in missing:
        steps.append(continuous_weights(tableau, order=missing["continuous"]))
        tableau = steps[-1].tableau
    return Draft(
        path=str(place),
        text=format_tableau(tableau),
        understood=tuple(map(_told, steps)),
        tableau=tableau,
        misfits=() if given.order <= tableau.order else (_too_much(given.order, tableau.order),),
        written=overwrite,
    )


def _too_much(claimed: int, found: int) -> str:
    return f"order {claimed} was claimed; the matrix allows order {found}"


def _told(step: Completion) -> str:
    free = "no parameter is free" if not step.free else f"{step.free} free, by the {step.criterion}"
    return f"{step.part}: order {step.order}, {free}; error norm {step.error_norm:.3g}"
