"""Rows of a tableau as they come out of a PDF: read as far as they can be, and told what could not be.

Nodes may stand in front of the rows or not, with or without a bar; rows may be cut at the diagonal or be
full, and may be broken over lines. Which of these it is, the numbers tell: with nodes in front each row's
entries sum to its node.
"""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Iterator, Sequence
from fractions import Fraction

import attrs

from newel.errors import BadNumber, BadRequest
from newel.methods.exact import Exact, parse_exact

__all__ = ["Pasted", "read_pasted"]

LONGEST_TEXT = 200_000
MOST_STAGES = 64

_DASHES = dict.fromkeys(map(ord, "−–—‐‑‒﹣－"), "-")
_SLASHES = dict.fromkeys(map(ord, "⁄∕／"), "/")
_BARS = dict.fromkeys(map(ord, "│┃∣❘｜‖┆┊"), "|")
_PLAIN = {**_DASHES, **_SLASHES, **_BARS, ord("√"): "sqrt", ord("·"): "*", ord("×"): "*"}
_RULE = re.compile(r"[-_=─━┄+|┼ \t.]*")


@attrs.frozen(kw_only=True)
class Pasted:
    """Rows that were understood: exact numbers with their printed texts, and lines on how they were read.

    `nodes` is None where none were printed. `weights` holds the rows of weights in the order of the text.
    The other three are lines of words: how the rows were read, which lines of the text were passed over, and
    which rows do not sum to their nodes.
    """

    nodes: tuple[Exact, ...] | None
    matrix: tuple[tuple[Exact, ...], ...]
    weights: tuple[tuple[Exact, ...], ...]
    understood: tuple[str, ...]
    passed_over: tuple[str, ...]
    misfits: tuple[str, ...]


@attrs.frozen
class _Line:
    """One line of numbers; `bar` is how many of them stand left of a bar, or None without one."""

    number: int
    values: tuple[Exact, ...]
    bar: int | None


@attrs.frozen
class _Reading:
    """One way to read the numbers: nodes or None, rows below the diagonal, rows of weights."""

    nodes: tuple[Exact, ...] | None
    matrix: tuple[tuple[Exact, ...], ...]
    weights: tuple[tuple[Exact, ...], ...]
    how: str

    def misfits(self) -> list[int]:
        """Return the rows, counted from 1, that do not sum to their nodes within the digits printed."""
        if self.nodes is None:
            return []
        pairs = zip(self.nodes, self.matrix, strict=True)
        return [i for i, (node, row) in enumerate(pairs, 1) if abs(_sum(row) - node) > _slack(node, row)]


def read_pasted(text: str) -> Pasted:
    """Read the rows of a tableau from a text that was copied out of a document.

    Args:
        text: lines of numbers; other lines are passed over and reported. Odd spaces, Unicode minus signs and
            fraction slashes, ½ and its like, `\\frac{1}{2}`, `&` and bars are read.

    Raises:
        BadRequest: no tableau can be made out, or the text is too long.

    >>> found = read_pasted("0 │\\n½ │ ½\\n 1 │ −1  2\\n  │ 1 ⁄ 6 2/3 1/6")
    >>> [str(c) for c in found.nodes], [str(b) for b in found.weights[0]]
    (['0', '1/2', '1'], ['1/6', '2/3', '1/6'])
    """
    if len(text) > LONGEST_TEXT:
        raise BadRequest(f"{len(text):,} characters; paste the rows alone, at most {LONGEST_TEXT:,}")
    lines, strange = _lines(text)
    best = _best(_readings(lines))
    if best is None:
        shown = "\n".join(f"  {each}" for each in strange[:5])
        raise BadRequest(
            f"no tableau can be made out in {len(lines)} lines of numbers\n{shown + chr(10) if shown else ''}"
            "  Give one row a line: the node, its entries left to right, and the weights last.",
            argument="pasted",
        )
    misfits = [
        f"row {i} sums to {_told(_sum(best.matrix[i - 1]))}, its node is {best.nodes[i - 1]}"
        for i in best.misfits()
        if best.nodes is not None
    ]
    s = len(best.matrix)
    rows = f"{len(best.weights)} row{'' if len(best.weights) == 1 else 's'} of weights"
    return Pasted(
        nodes=best.nodes,
        matrix=best.matrix,
        weights=best.weights,
        understood=(f"{s} stages, {best.how}", rows),
        passed_over=tuple(strange),
        misfits=tuple(misfits),
    )


def _lines(text: str) -> tuple[list[_Line], list[str]]:
    """Return the lines of numbers, and words on the others."""
    found, strange = [], []
    for number, raw in enumerate(text.splitlines(), 1):
        line = _plain(raw)
        if _RULE.fullmatch(line):
            continue
        left, bar, right = line.partition("|")
        cells = [left, right.replace("|", " ")] if bar else [left]
        parts: list[list[Exact]] = []
        words: list[str] = []
        for cell in cells:
            read, others = _numbers(cell)
            parts.append(read)
            words += others
        values = tuple(x for part in parts for x in part)
        label = bool(bar) and not parts[0] and len(words) == 1 and _is_label(words[0])
        if words and not label:
            strange.append(f"line {number} was passed over, for {words[0][:30]!r}: {raw.strip()[:60]}")
        elif values:
            found.append(_Line(number, values, len(parts[0]) if bar else None))
    return found, strange


def _is_label(word: str) -> bool:
    return re.fullmatch(r"[A-Za-zŷŝb̂β^'*_0-9\u0300-\u036f]{1,6}:?", word) is not None


