"""Checks of what a model is given; each failure names the argument, the value, and what to do."""

from __future__ import annotations

import difflib
import inspect
import math
from collections.abc import Iterable
from typing import Any

import numpy as np

from newel.errors import BadModel
from newel.protocols import Array

__all__ = [
    "bad",
    "check_call",
    "check_labels",
    "finite",
    "flag",
    "nearest",
    "number",
    "text_tuple",
    "where",
    "within_pair",
]

TIME_NAMES = frozenset({"t", "time"})

RESERVED_LABELS = frozenset({"t", "event"})
"""Columns that every table of a run may have."""


def bad(argument: str, what: str, remedy: str) -> BadModel:
    """Return the error for one argument: what is wrong with its value, and what to do."""
    return BadModel(f"{what}\n  {remedy}", argument=argument)


def nearest(name: str, allowed: Iterable[str]) -> str:
    """Return "  Did you mean x?" for the allowed name nearest to `name`, or ""."""
    near = difflib.get_close_matches(name, list(allowed), n=1, cutoff=0.5)
    return f"  Did you mean {near[0]}?" if near else ""


def where(index: int, shape: tuple[int, ...]) -> str:
    """Return "entry 3 of 8", or "entry [2, 1] of (4, 5)", of a flat C-order index; both count from 1."""
    size = math.prod(shape)
    if len(shape) < 2:
        return f"entry {index + 1} of {size}"
    place = ", ".join(str(int(i) + 1) for i in np.unravel_index(index, shape))
    return f"entry [{place}] of {shape}"


def finite(values: Array) -> Array:
    """Return True where an entry is finite, for object arrays too (what has no size counts)."""
    if values.dtype != object:
        return np.asarray(np.isfinite(values))
    flat = [_object_is_finite(value) for value in values.reshape(-1)]
    return np.array(flat, dtype=bool).reshape(values.shape)


def _object_is_finite(value: Any) -> bool:
    try:
        return math.isfinite(abs(value))
    except OverflowError:  # an exact number beyond the range of floats is finite
        return True
    except TypeError:
        return True


def number(value: Any, argument: str) -> float:
    """Return `value` as a finite float, or raise BadModel naming the argument."""
    wrong = isinstance(value, (str, bytes, bool, np.bool_)) or value is None
    try:
        if wrong:
            raise TypeError
        result = float(value)
    except (TypeError, ValueError, OverflowError):
        raise bad(
            argument,
            f"{argument} is {value!r}, which is not a number",
            "Give a finite number in the model's time unit.",
        ) from None
    if not math.isfinite(result):
        raise bad(argument, f"{argument} is {result}", "Give a finite number in the model's time unit.")
    return result


def flag(value: Any, argument: str) -> bool:
    """Return `value` if it is True or False, or raise BadModel naming the argument."""
    if isinstance(value, (bool, np.bool_)):
        return bool(value)
    raise bad(argument, f"{argument} is {value!r}", "Give True or False.")


def text_tuple(value: Any, argument: str) -> tuple[str, ...]:
    """Return a sequence of texts as a tuple, or raise BadModel naming the argument."""
    if isinstance(value, str):
        raise bad(argument, f"{argument} is one text, {value!r}", f"Give a sequence of texts: ({value!r},).")
    try:
        texts = tuple(value)
    except TypeError:
        raise bad(argument, f"{argument} is {value!r}", "Give a sequence of texts.") from None
    for i, text in enumerate(texts, start=1):
        if not isinstance(text, str):
            raise bad(argument, f"{argument}: entry {i} is {text!r}, not a text", "Give a sequence of texts.")
    return tuple(str(text) for text in texts)


