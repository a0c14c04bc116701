"""BibTeX: where a method was published."""

from __future__ import annotations

from newel.methods.exports.latex_text import latex_text
from newel.methods.tableau import Tableau

__all__ = ["export_bibtex"]


def export_bibtex(tableau: Tableau) -> str:
    """Return one `@misc` entry whose key is the slug; the citation stands in it as the file has it.

    >>> t = Tableau("mine-1", order=1, matrix=[[]], weights=[1], authors=["A. Heun"], year=1900)
    >>> print(export_bibtex(t))
    @misc{mine-1,
      author = {A. Heun},
      title = {{mine-1}},
      year = {1900},
      note = {explicit Runge--Kutta method of order 1, 1 stage; newel slug \\texttt{mine-1}},
    }
    <BLANKLINE>
    """
    t = tableau
    pair = "" if t.embedded_order is None else f"({t.embedded_order})"
    stages = f"{t.stages} stage{'' if t.stages == 1 else 's'}"
    note = f"explicit Runge--Kutta method of order {t.order}{pair}, {stages}; newel slug \\texttt{{{t.slug}}}"
    fields = [
        ("author", " and ".join(map(latex_text, t.authors))),
        # A second pair of braces keeps the capitals of names through any bibliography style.
        ("title", f"{{{latex_text(t.name)}}}"),
        ("year", "" if t.year is None else str(t.year)),
        ("howpublished", latex_text(t.source)),
        ("note", note),
    ]
    body = "".join(f"  {key} = {{{text}}},\n" for key, text in fields if text)
    return f"@misc{{{t.slug},\n{body}}}\n"
