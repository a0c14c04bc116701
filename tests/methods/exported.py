"""Readers of exported texts, which share no code with the writers: numbers back out of each language."""

import re

from newel.methods.exact import Exact, parse_exact
from newel.methods.tableau import Tableau
from newel.methods.tableau_file import parse_tableau


def read_c(text):
    """The five arrays of a C header, by their names without the prefix."""
    roots = {name: f"sqrt({d})" for name, d in re.findall(r"#define (\w+_SQRT_(\d+)) ", text)}
    name = re.search(r"static const double (\w+)_nodes\[", text)[1]
    found = {}
    for kind, shape, body in re.findall(
        rf"static const double {name}_(\w+?)((?:\[\d+\])+) = \{{(.*?)\}};", text, re.DOTALL
    ):
        for macro, root in roots.items():
            body = body.replace(macro, root)
        sizes = [int(n) for n in re.findall(r"\d+", shape)]
        rows = re.findall(r"\{(.*?)\}", body, re.DOTALL) if len(sizes) == 2 else [body]
        table = [[_number(item) for item in row.split(",") if item.strip()] for row in rows]
        assert len(table if len(sizes) == 2 else table[0]) == sizes[0]
        assert all(len(row) == sizes[-1] for row in table)
        found[kind] = table if len(sizes) == 2 else table[0]
    return found


def read_fortran(text):
    """The five arrays of a Fortran module; continued lines are joined first."""
    joined = re.sub(r"&\n\s*&", "", text)
    joined = re.sub(r"\s*&\n\s*", " ", joined)
    rows, found = {}, {}
    for name, body in re.findall(
        r"real\(real64\), parameter(?:, public)? :: (\w+)\([\d, ]+\) = (.*)", joined
    ):
        if body.startswith("reshape("):
            names = re.search(r"\[ (.*?) \]", body)[1].split(", ")
            found[name] = [rows[each] for each in names]
        else:
            items = body.strip("[] ").replace("_real64", "").split(",")
            rows[name] = [_number(item) for item in items]
    return found | {name: row for name, row in rows.items() if "_row_" not in name}


def read_python(text):
    """The constants of a Python module, by running it; floats of roots are read from its text instead."""
    exact = re.sub(r"Fraction\(\"(.*?)\"\)", r"\1", text)
    exact = re.sub(r"Fraction\((-?\d+), (\d+)\)", r"\1/\2", exact)
    exact = re.sub(r"Fraction\((-?\d+)\)", r"\1", exact)
    found = {}
    for name, body in re.findall(r"^([A-Z_]+) = \[(.*?)\]$", exact, re.DOTALL | re.MULTILINE):
        rows = re.findall(r"\[(.*?)\]", body, re.DOTALL) if "[" in body else None
        if rows is None:
            found[name.lower()] = [_number(item) for item in body.split(",") if item.strip()]
        else:
            found[name.lower()] = [[_number(i) for i in row.split(",") if i.strip()] for row in rows]
    return found


def read_latex(text):
    """Nodes, matrix and weights of the array; continuous weights of the polynomials."""
    first, *others = re.findall(r"\\begin\{array\}\{.*?\}\n(.*?)\\end\{array\}", text, re.DOTALL)
    above, below = first.split("\\hline\n")
    lines = [_cells(line) for line in above.strip().split("\n")]
    found = {"nodes": [_tex(cells[0]) for cells in lines]}
    found["matrix"] = [[_tex(c) for c in cells[1:] if c] for cells in lines]
    kinds = ("weights", "embedded_weights")
    for kind, line in zip(kinds, below.strip().split("\n"), strict=False):
        found[kind] = [_tex(c) for c in _cells(line)[1:]]
    if others:
        found["continuous_weights"] = [_polynomial(line) for line in others[0].strip().split("\n")]
    return found


def _cells(line):
    return [cell.strip() for cell in line.removesuffix("\\\\").split("&")]


def _tex(text):
    text = re.sub(r"\\sqrt\{(\d+)\}", r"*sqrt(\1)", text)
    text = re.sub(r"\\frac\{(.*?)\}\{(.*?)\}", r"((\1)/\2)", text)
    text = re.sub(r" \\cdot 10\^\{(-?\d+)\}", r"e\1", text)
    return _number(re.sub(r"(^|[(\-+]) *\*", r"\1", text.replace(" ", "")))


def _polynomial(line):
    body = _cells(line)[2]
    terms = {}
    # Signs inside braces and parentheses belong to a coefficient.
    body = re.sub(r"\{[^{}]*\}|\([^()]*\)", lambda m: m[0].replace("+", "P").replace("-", "M"), body)
    for sign, factor, power in re.findall(r"([-+]?) *([^-+]*?) *\\theta(?:\^\{(\d+)\})?", body):
        value = _tex(factor.replace("P", "+").replace("M", "-")) if factor else Exact(1)
        terms[int(power or 1)] = -value if sign == "-" else value
    return [terms.get(k, Exact(0)) for k in range(1, max(terms, default=1) + 1)]


def _number(text):
    """Read a number of a program: the `.0` of an integer does not make it a decimal."""
    return parse_exact(re.sub(r"(?<![\d.])(\d+)\.0(?![\de])", r"\1", text.strip()))


READERS = {"c": read_c, "fortran": read_fortran, "python": read_python, "latex": read_latex}


def read_back(text, language, like, digits=None):
    """Make a tableau again from an export, with the claims of the one that was exported."""
    if language == "toml":
        return parse_tableau(text)
    arrays = READERS[language](text)
    s = like.stages
    dense = arrays.get("continuous_weights")
    if dense is not None:
        width = max(map(len, dense))
        dense = [[*row, *[Exact(0)] * (width - len(row))] for row in dense]
    return Tableau(
        like.slug,
        order=like.order,
        nodes=arrays["nodes"],
        matrix=[row[:i] for i, row in zip(range(s), arrays["matrix"], strict=True)],
        weights=arrays["weights"],
        embedded_weights=arrays.get("embedded_weights"),
        embedded_order=like.embedded_order,
        continuous_weights=dense,
        continuous_order=like.continuous_order,
        digits=like.digits if digits is None else digits,
    )