def check_call(function: Any, name: str, arguments: tuple[str, ...]) -> None:
    """Raise BadModel unless `function` can be called with these positional arguments.

    A function whose signature cannot be read (compiled ones, mostly) passes. One whose second parameter is
    named t or time, and whose first is not, is refused: its arguments are swapped.
    """
    form = f"{name}({', '.join(arguments)})"
    if not callable(function):
        raise bad(name, f"{name} is {function!r}, which cannot be called", f"Give a function: {form}.")
    try:
        signature = inspect.signature(function)
    except (ValueError, TypeError):
        return
    positional = [
        p.name
        for p in signature.parameters.values()
        if p.kind in (p.POSITIONAL_ONLY, p.POSITIONAL_OR_KEYWORD)
    ]
    if len(positional) > 1 and positional[1] in TIME_NAMES and positional[0] not in TIME_NAMES:
        rest = ", ".join(arguments)
        swapped = ", ".join((arguments[1], arguments[0], *arguments[2:]))
        raise bad(
            name,
            f"{name} takes ({', '.join(positional)}): the state first, the time second",
            f"Here the time comes first; wrap it: lambda {rest}: {name}({swapped})",
        )
    try:
        signature.bind(*arguments)
    except TypeError:
        raise BadModel(_wrong_count(name, form, signature, positional, arguments), argument=name) from None


def _wrong_count(
    name: str, form: str, signature: inspect.Signature, positional: list[str], arguments: tuple[str, ...]
) -> str:
    remedy = f"Write it as {form}, or wrap it in a lambda of that form."
    if len(positional) == len(arguments) + 1:
        if "out" in positional and "out" not in arguments and name == "rate":
            remedy = "If it fills its third argument, say in_place=True."
        elif "params" not in arguments:
            remedy = f"If {positional[-1]} is for parameters, give the model params=…; " + remedy
    elif len(positional) == len(arguments) - 1 and "params" in arguments:
        remedy = "The model has params, and hands them over as the last argument. " + remedy
    return f"{name}{signature} is called as {form}, and cannot be\n  {remedy}"


def check_labels(labels: tuple[str, ...]) -> None:
    """Raise BadModel for a label that is empty, unprintable, reserved for a column, or given twice."""
    seen: dict[str, int] = {}
    for i, label in enumerate(labels, start=1):
        if not label or label != label.strip() or not label.isprintable():
            raise bad(
                "labels",
                f"labels: entry {i} is {label!r}",
                "Give a printable text without space at its ends.",
            )
        if label in RESERVED_LABELS:
            raise bad(
                "labels",
                f"labels: entry {i} is {label!r}, the name of another column of every table",
                "Give another label.",
            )
        if label in seen:
            raise bad(
                "labels", f"labels: entries {seen[label]} and {i} are both {label!r}", "Give each its own."
            )
        seen[label] = i


def within_pair(given: Any, state: Array) -> tuple[Array, Array]:
    """Return (low, high) as read-only arrays of the state's dtype, checked against the start state."""
    remedy = "Give a pair (low, high) that broadcasts to the state, or a function within(t, y) -> bool."
    try:
        low, high = (np.array(limit, dtype=state.dtype) for limit in given)
        np.broadcast_to(low, state.shape), np.broadcast_to(high, state.shape)
        crossed = None if state.dtype.kind == "c" else not np.all(low <= high)
    except (TypeError, ValueError):
        raise bad("within", f"within is {given!r}", remedy) from None
    if crossed is None:
        raise bad(
            "within",
            "within is a pair, and complex states have no order",
            "Give a function within(t, y) -> bool.",
        )
    if crossed:
        raise bad("within", f"within: low is not at or below high: {given!r}", remedy)
    inside = np.broadcast_to((state >= low) & (state <= high), state.shape).reshape(-1)
    if not inside.all():
        i = int(np.argmin(inside.astype(bool)))
        raise bad(
            "within",
            f"state is {state.reshape(-1)[i]} at {where(i, state.shape)}, outside within",
            "Start from a state inside the limits, or widen them.",
        )
    for limit in (low, high):
        limit.setflags(write=False)
    return low, high
