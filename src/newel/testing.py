"""What a plugin author needs for tests: contract checks, doubles, and Hypothesis strategies.

The checks and doubles need newel alone; the strategies need the extra `testing` (Hypothesis) and say so when
they are called without it. A check raises AssertionError with the rule that is broken.
"""

from __future__ import annotations

import copy
import gc
import json
import math
import weakref
from collections.abc import Callable
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import DTypeLike

from newel.protocols import Array, Controller, ControllerMemory, Head, Sink, Thinning
from newel.results.run import Ended

if TYPE_CHECKING:
    from hypothesis.strategies import SearchStrategy

    from newel.methods.tableau import Tableau

__all__ = [
    "FailingSink",
    "RecordingSink",
    "blocks",
    "check_controller_contract",
    "check_sink_contract",
    "check_tableau_contract",
    "head_for",
    "tableaux",
]

ReadBack = Callable[[Any], tuple[Array, Array]]
"""Gives the times and states that a closed sink holds."""


def head_for(shape: tuple[int, ...] = (2,), dtype: DTypeLike = float, has_events: bool = True) -> Head:
    """A head with made-up labels, for tests of sinks.

    >>> head_for((2,)).labels
    ('y[0]', 'y[1]')
    """
    labels = tuple(f"y[{','.join(map(str, index))}]" for index in np.ndindex(*shape))
    about = {"method": "kutta-4", "digest": "0" * 64, "settings": {"steps": "fixed", "step": 0.1}}
    return Head(labels, ("m",) * len(labels), "s", shape, np.dtype(dtype), has_events, about)


class RecordingSink:
    """A sink that keeps everything it is told.

    Attributes:
        heads: what `open` got. times, states, events: all rows, in order. blocks: the length of each block.
        ended: what `close` got.

    >>> sink = RecordingSink()
    >>> sink.open(head_for((1,)))
    >>> sink.write(np.array([0.0]), np.array([[1.0]]), ("",))
    >>> sink.times, sink.blocks
    ([0.0], [1])
    """

    def __init__(self, thinning: Thinning | None = None) -> None:
        self.thinning = thinning or Thinning()
        self.heads: list[Head] = []
        self.times: list[float] = []
        self.states: list[Array] = []
        self.events: list[str] = []
        self.blocks: list[int] = []
        self.ended: list[Ended] = []

    def open(self, head: Head) -> None:
        """Note the head."""
        self.heads.append(head)

    def write(self, times: Array, states: Array, events: tuple[str, ...]) -> None:
        """Keep copies of the rows."""
        self.times += times.tolist()
        self.states += list(states.copy())
        self.events += events
        self.blocks.append(len(times))

    def close(self, ended: Ended) -> None:
        """Note how the march ended."""
        self.ended.append(ended)


class FailingSink(RecordingSink):
    """A recording sink that raises in one of its methods.

    Args:
        where: "open", "write" or "close".
        error: what it raises.
        after: how many blocks it takes first, where `write` fails.

    >>> FailingSink("open", OSError(28, "No space left on device")).open(head_for())
    Traceback (most recent call last):
    OSError: [Errno 28] No space left on device
    """

    def __init__(self, where: str, error: BaseException, after: int = 0) -> None:
        super().__init__()
        self.where, self.error, self.after = where, error, after

    def open(self, head: Head) -> None:
        """Note the head, or raise."""
        if self.where == "open":
            raise self.error
        super().open(head)

    def write(self, times: Array, states: Array, events: tuple[str, ...]) -> None:
        """Keep the rows, or raise."""
        if self.where == "write" and len(self.blocks) >= self.after:
            raise self.error
        super().write(times, states, events)

    def close(self, ended: Ended) -> None:
        """Note the end, then raise where `close` is to fail."""
        super().close(ended)
        if self.where == "close":
            raise self.error


def check_sink_contract(make_sink: Callable[[], Sink], read_back: ReadBack | None = None) -> None:
    """Hold a sink to its protocol: shapes, dtypes, blocks, read-only and reused arrays, every way to end.

    Args:
        make_sink: gives a fresh sink at each call; a file sink gets a path of its own each time.
        read_back: gives times (n,) and states (n, *shape) out of a closed sink; with it the values are
            compared too.

    Raises:
        AssertionError: with the rule that is broken.

    >>> from newel.results.sinks import Memory
    >>> check_sink_contract(Memory, read_back=lambda memory: (memory.times, memory.states))
    """
    _check_sink_shape(make_sink())
    for shape, dtype in [((2,), "float64"), ((), "float64"), ((2, 3), "float32"), ((2,), "complex128")]:
        _check_rows(make_sink(), head_for(shape, dtype), read_back)
    _check_rows(make_sink(), head_for((2,), has_events=False), read_back)
    _check_not_kept(make_sink())
    for reason in ("stop", "event", "budget", "memory", "interrupted", "failed"):
        sink = make_sink()
        sink.open(head_for())
        sink.close(Ended(reason, 0.0, "full" if reason == "event" else None))


