"""LaTeX: the tableau as it stands in papers, in plain `array`s that need no package."""

from __future__ import annotations

from collections.abc import Iterator
from math import lcm

from newel.methods.exact import Exact
from newel.methods.exports.latex_text import latex_text
from newel.methods.exports.numbers import plain_decimal, rounded_decimal
from newel.methods.exports.words import about
from newel.methods.tableau import Row, Tableau

__all__ = ["export_latex"]

_SPACE = r"\renewcommand{\arraystretch}{1.4}"


def export_latex(tableau: Tableau, digits: int | None = None) -> str:
    r"""Return displayed formulas for a LaTeX document: the tableau, and continuous weights where there are.

    Nodes stand left of the bar, the weights below the line, embedded weights below those. Zeros on and above
    the diagonal are left blank.

    >>> text = export_latex(Tableau("midpoint-2", order=2, matrix=[[], ["1/2"]], weights=[0, 1]))
    >>> print("\n".join(text.splitlines()[6:11]))
    \begin{array}{c|cc}
    0 &  & \\
    \frac{1}{2} & \frac{1}{2} & \\
    \hline
    & 0 & 1 \\
    """
    return "\n".join(_lines(tableau, digits)) + "\n"


def _lines(t: Tableau, digits: int | None) -> Iterator[str]:
    yield from (f"% {latex_text(line)}" for line in about(t, digits))
    yield from (r"\[", "{" + _SPACE, rf"\begin{{array}}{{c|{'c' * t.stages}}}")
    for i, (node, row) in enumerate(zip(t.nodes, t.matrix, strict=True)):
        yield _line(_number(node, digits), row[:i], t.stages, digits)
    yield r"\hline"
    yield _line("", t.weights, t.stages, digits)
    if t.embedded_weights is not None:
        yield _line("", t.embedded_weights, t.stages, digits)
    yield from (r"\end{array}}", r"\]")
    if t.continuous_weights is not None:
        yield from (r"\[", "{" + _SPACE, r"\begin{array}{rcl}")
        for i, row in enumerate(t.continuous_weights, 1):
            yield rf"b_{{{i}}}(\theta) & = & {_polynomial(row, digits)} \\"
        yield from (r"\end{array}}", r"\]")


def _line(head: str, row: Row, stages: int, digits: int | None) -> str:
    cells = [head, *(_number(x, digits) for x in row)] + [""] * (stages - len(row))
    return f"{' & '.join(cells).rstrip()} \\\\"


def _polynomial(row: Row, digits: int | None) -> str:
    text = ""
    for power, x in enumerate(row, 1):
        if x:
            theta = r"\theta" if power == 1 else rf"\theta^{{{power}}}"
            factor = "" if abs(x) == 1 else f"{_factor(abs(x), digits)} "
            text += f" {'-' if x < 0 else '+'} {factor}{theta}"
    return text.removeprefix(" + ").strip() or "0"


def _factor(x: Exact, digits: int | None) -> str:
    text = _number(x, digits)
    return f"({text})" if " + " in text and not text.startswith(r"\frac") else text


def _number(x: Exact, digits: int | None) -> str:
    if digits is not None and (x.surd or x.rational.denominator != 1):
        return _decimal(rounded_decimal(x, digits))
    printed = plain_decimal(x)
    return _exact(x) if printed is None else _decimal(printed)


def _decimal(text: str) -> str:
    mantissa, _, power = text.partition("e")
    return rf"{mantissa} \cdot 10^{{{int(power)}}}" if power else mantissa


def _exact(x: Exact) -> str:
    sign, size = ("-", abs(x)) if x < 0 and not (x.rational and x.surd) else ("", x)
    below = lcm(size.rational.denominator, size.surd.denominator)
    above, factor = int(size.rational * below), int(size.surd * below)
    root = "" if not factor else rf"\sqrt{{{size.radicand}}}"
    root = f"{abs(factor)} {root}" if abs(factor) > 1 else root
    if not factor:
        top = str(above)
    elif not above:
        top = root
    else:
        top = f"{above} {'-' if factor < 0 else '+'} {root}"
    return sign + (top if below == 1 else rf"\frac{{{top}}}{{{below}}}")
