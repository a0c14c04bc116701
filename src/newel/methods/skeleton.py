"""The skeleton of a tableau file: every key with a word on it, every number a question mark."""

from __future__ import annotations

from collections.abc import Iterator

from newel.methods.tableau import Tableau
from newel.methods.tableau_text import quoted

__all__ = ["skeleton"]


def skeleton(blank: Tableau, order: int, embedded: int | None = None) -> str:
    """Return a file to fill in, of the slug and stages of a tableau.

    >>> blank = Tableau("mine-2", order=1, matrix=[[], [0]], weights=[0, 0])
    >>> [line for line in skeleton(blank, 2).splitlines() if line.startswith("weights")]
    ['weights = ["?", "?"]']
    """
    return "\n".join(_blanks(blank, order, embedded)) + "\n"


def _blanks(blank: Tableau, order: int, embedded: int | None) -> Iterator[str]:
    s = blank.stages
    yield "# Fill in each ?, then: newel check " + f"{blank.slug}.toml"
    yield "# Weights that you do not have can stay ?: newel draft " + f"{blank.slug}.toml --complete"
    yield 'schema = "newel-tableau/1"'
    yield from _explained(
        (f"slug = {quoted(blank.slug)}", "the file's name without .toml"),
        (f"name = {quoted(blank.name)}", "the usual name, one line"),
        ("authors = []", 'such as ["A. Author", "B. Author"]'),
        ("# year = 1901", "when it was published"),
        ('source = ""', "where the numbers stand, as a citation"),
        ('numbers = "published"', 'or "derived", or "from memory"'),
        (f"order = {order}", "the order that weights claim"),
    )
    yield '# Numbers are texts: "1/3", "-0.25", "(5 - sqrt(5))/10". Rounded decimals need the line digits:'
    yield "# digits = 16               # significant digits that are to be trusted"
    yield "# c: leave nodes out where the source prints none; they find misprints."
    yield f"nodes = {_marks(s, first='0')}"
    yield "# a: row i holds the i - 1 numbers left of the diagonal."
    yield from ("matrix = [", *(f"  {_marks(i)}," for i in range(s)), "]")
    yield "# b: the solution that is carried on."
    yield f"weights = {_marks(s)}"
    if embedded is not None:
        yield from ("", "# The second solution, for the error estimate.", "[embedded]")
        yield from (f"order = {embedded}", f"weights = {_marks(s)}")
    yield from ("", "# Sentences for those who choose a method.", "[notes]")
    yield from ("strengths = []", "weaknesses = []", "known_failures = []", "remarks = []")


def _explained(*lines: tuple[str, str]) -> Iterator[str]:
    width = max(len(line) for line, _ in lines) + 2
    yield from (f"{line.ljust(width)}# {words}" for line, words in lines)


def _marks(count: int, first: str = "?") -> str:
    return "[" + ", ".join(f'"{first if i == 0 else "?"}"' for i in range(count)) + "]"
