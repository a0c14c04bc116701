"""What would spoil a march, found by calling a model's functions a few times."""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import Any

import numpy as np

from newel.models.findings import SEVERITIES, Examination, Finding
from newel.models.intake import copy_params, differs
from newel.models.model import Model
from newel.models.rate_checks import RateChecks, said

__all__ = ["Examination", "Finding", "examine"]


def examine(model: Model) -> Examination:
    """Call a model's functions a few times and report what would spoil a march.

    `rate` is called some ten times, at the start state or near it, and up to 200 times to measure its speed;
    the other functions once. Nothing is marched. The functions get a copy of the params.

    Example:
        >>> examination = examine(Model(lambda t, y: -y, start=0.0, stop=1.0, state=[1.0]))
        >>> examination.ok, examination.findings
        (True, ())
    """
    return _Examiner(model).examination()


class _Examiner:
    """The findings so far, and the calls that lead to them."""

    def __init__(self, model: Model) -> None:
        self.model = model
        self.params = copy_params(model.params)[0]
        self.extra = () if model.params is None else (self.params,)
        self.findings: list[Finding] = []

    def examination(self) -> Examination:
        for note in self.model.notes:
            self.add("note", "model", note)
        rate = RateChecks(self.model, self.params)
        rate.run()
        self.findings += rate.findings
        self.look_at_events()
        self.look_at_limits()
        self.look_at_changes()
        self.look_at_files()
        if differs(self.params, self.model.params):
            text = "a function changes the params: what it gives then depends on the calls before"
            self.add("error", "params", text)
        found = sorted(dict.fromkeys(self.findings), key=lambda finding: SEVERITIES.index(finding.severity))
        return Examination(tuple(found), rate.microseconds, rate.calls)

    def add(self, severity: str, subject: str, text: str) -> None:
        self.findings.append(Finding(severity, subject, text))

    def value_of(self, function: Callable[..., Any], subject: str) -> Any:
        """Return what a function of (t, y[, params]) gives at the start, or None after reporting why not."""
        y = self.model.state.copy()
        y.setflags(write=False)
        try:
            return function(self.model.start, y, *self.extra)
        except Exception as error:
            self.add("error", subject, f"raised {said(error)}")
            return None

    def look_at_events(self) -> None:
        for event in self.model.events:
            subject = f"event {event.label!r}"
            before = len(self.findings)
            value = self.value_of(event.indicator, subject)
            if len(self.findings) > before:
                continue
            try:
                number = float(value)
            except (TypeError, ValueError):
                self.add("error", subject, f"its indicator gives {value!r}, not a number")
                continue
            if isinstance(value, (bool, np.bool_)):
                self.add(
                    "error", subject, f"its indicator gives {value!r}; it must be a number that crosses zero"
                )
            elif not math.isfinite(number):
                self.add("error", subject, f"its indicator gives {number} at the start")
            elif number == 0.0:
                self.add("note", subject, "its indicator is zero at the start, which is no crossing")

    def look_at_limits(self) -> None:
        if callable(self.model.within):
            before = len(self.findings)
            inside = self.value_of(self.model.within, "within")
            if len(self.findings) == before and not isinstance(inside, (bool, np.bool_)):
                self.add("error", "within", f"gives {inside!r}; it must give True or False")
            elif len(self.findings) == before and not inside:
                self.add("error", "within", "the start state is outside the limits")

    def look_at_changes(self) -> None:
        for name in ("after_step", "after_stage"):
            function = getattr(self.model, name)
            changed = None if function is None else self.value_of(function, name)
            if changed is not None and np.shape(changed) != self.model.state.shape:
                text = (
                    f"gives shape {np.shape(changed)}, the state has {self.model.state.shape}; or return None"
                )
                self.add("error", name, text)

    def look_at_files(self) -> None:
        for path in self.model.files:
            if not path.is_file():
                self.add("error", "files", f"there is no file {path}")
