"""Whose code an error came out of, and where it stands."""

from __future__ import annotations

import importlib
import inspect
from importlib.metadata import EntryPoint
from pathlib import Path

__all__ = ["blame", "place_of", "said", "shown"]


def place_of(thing: object) -> str:
    """Return `file:line` of a Python function or class, or an empty text."""
    try:
        target = inspect.unwrap(thing)  # type: ignore[arg-type]  # what is no function raises below
        return f"{inspect.getsourcefile(target)}:{inspect.getsourcelines(target)[1] or 1}"
    except (TypeError, OSError, ValueError):
        return ""


def blame(error: BaseException) -> str:
    """Return `file:line` of the plugin author's own code that an error came out of, or an empty text.

    That is the innermost frame below the folder of the first frame that is neither newel's nor Python's own
    import machinery: a failure inside a third library is put down to the line that called it.
    """
    if isinstance(error, SyntaxError) and error.filename:
        return f"{error.filename}:{error.lineno or 1}"
    own = (str(Path(__file__).parents[1]), "<frozen", importlib.__file__, inspect.getfile(EntryPoint))
    frames, trace = [], error.__traceback__
    while trace is not None:
        file = trace.tb_frame.f_code.co_filename
        if not file.startswith(own):
            frames.append((file, trace.tb_lineno))
        trace = trace.tb_next
    if not frames:
        return ""
    home = str(Path(frames[0][0]).parent)
    file, line = [frame for frame in frames if frame[0].startswith(home)][-1]
    return f"{file}:{line}"


def said(error: BaseException) -> str:
    """Return an error's type and text on one line."""
    return f"{type(error).__name__}: {error}" if str(error) else type(error).__name__


def shown(value: object) -> str:
    """Return the type of a value and the beginning of its repr."""
    text = repr(value)
    return f"{type(value).__name__} {text}" if len(text) <= 40 else f"{type(value).__name__} {text[:37]}…"
