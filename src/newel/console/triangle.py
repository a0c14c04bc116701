"""A tableau as text: the usual triangle where it fits, else a list for each stage."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import TYPE_CHECKING

from newel.console.words import in_columns

if TYPE_CHECKING:
    from newel.methods.exact import Exact
    from newel.methods.tableau import Tableau

__all__ = ["as_text", "polynomial"]

_POWERS = str.maketrans("0123456789", "⁰¹²³⁴⁵⁶⁷⁸⁹")


def as_text(tableau: Tableau, width: int) -> str:
    """Return the nodes, matrix and weights in lines of at most a width, as far as one number fits into it.

    >>> from newel import find
    >>> print(as_text(find("heun-euler-2-1"), 80))
      0 │
      1 │   1
    ────┼─────────
        │ 1/2  1/2
        │   1    0
    """
    lines = _triangle(tableau, indent=2, gap=2)
    if max(map(len, lines)) > width:
        lines = _triangle(tableau, indent=0, gap=1)
    if max(map(len, lines)) > width:
        lines = list(_by_stages(tableau, width))
    if tableau.continuous_weights is not None:
        lines += ["", *_continuous(tableau, width)]
    return "\n".join(lines)


def _triangle(tableau: Tableau, indent: int, gap: int) -> list[str]:
    """Return the usual layout: nodes left, the matrix right, weights and embedded weights below the rule."""
    rows = [[str(x) for x in row[:i]] for i, row in enumerate(tableau.matrix)]
    last = [[str(x) for x in tableau.weights]]
    if tableau.embedded_weights is not None:
        last.append([str(x) for x in tableau.embedded_weights])
    widths = [0] * tableau.stages
    for row in (*rows, *last):
        for j, text in enumerate(row):
            widths[j] = max(widths[j], len(text))
    nodes = [str(x) for x in tableau.nodes]
    left = max(map(len, nodes)) + indent

    def line(head: str, row: Sequence[str]) -> str:
        cells = (" " * gap).join(text.rjust(width) for text, width in zip(row, widths, strict=False))
        return f"{head:>{left}} │ {cells}".rstrip()

    lines = [line(node, row) for node, row in zip(nodes, rows, strict=True)]
    rule = "─" * (left + 1) + "┼" + "─" * (sum(widths) + gap * (tableau.stages - 1) + 1)
    return [*lines, rule, *(line("", row) for row in last)]


def _by_stages(tableau: Tableau, width: int) -> Iterator[str]:
    """Yield each stage with its node and the entries that are not zero, by their number."""
    yield "  Entries that are not listed are 0."
    for i, (node, row) in enumerate(zip(tableau.nodes, tableau.matrix, strict=True), 1):
        yield from _cut(f"  stage {i}   c = {node}", width)
        yield from _entries(row, width)
    yield f"  weights, order {tableau.order}"
    yield from _entries(tableau.weights, width)
    if tableau.embedded_weights is not None:
        yield f"  embedded weights, order {tableau.embedded_order}"
        yield from _entries(tableau.embedded_weights, width)


def _entries(row: Sequence[Exact], width: int) -> Iterator[str]:
    texts = [f"{j:>2}: {x}" for j, x in enumerate(row, 1) if x]
    for line in in_columns(texts, width, "    "):
        yield from _cut(line, width)


def _cut(line: str, width: int) -> Iterator[str]:
    """Break a number that is longer than a line, before its denominator where that helps, else anywhere."""
    indent = " " * 8
    while len(line) > width:
        slash = line.rfind("/", len(indent) + 1, width)
        at = slash if slash > 0 else width
        yield line[:at]
        line = indent + line[at:]
    yield line


def _continuous(tableau: Tableau, width: int) -> Iterator[str]:
    yield f"  continuous weights, order {tableau.continuous_order}, at the fraction θ of a step"
    for j, row in enumerate(tableau.continuous_weights or (), 1):
        head = f"    {j:>2}: "
        for n, line in enumerate(_broken(polynomial(row), width - len(head))):
            yield (head if n == 0 else " " * len(head)) + line


def polynomial(row: Sequence[Exact]) -> str:
    """Return a polynomial in θ without a constant term, from its coefficients of θ, θ², …"""
    terms = []
    for power, x in enumerate(row, 1):
        if x:
            theta = "θ" if power == 1 else "θ" + str(power).translate(_POWERS)
            text = str(x)
            inside = f"({text})" if any(sign in text[1:] for sign in "+-") or "(" in text else text
            terms.append(theta if text == "1" else "-" + theta if text == "-1" else f"{inside}·{theta}")
    joined = " + ".join(terms).replace("+ -", "- ")
    return joined or "0"


def _broken(text: str, width: int) -> list[str]:
    """Break before a term."""
    lines: list[str] = []
    for word in text.replace(" + ", "\n+ ").replace(" - ", "\n- ").split("\n"):
        if lines and len(lines[-1]) + 1 + len(word) <= width:
            lines[-1] += " " + word
        else:
            lines.append(word)
    return lines
