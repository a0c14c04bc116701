"""The committed outcome of the full run: what is in it, and when it is stale."""

from __future__ import annotations

import hashlib
import json
from collections import Counter
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

from newel.methods.order_conditions import PROOF_VERSION, proof_key
from tests.independent.judging import unseen
from tests.mutation.moves import COMPENSATED, HALF_UNIT, SINGLE
from tests.mutation.trials import (
    MANY_STAGES,
    MOST_MOVES,
    Trial,
    all_moves,
    as_tableau,
    files,
    verdict_of,
    workshop,
)

HERE = Path(__file__).with_name("outcome.json")
SCHEMA = "newel-mutation/1"
MOST_UNITS = 1000
"""A least change that shows is large above this, in units of the last trusted digit."""


def made_from(slug: str) -> dict[str, str]:
    """The digests that an entry rests on: the numbers, the proof's key, and the names of all the moves."""
    file = files()[slug]
    tableau = as_tableau(workshop(file).document)
    names = "\n".join(map(str, all_moves(file)))
    moves = hashlib.sha256(names.encode()).hexdigest()
    return {"digest": tableau.digest, "key": proof_key(tableau), "moves": moves}


def is_fresh(slug: str, old: Mapping[str, Any]) -> bool:
    """Whether an entry was made from what is there today."""
    return all(old.get(name) == value for name, value in made_from(slug).items())


def entry(slug: str, trials: Sequence[Trial]) -> dict[str, Any]:
    """The entry of one method."""
    document = workshop(files()[slug]).document
    undetermined = list(verdict_of(document).undetermined)
    unexplained = [
        f"{trial.move} ({trial.mutant}): {trial.outcome}, but {trial.finding}"
        for trial in trials
        if not trial.agreed
    ]
    if undetermined != (found := unseen(document)):
        unexplained.append(f"{slug}: undetermined {undetermined}, but by the tree formulas {found}")
    unlisted = [trial for trial in trials if trial.survived and _unlisted(trial, undetermined)]
    unexplained += [
        f"{trial.move}: accepted, but its entry is not listed as undetermined" for trial in unlisted
    ]
    rounded = {"least_change_in_units": _units(trials)} if document.rounded else {}
    return {
        **made_from(slug),
        "mutants": dict(sorted(Counter(trial.move.kind for trial in trials).items())),
        "outcomes": dict(sorted(Counter(trial.outcome for trial in trials).items())),
        "judged_independently": sum(bool(trial.finding) for trial in trials),
        **rounded,
        "undetermined": undetermined,
        "survivors": _by_finding([trial for trial in trials if trial.survived]),
        "half_units_not_accepted": _by_finding([trial for trial in trials if trial.half_unit_rejected]),
        "unexplained": unexplained,
    }


def _unlisted(trial: Trial, undetermined: Sequence[str]) -> bool:
    """Whether an entry that may move together with its node is missing from the list of undetermined ones."""
    return trial.move.way == "with the node" and str(trial.move.direction[0][0]) not in undetermined


def _units(trials: Sequence[Trial]) -> dict[str, Any]:
    """The largest of the least changes that show, and each compensated one of more than 1000 units."""
    single = [trial.units for trial in trials if trial.move.kind == SINGLE]
    pairs = [trial for trial in trials if trial.move.kind == COMPENSATED]
    above = sorted((trial for trial in pairs if trial.units > MOST_UNITS), key=lambda trial: -trial.units)
    return {
        "single": float(f"{max(single, default=0.0):.3g}"),
        "compensated": float(f"{max((trial.units for trial in pairs), default=0.0):.3g}"),
        "above_1000": [f"{trial.move}: {trial.units:.3g}" for trial in above],
    }


def _by_finding(trials: Sequence[Trial]) -> dict[str, list[str]]:
    found: dict[str, list[str]] = {}
    for trial in trials:
        found.setdefault(trial.finding, []).append(f"{trial.move.way}: {trial.mutant}")
    return found


def totals_of(methods: Mapping[str, Any]) -> dict[str, int]:
    """The sums over all methods."""
    entries = list(methods.values())
    mutants = sum(sum(each["mutants"].values()) for each in entries)
    half = sum(each["mutants"].get(HALF_UNIT, 0) for each in entries)
    survivors = sum(len(words) for each in entries for words in each["survivors"].values())
    limited = sum(len(words) for each in entries for words in each["half_units_not_accepted"].values())
    return {
        "methods": len(entries),
        "mutants": mutants,
        "half_units": half,
        "half_units_not_accepted": limited,
        "rejected": mutants - half - survivors,
        "survivors_found_valid": survivors,
        "unexplained": sum(len(each["unexplained"]) for each in entries),
    }


def write_outcome(methods: Mapping[str, Any]) -> dict[str, int]:
    """Write the file; return the sums."""
    totals = totals_of(methods)
    data = {
        "schema": SCHEMA,
        "written_by": "python -m tests.mutation",
        "proof_version": PROOF_VERSION,
        "sampled": f"up to {MANY_STAGES} stages every move was tried, above that {MOST_MOVES} of a method",
        "totals": totals,
        "methods": dict(sorted(methods.items())),
    }
    HERE.write_text(json.dumps(data, indent=1, ensure_ascii=False) + "\n", encoding="utf-8", newline="\n")
    return totals


def read_outcome() -> dict[str, Any]:
    """The committed outcome."""
    data: dict[str, Any] = json.loads(HERE.read_text(encoding="utf-8"))
    return data
