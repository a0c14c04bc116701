"""Cubic Hermite interpolation over one step: order 3, from both ends and their rates."""

from __future__ import annotations

from newel.protocols import Array

__all__ = ["CubicHermite"]


class CubicHermite:
    """The cubic through (y0, f0) and (y1, f1) over a step of length h (signed, in time units).

    The four arrays have one shape; they are read at each call, not copied.

    Source: E. Hairer, S. P. Nørsett and G. Wanner, Solving Ordinary Differential Equations I, section II.6.

    Example:
        >>> import numpy as np
        >>> cubic = CubicHermite(np.array([0.0]), np.array([0.0]), np.array([8.0]), np.array([12.0]), 2.0)
        >>> float(cubic(0.5)[0])  # t³ at t = 1
        1.0
    """

    def __init__(self, y0: Array, f0: Array, y1: Array, f1: Array, h: float) -> None:
        self.y0, self.f0, self.y1, self.f1, self.h = y0, f0, y1, f1, h

    def __call__(self, theta: float) -> Array:
        """Return the state at the fraction `theta` (0 to 1, unitless) of the step, a new array."""
        rest = 1.0 - theta
        result: Array = (
            (1.0 + 2.0 * theta) * rest**2 * self.y0
            + theta**2 * (3.0 - 2.0 * theta) * self.y1
            + self.h * theta * rest * (rest * self.f0 - theta * self.f1)
        )
        return result
