"""Python: lists of fractions or floats, and on request one step as a function, with nothing to install."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from newel.methods.exact import Exact
from newel.methods.exports.numbers import Numerals, plain_decimal
from newel.methods.exports.words import about, comment_lines
from newel.methods.tableau import Row, Tableau

__all__ = ["export_python"]

_WIDTH = 100

_STEP = '''

_A = [[float(a) for a in row] for row in MATRIX]
_B = [float(b) for b in WEIGHTS]
_C = [float(c) for c in NODES]
{error_floats}

def step(rate, t, y, h):
    """Make one step of length h (negative: backward) from (t, y), y a sequence of numbers.

    rate(t, y) returns dy/dt as a sequence as long as y; y is handed to it as a list of its own.
    Returns the new state as a list, and {error_words}.
    """
    rates = []
    for row, c in zip(_A, _C):
        sums = [sum(a * k[i] for a, k in zip(row, rates) if a) for i in range(len(y))]
        rates.append(list(rate(t + h * c, [x + h * s for x, s in zip(y, sums)])))
    new = [x + h * sum(b * k[i] for b, k in zip(_B, rates)) for i, x in enumerate(y)]
{error_computed}'''

_WITH_ERROR = {
    "error_floats": "_D = [float(b - e) for b, e in zip(WEIGHTS, EMBEDDED_WEIGHTS)]\n",
    "error_words": "what it is off the embedded solution, a list too",
    "error_computed": "    return new, [h * sum(d * k[i] for d, k in zip(_D, rates)) for i in range(len(y))]",
}
_WITHOUT = {
    "error_floats": "",
    "error_words": "None: there is no estimate",
    "error_computed": "    return new, None",
}


def export_python(tableau: Tableau, digits: int | None = None, with_step: bool = False) -> str:
    """Return a Python module with the tableau as lists: of `Fraction`, of floats where digits are asked for.

    A number with a square root is a float expression. Row i of MATRIX holds the entries left of the diagonal.

    >>> t = Tableau("midpoint-2", order=2, matrix=[[], ["1/2"]], weights=[0, 1])
    >>> "NODES = [Fraction(0), Fraction(1, 2)]" in export_python(t)
    True
    """
    numerals = Numerals(lambda n: f"{n}.0", str, lambda d: f"sqrt({d}.0)", digits)
    numerals.check(tableau)
    return "\n".join(_lines(tableau, numerals, with_step)) + "\n"


def _lines(t: Tableau, numerals: Numerals, with_step: bool) -> Iterator[str]:
    yield from (f"# {line}" for line in comment_lines(about(t, numerals.digits)))
    body = list(_constants(t, numerals))
    whole = "\n".join(body)
    imports = [
        line
        for word, line in (
            ("Fraction(", "from fractions import Fraction"),
            ("sqrt(", "from math import sqrt"),
        )
        if word in whole
    ]
    yield from (*imports, "") if imports else ()
    yield from body
    if with_step:
        yield _STEP.format(**(_WITHOUT if t.embedded_weights is None else _WITH_ERROR)).rstrip("\n")


def _constants(t: Tableau, numerals: Numerals) -> Iterator[str]:
    yield f"STAGES, ORDER = {t.stages}, {t.order}"
    yield from _list("NODES = [", t.nodes, numerals, "]")
    yield from _table("MATRIX", [row[:i] for i, row in enumerate(t.matrix)], numerals)
    yield from _list("WEIGHTS = [", t.weights, numerals, "]")
    if t.embedded_weights is not None:
        yield f"EMBEDDED_ORDER = {t.embedded_order}"
        yield from _list("EMBEDDED_WEIGHTS = [", t.embedded_weights, numerals, "]")
    if t.continuous_weights is not None:
        yield f"CONTINUOUS_ORDER = {t.continuous_order}"
        yield "# by stage: the coefficients of theta, theta**2, ... of the solution at t + theta*h"
        yield from _table("CONTINUOUS_WEIGHTS", t.continuous_weights, numerals)


def _table(name: str, rows: Sequence[Row], numerals: Numerals) -> Iterator[str]:
    yield f"{name} = ["
    for row in rows:
        yield from _list("    [", row, numerals, "],")
    yield "]"


def _list(head: str, row: Row, numerals: Numerals, end: str) -> Iterator[str]:
    texts = [_number(x, numerals) for x in row]
    whole = head + ", ".join(texts) + end
    if len(whole) <= _WIDTH:
        yield whole
        return
    indent = " " * (len(head) - len(head.lstrip()))
    yield from (head, *(f"{indent}    {text}," for text in texts), f"{indent}{end}")


def _number(x: Exact, numerals: Numerals) -> str:
    if numerals.digits is not None or x.surd:
        return numerals.text(x)
    printed = plain_decimal(x)
    if printed is not None:
        return f'Fraction("{printed}")'
    below = x.rational.denominator
    return f"Fraction({x.rational.numerator})" if below == 1 else f"Fraction({x.rational.numerator}, {below})"
