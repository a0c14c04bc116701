"""Computes the references: `python -m tests.problems.make_references [NAME ...]`, of problems and orbits.

Gragg's modified midpoint rule with polynomial extrapolation (W. B. Gragg, SIAM J. Numer. Anal. 2 (1965)
384-403; R. Bulirsch and J. Stoer, Numer. Math. 8 (1966) 1-13) in mpmath's arithmetic, a
program of its own that shares no code with the library. Each problem is solved at two tolerances; both must
agree to 25 digits in each component, or nothing is written. With names, only those problems are computed
anew.
"""

from __future__ import annotations

import json
import sys
from concurrent.futures import ProcessPoolExecutor
from dataclasses import asdict, dataclass
from typing import Any

import mpmath
import numpy as np

from tests.problems.arithmetic import Array, Rate, high_precision
from tests.problems.nonstiff_1972 import NONSTIFF, REFERENCES
from tests.problems.orbits import ORBITS

__all__ = ["TIMES", "extrapolate", "solve"]

PRINTED_DIGITS = 25
TIMES = ("4", "8", "12", "16", "20")


@dataclass(frozen=True)
class Precision:
    """How a reference is computed; solutions are compared relative to an entry or to `smallest`."""

    working_digits: int
    tolerances: tuple[str, str]
    columns: int
    smallest: str


# C4 has entries down to 1e-35 that are wanted to 25 digits; the orbits have none that small but true zeros.
SET_OF_1972 = Precision(85, ("1e-64", "1e-69"), 30, "1e-40")
OF_ORBITS = Precision(55, ("1e-38", "1e-42"), 20, "1")


def _midpoint(rate: Rate, t: Any, y: Array, first: Array, length: Any, count: int) -> Array:
    """Gragg's rule over one big step in `count` (even) small ones, without smoothing."""
    h = length / count
    before, now = y, y + h * first
    for i in range(1, count):
        before, now = now, before + 2 * h * rate(t + i * h, now)
    return now


def extrapolate(rate: Rate, t: Any, y: Array, length: Any, columns: int) -> tuple[Array, Any]:
    """One step extrapolated from 2, 4, …, 2·columns small ones: the new state, the last correction's size."""
    first = rate(t, y)
    row: list[Array] = []
    for j in range(1, columns + 1):
        new = [_midpoint(rate, t, y, first, length, 2 * j)]
        for i, older in enumerate(row, start=1):
            ratio = mpmath.mpf(j * j) / ((j - i) * (j - i)) - 1
            new.append(new[-1] + (new[-1] - older) / ratio)
        row = new
    return row[-1], max(abs(d) for d in row[-1] - row[-2])


def solve(rate: Rate, y: Array, times: tuple[str, ...], tolerance: Any, columns: int) -> list[Array]:
    """The states at some times, from y at t = 0; each big step's last correction is below the tolerance."""
    t, length, out = mpmath.mpf(0), mpmath.mpf("0.125"), []
    for stop in map(mpmath.mpf, times):
        while t < stop:
            taken = min(length, stop - t)
            new, error = extrapolate(rate, t, y, taken, columns)
            factor = mpmath.mpf("0.9") * mpmath.root(
                tolerance / max(error, tolerance / 10**12), 2 * columns - 1
            )
            if error <= tolerance:
                y, t = new, stop if taken == stop - t else t + taken
            length = taken * factor if error > tolerance or taken == length else max(length, taken * factor)
        out.append(y)
    return out


def compute(name: str) -> tuple[str, dict[str, list[str]], float]:
    """A problem's name, its states as texts by time, and how far the two solutions differ (relative)."""
    precision = OF_ORBITS if name in ORBITS else SET_OF_1972
    with mpmath.workdps(precision.working_digits):
        problem = NONSTIFF.get(name) or ORBITS[name]
        times = tuple(ORBITS[name].values) if name in ORBITS else TIMES
        rate, start = problem.build(high_precision())
        coarse, fine = (
            solve(rate, start, times, mpmath.mpf(text), precision.columns) for text in precision.tolerances
        )
        worst = max(
            abs(a - b) / max(abs(b), mpmath.mpf(precision.smallest))
            for one, other in zip(coarse, fine, strict=True)
            for a, b in zip(one, other, strict=True)
        )
        texts = {
            time: [mpmath.nstr(value, PRINTED_DIGITS, min_fixed=-4, max_fixed=6) for value in state]
            for time, state in zip(times, fine, strict=True)
        }
        return name, texts, float(worst)


def main(names: list[str]) -> int:
    """Compute the named problems, or all, and write the file."""
    states: dict[str, Any] = {}
    if names and REFERENCES.exists():
        states = json.loads(REFERENCES.read_text(encoding="utf-8"))["states"]
    with ProcessPoolExecutor(max_workers=2) as pool:
        for name, texts, worst in pool.map(compute, names or [*NONSTIFF, *ORBITS]):
            print(f"{name}: the two solutions differ by {worst:.1e}", flush=True)
            if worst > 10.0 ** (-PRINTED_DIGITS - 1):
                print(
                    f"{name}: fewer than {PRINTED_DIGITS} digits agree; nothing was written", file=sys.stderr
                )
                return 1
            states[name] = texts
    document = {
        "about": "states of the 1972 problems and of orbits; python -m tests.problems.make_references",
        "printed_digits": PRINTED_DIGITS,
        "set_of_1972": asdict(SET_OF_1972),
        "orbits": asdict(OF_ORBITS),
        "states": {name: states[name] for name in [*NONSTIFF, *ORBITS] if name in states},
    }
    REFERENCES.write_text(json.dumps(document, indent=1) + "\n", encoding="utf-8")
    return 0


if __name__ == "__main__":
    np.seterr(all="raise")
    raise SystemExit(main(sys.argv[1:]))