def _plain(raw: str) -> str:
    """Return a line in plain characters, with the spaces inside a number taken out."""
    line = re.sub(r"(\d)([½⅓⅔¼¾⅕⅖⅗⅘⅙⅚⅛⅜⅝⅞])", r"\1 \2", raw)
    line = unicodedata.normalize("NFKC", line).translate(_PLAIN)
    line = "".join(" " if unicodedata.category(c)[0] in "CZ" else c for c in line)
    line = re.sub(r"\\[dt]?frac\s*\{([^{}]*)\}\s*\{([^{}]*)\}", r"(\1)/(\2)", line)
    line = re.sub(r"\((\d+)\)/\((\d+)\)", r"\1/\2", line)
    line = re.sub(r"\\sqrt\s*\{?(\d+)\}?", r"sqrt(\1)", line)
    line = re.sub(r"\\(hline|cline\{.*?\}|\\)|[$&;]", " ", line)
    line = re.sub(r"sqrt\s*(\d+)", r"sqrt(\1)", line)
    line = re.sub(r"\s*([/*])\s*", r"\1", line)
    line = re.sub(r"(^|[\s|(])([-+])\s+(?=[\d.(s])", r"\1\2", line)
    line = re.sub(r"(\d),(?=\s|$)", r"\1 ", line)
    return re.sub(r"(\d|\))sqrt", r"\1*sqrt", _without_inner_spaces(line))


def _without_inner_spaces(line: str) -> str:
    depth, kept = 0, []
    for c in line:
        depth += (c == "(") - (c == ")")
        if c != " " or depth <= 0:
            kept.append(c)
    return "".join(kept)


def _numbers(cell: str) -> tuple[list[Exact], list[str]]:
    values, others = [], []
    for word in cell.split():
        try:
            values.append(parse_exact(re.sub(r"(?<=\d),(?=\d)", ".", word)))
        except BadNumber:
            others.append(word)
    return values, others


def _readings(lines: Sequence[_Line]) -> Iterator[_Reading]:
    """Yield every way to read the numbers, the most likely first."""
    headed = any(line.bar == 1 for line in lines)
    if headed:
        yield from _by_bars(lines)
    flat = tuple(x for line in lines for x in line.values)
    for stages in range(1, MOST_STAGES + 1):
        for extra in (1, 2):
            for nodes in (True,) if headed else (True, False):
                for full in (False, True):
                    yield from _by_count(flat, stages, extra, nodes, full)


def _by_bars(lines: Sequence[_Line]) -> Iterator[_Reading]:
    """Read rows with one number left of the bar as stages, and rows with none as weights."""
    barred = [line for line in lines if line.bar is not None or line.values]
    stages = [line for line in barred if line.bar == 1]
    rest = [line.values for line in barred if line.bar != 1 and line.values]
    s = len(stages)
    if not stages or not all(len(row) == s for row in rest) or not 1 <= len(rest) <= 2:
        return
    rows = [line.values[1:] for line in stages]
    if all(len(row) == i or (len(row) == s and not any(row[i:])) for i, row in enumerate(rows)):
        matrix = tuple(row[:i] for i, row in enumerate(rows))
        yield _Reading(tuple(line.values[0] for line in stages), matrix, tuple(rest), "nodes left of a bar")


def _by_count(flat: tuple[Exact, ...], s: int, extra: int, nodes: bool, full: bool) -> Iterator[_Reading]:
    """Read so many stages and rows of weights out of all numbers in one line, if the count is right."""
    sizes = [(s if full else i) + nodes for i in range(s)] + [s] * extra
    if sum(sizes) != len(flat):
        return
    rows, at = [], 0
    for size in sizes:
        rows.append(flat[at : at + size])
        at += size
    heads = tuple(row[0] for row in rows[:s]) if nodes else None
    body = [row[1:] if nodes else row for row in rows[:s]]
    if any(any(row[i:]) for i, row in enumerate(body)):
        return
    how = ("nodes in front" if nodes else "no nodes") + (", full rows" if full else "")
    yield _Reading(heads, tuple(row[:i] for i, row in enumerate(body)), tuple(rows[s:]), how)


def _best(readings: Iterator[_Reading]) -> _Reading | None:
    """Return the reading with the fewest misfits; weights that sum to 1 part those that are equal."""
    best, least = None, (0, 0)
    for each in readings:
        off = sum(abs(_sum(row) - 1) > _slack(Exact(1), row) for row in each.weights)
        rank = (len(each.misfits()) + off, off)
        # One slip in a row is a finding; a reading in which most things are off is a wrong reading.
        unsure = each.nodes is None and off == len(each.weights)
        if unsure or 2 * rank[0] > len(each.matrix) + len(each.weights):
            continue
        if best is None or rank < least:
            best, least = each, rank
    return best


def _sum(row: Sequence[Exact]) -> Exact:
    try:
        return sum((x for x in row if x), Exact(0))
    except BadNumber:  # two different roots
        return Exact.of(sum(map(float, row)))


def _told(x: Exact) -> str:
    return x.canonical if len(x.canonical) <= 20 else f"{float(x):.12g}"


def _slack(node: Exact, row: Sequence[Exact]) -> Fraction:
    """Return what the printed decimals leave open: a unit in the last place of each."""
    places = [len(str(x).partition(".")[2]) for x in (node, *row) if x.form == "decimal"]
    return Fraction(len(places), 10 ** min(places)) if places else Fraction(0)
