"""What an examination found: data only."""

from __future__ import annotations

import html
from typing import Any

import attrs

__all__ = ["SEVERITIES", "Examination", "Finding"]

SEVERITIES = ("error", "warning", "note")


@attrs.frozen
class Finding:
    """One thing found: its `severity` ("error", "warning" or "note"), its `subject` and the `text`."""

    severity: str
    subject: str
    text: str


@attrs.frozen(repr=False)
class Examination:
    """What `examine` found.

    Attributes:
        findings: errors first, then warnings, then notes.
        microseconds: the time of one call of `rate`, the best of several, or None where it did not run.
        calls: how often `rate` was called.
    """

    findings: tuple[Finding, ...]
    microseconds: float | None
    calls: int

    @property
    def ok(self) -> bool:
        """Whether nothing was found that spoils a march: no finding is an error."""
        return not any(finding.severity == "error" for finding in self.findings)

    def to_data(self) -> dict[str, Any]:
        """Return the examination in a form fit for JSON."""
        return {
            "schema": "newel-examination/1",
            "ok": self.ok,
            "microseconds_per_call": self.microseconds,
            "calls": self.calls,
            "findings": [attrs.asdict(finding) for finding in self.findings],
        }

    def _verdict(self) -> str:
        speed = (
            "rate does not run"
            if self.microseconds is None
            else f"{self.microseconds:.3g} µs per call of rate"
        )
        return f"{'nothing spoils a march' if self.ok else 'this would spoil a march'}; {speed}"

    def __repr__(self) -> str:
        lines = [f"  {f.severity}: {f.subject}: {f.text}" for f in self.findings]
        return "\n".join([f"Examination: {self._verdict()}", *lines])

    def _repr_html_(self) -> str:
        cells = (
            f"<td>{f.severity}</td><td>{html.escape(f.subject)}</td><td>{html.escape(f.text)}</td>"
            for f in self.findings
        )
        rows = "".join(f"<tr>{cell}</tr>" for cell in cells)
        return f"<table><caption>{html.escape(self._verdict())}</caption>{rows}</table>"
