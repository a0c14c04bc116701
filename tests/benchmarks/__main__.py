"""`python -m tests.benchmarks`: every speed figure, as a table and, with `--json FILE`, as JSON.

`OPENBLAS_CORETYPE` and `OPENBLAS_L2_SIZE` slow NumPy down where a machine sets them; they are taken out of
the environment first, in a new process, for a library reads them when it is loaded.
"""

from __future__ import annotations

import argparse
import datetime
import json
import os
import sys
from pathlib import Path

SLOWING = ("OPENBLAS_CORETYPE", "OPENBLAS_L2_SIZE")

# What is to be reached, by benchmark and figure.
REACH = {
    ("engine overhead, 3 components, adaptive 5(4)", "ratio"): 0.45,
    ("10⁶ components against memory traffic", "ratio"): 2.2,
    ("import", "ratio"): 1.4,
    ("list, cold", "newel list, s"): 0.5,
    ("proofs", "proof of prince-dormand-8-7, ms"): 50.0,
    ("proofs", "newel check --all, s"): 10.0,
}


def measured() -> dict[str, dict[str, float]]:
    """Run every benchmark."""
    from tests.benchmarks import engine, start

    works = {
        "engine overhead, 3 components, adaptive 5(4)": engine.overhead,
        "10⁶ components against memory traffic": engine.wide_state,
        "import": start.imports,
        "list, cold": start.list_cold,
        "proofs": start.proofs,
    }
    results = {}
    for name, work in works.items():
        print(f"{name} …", file=sys.stderr, flush=True)
        results[name] = work()
    return results


def main() -> None:
    """Measure, print, write."""
    parser = argparse.ArgumentParser(prog="python -m tests.benchmarks", description=__doc__)
    parser.add_argument("--json", type=Path, help="write the figures to this file")
    options = parser.parse_args()
    if any(name in os.environ for name in SLOWING):
        clean = {name: value for name, value in os.environ.items() if name not in SLOWING}
        print(f"without {' and '.join(SLOWING)} in the environment", file=sys.stderr)
        os.execve(sys.executable, [sys.executable, "-m", "tests.benchmarks", *sys.argv[1:]], clean)

    from rich.console import Console
    from rich.table import Table

    from newel.models.provenance import machine

    results = measured()
    table = Table(title="newel benchmarks")
    for heading in ("benchmark", "figure", "measured", "reach"):
        table.add_column(heading, justify="left" if heading in ("benchmark", "figure") else "right")
    for name, figures in results.items():
        for figure, value in figures.items():
            reach = REACH.get((name, figure))
            table.add_row(name, figure, f"{value:.3g}", "" if reach is None else f"≤ {reach:g}")
    Console().print(table)
    if options.json is not None:
        document = {
            "schema": "newel-benchmarks/1",
            "date": datetime.date.today().isoformat(),
            "machine": machine(),
            "figures": results,
        }
        options.json.write_text(json.dumps(document, indent=2, ensure_ascii=False) + "\n", encoding="utf-8")


if __name__ == "__main__":
    main()
