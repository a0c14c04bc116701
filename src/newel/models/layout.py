"""A layout: names for the parts of one flat state."""

from __future__ import annotations

import math
from collections.abc import Iterator
from functools import cached_property
from types import SimpleNamespace
from typing import Any

import numpy as np

from newel.models.checks import bad, nearest
from newel.models.labels import IndexLabels
from newel.protocols import Array

__all__ = ["Layout"]


class Layout:
    """Names for the parts of a one-dimensional state, in the order given.

    Args:
        parts: for each part its shape: `()` for a single number, `(100,)` or `100` for a vector, `(4, 5)`
            for a grid in C order.

    Attributes:
        parts: the shape of each part, by name.
        size: how many entries the state has.

    Raises:
        BadModel: no part, a name that is no identifier or a reserved one, or a shape that is not one.

    Example:
        >>> layout = Layout(level=(), conc=(3,))
        >>> y = layout.pack(level=2.0, conc=[0.1, 0.2, 0.3])
        >>> layout.views(y).conc[1] = 0.5
        >>> y.tolist()
        [2.0, 0.1, 0.5, 0.3]
        >>> layout.labels
        ('level', 'conc[0]', 'conc[1]', 'conc[2]')
    """

    def __init__(self, /, **parts: int | tuple[int, ...]) -> None:
        if not parts:
            raise bad("layout", "a layout without parts", "Name each part: Layout(level=(), conc=(100,)).")
        self.parts: dict[str, tuple[int, ...]] = {name: _shape(name, given) for name, given in parts.items()}
        ends = np.cumsum([math.prod(shape) for shape in self.parts.values()]).tolist()
        starts = [0, *ends[:-1]]
        self._slices = {
            name: slice(start, stop) for name, start, stop in zip(self.parts, starts, ends, strict=True)
        }
        self.size: int = ends[-1]

    @cached_property
    def labels(self) -> IndexLabels:
        """A label for each entry in the order of the flat state: `level`, `conc[17]`, `grid[1,2]`."""
        return IndexLabels(self.parts)

    def owners(self) -> Iterator[str]:
        """Yield for each entry of the flat state the name of the part that it belongs to."""
        for name, shape in self.parts.items():
            yield from (name for _ in range(math.prod(shape)))

    def pack(self, /, **values: Any) -> Array:
        """Return a new flat array, shape (size,), from a value for every part that broadcasts to its shape.

        The dtype is what the values need: complex, longdouble or object where a value is, float32 where all
        values are float32 arrays, else float64.

        Raises:
            BadModel: a part is missing or unknown, or a value does not have the shape of its part.
        """
        for name in values:
            if name not in self.parts:
                what = f"pack: {name!r} is no part of {self!r}{nearest(name, self.parts)}"
                raise bad(name, what, f"Its parts: {', '.join(self.parts)}.")
        missing = [name for name in self.parts if name not in values]
        if missing:
            raise bad(missing[0], f"pack: no value for {', '.join(missing)}", "Give a value for every part.")
        arrays = {name: np.asarray(values[name]) for name in self.parts}
        kinds = [
            value.dtype if value.dtype.kind not in "biu" else np.dtype(float) for value in arrays.values()
        ]
        dtype = np.result_type(*kinds)
        if dtype.kind not in "fcO":
            raise bad("pack", f"pack: the values need dtype {dtype}", "Give numbers.")
        flat: Array = np.empty(self.size, dtype=dtype)
        for name, value in arrays.items():
            try:
                self._part(name, flat)[...] = value
            except (ValueError, TypeError) as error:
                what = f"pack: {name} has shape {value.shape}, its part {self.parts[name]}: {error}"
                raise bad(name, what, "Give a value that broadcasts to the shape of the part.") from None
        return flat

    def _part(self, name: str, y: Array) -> Array:
        return y[self._slices[name]].reshape(self.parts[name])

    def views(self, y: Array) -> SimpleNamespace:
        """Return the parts of a flat state by name, as views: nothing is copied, writing goes through.

        A single number is a view of shape (): it computes like a number, `views.level[...] = 2.0` writes it.

        Args:
            y: shape (size,), of any dtype and stride.

        Raises:
            BadModel: `y` has another shape.
        """
        if y.shape != (self.size,):
            raise bad("y", f"views: an array of shape {y.shape}", f"Give one of shape ({self.size},).")
        return SimpleNamespace(**{name: self._part(name, y) for name in self.parts})

    def __repr__(self) -> str:
        return f"Layout({', '.join(f'{name}={shape}' for name, shape in self.parts.items())})"

    def __eq__(self, other: object) -> bool:
        return isinstance(other, Layout) and list(self.parts.items()) == list(other.parts.items())

    def __hash__(self) -> int:
        return hash(tuple(self.parts.items()))


def _shape(name: str, given: Any) -> tuple[int, ...]:
    if name in {"t", "event"} or name.startswith("_"):
        raise bad(name, f"layout: a part named {name!r}", "t, event and names with a leading _ are reserved.")
    whole = isinstance(given, (int, np.integer)) and not isinstance(given, bool)
    shape = (given,) if whole else given
    good = isinstance(shape, (tuple, list)) and all(
        isinstance(n, (int, np.integer)) and not isinstance(n, bool) and n > 0 for n in shape
    )
    if not good:
        what = f"layout: the shape of {name} is {given!r}"
        raise bad(name, what, "Give () for one number, (100,) for a vector, (4, 5) for a grid.")
    return tuple(int(n) for n in shape)
