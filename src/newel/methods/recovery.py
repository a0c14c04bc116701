"""A, b and c read off a step function.

An explicit Runge–Kutta step from y = 0 at t = 0 with h = 1 asks its rate for y = Σ a_kj k_j at t = c_k. Where
call number j is answered with the unit vector e_j, what it asks is the rows of A and the nodes, and what it
returns is b. A state that is too short for all unit vectors is probed several times. Other probes with drawn
numbers then confirm that the step is y + h·Σ b_j k_j for any data; where they do not, the difference tells
what broke.
"""

from __future__ import annotations

from collections.abc import Iterator
from math import ceil

import attrs
import numpy as np

from newel.errors import BadRequest, NotRecovered
from newel.methods.probing import MOST_CALLS, Answers, Floats, Seen, StepFunction, watch

__all__ = ["LENGTHS", "Reading", "read_step"]

LENGTHS = (1, 2, 3, 4, 5, 6, 8, 10, 12, 16)
"""The lengths of the state that are tried where one of any length will not do."""
LONG = 24
TOLERANCE = 1e-9
REMEMBERS = "the same call twice does not do the same: it remembers something of earlier calls"
DRAWS = ((1.3, 0.37, 1.0), (-2.1, 0.011, 30.0), (0.4, 1.7, 0.01))
"""Time, step length and size of the numbers of the probes that confirm."""


@attrs.frozen(eq=False)
class Reading:
    """What was read: float arrays A (s, s), b and c (s,), all unitless, and remarks.

    `length` is that of the state which was used, 0 for a plain number.
    """

    matrix: Floats
    weights: Floats
    nodes: Floats
    length: int
    remarks: tuple[str, ...]


def read_step(step: StepFunction, length: int | None = None) -> Reading:
    """Read A, b and c off a step function.

    Args:
        step: called as `step(rate, t, y, h)`; it calls `rate(t, y)`, and returns the new state or changes y.
        length: the length of the state that it works on, 0 for a plain float; by default any is tried.

    Raises:
        NotRecovered: it is no explicit Runge–Kutta step; `reason` says what broke: "memory", "branch",
            "overwritten", "raises", "never calls", "calls", "signature", "shape", "no state", "not finite".
        BadRequest: `step` cannot be called, or `length` is no length.

    >>> def step(rate, t, y, h):
    ...     return y + h * rate(t + h / 2, y + h / 2 * rate(t, y))
    >>> reading = read_step(step)
    >>> reading.matrix.tolist(), reading.weights.tolist(), reading.nodes.tolist()
    ([[0.0, 0.0], [0.5, 0.0]], [0.0, 1.0], [0.0, 0.5])
    """
    if not callable(step):
        raise BadRequest(f"a {type(step).__name__} is no step function", argument="step")
    if length is not None and (isinstance(length, bool) or not 0 <= length <= MOST_CALLS):
        raise BadRequest(f"length={length!r}: give the length of the state, or 0", argument="length")
    failures = []
    for each in (LONG, 0, *LENGTHS) if length is None else (length,):
        try:
            return _read(step, each, fixed=length is not None)
        except NotRecovered as error:
            failures.append(error)
            if error.reason in ("memory", "calls", "never calls", "signature"):
                break
    # What a step function says to a length that is not its own explains nothing.
    raise next((error for error in failures if error.reason not in ("raises", "shape")), failures[0])


def _read(step: StepFunction, length: int, fixed: bool) -> Reading:
    plain, n = length == 0, max(1, length)
    first = _unit_probe(step, n, plain, 0)
    stages = len(first.times)
    if stages > n and not plain and not fixed and n >= LONG:
        return _read(step, stages, fixed=True)
    again = _unit_probe(step, n, plain, 0)
    if not first.same(again):
        raise NotRecovered(REMEMBERS, reason="memory")
    probes = [first, *(_unit_probe(step, n, plain, part) for part in range(1, ceil(stages / n)))]
    _same_calls(probes)
    matrix = np.hstack([probe.arguments for probe in probes])[:, :stages]
    weights = np.concatenate([probe.result for probe in probes])[:stages]
    reading = Reading(matrix, weights, first.times, length, tuple(_remarks(probes)))
    _confirm(step, reading, n, plain)
    if not first.same(_unit_probe(step, n, plain, 0)):
        raise NotRecovered(REMEMBERS, reason="memory")
    return reading


def _unit_probe(step: StepFunction, n: int, plain: bool, part: int) -> Seen:
    def answers(call: int) -> Floats:
        answer = np.zeros(n)
        if 0 <= call - part * n < n:
            answer[call - part * n] = 1.0
        return answer

    return watch(step, 0.0, np.zeros(n), 1.0, answers, plain)


def _same_calls(probes: list[Seen]) -> None:
    counts = {len(probe.times) for probe in probes}
    if len(counts) > 1:
        listed = " or ".join(map(str, sorted(counts)))
        raise NotRecovered(
            f"it calls its rate {listed} times, depending on the data: it has a branch", reason="branch"
        )


def _confirm(step: StepFunction, reading: Reading, n: int, plain: bool) -> None:
    """Hold the step to what was read, with numbers drawn from a fixed seed."""
    stages = len(reading.weights)
    generator = np.random.default_rng(20)
    for t, h, size in DRAWS:
        y = size * generator.uniform(-1.0, 1.0, n)
        rates = size * generator.uniform(-1.0, 1.0, (MOST_CALLS, n))
        answers: Answers = rates.__getitem__
        seen = watch(step, t, y, h, answers, plain)
        if len(seen.times) != stages:
            raise NotRecovered(
                f"it calls its rate {stages} times for one state and {len(seen.times)} times for another: "
                "it has a branch that depends on the data",
                reason="branch",
            )
        size_of_all = max(np.abs(reading.matrix).sum(), np.abs(reading.weights).sum())
        tolerance = TOLERANCE * size * (1.0 + abs(h)) * (1.0 + size_of_all)
        what = next(_differences(reading, seen, t, y, h, rates[:stages], tolerance), None)
        if what is None:
            continue
        if not seen.same(watch(step, t, y, h, answers, plain)):
            raise NotRecovered(REMEMBERS, reason="memory")
        if seen.overwritten:
            more = "it overwrites the state that it is given while it still needs it"
            raise NotRecovered(f"{what}; {more}", reason="overwritten")
        raise NotRecovered(what, reason="branch")


def _differences(
    reading: Reading, seen: Seen, t: float, y: Floats, h: float, rates: Floats, tolerance: float
) -> Iterator[str]:
    asked = y + h * (reading.matrix @ rates)
    for stage, (got, expected) in enumerate(zip(seen.arguments, asked, strict=True), 1):
        if np.abs(got - expected).max() > tolerance:
            yield f"stage {stage} is not y + h·Σ a·k: its coefficients depend on the data, or on h"
    if np.abs(seen.result - y - h * (reading.weights @ rates)).max() > tolerance:
        yield "the new state is not y + h·Σ b·k: its coefficients depend on the data, or on h"
    times = t + h * reading.nodes
    if np.abs(seen.times - times).max() > TOLERANCE * (1.0 + abs(t)):
        stage = int(np.argmax(np.abs(seen.times - times))) + 1
        yield f"the time of stage {stage} is not t + c·h"


def _remarks(probes: list[Seen]) -> Iterator[str]:
    if any(probe.overwritten for probe in probes):
        yield "it overwrites the y that it is given, and returns another array"
    if any(probe.printed for probe in probes):
        yield "it prints; what it printed was kept off the screen"
