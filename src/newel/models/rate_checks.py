"""What would spoil a march in a model's rate, found by calling it a few times."""

from __future__ import annotations

import math
import time
import traceback
from typing import Any

import numpy as np

from newel.models.checks import finite, where
from newel.models.findings import Finding
from newel.models.intake import differs
from newel.models.model import Model
from newel.protocols import Array

__all__ = ["RateChecks", "said"]

SPEED_SECONDS = 0.02
SPEED_CALLS = 200
SENTINEL = 0.1234567890123


class RateChecks:
    """Calls a model's rate and collects `findings`; `calls` counts, `microseconds` is the time of one call.

    Args:
        model: whose rate is called.
        params: what it is called with, where the model has params.
    """

    def __init__(self, model: Model, params: Any) -> None:
        self.model = model
        self.extra = () if model.params is None else (params,)
        self.writable = model.copies
        self.findings: list[Finding] = []
        self.calls = 0
        self.microseconds: float | None = None
        self.returned_other = False
        self.finite_at_start = True

    def run(self) -> None:
        """Make every check that the ones before it leave sense in."""
        try:
            if self._look_at_first_call():
                self._look_at_repetition()
                if self.finite_at_start:
                    self._look_along_the_span()
                self.microseconds = self._speed()
        except Exception as error:
            self._error(f"raised {said(error)}, though an earlier call at the same t and y did not")

    def _error(self, text: str) -> None:
        self.findings.append(Finding("error", "rate", text))

    def _warning(self, text: str) -> None:
        self.findings.append(Finding("warning", "rate", text))

    def _note(self, text: str) -> None:
        self.findings.append(Finding("note", "rate", text))

    def _state(self) -> Array:
        y = self.model.state.copy()
        y.setflags(write=self.writable)
        return y

    def _rate(self, t: float, y: Array, fill: float = math.nan) -> Any:
        """Return what the engine would take from one call: the result, or `out` where the rate fills it."""
        self.calls += 1
        if not self.model.in_place:
            return self.model.rate(t, y, *self.extra)
        out = np.full_like(y, fill)
        returned = self.model.rate(t, y, out, *self.extra)
        self.returned_other = returned is not None and returned is not out
        return out

    def _look_at_first_call(self) -> bool:
        """Report whether one call gives a usable result; only then is there more to ask of the rate."""
        y = self._state()
        try:
            result = self._rate(self.model.start, y)
        except Exception as error:
            if not self.writable and "read-only" in str(error):
                return self._look_at_writable_call(error)
            hint = "; with the state first it works: wrap it, lambda t, y: rate(y, t)"
            self._error(f"raised {said(error)}{hint if self._works_swapped() else ''}")
            return False
        if differs(y, self.model.state) and not self.writable:
            self._error("writes to y, though it is handed over read-only; work on a copy: y = y.copy()")
        return self._look_at_result(result) and (not self.model.in_place or self._look_at_out())

    def _look_at_writable_call(self, refusal: Exception) -> bool:
        """Tell a rate that writes to y from a compiled one that takes only arrays that it could write to."""
        self.writable = True
        y = self._state()
        try:
            result = self._rate(self.model.start, y)
        except Exception as error:
            self._error(f"raised {said(error)}")
            return False
        # What NumPy itself refused was a write, though perhaps of the value that was there.
        refused = any(words in str(refusal) for words in ("assignment destination", "output array"))
        if refused or differs(y, self.model.state):
            self._error(f"writes to y ({said(refusal)}); work on a copy: y = y.copy()")
        else:
            self._note("needs an array that it may write to, and gets a copy at each call (copies=True)")
        return self._look_at_result(result) and (not self.model.in_place or self._look_at_out())

    def _works_swapped(self) -> bool:
        if self.model.in_place:
            return False
        try:
            result = np.asarray(self.model.rate(self._state(), self.model.start, *self.extra))
        except Exception:
            return False
        return result.shape == self.model.state.shape and result.dtype.kind in "fciu"

    def _look_at_result(self, result: Any) -> bool:
        state = self.model.state
        if result is None:
            self._error("returned None; return an array, or say in_place=True if it fills `out`")
            return False
        try:
            values = np.asarray(result)
        except ValueError as error:
            self._error(f"returned what is no array: {error}")
            return False
        if values.shape != state.shape:
            self._error(f"gives shape {values.shape}, the state has {state.shape}")
            return False
        if not self._dtype_fits(values):
            return False
        bad = ~finite(values).reshape(-1)
        if bad.any() and not self.model.in_place:
            self._report_not_finite(values, int(np.argmax(bad)))
        return True

    def _dtype_fits(self, values: Array) -> bool:
        given, kept = values.dtype, self.model.state.dtype
        if kept.kind == "O" or given == kept:
            return True
        if given.kind not in "biufc" or (given.kind == "c" and kept.kind != "c"):
            self._error(
                f"gives dtype {given}, which a state of {kept} cannot take; start from a state of {given}"
            )
            return False
        if not np.can_cast(given, kept):
            self._note(f"gives {given}, rounded to the state's {kept} at each call")
        return True

    def _report_not_finite(self, values: Array, i: int) -> None:
        self.finite_at_start = False
        place = f"{self.model.labels[i]!r} ({where(i, values.shape)})"
        self._error(f"gives {values.reshape(-1)[i]} in {place} at the start state")

    def _look_at_out(self) -> bool:
        first = self._rate(self.model.start, self._state()).reshape(-1)
        second = self._rate(self.model.start, self._state(), SENTINEL).reshape(-1)
        untouched = second == np.full_like(second, SENTINEL)
        if untouched.any():
            i = int(np.argmax(untouched))
            hint = (
                "; it returns an array: leave out in_place" if self.returned_other and untouched.all() else ""
            )
            count = int(untouched.sum())
            first_label = self.model.labels[i]
            text = f"leaves {count} of {len(second)} entries of out unwritten, first {first_label!r}{hint}"
            self._error(text)
            return False
        bad = ~finite(first)
        if (bad & finite(second)).any():
            self._error(
                "reads out before it writes it (adds to it, perhaps): out holds nothing to begin with"
            )
            return False
        if bad.any():
            self._report_not_finite(first.reshape(self.model.state.shape), int(np.argmax(bad)))
        return True

    def _look_at_repetition(self) -> None:
        start, stop = self.model.start, self.model.stop
        y = self._state()
        raw = self._rate(start, y)
        first = np.array(raw)
        again = self._rate(start, self._state())
        if isinstance(raw, np.ndarray) and not self.model.in_place:
            if np.may_share_memory(raw, y):
                self._note("returns memory of y itself; newel copies it at once")
            elif np.may_share_memory(raw, again):
                self._note("returns the same array each time; newel copies it at once, other code may not")
        if differs(first, np.array(again)):
            self._error(
                "gives two results for the same t and y: chance, a clock, or a memory of earlier calls"
            )
            return
        try:
            self._rate(start + (stop - start) / 3, np.multiply(self.model.state, 1.125))
            later = np.array(self._rate(start, self._state()))
        except Exception:  # another state need not be a valid one
            return
        if differs(first, later):
            self._error("has a memory: a call elsewhere changes what it gives for the same t and y")

    def _look_along_the_span(self) -> None:
        """Call the rate at other times of the span: tables that end early show here."""
        start, stop = self.model.start, self.model.stop
        low, high = sorted((start, stop))
        times = [start + (stop - start) / 2, stop, *(b for b in self.model.breaks if low <= b <= high)]
        for t in times[:20]:
            try:
                good = bool(finite(np.asarray(self._rate(t, self._state()))).all())
                if not good:
                    self._warning(f"is not finite for the start state at t = {t:g}")
            except Exception as error:
                self._warning(f"raised {said(error)} for the start state at t = {t:g}")

    def _speed(self) -> float:
        y, t = self._state(), self.model.start
        best, spent, left = math.inf, 0.0, SPEED_CALLS
        while left > 0 and spent < SPEED_SECONDS:
            before = time.perf_counter()
            self._rate(t, y)
            took = time.perf_counter() - before
            best, spent, left = min(best, took), spent + took, left - 1
        return best * 1e6


def said(error: Exception) -> str:
    """Return the exception on one line, with the place in the user's code where it was raised."""
    frames = [frame for frame in traceback.extract_tb(error.__traceback__) if frame.filename != __file__]
    place = f" ({frames[-1].filename.rpartition('/')[2]}:{frames[-1].lineno})" if frames else ""
    text = " ".join(str(error).split())
    return f"{type(error).__name__}: {text}{place}"
