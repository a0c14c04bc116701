"""Plant misprints over the catalogue and look for them: `python -m tests.misprints [--workers N]`.

Writes `misprints.json` beside this file: counts, digests, and every misprint whose original
value is not the first repair. The exit status is 1 where the finder falls short of what is asked of it.
"""

from __future__ import annotations

import argparse
import os
import sys
from collections.abc import Sequence
from concurrent.futures import ProcessPoolExecutor
from time import monotonic

from tests.misprints.outcome import FIRST_SHARE, summary, write_outcome
from tests.misprints.planting import Outcome, files, misprints, tried


def carry_out(slug: str) -> list[Outcome]:
    """Plant and find on one method."""
    found = (tried(planted) for planted in misprints(slug))
    return [outcome for outcome in found if outcome is not None]


def main(arguments: Sequence[str]) -> int:
    parser = argparse.ArgumentParser(prog="python -m tests.misprints", description=__doc__)
    parser.add_argument("--workers", type=int, default=os.cpu_count() or 1, help="processes; one a core")
    options = parser.parse_args(arguments)
    began, outcomes = monotonic(), []
    slugs = list(files())
    with ProcessPoolExecutor(options.workers) as pool:
        for done, found in enumerate(pool.map(carry_out, slugs), 1):
            outcomes += found
            if sys.stderr.isatty():
                print(f"\r{done} of {len(slugs)} methods", end="", file=sys.stderr, flush=True)
    totals = summary(outcomes)
    write_outcome(totals, outcomes)
    print(f"{totals} in {monotonic() - began:.0f} s")
    return 0 if totals["first_share_of_order_3_and_up"] >= FIRST_SHARE and not totals["not_listed"] else 1


if __name__ == "__main__":
    os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
    sys.exit(main(sys.argv[1:]))
