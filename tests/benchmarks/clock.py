"""How the benchmarks measure: interleaved, the best of several, in the time that this process was given."""

from __future__ import annotations

import time
from collections.abc import Callable
from typing import Any

__all__ = ["best_each", "repeated"]


def best_each(rounds: int, **works: Callable[[], float]) -> dict[str, float]:
    """Run works in turn and return the least figure of each; a work returns its own figure."""
    figures = {name: float("inf") for name in works}
    for _ in range(rounds):
        for name, work in works.items():
            figures[name] = min(figures[name], work())
    return figures


def repeated(function: Callable[..., Any], *arguments: Any, times: int) -> float:
    """Return the processor seconds that one call takes, over many calls."""
    begin = time.process_time()
    for _ in range(times):
        function(*arguments)
    return (time.process_time() - begin) / times
