"""Try every change on every built-in method: `python -m tests.mutation [--stale] [--workers N]`.

Of methods with more than 16 stages a fixed draw of 100 changes is tried.

Writes `outcome.json` beside this file: by method the digests that it was made from, counts, every change that
the proof accepts with the reason why it is right to do so, and every half unit that it does not accept.
With `--stale` only methods whose entry is missing or stale are tried anew. The exit status is 1 where the
proof and the independent judgement are of two minds.
"""

from __future__ import annotations

import argparse
import os
import sys
from collections.abc import Iterator, Sequence
from concurrent.futures import ProcessPoolExecutor
from itertools import groupby
from pathlib import Path
from time import monotonic

from tests.mutation.outcome import HERE, entry, is_fresh, read_outcome, write_outcome
from tests.mutation.trials import Trial, all_moves, files, tried, workshop

BATCH = 40
Task = tuple[str, Path, int]


def tasks(wanted: Sequence[str]) -> list[Task]:
    """Batches of moves: slug, file and the first of them."""
    known = files()
    return [
        (slug, known[slug], start)
        for slug in wanted
        for start in range(0, len(all_moves(known[slug])), BATCH)
    ]


def carry_out(task: Task) -> tuple[str, list[Trial]]:
    """Try one batch."""
    slug, file, start = task
    trials = (tried(workshop(file), move) for move in all_moves(file)[start : start + BATCH])
    return slug, [trial for trial in trials if trial is not None]


class Progress:
    """One line on stderr, where that is a terminal."""

    def __init__(self, total: int) -> None:
        self.total, self.done, self.began = total, 0, monotonic()

    def add(self, count: int) -> None:
        self.done += count
        if sys.stderr.isatty():
            rate = self.done / max(monotonic() - self.began, 1e-3)
            end = "\n" if self.done >= self.total else ""
            print(
                f"\r{self.done:,} of {self.total:,} moves, {rate:.0f}/s ",
                end=end,
                file=sys.stderr,
                flush=True,
            )


def run(wanted: Sequence[str], workers: int) -> Iterator[tuple[str, list[Trial]]]:
    """Yield each method with all its trials."""
    batches = tasks(wanted)
    progress = Progress(sum(len(all_moves(files()[slug])) for slug in wanted))
    with ProcessPoolExecutor(workers) as pool:
        for slug, group in groupby(pool.map(carry_out, batches), key=lambda found: found[0]):
            trials: list[Trial] = []
            for _, batch in group:
                trials += batch
                progress.add(BATCH)
            yield slug, trials


def main(arguments: Sequence[str]) -> int:
    parser = argparse.ArgumentParser(prog="python -m tests.mutation", description=__doc__)
    parser.add_argument("--stale", action="store_true", help="only methods whose entry is missing or stale")
    parser.add_argument("--workers", type=int, default=os.cpu_count() or 1, help="processes; one a core")
    options = parser.parse_args(arguments)
    kept = read_outcome()["methods"] if options.stale and HERE.is_file() else {}
    kept = {slug: old for slug, old in kept.items() if slug in files() and is_fresh(slug, old)}
    wanted = [slug for slug in files() if slug not in kept]
    began = monotonic()
    for slug, trials in run(wanted, options.workers):
        kept[slug] = entry(slug, trials)
    totals = write_outcome(kept)
    for slug in wanted:
        for words in kept[slug]["unexplained"]:
            print(f"UNEXPLAINED {words}", file=sys.stderr)
    print(f"{len(wanted)} methods in {monotonic() - began:.0f} s; all {len(kept)}: {totals}")
    return 1 if totals["unexplained"] else 0


if __name__ == "__main__":
    os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
    sys.exit(main(sys.argv[1:]))
