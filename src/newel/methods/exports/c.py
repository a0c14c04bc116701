"""C99: constant arrays, and on request one step as a function."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from newel.methods.exact import Exact
from newel.methods.exports.numbers import Numerals, radicands, rounded_decimal
from newel.methods.exports.words import about, comment_lines, identifier
from newel.methods.tableau import Row, Tableau

__all__ = ["export_c"]

_ROOT_DIGITS = 40
_WIDTH = 100

_STEP = """
/*
 * The rate of change: writes dy/dt at (t, y) to out; y and out hold n numbers each. `user` is what was
 * handed to the step. NaN in out says that the rate cannot be evaluated there; it then reaches y_new.
 */
typedef void (*{name}_rate)(int64_t n, double t, const double *y, double *out, void *user);

/*
 * One step of length h (negative: backward) from (t, y) to y_new, which holds n numbers and may be y itself.
 * `work` has room for {rows}*n numbers: the {stages} stage rates, each of n, then the last stage state.
{error_words} */
static inline void {name}_step({name}_rate rate, void *user, int64_t n, double t, double h,
    const double *y, double *y_new, {error_argument}double *work)
{{
    double *state = work + {stages}*n;
    for (int stage = 0; stage < {stages}; stage++) {{
        for (int64_t i = 0; i < n; i++)
            state[i] = 0.0;
        for (int j = 0; j < stage; j++) {{
            const double a = {name}_matrix[stage][j];
            if (a != 0.0)
                for (int64_t i = 0; i < n; i++)
                    state[i] += a*work[j*n + i];
        }}
        for (int64_t i = 0; i < n; i++)
            state[i] = y[i] + h*state[i];
        rate(n, t + h*{name}_nodes[stage], state, work + stage*n, user);
    }}
    for (int64_t i = 0; i < n; i++) {{
        double sum = 0.0{error_sum};
        for (int j = 0; j < {stages}; j++) {{
            sum += {name}_weights[j]*work[j*n + i];{error_add}
        }}
        y_new[i] = y[i] + h*sum;{error_store}
    }}
}}
"""

_ERROR = {
    "error_words": " * `error` takes n numbers, y_new less the embedded solution; NULL: not wanted.\n",
    "error_argument": "double *error, ",
    "error_sum": ", difference = 0.0",
    "error_add": "\n            difference += ({name}_weights[j] - {name}_embedded_weights[j])"
    "*work[j*n + i];",
    "error_store": "\n        if (error)\n            error[i] = h*difference;",
}


def export_c(tableau: Tableau, digits: int | None = None, with_step: bool = False) -> str:
    """Return a C99 header with the tableau as `static const double` arrays.

    A fraction is a quotient such as `35.0/384.0`, a constant expression. Its double is the nearest one where
    both numbers are below 2^53, and within two units in the last place otherwise; so are roots, through a
    macro. With digits=17 every number is the nearest double.

    >>> t = Tableau("midpoint-2", order=2, matrix=[[], ["1/2"]], weights=[0, 1])
    >>> "static const double midpoint_2_nodes[2] = {0.0, 1.0/2.0};" in export_c(t)
    True
    """
    name = identifier(tableau)
    numerals = Numerals(lambda n: f"{n}.0", str, lambda d: f"{name.upper()}_SQRT_{d}", digits)
    numerals.check(tableau)
    return "\n".join(_lines(tableau, name, numerals, with_step)) + "\n"


def _lines(t: Tableau, name: str, numerals: Numerals, with_step: bool) -> Iterator[str]:
    guard = f"{name.upper()}_H"
    yield from ("/*", *(f" * {line}" for line in comment_lines(about(t, numerals.digits))), " */")
    yield from (f"#ifndef {guard}", f"#define {guard}", "")
    if with_step:
        yield from ("#include <stdint.h>", "")
    yield f"#define {name.upper()}_STAGES {t.stages}"
    yield f"#define {name.upper()}_ORDER {t.order}"
    if t.embedded_order is not None:
        yield f"#define {name.upper()}_EMBEDDED_ORDER {t.embedded_order}"
    if t.continuous_order is not None:
        yield f"#define {name.upper()}_CONTINUOUS_ORDER {t.continuous_order}"
    for d in radicands(t) if numerals.digits is None else ():
        yield f"#define {name.upper()}_SQRT_{d} {rounded_decimal(Exact(0, 1, d), _ROOT_DIGITS)}"
    yield ""
    yield from _row(name, "nodes", t.nodes, numerals)
    yield from _table(name, "matrix", t.matrix, numerals)
    yield from _row(name, "weights", t.weights, numerals)
    if t.embedded_weights is not None:
        yield from _row(name, "embedded_weights", t.embedded_weights, numerals)
    if t.continuous_weights is not None:
        yield "/* by stage: the coefficients of theta, theta^2, ... of the solution at t + theta*h */"
        yield from _table(name, "continuous_weights", t.continuous_weights, numerals)
    if with_step:
        yield _step(t, name).strip("\n")
    yield from ("", "#endif")


def _row(name: str, kind: str, row: Row, numerals: Numerals) -> Iterator[str]:
    yield from _filled(f"static const double {name}_{kind}[{len(row)}] = {{", row, numerals, "};")


def _table(name: str, kind: str, rows: Sequence[Row], numerals: Numerals) -> Iterator[str]:
    yield f"static const double {name}_{kind}[{len(rows)}][{len(rows[0])}] = {{"
    for row in rows:
        yield from _filled("    {", row, numerals, "},")
    yield "};"


def _filled(head: str, row: Row, numerals: Numerals, end: str) -> Iterator[str]:
    """Yield one braced list, on one line where it fits."""
    texts = [numerals.text(x) for x in row]
    whole = head + ", ".join(texts) + end
    if len(whole) <= _WIDTH:
        yield whole
        return
    indent = " " * (len(head) - len(head.lstrip()) + 4)
    yield head
    line = indent
    for text in texts:
        if len(line) + len(text) > _WIDTH and line.strip():
            yield line.rstrip()
            line = indent
        line += f"{text}, "
    yield line.rstrip().rstrip(",")
    yield f"{indent[4:]}{end}"


def _step(t: Tableau, name: str) -> str:
    pair = t.embedded_weights is not None
    words = {key: text.format(name=name) if pair else "" for key, text in _ERROR.items()}
    return _STEP.format(name=name, stages=t.stages, rows=t.stages + 1, **words)
