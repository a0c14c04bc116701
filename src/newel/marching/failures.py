"""The words for a march that could not go on."""

from __future__ import annotations

import math
import traceback
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from newel.stepping.rate_call import where_defined

if TYPE_CHECKING:
    from newel.models.model import Model
    from newel.stepping.numpy_step import NumpyStep

__all__ = ["CannotGoOn", "blame", "kept", "not_finite", "outside"]

_HOME = str(Path(__file__).resolve().parent.parent)
# The modules that call the user's functions.
_CALLERS = ("rate_call.py", "numpy_step.py", "crossings.py", "pacing.py")
# The module that raises in a user's function what NumPy was asked to raise there.
_LISTENER = "arithmetic.py"


class CannotGoOn(Exception):
    """Raised inside a march; the driver turns it into `newel.MarchFailed` with the run."""

    def __init__(self, reason: str, headline: str, advice: str = "") -> None:
        self.reason, self.headline, self.advice = reason, headline, advice
        super().__init__(headline)


def kept(rows: int, time: Any) -> str:
    """Return the line that says what was computed before the failure."""
    steps = "1 step" if rows == 1 else f"{rows:,} steps"
    return f"  Kept: {steps} up to t = {float(time):g} (error.run)." if rows else "  No step was made."


def not_finite(step: NumpyStep, model: Model, t: Any, h: Any) -> str:
    """Return the first line for a rate, or a state, that is not a finite number in the last attempt."""
    for stage in range(1, step.stages + 1):
        row = np.asarray(step.slab[stage])
        wrong = np.flatnonzero(~np.isfinite(row))
        if wrong.size:
            entry = int(wrong[0])
            time = t if stage == 1 else t + step.nodes[stage - 1] * h
            return (
                f"rate gave {_spelled(row[entry])} at t = {time:g} in {model.labels[entry]!r} "
                f"(entry {entry + 1} of {row.size})"
            )
    wrong = np.flatnonzero(~np.isfinite(step.new_flat))
    if wrong.size:
        entry = int(wrong[0])
        return f"the state overflows in the step from t = {t:g} in {model.labels[entry]!r}"
    return f"the error estimate is not a number in the step from t = {t:g}"


def outside(model: Model, state: Any, t: Any) -> str:
    """Return the first line for a state outside the model's `within`."""
    t = float(t)
    if model.within is None or callable(model.within):
        return f"the state leaves within at t = {t:g}"
    low, high = model.within
    wrong = np.flatnonzero(~((state >= low) & (state <= high)))
    entry = int(wrong[0]) if wrong.size else 0
    value = state.reshape(-1)[entry]
    place = f"entry {entry + 1} of {state.size}"
    return f"{model.labels[entry]!r} = {float(value):g} leaves within at t = {t:g} ({place})"


def _spelled(value: Any) -> str:
    if np.iscomplexobj(value):
        return "NaN" if np.isnan(value) else "infinity"
    return "NaN" if math.isnan(value) else ("infinity" if value > 0 else "-infinity")


def blame(error: BaseException, model: Model) -> str | None:
    """Return `rate raised ZeroDivisionError: … (plant.py:22)` for what a user's function raised.

    None where no function of the user's was running: the error is newel's own, and shows itself as it is.
    """
    frames = [f for f in traceback.extract_tb(error.__traceback__) if Path(f.filename).name != _LISTENER]
    ours = [i for i, frame in enumerate(frames) if frame.filename.startswith(_HOME)]
    deepest = ours[-1] if ours else -1
    below = frames[deepest + 1 :]
    if not below:
        # A compiled function leaves no frame of its own.
        calling = ours and Path(frames[deepest].filename).name in _CALLERS
        return f"rate raised {_told(error)} ({where_defined(model.rate)})" if calling else None
    own = next((frame for frame in reversed(below) if not _is_library(frame.filename)), below[0])
    place = f"{Path(own.filename).name}:{own.lineno}"
    return f"{_named(below, model)} raised {_told(error)} ({place})"


def _told(error: BaseException) -> str:
    text = str(error)
    return f"{type(error).__name__}: {text}" if text else type(error).__name__


def _is_library(filename: str) -> bool:
    return "site-packages" in filename or filename.startswith("<__array_function__")


def _named(frames: list[traceback.FrameSummary], model: Model) -> str:
    functions = [("rate", model.rate), ("after_step", model.after_step), ("after_stage", model.after_stage)]
    if callable(model.within):
        functions.append(("within", model.within))
    functions += [(f"the indicator of {event.label!r}", event.indicator) for event in model.events]
    for name, function in functions:
        code = getattr(function, "__code__", None)
        first = frames[0]
        if code is not None and (first.filename, first.name) == (code.co_filename, code.co_name):
            return name
    return "a function of the model"
