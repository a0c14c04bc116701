"""Every pair on every problem of 1972: `python -m tests.problems.nonstiff_table [--all] [SLUG ...]`.

Marches the 25 problems of T. E. Hull, W. H. Enright, B. M. Fellen, A. E. Sedgwick (SIAM J. Numer. Anal. 9
(1972) 603-637) at rel_tol = abs_tol = 1e-3, 1e-6 and 1e-9 with every built-in pair and writes
nonstiff_table.json. By default only methods whose digest has changed, or that are new, are marched anew;
`--all` takes all of them, and slugs take those. A figure is the largest error of an entry at t = 20 over
what was asked of it, tol·(1 + |y|).
"""

from __future__ import annotations

import argparse
import json
import math
from concurrent.futures import ProcessPoolExecutor
from pathlib import Path
from typing import Any

import numpy as np

from tests.problems.arithmetic import Array
from tests.problems.nonstiff_1972 import NONSTIFF, STOP, Problem, references

__all__ = ["TABLE", "TOLERANCES", "Figure", "march_one", "pairs", "read_table", "tolerances_of"]

TABLE = Path(__file__).with_name("nonstiff_table.json")
TOLERANCES = ("1e-3", "1e-6", "1e-9")
MOST_CALLS = 20_000_000

Figure = dict[str, Any]
"""`error` (over the tolerance, None where t = 20 was not reached), `calls` of the rate, and `ended`."""


class TooManyCalls(Exception):
    """A march that calls its rate this often hangs."""


def pairs() -> dict[str, Any]:
    """The built-in tableaux with embedded weights, by slug."""
    from newel.catalogue.registry import Registry

    registry = Registry(folders=(), plugins=False)
    found = {slug: registry.find(slug) for slug in registry.names()}
    return {slug: tableau for slug, tableau in found.items() if tableau.embedded_weights is not None}


def tolerances_of(tableau: Any) -> tuple[str, ...]:
    """The tolerances that a pair is tried at: order-1 estimators not at 1e-9, orders from 10 not at 1e-3."""
    lower = min(tableau.order, tableau.embedded_order)
    return tuple(
        text
        for text in TOLERANCES
        if not (lower == 1 and text == "1e-9") and not (tableau.order >= 10 and text == "1e-3")
    )


def march_one(problem: Problem, method: Any, tolerance: str) -> Figure:
    """March one problem with one pair; the figure says how it ended, and only a fault of newel raises."""
    import newel

    calls = 0

    def rate(t: float, y: Array) -> Array:
        nonlocal calls
        calls += 1
        if calls > MOST_CALLS:
            raise TooManyCalls(f"{problem.name} at {tolerance}: more than {MOST_CALLS} calls")
        return problem.rate(t, y)

    model = newel.Model(rate, start=0.0, stop=STOP, state=problem.state)
    tol = float(tolerance)
    with np.errstate(all="ignore"):
        try:
            run = newel.march(model, method, rel_tol=tol, abs_tol=tol, sinks=[])
        except newel.MarchFailed as failure:
            return {"error": None, "calls": calls, "ended": f"failed: {failure.reason}"}
    expected = references(problem.name)[STOP]
    error = float(np.max(np.abs(run.last_state - expected) / (tol * (1.0 + np.abs(expected)))))
    reason = run.ended.reason if run.ended is not None else "unknown"
    return {"error": error if math.isfinite(error) else None, "calls": run.calls, "ended": reason}


def _row(slug: str, name: str) -> tuple[str, str, dict[str, Figure]]:
    from newel.catalogue.registry import Registry

    tableau = Registry(folders=(), plugins=False).find(slug)
    return slug, name, {text: march_one(NONSTIFF[name], tableau, text) for text in tolerances_of(tableau)}


def read_table() -> dict[str, Any]:
    """The committed table: by slug its `digest` and `problems`: by name, by tolerance, a `Figure`."""
    methods: dict[str, Any] = json.loads(TABLE.read_text(encoding="utf-8"))["methods"]
    return methods


def _short(figure: Figure) -> Figure:
    error = figure["error"]
    return figure | {"error": None if error is None else float(f"{error:.3g}")}


def write_table(methods: dict[str, Any]) -> None:
    """Write the table with one line a problem, methods in alphabetical order."""
    lines = [
        "{",
        ' "about": "made by python -m tests.problems.nonstiff_table; error over tol (1 + |y|) at t = 20",',
    ]
    lines.append(' "methods": {')
    slugs = sorted(methods)
    for slug in slugs:
        lines.append(f'  "{slug}": {{"digest": "{methods[slug]["digest"]}", "problems": {{')
        problems = methods[slug]["problems"]
        for name in NONSTIFF:
            short = {text: _short(figure) for text, figure in problems[name].items()}
            lines.append(f'   "{name}": {json.dumps(short)}' + ("," if name != "E5" else ""))
        lines.append("  }}" + ("," if slug != slugs[-1] else ""))
    lines += [" }", "}"]
    TABLE.write_text("\n".join(lines) + "\n", encoding="utf-8")


def main(arguments: list[str] | None = None) -> int:
    """March what is stale, or what is asked for, and write the table."""
    parser = argparse.ArgumentParser(prog="python -m tests.problems.nonstiff_table", description=__doc__)
    parser.add_argument("slugs", nargs="*", metavar="SLUG")
    parser.add_argument("--all", action="store_true", help="march every pair anew")
    parser.add_argument("--processes", type=int, default=2)
    asked = parser.parse_args(arguments)

    found = pairs()
    kept = read_table() if TABLE.exists() else {}
    methods = {slug: kept[slug] for slug in found if slug in kept}
    stale = [slug for slug in found if slug not in methods or methods[slug]["digest"] != found[slug].digest]
    chosen = list(found) if asked.all else asked.slugs or stale
    unknown = [slug for slug in chosen if slug not in found]
    if unknown:
        parser.error(f"no built-in pair has the slug {', '.join(unknown)}")
    tasks = [(slug, name) for slug in chosen for name in NONSTIFF]
    rows: dict[str, dict[str, Any]] = {slug: {} for slug in chosen}
    with ProcessPoolExecutor(max_workers=asked.processes) as pool:
        for slug, name, row in pool.map(_row, *zip(*tasks, strict=True)) if tasks else ():
            rows[slug][name] = row
            print(
                slug,
                name,
                *(f"{t}: {f['error']} {f['calls']} {f['ended']}" for t, f in row.items()),
                flush=True,
            )
            if len(rows[slug]) == len(NONSTIFF):
                methods[slug] = {"digest": found[slug].digest, "problems": rows[slug]}
                if set(stale) <= set(methods):
                    write_table(methods)
    write_table(methods)
    return 0


if __name__ == "__main__":
    raise SystemExit(main())
