"""What a model owns: copies of its state and parameters, so that nothing changes behind its back."""

from __future__ import annotations

import dataclasses
import datetime
import numbers
import types
from collections.abc import Callable
from decimal import Decimal
from enum import Enum
from fractions import Fraction
from pathlib import PurePath
from typing import Any

import attrs
import numpy as np

from newel.models.checks import bad, finite, where
from newel.protocols import Array

__all__ = ["copy_params", "differs", "own_state"]

KEPT_DTYPES = frozenset("fdgFD")
"""The type characters of float32, float64, longdouble, complex64 and complex128."""

IMMUTABLE = (
    *(numbers.Number, np.generic, Fraction, Decimal, str, bytes, type(None), Enum, range, slice),
    *(datetime.date, datetime.time, datetime.timedelta, datetime.tzinfo, PurePath),
)


def own_state(value: Any) -> Array:
    """Return a read-only copy of a start state, in C order and native byte order.

    Integers and booleans become float64; float32, float64, longdouble, complex64, complex128 and object stay.

    Raises:
        BadModel: for another dtype, a ragged or empty array, a masked one, or an entry that is not finite.
    """
    if isinstance(value, np.ma.MaskedArray):
        raise bad("state", "state is a masked array, and a march has no masks", "Fill it: state.filled(0.0).")
    try:
        state = np.array(value, order="C")
    except (ValueError, TypeError) as error:
        what = f"state cannot be an array: {error}"
        raise bad("state", what, "Give numbers, or nested sequences of equal lengths.") from None
    if state.dtype.kind in "biu":
        state = state.astype(np.float64)
    state = state.astype(state.dtype.newbyteorder("="), copy=False)
    if state.dtype.char not in KEPT_DTYPES and state.dtype != object:
        raise bad(
            "state",
            f"state has dtype {state.dtype}",
            "Kept: float32, float64, longdouble, complex64, complex128, object; integers become float64.",
        )
    if state.size == 0:
        raise bad("state", f"state has no entries (shape {state.shape})", "Give at least one number.")
    _check_entries(state)
    state.setflags(write=False)
    return state


def _check_entries(state: Array) -> None:
    if state.dtype == object:
        for i, entry in enumerate(state.reshape(-1)):
            if entry is None or not (hasattr(entry, "__mul__") and hasattr(entry, "__sub__")):
                what = f"state holds {entry!r} at {where(i, state.shape)}"
                raise bad("state", what, "Give objects that can be added and multiplied.")
    good = finite(state).reshape(-1)
    if not good.all():
        i = int(np.argmin(good))
        what = f"state is {state.reshape(-1)[i]} at {where(i, state.shape)}"
        raise bad("state", what, "A march starts from finite numbers.")


def copy_params(params: Any) -> tuple[Any, tuple[str, ...]]:
    """Copy what can be copied of a model's parameters.

    Copied, however nested: arrays, and lists, tuples, named tuples, dicts, sets, simple namespaces, attrs and
    data classes. Numbers, texts and other immutable values need no copy. Anything else is kept as given.

    Returns:
        The copy, and one text such as `params['pump'] (Pump)` for each thing kept as given.
    """
    kept: list[str] = []
    copy = _copy(params, "params", kept, {})
    return copy, tuple(kept)


def _copy(value: Any, path: str, kept: list[str], seen: dict[int, Any]) -> Any:
    if isinstance(value, IMMUTABLE):
        return value
    if id(value) in seen:
        return seen[id(value)]
    copier = _copier(value)
    if copier is None:
        kept.append(f"{path} ({type(value).__name__})")
        return value
    return copier(value, path, kept, seen)


