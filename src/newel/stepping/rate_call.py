"""The user's rate, bound once: checked on the first call, then as thin as it can be."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, Any

import numpy as np

from newel.errors import BadModel
from newel.protocols import Array

if TYPE_CHECKING:
    from newel.models.model import Model

__all__ = ["RateCall", "where_defined"]

Evaluate = Callable[[Any, Array, Array], None]

# What NumPy says to Python code that writes to a read-only array; such a rate is wrong, not compiled.
_WRITES = ("assignment destination is read-only", "output array is read-only")
# What compiled rates say that were declared with writable arguments.
_CANNOT_TAKE = ("read-only", "readonly", "not writable", "not writeable")


def where_defined(function: Any) -> str:
    """Return `plant.py:22` for a Python function, or the name of anything else."""
    code = getattr(function, "__code__", None)
    if code is None:
        return str(getattr(function, "__qualname__", type(function).__qualname__))
    return f"{code.co_filename.replace(chr(92), '/').rsplit('/', 1)[-1]}:{code.co_firstlineno}"


class RateCall:
    """Calls a model's rate so that the result lands in a row of the slab.

    `evaluate(t, y, out)` takes the time, a read-only state and a row to fill, both of the state's shape.
    What the rate returns is copied at once, so that a rate may return the same array each time.

    `call(t, y)`, or `call(t, y, out)` in place, is the bare call, for the engine's own loop, which then does
    what `evaluate` does.

    Args:
        model: the model whose rate is called.
        params: the params of this march (its own copy), passed exactly when the model has params.
    """

    def __init__(self, model: Model, params: Any) -> None:
        self.rate, self.in_place = model.rate, model.in_place
        self.extra: tuple[Any, ...] = () if model.params is None else (params,)
        self.shape, self.dtype = model.state.shape, model.state.dtype
        self.model = model
        self.copies = bool(model.copies)
        self.notes: list[str] = []
        self.call: Callable[..., Any] = self.rate
        self.evaluate: Evaluate = self._bound()

    def first(self, t: Any, y: Array, out: Array) -> None:
        """Make the first call, with every check that would be too dear later.

        Raises:
            BadModel: for a result of the wrong kind, shape or dtype, a write to `y`, an unwritten `out`.
        """
        try:
            self._checked_call(t, y, out)
        except (TypeError, ValueError, BufferError) as error:
            text = str(error)
            if any(words in text for words in _WRITES):
                raise BadModel(
                    f"rate writes to the state it is given ({where_defined(self.rate)}); the state is "
                    "read-only\n  Write y = y.copy() first, or newel.Model(..., copies=True).",
                    argument="rate",
                ) from error
            if self.copies or not any(words in text.lower() for words in _CANNOT_TAKE):
                raise
            self.copies = True
            self.evaluate = self._bound()
            self._checked_call(t, y, out)
            size = y.size * y.dtype.itemsize
            self.notes.append(
                f"rate cannot take a read-only state ({text}); it gets a private copy of {size:,} bytes at "
                "every call"
            )

    def _checked_call(self, t: Any, y: Array, out: Array) -> None:
        if not self.in_place or self.dtype == object:
            self.evaluate(t, y, out)
            return
        out[...] = np.nan
        self.evaluate(t, y, out)
        if not np.isnan(out).any():
            return
        # A NaN may be the rate's own; what keeps another filling through a second call was not written.
        suspects = np.isnan(out)
        out[...] = 1.0
        self.evaluate(t, y, out)
        unwritten = np.flatnonzero(suspects & (out == 1.0))
        if unwritten.size:
            names = ", ".join(self.model.labels[i] for i in unwritten[:6])
            more = "" if unwritten.size <= 6 else f" and {unwritten.size - 6} more"
            raise BadModel(
                f"rate left {unwritten.size} of {out.size} entries of out unwritten: {names}{more} "
                f"({where_defined(self.rate)})\n  An in-place rate fills every entry at every call.",
                argument="rate",
            )

    def take_params(self, extra: tuple[Any, ...]) -> None:
        """Pass other params from now on."""
        self.extra = extra
        self.evaluate = self._bound()

    def _bound(self) -> Evaluate:
        """Return the thinnest function that calls the rate in the way that it wants."""
        rate, extra = self.rate, self.extra
        if self.copies:

            def call(t: Any, y: Array, *more: Any) -> Any:
                return rate(t, y.copy(), *more, *extra)
        elif extra:

            def call(t: Any, y: Array, *more: Any) -> Any:
                return rate(t, y, *more, *extra)
        else:
            call = rate
        self.call = call
        if self.in_place:
            return call

        fit, shape, dtype, ndarray = self.fit, self.shape, self.dtype, np.ndarray

        def evaluate(t: Any, y: Array, out: Array) -> None:
            result = call(t, y)
            if result.__class__ is ndarray and result.dtype is dtype and result.shape == shape:
                out[...] = result
            else:
                out[...] = fit(result)

        return evaluate

    def fit(self, result: Any) -> Array:
        """Turn what the rate returned into an array of the state's shape and dtype, or say what is wrong."""
        where = where_defined(self.rate)
        if result is None:
            raise BadModel(
                f"rate returned None ({where})\n  Return the rate of change, or, for a rate that fills out, "
                "newel.Model(..., in_place=True).",
                argument="rate",
            )
        try:
            array = np.asarray(result)
        except ValueError as error:
            raise BadModel(
                f"rate returned rows of unequal length ({where}): {error}", argument="rate"
            ) from None
        if array.shape != self.shape:
            raise BadModel(
                f"rate returned shape {array.shape}, and the state has shape {self.shape} ({where})\n"
                "  Return one rate for each entry of the state.",
                argument="rate",
            )
        if array.dtype != self.dtype and not np.can_cast(array.dtype, self.dtype, casting="same_kind"):
            raise BadModel(
                f"rate returned dtype {array.dtype}, and the state has dtype {self.dtype} ({where})\n"
                f"  Give the model a state of dtype {array.dtype}, or return {self.dtype}.",
                argument="rate",
            )
        return array
