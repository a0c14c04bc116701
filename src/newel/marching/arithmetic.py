"""NumPy's floating-point warnings: newel's own sums are quiet, the user's functions keep theirs.

A stage that overflows or is no number is looked for and named by the march itself. NumPy would speak of the
engine's products as well, and where warnings are errors a step that could be shortened would end the march.
"""

from __future__ import annotations

import sys
import warnings
from typing import Any

import numpy as np

__all__ = ["own_sums_are_quiet"]

_KINDS = {"over": "overflow", "invalid": "invalid value", "under": "underflow"}


def own_sums_are_quiet() -> np.errstate:
    """Return a context in which overflow and invalid values inside newel go without NumPy's words.

    In the user's functions they do what the user set: NumPy's default, a warning, or an error. Nothing is
    paid for it where nothing overflows.

    Example:
        >>> with own_sums_are_quiet():
        ...     np.geterr()["invalid"]
        'call'
    """
    before: dict[str, Any] = dict(np.geterr())
    spoken = {_KINDS[kind]: before[kind] for kind in _KINDS if before[kind] in ("warn", "raise")}

    def heard(what: str, flag: int) -> None:
        if sys._getframe(1).f_globals.get("__name__", "").startswith("newel."):
            return
        text = f"{what} encountered"
        if spoken[what] == "raise":
            raise FloatingPointError(text)
        warnings.warn(text, RuntimeWarning, stacklevel=2)

    modes: dict[str, Any] = {kind: "call" for kind, what in _KINDS.items() if what in spoken}
    return np.errstate(call=heard, **modes) if modes else np.errstate()
