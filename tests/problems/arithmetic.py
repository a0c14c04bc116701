"""The few operations that a test problem needs, over floats and over mpmath numbers.

Each problem is written once, over an `Arithmetic`: in double precision it is what a march is given, in
high precision it is what the references are computed from. Constants are texts, so that 0.51 is the double
next to 51/100 in the one and 51/100 itself in the other.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

__all__ = ["FLOATS", "Arithmetic", "Array", "Build", "Rate", "high_precision"]

Array = NDArray[Any]
Rate = Callable[[Any, Array], Array]


@dataclass(frozen=True)
class Arithmetic:
    """`number` reads a decimal text; the functions take and return such numbers."""

    number: Callable[[str], Any]
    sqrt: Callable[[Any], Any]
    sin: Callable[[Any], Any]
    cos: Callable[[Any], Any]
    dtype: Any

    def vector(self, *texts: str) -> Array:
        """The numbers of some texts as one array."""
        return np.array([self.number(text) for text in texts], dtype=self.dtype)


Build = Callable[[Arithmetic], tuple[Rate, Array]]
"""Gives a problem's rate(t, y) and its state at t = 0 in one arithmetic."""

FLOATS = Arithmetic(float, math.sqrt, math.sin, math.cos, np.float64)


def high_precision() -> Arithmetic:
    """mpmath's numbers, at whatever precision is set in `mpmath.mp` when they are used."""
    import mpmath

    return Arithmetic(mpmath.mpf, mpmath.sqrt, mpmath.sin, mpmath.cos, object)
