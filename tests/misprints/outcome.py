"""The committed outcome of the full run: what is in it, and when it is stale."""

from __future__ import annotations

import json
from collections import Counter
from collections.abc import Sequence
from pathlib import Path
from typing import Any

from tests.misprints.planting import Outcome, files, tableau

HERE = Path(__file__).with_name("misprints.json")
SCHEMA = "newel-misprints/1"
FIRST_SHARE = 0.98
"""Of the misprints on methods of order 3 and up, so many have the original value as the first repair."""


def summary(outcomes: Sequence[Outcome]) -> dict[str, Any]:
    """The counts; `not_listed` are misprints whose original value is not in the list at all."""
    upper = [each for each in outcomes if each.order >= 3]
    first = sum(each.rank == 1 for each in upper)
    return {
        "planted": len(outcomes),
        "by_kind": dict(sorted(Counter(each.planted.kind for each in outcomes).items())),
        "of_order_3_and_up": len(upper),
        "first_of_order_3_and_up": first,
        "first_share_of_order_3_and_up": round(first / max(1, len(upper)), 4),
        "not_listed": sum(not each.rank for each in outcomes),
    }


def missed(outcomes: Sequence[Outcome]) -> list[dict[str, Any]]:
    """Every misprint whose original value is not the first repair."""
    return [
        {
            "misprint": str(each.planted),
            "rank": each.rank,
            "as_near_as_the_first": each.equally_near,
            "found": list(each.found),
        }
        for each in sorted(outcomes, key=lambda each: str(each.planted))
        if each.rank != 1
    ]


def digests() -> dict[str, str]:
    """The digests of the methods that misprints are planted on."""
    return {slug: tableau(slug).digest for slug in files()}


def write_outcome(totals: dict[str, Any], outcomes: Sequence[Outcome]) -> None:
    """Write the file."""
    data = {
        "schema": SCHEMA,
        "written_by": "python -m tests.misprints",
        "totals": totals,
        "missed": missed(outcomes),
        "methods": digests(),
    }
    HERE.write_text(json.dumps(data, indent=1, ensure_ascii=False) + "\n", encoding="utf-8", newline="\n")


def read_outcome() -> dict[str, Any]:
    """The committed outcome."""
    data: dict[str, Any] = json.loads(HERE.read_text(encoding="utf-8"))
    return data
