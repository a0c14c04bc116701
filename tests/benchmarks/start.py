"""What a user waits for before anything is computed: imports, the list, proofs."""

from __future__ import annotations

import os
import resource
import subprocess
import sys
import tempfile
import time

import newel
from newel.methods.order_conditions import prove
from tests.benchmarks.clock import best_each, repeated

__all__ = ["imports", "list_cold", "proofs"]


def _child(*arguments: str, **environment: str) -> float:
    """Return the processor seconds of a fresh Python process."""
    before = resource.getrusage(resource.RUSAGE_CHILDREN)
    subprocess.run(
        [sys.executable, *arguments], check=True, stdout=subprocess.DEVNULL, env={**os.environ, **environment}
    )
    after = resource.getrusage(resource.RUSAGE_CHILDREN)
    return after.ru_utime + after.ru_stime - before.ru_utime - before.ru_stime


def imports(rounds: int = 10) -> dict[str, float]:
    """`import newel`, with what a march needs not yet loaded, beside `import numpy`."""
    best = best_each(
        rounds,
        newel=lambda: _child("-c", "import newel"),
        march=lambda: _child("-c", "import newel; newel.march, newel.Model"),
        numpy=lambda: _child("-c", "import numpy"),
    )
    return {
        "import newel, s": best["newel"],
        "import newel and touch march, s": best["march"],
        "import numpy, s": best["numpy"],
        "ratio": best["newel"] / best["numpy"],
        "ratio with march": best["march"] / best["numpy"],
    }


def list_cold(rounds: int = 5) -> dict[str, float]:
    """`newel list` in a fresh process with an empty cache, processor seconds."""

    def once() -> float:
        with tempfile.TemporaryDirectory() as cache:
            return _child("-m", "newel", "list", NEWEL_CACHE=cache)

    return {"newel list, s": best_each(rounds, list=once)["list"]}


def proofs(rounds: int = 5) -> dict[str, float]:
    """One proof of an order-8 pair of 13 stages, and `newel check --all` with an empty cache."""
    tableaux = {
        slug: newel.find(slug) for slug in ("prince-dormand-8-7", "fehlberg-8-7", "dormand-prince-5-4")
    }
    best = best_each(
        rounds, **{slug: lambda t=t: repeated(prove, t, times=1) for slug, t in tableaux.items()}
    )

    def everything() -> float:
        with tempfile.TemporaryDirectory() as cache:
            begin = time.process_time()
            spent = _child("-m", "newel", "check", "--all", NEWEL_CACHE=cache)
            return spent + time.process_time() - begin

    figures = {f"proof of {slug}, ms": seconds * 1e3 for slug, seconds in best.items()}
    return {**figures, "newel check --all, s": best_each(2, all=everything)["all"]}