def _demand(holds: bool, rule: str) -> None:
    if not holds:
        raise AssertionError(rule)


def _check_sink_shape(sink: object) -> None:
    for method in ("open", "write", "close"):
        _demand(callable(getattr(sink, method, None)), f"{type(sink).__name__} has no method {method}")
    thinning = getattr(sink, "thinning", None)
    _demand(
        thinning is None or isinstance(thinning, Thinning),
        f"thinning is {thinning!r}; newel.protocols.Thinning",
    )
    endings = getattr(sink, "endings", ())
    right = isinstance(endings, tuple) and all(isinstance(e, str) and e.startswith(".") for e in endings)
    _demand(right, f"endings is {endings!r}; it is a tuple of texts such as '.csv'")


def _check_rows(sink: Sink, head: Head, read_back: ReadBack | None) -> None:
    """Blocks of 1, 3 and 256 rows, in arrays that are read-only and overwritten after each call."""
    all_times: list[float] = []
    all_states: list[Array] = []
    sink.open(head)
    for count in (1, 3, 256):
        times = np.linspace(len(all_times), len(all_times) + 1, count, endpoint=False)
        states = _values((count, *head.shape), head.dtype, len(all_times))
        all_times += times.tolist()
        all_states += list(states.copy())
        events = tuple('full, "at" last' if head.has_events and i % 100 == 2 else "" for i in range(count))
        sink.write(_sealed(times), _sealed(states), events)
        times[...], states[...] = np.nan, np.nan
    sink.close(Ended("stop", all_times[-1]))
    if read_back is not None:
        got_times, got_states = read_back(sink)
        what = f"{head.dtype.name} states of shape {head.shape}"
        _demand(
            np.array_equal(got_times, all_times), f"the times read back differ from those written, for {what}"
        )
        _demand(
            np.shape(got_states) == np.shape(all_states),
            f"the states read back have another shape, for {what}",
        )
        same = np.array_equal(np.asarray(got_states).astype(head.dtype), np.array(all_states))
        _demand(same, f"the states read back differ from those written, for {what}")


def _values(shape: tuple[int, ...], dtype: np.dtype[Any], seed: int) -> Array:
    """Numbers that need all their digits, of very different sizes."""
    size = math.prod(shape)
    real = np.sin(1.0 + seed + np.arange(size)) * 10.0 ** (np.arange(size) % 41 - 20)
    values = real + 1j * real[::-1] if dtype.kind == "c" else real
    out: Array = values.reshape(shape).astype(dtype)
    return out


def _sealed(array: Array) -> Array:
    view = array.view()
    view.flags.writeable = False
    return view


def _check_not_kept(sink: Sink) -> None:
    """A sink copies: once the driver lets go of its arrays, nobody holds them."""
    sink.open(head_for())
    times, states = np.zeros(3), np.zeros((3, 2))
    held: list[weakref.ref[Array]] = [weakref.ref(times), weakref.ref(states)]
    sink.write(_sealed(times), _sealed(states), ("", "", ""))
    del times, states
    gc.collect()
    _demand(
        all(ref() is None for ref in held), "write kept the driver's arrays; they are reused: keep copies"
    )
    sink.close(Ended("stop", 0.0))


def check_controller_contract(controller: Controller) -> None:
    """Hold a controller to its protocol: pure, with a memory of floats, sane factors, and able to settle.

    Raises:
        AssertionError: with the rule that is broken.
    """
    name: Any = getattr(controller, "name", None)
    _demand(isinstance(name, str) and bool(name), f"name is {name!r}; it is a text")
    _check_memory(controller.start(), "start")
    for order in range(2, 10):
        _check_decisions(controller, order)
        _check_settling(controller, order)


def _check_memory(memory: ControllerMemory, method: str) -> None:
    right = isinstance(memory, tuple) and all(isinstance(x, (int, float)) for x in memory)
    _demand(right, f"{method} returned the memory {memory!r}; it is a tuple of floats")
    stored = tuple(json.loads(json.dumps([float(x) for x in memory])))
    _demand(stored == memory, f"{method}: the memory {memory!r} does not come back from storage the same")


def _check_decisions(controller: Controller, order: int) -> None:
    memory = controller.start()
    for error in (0.0, 1e-300, 1e-8, 0.3, 1.0, 1.5, 4.0, 1e6, 1e300, 0.5, 0.0, 2.5, 0.9):
        frozen = copy.deepcopy(memory)
        accepted, factor, after = controller.decide(error, 0.125, order, memory)
        place = f"decide(error={error}, step=0.125, order={order}, memory={memory})"
        _demand(isinstance(accepted, (bool, np.bool_)), f"{place}: accepted is {accepted!r}; it is a bool")
        _demand(
            math.isfinite(factor) and factor > 0, f"{place}: factor is {factor!r}; it is positive and finite"
        )
        _demand(bool(accepted) or factor < 1, f"{place}: rejected with factor {factor!r}; it is then below 1")
        _demand(bool(accepted) or error > 0, f"{place}: a step without an error was rejected")
        _demand(not accepted or error <= 2, f"{place}: an error of twice the tolerance and more was accepted")
        _check_memory(after, place)
        again = controller.decide(error, 0.125, order, frozen)
        _demand(again == (accepted, factor, after), f"{place}: the same call gave {again!r} the second time")
        memory = after


