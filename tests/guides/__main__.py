"""Renew what the README and the guides show: `python -m tests.guides`.

A `text` block is replaced by what is printed now. One with `…` in it, and a block that fails,
are only reported.
"""

from __future__ import annotations

import sys
import tempfile
from pathlib import Path

from tests.guides.documents import documents, faults, runnable


def renew(path: Path) -> list[str]:
    """Renew one document; return what is left to be done by hand."""
    left = []
    text = path.read_text(encoding="utf-8")
    with tempfile.TemporaryDirectory() as folder:
        found = faults(runnable(path), Path(folder))
    for outcome in found:
        if outcome.error or outcome.shown is None or "…" in outcome.shown.text:
            left.append(f"{path.name}, {outcome}")
            continue
        before, after = f"```text\n{outcome.shown.text}```", f"```text\n{outcome.output.rstrip()}\n```"
        text = text.replace(before, after)
    path.write_text(text, encoding="utf-8")
    return left


if __name__ == "__main__":
    remaining = [line for path in documents() for line in renew(path)]
    print("\n".join(remaining) or "Everything is shown as it is.")
    sys.exit(1 if remaining else 0)
