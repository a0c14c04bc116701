"""What every export says of its method, and names that a language takes."""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Iterator
from textwrap import wrap

from newel.methods.tableau import Tableau

__all__ = ["about", "comment_lines", "identifier"]

LONGEST_NAME = 40


def identifier(tableau: Tableau) -> str:
    """Return the slug as a name in C, Fortran and Python: letters, digits and underscores, a letter first.

    A long slug is cut and ends in the beginning of the method's digest, so that names stay apart within the
    63 characters that the languages guarantee.

    >>> identifier(Tableau("midpoint-2", order=2, matrix=[[], ["1/2"]], weights=[0, 1]))
    'midpoint_2'
    """
    name = tableau.slug.replace("-", "_")
    if not name[0].isalpha():
        name = f"method_{name}"
    if len(name) > LONGEST_NAME:
        name = f"{name[: LONGEST_NAME - 9].rstrip('_')}_{tableau.digest[:8]}"
    return name


def about(tableau: Tableau, digits: int | None = None) -> Iterator[str]:
    """Yield lines that say which method this is, whose, what is proved, and how its numbers are written."""
    t = tableau
    pair = "" if t.embedded_order is None else f"({t.embedded_order})"
    dense = "" if t.continuous_order is None else f", continuous {t.continuous_order}"
    last = ", the last stage is the first of the next step" if t.first_same_as_last else ""
    yield f"{t.name} ({t.slug})"
    yield f"order {t.order}{pair}{dense}, {t.stages} stage{'' if t.stages == 1 else 's'}{last}"
    who = ", ".join(t.authors) + (f" ({t.year})" if t.year else "")
    yield from (line for line in (who.strip(), t.source) if line)
    proof = "not proved" if t.proof is None else f"proof: {t.proof.outcome}"
    if t.proof is not None and t.proof.digits is not None:
        proof += f", {t.proof.digits} digits are trusted"
    yield f"numbers: {t.numbers}; {proof}"
    if digits is not None:
        yield f"rounded here to {digits} significant digits"
    yield f"digest {t.digest}"


def comment_lines(lines: Iterator[str], width: int = 96) -> Iterator[str]:
    """Yield the lines without control characters and comment ends, broken to a width."""
    for line in lines:
        plain = "".join(" " if unicodedata.category(c)[0] in "CZ" else c for c in line)
        plain = re.sub(r"\*/|/\*", "* /", " ".join(plain.split()))
        yield from wrap(plain, width, subsequent_indent="  ", break_on_hyphens=False) or [""]