def _check_settling(controller: Controller, order: int) -> None:
    """On error = (step / 1)**order it must find a step near 1 from far above and far below and stay."""
    for first in (1e-6, 1e3):
        step, memory, accepted = first, controller.start(), []
        for _ in range(300):
            error = step**order
            good, factor, memory = controller.decide(error, step, order, memory)
            accepted.append(bool(good))
            step *= factor
        _demand(
            0.1 < step < 10,
            f"order {order}: from step {first} it came to {step:.3g}, where 1 is within tolerance",
        )
        share = sum(accepted[-100:])
        _demand(
            share >= 50,
            f"order {order}: {100 - share} of 100 steps were rejected on a problem without change",
        )


def check_tableau_contract(tableau: Tableau) -> None:
    """Prove a tableau, and hold its text form and its float views to it.

    Raises:
        AssertionError: with the failing condition or the rule that is broken.
    """
    from newel.methods.order_conditions import prove
    from newel.methods.tableau_file import format_tableau, parse_tableau

    verdict = prove(tableau)
    failures = "; ".join(failure.message for failure in verdict.failures)
    _demand(bool(verdict), f"{tableau.slug}: the proof fails: {failures}")
    _demand(
        verdict.order >= tableau.order,
        f"{tableau.slug}: order {tableau.order} is claimed, {verdict.order} proven",
    )
    again = parse_tableau(format_tableau(tableau), file=f"{tableau.slug}.toml")
    _demand(again == tableau, f"{tableau.slug}: written to a file and read again it is another tableau")
    _demand(again.digest == tableau.digest, f"{tableau.slug}: its digest changes when it is written and read")
    stages = tableau.stages
    _demand(tableau.A.shape == (stages, stages), f"{tableau.slug}: A has shape {tableau.A.shape}")
    _demand(bool(tableau.source), f"{tableau.slug}: source is empty; say where the numbers come from")


def tableaux(most_stages: int = 5) -> SearchStrategy[Tableau]:
    """A strategy for explicit tableaux of small fractions whose weights sum to 1: of order 1 at least.

    Raises:
        ImportError: without Hypothesis.
    """
    st = _strategies()
    from newel.methods.tableau import Tableau

    entry = st.fractions(min_value=-2, max_value=2, max_denominator=12)

    def build(numbers: list[Any]) -> Tableau:
        stages = next(s for s in range(1, most_stages + 1) if s * (s + 1) // 2 == len(numbers))
        left = iter(numbers)
        matrix = [[next(left) for _ in range(row)] for row in range(stages)]
        weights = [next(left) for _ in range(stages)]
        weights[-1] += 1 - sum(weights)
        return Tableau(
            "drawn", name="drawn", order=1, matrix=matrix, weights=weights, source="drawn by a test"
        )

    sizes = st.integers(1, most_stages).map(lambda s: s * (s + 1) // 2)
    drawn: SearchStrategy[Tableau] = sizes.flatmap(lambda n: st.lists(entry, min_size=n, max_size=n)).map(
        build
    )
    return drawn


def blocks(shape: tuple[int, ...] = (2,), most_rows: int = 20) -> SearchStrategy[tuple[Array, Array]]:
    """A strategy for rows of a march: growing times (n,) and float64 states (n, *shape), all finite.

    Raises:
        ImportError: without Hypothesis.
    """
    st = _strategies()
    size = math.prod(shape)
    number = st.floats(allow_nan=False, allow_infinity=False)
    row = st.lists(number, min_size=size, max_size=size)

    def build(drawn: tuple[list[float], list[list[float]]]) -> tuple[Array, Array]:
        times, rows = drawn
        count = min(len(times), len(rows))
        return np.array(sorted(times)[:count]), np.array(rows[:count], dtype=float).reshape(count, *shape)

    times = st.lists(number, min_size=1, max_size=most_rows, unique=True)
    rows = st.lists(row, min_size=1, max_size=most_rows)
    drawn: SearchStrategy[tuple[Array, Array]] = st.tuples(times, rows).map(build)
    return drawn


def _strategies() -> Any:
    try:
        import hypothesis.strategies
    except ImportError as error:
        raise ImportError(
            "the strategies of newel.testing need Hypothesis, which is not installed\n"
            "  The checks and doubles work without it.\n"
            "  pip install 'newel[testing]'",
            name="hypothesis",
        ) from error
    return hypothesis.strategies
