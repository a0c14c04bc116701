"""How far a march has got, shown on a terminal and nowhere else."""

from __future__ import annotations

import time as clock
from types import TracebackType
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from rich.console import Console
    from rich.progress import TaskID

__all__ = ["Progress", "open_progress"]

_EVERY_SECONDS = 0.1


class Progress:
    """A bar on stderr, with the time reached, the steps and their length; it goes away at the end.

    `update` may be called at every step: it draws at most ten times a second.

    Args:
        start, stop: the ends of the march, in the model's time unit.
        time_unit: the unit's name, or "".
        console: where to draw.
    """

    def __init__(self, start: float, stop: float, time_unit: str, console: Console) -> None:
        from rich.progress import BarColumn, TextColumn, TimeRemainingColumn
        from rich.progress import Progress as Bars

        self._start, self._stop, self._unit = start, stop, time_unit
        texts = (TextColumn("{task.percentage:>3.0f} %"), TextColumn("{task.description}", markup=False))
        columns = (BarColumn(bar_width=12), *texts, TimeRemainingColumn())
        self._bars = Bars(*columns, console=console, transient=True, auto_refresh=False)
        self._task: TaskID | None = None
        self._drawn = -float("inf")

    def __enter__(self) -> Progress:
        self._task = self._bars.add_task("", total=1.0)
        self._bars.start()
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self._bars.stop()

    def update(self, time: float, accepted: int, rejected: int, step: float) -> None:
        """Show where the march is.

        Args:
            time: the time reached. accepted, rejected: steps so far. step: the length of the last one.
        """
        now = clock.monotonic()
        if now - self._drawn < _EVERY_SECONDS or self._task is None:
            return
        self._drawn = now
        done = (time - self._start) / (self._stop - self._start)
        unit = f" {self._unit}" if self._unit else ""
        steps = f"{accepted:,} step{'' if accepted == 1 else 's'}"
        steps += f", {rejected:,} rejected" if rejected else ""
        text = f"t = {time:.6g}{unit}   {steps}   step {abs(step):.2g}{unit}"
        completed = min(max(float(done), 0.0), 1.0)
        self._bars.update(self._task, completed=completed, description=text, refresh=True)


def open_progress(
    enabled: bool, start: float, stop: float, time_unit: str, console: Console | None = None
) -> Progress | None:
    """A progress bar to be used in a `with` statement; None where it is not wanted or stderr is no terminal.

    >>> open_progress(False, 0.0, 1.0, "s") is None
    True
    """
    if not enabled:
        return None
    if console is None:
        import sys

        if sys.stderr is None or not sys.stderr.isatty():
            return None
        from rich.console import Console

        console = Console(stderr=True)
    return Progress(start, stop, time_unit, console) if console.is_terminal else None
