"""The languages that a tableau is exported to, and the one function that does it."""

from __future__ import annotations

from collections.abc import Callable
from difflib import get_close_matches
from importlib import import_module

import attrs

from newel.errors import BadRequest
from newel.methods.exports.numbers import check_digits
from newel.methods.tableau import Tableau

__all__ = ["LANGUAGES", "Language", "export_tableau"]


@attrs.frozen
class Language:
    """One language: what it is good for, and whether it takes digits and a step."""

    what: str
    takes_digits: bool = True
    takes_step: bool = False


LANGUAGES = {
    "latex": Language("displayed formulas for a paper"),
    "toml": Language("newel's own tableau file"),
    "c": Language("a C99 header of constant arrays", takes_step=True),
    "fortran": Language("a Fortran 2008 module of named constants", takes_step=True),
    "python": Language("a Python module of lists", takes_step=True),
    "bibtex": Language("the citation", takes_digits=False),
}
"""By name; each stands in a module of the same name."""


def export_tableau(
    tableau: Tableau, language: str, digits: int | None = None, with_step: bool = False
) -> str:
    """Return a tableau as the text of another language.

    Args:
        tableau: what to write.
        language: "latex", "toml", "c", "fortran", "python" or "bibtex".
        digits: significant digits, 1 to 100; None for exact numbers.
        with_step: add one step as a routine that needs nothing else; for c, fortran and python.

    Raises:
        BadRequest: no such language, digits out of range, or what the language does not take.

    >>> export_tableau(Tableau("euler-1", order=1, matrix=[[]], weights=[1]), "cobol")
    Traceback (most recent call last):
      ...
    newel.errors.BadRequest: 'cobol': no language of an export
      Languages: latex, toml, c, fortran, python, bibtex.
    """
    known = LANGUAGES.get(language) if isinstance(language, str) else None
    if known is None:
        near = get_close_matches(str(language).lower(), LANGUAGES, 1, 0.6)
        hint = f"; the nearest is {near[0]}" if near else ""
        raise BadRequest(
            f"{str(language)[:60]!r}: no language of an export{hint}\n  Languages: {', '.join(LANGUAGES)}.",
            argument="language",
        )
    check_digits(digits)
    if digits is not None and not known.takes_digits:
        raise BadRequest(
            f"digits={digits}: {language} holds no coefficients\n  Leave it out.", argument="digits"
        )
    if with_step and not known.takes_step:
        able = ", ".join(name for name, each in LANGUAGES.items() if each.takes_step)
        raise BadRequest(
            f"with_step: {language} has no routines\n  A step can be written in {able}.", argument="with_step"
        )
    write: Callable[..., str] = getattr(
        import_module(f"newel.methods.exports.{language}"), f"export_{language}"
    )
    settings = {"digits": digits} if known.takes_digits else {}
    return write(tableau, **settings, **({"with_step": with_step} if known.takes_step else {}))
