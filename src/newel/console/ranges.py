"""Values on the command line: numbers, lists and ranges of numbers, and values in TOML's grammar."""

from __future__ import annotations

import math
import re
from collections.abc import Iterable
from typing import Any

from newel.errors import BadRequest

__all__ = ["number", "numbers", "settings", "whole", "whole_numbers"]

_MOST = 1_000_000
_RANGE = re.compile(r"(?P<low>[^/]+?)\.\.(?P<high>[^/]+)/(?P<count>\d{1,9})(?P<log>log)?")
_FORMS = "Give 1,2,5 or 0..10/11 (11 values, ends included) or 1e-6..1e-2/9log."


def number(text: str, option: str) -> float:
    """Return a number. Raises BadRequest."""
    try:
        return float(text)
    except ValueError:
        shown = text if len(text) <= 60 else text[:57] + "…"
        raise BadRequest(
            f"{option} {shown}: no number\n  Give one such as 0.01 or 1e-6.", argument=option
        ) from None


def numbers(text: str, option: str) -> list[float]:
    """Return the numbers that a text such as `1,2,5`, `0..10/11` or `1e-6..1e-2/9log` stands for.

    Raises:
        BadRequest: for anything else.

    >>> numbers("0..1/5", "--at"), numbers("1e-2..1/3log", "--at")
    ([0.0, 0.25, 0.5, 0.75, 1.0], [0.01, 0.1, 1.0])
    """
    found: list[float] = []
    for part in text.split(","):
        match = _RANGE.fullmatch(part.strip())
        if match is None:
            if ".." in part:
                raise BadRequest(f"{option} {part[:60]}: no range\n  {_FORMS}", argument=option)
            if not part.strip():
                raise BadRequest(f"{option} {text[:60]}: a number is missing\n  {_FORMS}", argument=option)
            found.append(number(part, option))
        else:
            found += _between(match, option)
    return found


def _between(match: re.Match[str], option: str) -> list[float]:
    low, high = number(match["low"], option), number(match["high"], option)
    count = int(match["count"])
    problem = None
    if not (math.isfinite(low) and math.isfinite(high)):
        problem = "its ends must be finite"
    elif not 2 <= count <= _MOST:
        problem = f"{count:,} values; 2 to {_MOST:,} are possible"
    elif match["log"] and not (low > 0.0 and high > 0.0):
        problem = "a range in logarithms has positive ends"
    if problem is not None:
        raise BadRequest(f"{option} {match[0]}: {problem}\n  {_FORMS}", argument=option)
    parts = [i / (count - 1) for i in range(count)]
    if match["log"]:
        inner = [10.0 ** (math.log10(low) * (1 - part) + math.log10(high) * part) for part in parts]
    else:
        inner = [low * (1 - part) + high * part for part in parts]
    return [low, *inner[1:-1], high]


def whole(text: str, option: str) -> int:
    """Return a whole number. Raises BadRequest."""
    if not re.fullmatch(r"[+-]?\d{1,18}", text.strip()):
        raise BadRequest(f"{option} {text[:60]}: no whole number\n  Give one such as 5.", argument=option)
    return int(text)


def whole_numbers(text: str, option: str) -> list[int]:
    """Return the whole numbers of a text such as `5`, `4,5` or `4..6`. Raises BadRequest.

    >>> whole_numbers("1,4..6", "--order")
    [1, 4, 5, 6]
    """
    found: list[int] = []
    for part in text.split(","):
        low, dots, high = part.partition("..")
        first = whole(low, option)
        last = whole(high, option) if dots else first
        if last - first > 1000:
            raise BadRequest(
                f"{option} {part[:60]}: too many values\n  Give 5, or 4,5, or 4..6.", argument=option
            )
        found += range(first, last + 1)
    return found


def settings(texts: Iterable[str], option: str = "--set") -> dict[str, Any]:
    """Return what `name=value` texts set; a value is one of TOML's: a number, true, "text", [1, 2].

    Raises:
        BadRequest: for a text of another form, or a name that is set twice.

    >>> settings(["paddle=0.6", 'site="north"'])
    {'paddle': 0.6, 'site': 'north'}
    """
    found: dict[str, Any] = {}
    for text in texts:
        name, equals, value = text.partition("=")
        name = name.strip()
        if not equals or not name.isidentifier():
            raise BadRequest(f"{option} {text[:60]}: not of the form name=value", argument=option)
        if name in found:
            raise BadRequest(f"{option} {name} is given twice", argument=option)
        found[name] = _value(name, value, option)
    return found


def _value(name: str, text: str, option: str) -> Any:
    import tomllib

    try:
        data = tomllib.loads(f"value = {text}")
    except (ValueError, RecursionError):
        data = {}
    value = data.get("value")
    # TOML's integers have 64 bits; how long ones are read depends on what else set Python's own limit.
    beyond = isinstance(value, int) and not -(2**63) <= value < 2**63
    if list(data) == ["value"] and not beyond:
        return value
    shown = text if len(text) <= 60 else text[:57] + "…"
    lines = [
        f"{option} {name}={shown}: no value in TOML's grammar",
        f"  A number, true or false, [1, 2], or a text in quotation marks: {option} '{name}=\"north\"'",
    ]
    raise BadRequest("\n".join(lines), argument=option)