def _copier(value: Any) -> Callable[[Any, str, list[str], dict[int, Any]], Any] | None:
    kind = type(value)
    if isinstance(value, np.ndarray):
        return _copy_array
    if kind in (list, dict, set):
        return _copy_container
    if kind in (tuple, frozenset) or (isinstance(value, tuple) and hasattr(kind, "_make")):
        return _copy_tuple
    own_maker = any("__new__" in base.__dict__ for base in kind.__mro__[:-1])
    plain = (dataclasses.is_dataclass(value) or attrs.has(kind)) and not own_maker
    if kind is types.SimpleNamespace or (plain and not isinstance(value, type)):
        return _copy_fields
    return None


def _copy_array(value: Array, path: str, kept: list[str], seen: dict[int, Any]) -> Array:
    fresh = seen[id(value)] = value.copy()
    if fresh.dtype == object:
        flat = fresh.reshape(-1)
        for i, entry in enumerate(flat):
            flat[i] = _copy(entry, f"{path}[{i}]", kept, seen)
    return fresh


def _copy_container(value: Any, path: str, kept: list[str], seen: dict[int, Any]) -> Any:
    fresh = seen[id(value)] = type(value)()
    if isinstance(value, dict):
        for key, entry in value.items():
            fresh[key] = _copy(entry, f"{path}[{key!r}]", kept, seen)
    elif isinstance(value, list):
        fresh.extend(_copy(entry, f"{path}[{i}]", kept, seen) for i, entry in enumerate(value))
    else:
        fresh.update(_copy(entry, f"{path}{{…}}", kept, seen) for entry in value)
    return fresh


def _copy_tuple(value: Any, path: str, kept: list[str], seen: dict[int, Any]) -> Any:
    entries = [_copy(entry, f"{path}[{i}]", kept, seen) for i, entry in enumerate(value)]
    make = getattr(type(value), "_make", type(value))
    fresh = seen[id(value)] = make(entries)
    return fresh


def _copy_fields(value: Any, path: str, kept: list[str], seen: dict[int, Any]) -> Any:
    # Made without __init__: a class may check or convert there what it was once given in another form.
    make: Any = type(value).__new__
    fresh = seen[id(value)] = make(type(value))
    for name in _field_names(value):
        object.__setattr__(fresh, name, _copy(getattr(value, name), f"{path}.{name}", kept, seen))
    return fresh


def _field_names(value: Any) -> list[str]:
    names = [field.name for field in getattr(type(value), "__attrs_attrs__", ())]
    if dataclasses.is_dataclass(value):
        names += [field.name for field in dataclasses.fields(value)]
    names += list(getattr(value, "__dict__", ()))
    return [name for name in dict.fromkeys(names) if hasattr(value, name)]


def differs(one: Any, other: Any) -> bool:
    """Whether two values, copies of each other at first, differ now; NaN equals NaN.

    Looks into what `copy_params` copies; other things differ only if they are other things.
    """
    return _differs(one, other, set())


def _differs(one: Any, other: Any, seen: set[tuple[int, int]]) -> bool:
    if one is other or (id(one), id(other)) in seen:
        return False
    if type(one) is not type(other):
        return True
    if isinstance(one, IMMUTABLE):
        return bool(one != other) and not bool(one != one and other != other)
    if isinstance(one, (set, frozenset)):
        return bool(one != other)
    seen.add((id(one), id(other)))  # containers may hold themselves
    if isinstance(one, np.ndarray):
        return _arrays_differ(one, other, seen)
    if isinstance(one, dict):
        return one.keys() != other.keys() or any(_differs(one[key], other[key], seen) for key in one)
    if isinstance(one, (list, tuple)):
        pairs = zip(one, other, strict=False)
        return len(one) != len(other) or any(_differs(*pair, seen) for pair in pairs)
    return any(_differs(getattr(one, name), getattr(other, name), seen) for name in _field_names(one))


def _arrays_differ(one: Array, other: Array, seen: set[tuple[int, int]]) -> bool:
    if one.shape != other.shape or one.dtype != other.dtype:
        return True
    if one.dtype == object:
        return any(_differs(*pair, seen) for pair in zip(one.reshape(-1), other.reshape(-1), strict=True))
    return bool(np.any((one != other) & ~((one != one) & (other != other))))
