"""The labels of a state's entries, made when they are asked for: a field of 10⁶ cells costs nothing."""

from __future__ import annotations

import math
import re
from bisect import bisect_right
from collections.abc import Iterator, Mapping, Sequence
from itertools import accumulate
from typing import Any, overload

import numpy as np

__all__ = ["IndexLabels"]


class IndexLabels(Sequence[str]):
    """Labels such as `level`, `conc[17]`, `grid[1,2]` for named parts, in C order; compares like a tuple.

    Args:
        parts: the shape of each part by name; `()` is a single number, labelled with the bare name.

    Example:
        >>> labels = IndexLabels({"level": (), "conc": (1_000_000,)})
        >>> labels[0], labels[18], len(labels), labels.index("conc[17]")
        ('level', 'conc[17]', 1000001, 18)
    """

    def __init__(self, parts: Mapping[str, tuple[int, ...]]) -> None:
        self._parts = dict(parts)
        self._names = list(self._parts)
        self._ends = list(accumulate(math.prod(shape) for shape in self._parts.values()))

    def __len__(self) -> int:
        return self._ends[-1]

    @overload
    def __getitem__(self, index: int) -> str: ...
    @overload
    def __getitem__(self, index: slice) -> tuple[str, ...]: ...
    def __getitem__(self, index: int | slice) -> str | tuple[str, ...]:
        """Return one label, or a tuple of some; raises IndexError."""
        if isinstance(index, slice):
            return tuple(self[i] for i in range(*index.indices(len(self))))
        at = range(len(self))[index]
        part = bisect_right(self._ends, at)
        name = self._names[part]
        shape = self._parts[name]
        first = self._ends[part] - math.prod(shape)
        return _label(name, np.unravel_index(at - first, shape)) if shape else name

    def __iter__(self) -> Iterator[str]:
        for name, shape in self._parts.items():
            yield from (_label(name, index) for index in np.ndindex(shape)) if shape else (name,)

    def index(self, value: Any, start: int = 0, stop: int | None = None) -> int:
        """Return where a label stands; raises ValueError."""
        found = self._find(value)
        if found is None or not start <= found < (len(self) if stop is None else stop):
            raise ValueError(f"{value!r} is not among the labels")
        return found

    def __contains__(self, value: object) -> bool:
        return self._find(value) is not None

    def _find(self, value: object) -> int | None:
        match = re.fullmatch(r"(\w+)(?:\[(\d+(?:,\d+)*)\])?", value) if isinstance(value, str) else None
        if match is None or match[1] not in self._parts:
            return None
        shape = self._parts[match[1]]
        index = tuple(int(digits) for digits in match[2].split(",")) if match[2] else ()
        if len(index) != len(shape) or any(i >= n for i, n in zip(index, shape, strict=True)):
            return None
        first = self._ends[self._names.index(match[1])] - math.prod(shape)
        found = first + (int(np.ravel_multi_index(index, shape)) if shape else 0)
        return found if self[found] == value else None

    def __eq__(self, other: object) -> bool:
        if isinstance(other, IndexLabels):
            return list(self._parts.items()) == list(other._parts.items())
        return isinstance(other, tuple) and len(other) == len(self) and tuple(self) == other

    def __hash__(self) -> int:
        return hash(tuple(self._parts.items()))

    def __repr__(self) -> str:
        few = ", ".join(map(repr, self[:4])) + (", …" if len(self) > 4 else "")
        return f"({few})" if len(self) != 1 else f"({few},)"


def _label(name: str, index: Sequence[Any]) -> str:
    return f"{name}[{','.join(map(str, index))}]"
