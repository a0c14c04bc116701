"""A Runge–Kutta step as a textbook prints it, in plain Python loops: what the engine is held against."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Any

Vector = list[Any]


def textbook_step(
    rate: Callable[[Any, Vector], Sequence[Any]],
    times: Sequence[Any],
    y: Sequence[Any],
    h: Any,
    matrix: Any,
    weights: Any,
) -> tuple[Vector, list[Vector]]:
    """Return the new state and the stage rates of one explicit step; stage i is evaluated at times[i].

    E. Hairer, S. P. Nørsett and G. Wanner, Solving Ordinary Differential Equations I, section II.1,
    definition 1.1.
    """
    rates: list[Vector] = []
    for i in range(len(weights)):
        stage = list(y)
        for j in range(i):
            stage = [s + h * matrix[i][j] * k for s, k in zip(stage, rates[j], strict=True)]
        rates.append(list(rate(times[i], stage)))
    new = list(y)
    for weight, k in zip(weights, rates, strict=True):
        new = [s + h * weight * entry for s, entry in zip(new, k, strict=True)]
    return new, rates
