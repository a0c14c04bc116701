"""The step of the NumPy engine: overhead beside SciPy, traffic beside the memory's bandwidth."""

from __future__ import annotations

import time
from typing import Any

import numpy as np
from scipy.integrate import RK45

import newel
from tests.benchmarks.clock import best_each, repeated

__all__ = ["overhead", "wide_state"]

START = np.array([1.0, 1.0, 1.0])
STOP = 100.0


def _lorenz(t: float, y: np.ndarray[Any, Any]) -> np.ndarray[Any, Any]:
    return np.array([10.0 * (y[1] - y[0]), y[0] * (28.0 - y[2]) - y[1], y[0] * y[1] - 8.0 / 3.0 * y[2]])


def overhead(rounds: int = 15) -> dict[str, float]:
    """(time − calls × time of the rate)/attempts on Lorenz's system with the pair of Dormand and Prince.

    SciPy's stepper of the same tableau is driven by a bare loop that keeps its rows in lists.
    """
    model = newel.Model(_lorenz, start=0.0, stop=STOP, state=START)
    counts: dict[str, tuple[float, int]] = {}

    def ours() -> float:
        begin = time.process_time()
        run = newel.march(model, "dormand-prince-5-4", rel_tol=1e-6, abs_tol=1e-9)
        seconds = time.process_time() - begin
        counts["newel"] = (run.accepted + run.rejected, run.calls)
        return seconds

    def theirs() -> float:
        begin = time.process_time()
        solver = RK45(_lorenz, 0.0, START, STOP, rtol=1e-6, atol=1e-9)
        times, states = [], []
        while solver.status == "running":
            solver.step()
            times.append(solver.t)
            states.append(solver.y)
        seconds = time.process_time() - begin
        counts["scipy"] = ((solver.nfev - 2) / 6, solver.nfev)
        return seconds

    def rate() -> float:
        return repeated(_lorenz, 0.0, START.copy(), times=20_000)

    best = best_each(rounds, newel=ours, scipy=theirs, rate=rate)
    each = {name: (best[name] - calls * best["rate"]) / n for name, (n, calls) in counts.items()}
    return {
        "newel, µs an attempt": each["newel"] * 1e6,
        "SciPy, µs an attempt": each["scipy"] * 1e6,
        "rate, µs a call": best["rate"] * 1e6,
        "ratio": each["newel"] / each["scipy"],
    }


def _decay(t: float, y: np.ndarray[Any, Any], out: np.ndarray[Any, Any]) -> None:
    np.negative(y, out)


def wide_state(components: int = 10**6, rounds: int = 5) -> dict[str, float]:
    """Seconds of a march less the rate's own, beside those that its memory traffic needs.

    Traffic: for each stage its nonzeros and two vectors, and s + 2 for the error and its norm, 8 bytes each,
    at the bandwidth of np.add(a, b, out=c) on vectors of the same length. The additions go round as many
    vectors as the slab and its buffers have several times over: three alone would stay in a large cache and
    measure that.
    """
    state = np.linspace(0.5, 1.5, components)
    model = newel.Model(_decay, start=0.0, stop=1.0, state=state, in_place=True)
    tableau = newel.find("dormand-prince-5-4")
    nonzeros = [int(np.count_nonzero(row)) for row in tableau.A[1:]]
    vectors = sum(n + 2 for n in nonzeros) + tableau.stages + 2
    sums = np.ones((24, components))
    counts: list[tuple[int, int]] = []

    def march() -> float:
        begin = time.perf_counter()
        run = newel.march(model, tableau, steps=newel.Adaptive(rel_tol=1e-6, abs_tol=1e-9), sinks=[])
        seconds = time.perf_counter() - begin
        counts.append((run.accepted + run.rejected, run.calls))
        return seconds

    def addition() -> float:
        begin = time.perf_counter()
        for i in range(0, len(sums), 3):
            np.add(sums[i], sums[i + 1], sums[i + 2])
        return (time.perf_counter() - begin) / (len(sums) / 3)

    def rate() -> float:
        begin = time.perf_counter()
        for i in range(0, len(sums), 2):
            _decay(0.0, sums[i], sums[i + 1])
        return (time.perf_counter() - begin) / (len(sums) / 2)

    best = best_each(rounds, march=march, addition=addition, rate=rate)
    attempts, calls = counts[0]
    spent = best["march"] - calls * best["rate"]
    needed = attempts * vectors * best["addition"] / 3
    return {
        "newel, ms an attempt": spent / attempts * 1e3,
        "traffic, ms an attempt": needed / attempts * 1e3,
        "bandwidth, GB/s": 24e-9 * components / best["addition"],
        "ratio": spent / needed,
    }
