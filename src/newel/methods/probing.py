"""One call of somebody's step function under watch: what it asks of its rate, and what it gives back.

The rate handed to it is newel's own. It answers each call with a vector chosen beforehand, whatever it is
asked for, and keeps a copy of the question.
"""

from __future__ import annotations

import contextlib
import os
import traceback
import warnings
from collections.abc import Callable
from io import StringIO
from typing import Any, TypeAlias

import attrs
import numpy as np
from numpy.typing import NDArray

from newel.errors import NotRecovered

__all__ = ["MOST_CALLS", "Answers", "Seen", "StepFunction", "watch"]

Floats: TypeAlias = NDArray[np.float64]
StepFunction: TypeAlias = Callable[..., Any]
"""`step(rate, t, y, h) -> y_new`; or it changes `y` in place and returns None."""
Answers: TypeAlias = Callable[[int], Floats]
"""The vector that call number k, from 0, is answered with."""

MOST_CALLS = 512
MARGIN = 64


@attrs.frozen(eq=False)
class Seen:
    """What one call of the step function did.

    `times` has shape (s,) and `arguments` (s, n) for the s calls of the rate, `result` (n,) is the new state;
    `overwritten` tells that the y which was passed in has changed although another array came back, `printed`
    what was printed.
    """

    times: Floats
    arguments: Floats
    result: Floats
    overwritten: bool
    printed: str

    def same(self, other: Seen) -> bool:
        """Whether two calls asked and gave the same, to the bit."""
        pairs = ((self.times, other.times), (self.arguments, other.arguments), (self.result, other.result))
        return all(np.array_equal(a, b) for a, b in pairs)


class _Stop(Exception):
    """Raised inside the rate to end a step that cannot be read."""


class _Rate:
    """The rate that the step function is given."""

    def __init__(self, answers: Answers, length: int, plain: bool) -> None:
        self.answers, self.length, self.plain = answers, length, plain
        self.times: list[float] = []
        self.arguments: list[Floats] = []
        self.wrong: NotRecovered | None = None

    def __call__(self, t: Any, y: Any, *more: Any) -> Any:
        if len(self.times) >= MOST_CALLS:
            self._stop("calls", f"it calls its rate more than {MOST_CALLS} times in one step")
        out = more[0] if len(more) == 1 and isinstance(more[0], np.ndarray) else None
        if more and out is None:
            self._stop("signature", f"it calls its rate with {2 + len(more)} arguments; rate(t, y) has two")
        if np.ndim(t) and np.size(t) == self.length and np.ndim(y) == 0:
            self._stop("signature", "it calls its rate as rate(y, t); the order here is rate(t, y)")
        asked = np.array(y, dtype=np.float64).reshape(-1)
        if asked.size < self.length:
            self._stop(
                "shape", f"it calls its rate with {asked.size} numbers where the state has {self.length}"
            )
        answer = _padded(self.answers(len(self.times)))
        self.times.append(float(np.asarray(t).reshape(-1)[0]))
        self.arguments.append(asked[: self.length])
        if out is not None:
            out.reshape(-1)[: self.length] = answer
            return out
        return float(answer[0]) if self.plain else answer

    def _stop(self, reason: str, text: str) -> None:
        self.wrong = NotRecovered(text, reason=reason)
        raise _Stop(text)


def watch(step: StepFunction, t: float, y: Floats, h: float, answers: Answers, plain: bool = False) -> Seen:
    """Call a step function once and return what it did.

    Args:
        step: the function.
        t, y, h: what it is called with; y has shape (n,), and is handed over as a copy.
        answers: what its rate answers.
        plain: whether y and the rates are single floats in place of arrays of one entry.

    Raises:
        NotRecovered: it raises, never calls its rate, calls it wrongly or too often, or gives back no state.
    """
    rate = _Rate(answers, len(y), plain)
    given: Any = float(y[0]) if plain else _padded(y)
    sink = StringIO()
    try:
        with contextlib.redirect_stdout(sink), warnings.catch_warnings(), np.errstate(all="ignore"):
            warnings.simplefilter("ignore")
            returned = step(rate, t, given, h)
    except Exception as error:
        raise rate.wrong or _raised(error) from (None if rate.wrong else error)
    except SystemExit as error:
        raise NotRecovered(f"it calls sys.exit({error.code!r})", reason="raises") from None
    if rate.wrong is not None:
        raise rate.wrong
    if not rate.times:
        raise NotRecovered("it never calls its rate", reason="never calls")
    changed = not plain and not np.array_equal(given, y)
    result = _state(returned, given, len(y), changed)
    foreign = returned is not None and not np.shares_memory(np.asarray(result), given) if not plain else False
    return Seen(
        times=np.array(rate.times),
        arguments=np.array(rate.arguments),
        result=np.array(result),
        overwritten=changed and foreign,
        printed=sink.getvalue(),
    )


def _padded(values: Floats) -> Floats:
    """Return a copy with room behind it, so that code which reads on behind its end does no harm."""
    room = np.zeros(len(values) + MARGIN)
    room[: len(values)] = values
    return room[: len(values)]


def _state(returned: Any, given: Any, length: int, changed: bool) -> Floats:
    if returned is None:
        if not changed:
            raise NotRecovered("it returns nothing and leaves y as it was", reason="no state")
        return np.asarray(given, dtype=np.float64)
    candidates = [returned, *(returned if isinstance(returned, tuple) else ())]
    for each in candidates:
        try:
            values = np.asarray(each, dtype=np.float64).reshape(-1)
        except (TypeError, ValueError):
            continue
        if values.size == length and (each is returned or np.ndim(each) or length > 1):
            if not np.isfinite(values).all():
                raise NotRecovered("it returns NaN or infinity for finite rates", reason="not finite")
            return values
    shape = getattr(returned, "shape", None) or type(returned).__name__
    raise NotRecovered(f"it returns {shape} where the new state has {length} numbers", reason="no state")


def _raised(error: Exception) -> NotRecovered:
    frames = traceback.extract_tb(error.__traceback__)
    own = [frame for frame in frames if frame.filename != __file__]
    where = f" ({os.path.basename(own[-1].filename)}:{own[-1].lineno})" if own else ""
    return NotRecovered(f"it raises {type(error).__name__}: {error}{where}", reason="raises")
