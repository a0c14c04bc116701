"""Words and styles that several commands share."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from textwrap import TextWrapper
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from newel.methods.order_conditions import Verdict

__all__ = ["OUTCOME_STYLES", "claims", "count", "filled", "float_floor", "in_columns", "orders", "value"]

OUTCOME_STYLES = {"exact": "green", "rounded": "cyan", "fails": "bold red", "unproven": "yellow"}
"""Colours only repeat what the word says."""


def count(number: int, word: str) -> str:
    """Return `1 step` or `1,832 steps`."""
    return f"{number:,} {word}{'' if number == 1 else 's'}"


def orders(order: int, embedded: int | None, continuous: int | None = None) -> str:
    """Return `5(4), continuous 4`."""
    pair = "" if embedded is None else f"({embedded})"
    dense = "" if continuous is None else f", continuous {continuous}"
    return f"{order}{pair}{dense}"


def claims(verdict: Verdict) -> str:
    """Return the proven orders of a verdict."""
    return orders(verdict.order, verdict.embedded_order, verdict.continuous_order)


def float_floor(verdict: Verdict, separator: str) -> str:
    """Return how well the float64 numbers keep the proven order; nothing where a claim fails."""
    return f"{separator} in float64 to {verdict.working_floor:.1e}" if verdict else ""


def filled(text: str, width: int, first: str, rest: str) -> str:
    """Return a text broken into lines, the first with one beginning and the others with another."""
    wrapper = TextWrapper(
        width=width,
        initial_indent=first,
        subsequent_indent=rest,
        break_on_hyphens=False,
        break_long_words=False,
    )
    return wrapper.fill(text) or first.rstrip()


def value(found: Any, digits: int = 4) -> str:
    """Return a property as people read it: floats to some digits, a long exact number by its first twelve."""
    if found is None:
        return "none"
    if isinstance(found, bool):
        return "yes" if found else "no"
    if isinstance(found, float):
        return f"{found:.{digits}g}"
    if isinstance(found, tuple):
        return ", ".join(map(value, found))
    text = str(found)
    return text if isinstance(found, (int, str)) or len(text) <= 30 else f"≈{float(found):.12g}"


def in_columns(texts: Sequence[str], width: int, indent: str) -> Iterator[str]:
    """Yield lines in which the texts stand in as many equal columns as fit."""
    widest = max(map(len, texts), default=1) + 2
    fit = max(1, (width - len(indent) + 2) // widest)
    for first in range(0, len(texts), fit):
        yield indent + "".join(text.ljust(widest) for text in texts[first : first + fit]).rstrip()
