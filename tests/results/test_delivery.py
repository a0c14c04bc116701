"""Which rows reach which sink, in what blocks, and what happens when one fails."""

import itertools

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from newel.errors import BadRequest, OutputExists, OutputFailed
from newel.protocols import Thinning
from newel.results.delivery import Delivery
from newel.results.run import Ended
from newel.results.sinks import Call, Csv, JsonLines, Memory
from newel.results.sinks.memory import MemoryFull
from newel.testing import FailingSink, RecordingSink, head_for

pytestmark = pytest.mark.core

STOP = Ended("stop", 10.0)


def delivery(*sinks, head=None, start=0.0, stop=10.0):
    return Delivery(sinks, head or head_for((1,)), stop > start, start, stop)


def march(*sinks, steps=10, events=None, tell_last=True, ended=STOP, head=None):
    """Rows at 0, 1, …, steps with the state t², through one delivery."""
    out = delivery(*sinks, head=head, stop=float(steps))
    out.open()
    state = np.empty(1)
    for n in range(steps + 1):
        state[0] = n * n
        out.row(float(n), state, (events or {}).get(n, ""), last=tell_last and n == steps)
    out.close(ended)
    return out


def fill(out):
    """Rows without end, until something stops them."""
    for n in itertools.count():
        out.row(float(n), np.array([n * 1.0]))


def test_a_sink_without_thinning_gets_every_row_in_order_and_is_opened_and_closed_once():
    sink = RecordingSink()
    out = march(sink, events={4: "full"})
    assert sink.times == list(range(11))
    assert [float(y[0]) for y in sink.states] == [n * n for n in range(11)]
    assert sink.events == [""] * 4 + ["full"] + [""] * 6
    assert sink.heads == [head_for((1,))]
    assert sink.ended == [STOP]
    assert out.counts == (11,)
    assert out.last_time == 10.0


def test_a_plain_class_without_thinning_is_a_sink():
    class Plain:
        def __init__(self):
            self.rows = 0

        def open(self, head):
            pass

        def write(self, times, states, events):
            self.rows += len(times)

        def close(self, ended):
            pass

    plain = Plain()
    assert march(plain).names == ("Plain",)
    assert plain.rows == 11


@pytest.mark.parametrize("tell_last", [True, False])
def test_each_way_of_thinning_gives_the_rows_that_it_promises(tell_last):
    thinnings = [
        Thinning(every_steps=4),
        Thinning(every_time=4.0),
        Thinning(at=(3.0, 0.0)),
        Thinning(at=(10.0,)),
    ]
    sinks = [RecordingSink(thinning) for thinning in thinnings]
    out = march(*sinks, events={5: "full"}, tell_last=tell_last)
    assert sinks[0].times == [0, 4, 5, 8, 10]
    assert sinks[1].times == [0, 4, 5, 8, 10]
    assert sinks[2].times == [0, 3]
    assert sinks[3].times == [10]
    assert sinks[0].events == ["", "", "full", "", ""]
    assert [float(y[0]) for y in sinks[1].states] == [0, 16, 25, 64, 100]
    assert out.counts == (5, 5, 2, 1)


def test_a_march_that_breaks_off_still_gives_its_last_row_to_a_thinned_sink():
    sink = RecordingSink(Thinning(every_steps=100))
    out = delivery(sink)
    out.open()
    for n in range(8):
        out.row(float(n), np.array([n * 2.0]))
    out.close(Ended("failed", 7.0))
    assert sink.times == [0, 7]
    assert sink.states[-1] == 14.0


def test_the_last_row_comes_once_where_it_was_due_anyway():
    sink = RecordingSink(Thinning(every_steps=5))
    march(sink, tell_last=False)
    assert sink.times == [0, 5, 10]


def test_a_flush_in_between_changes_no_row():
    sinks = [RecordingSink(), RecordingSink(Thinning(every_steps=3))]
    out = delivery(*sinks)
    out.open()
    for n in range(8):
        out.row(float(n), np.array([float(n)]))
        out.flush()
    out.close(STOP)
    assert sinks[0].times == list(range(8))
    assert sinks[1].times == [0, 3, 6, 7]
    assert [float(y[0]) for y in sinks[1].states] == [0, 3, 6, 7]
    assert sinks[0].blocks == [1] * 8


def test_a_last_row_that_was_not_due_outlives_a_flush():
    sink = RecordingSink(Thinning(every_steps=10))
    out = delivery(sink)
    out.open()
    for n in range(3):
        out.row(float(n), np.array([n * 5.0]))
    out.flush()
    out.close(STOP)
    assert sink.times == [0, 2]
    assert [float(y[0]) for y in sink.states] == [0, 10]


def test_states_are_copied():
    sink, y = RecordingSink(), np.array([1.0])
    out = delivery(sink)
    out.open()
    out.row(0.0, y)
    y[0] = 99.0
    out.close(STOP)
    assert sink.states[0] == 1.0


def test_blocks_have_at_most_256_rows_and_a_mebibyte():
    small, large = RecordingSink(), RecordingSink()
    march(small, steps=600)
    assert small.blocks == [256, 256, 89]
    out = Delivery([large], head_for((40_000,), has_events=False), True, 0.0, 10.0)
    out.open()
    for n in range(8):
        out.row(float(n), np.full(40_000, float(n)))
    out.close(STOP)
    assert large.blocks == [3, 3, 2]
    assert [y[-1] for y in large.states] == list(range(8))


def test_sinks_get_read_only_arrays():
    class Vandal(RecordingSink):
        def write(self, times, states, events):
            states[0] = 0.0

    victim = RecordingSink()
    out = delivery(Vandal(), victim)
    out.open()
    out.row(0.0, np.array([1.0]))
    with pytest.raises(OutputFailed, match="read-only"):
        out.close(STOP)
    assert victim.states[0] == 1.0


@pytest.mark.parametrize("shape", [(), (2,), (2, 3)])
@pytest.mark.parametrize("dtype", ["float32", "complex128", "longdouble", "object"])
def test_states_of_any_shape_and_dtype_go_through(shape, dtype):
    sink = RecordingSink()
    out = Delivery([sink], head_for(shape, dtype), True, 0.0, 1.0)
    out.open()
    y = np.ones(shape, dtype)
    out.row(0.5, y)
    out.close(STOP)
    assert np.asarray(sink.states[0], dtype).tolist() == y.tolist()
    assert np.shape(sink.states[0]) == shape


def test_a_call_comes_as_soon_as_the_row_is_there_and_sees_a_read_only_state():
    seen = []

    def look(t, y):
        seen.append((t, y.copy()))
        with pytest.raises(ValueError, match="read-only"):
            y[0] = 1.0

    out = delivery(Call(look), RecordingSink())
    out.open()
    out.row(0.0, np.array([5.0]))
    assert seen == [(0.0, 5.0)]
    out.row(1.0, np.array([6.0]))
    assert seen[1] == (1.0, 6.0)
    out.close(STOP)
    assert len(seen) == 2


def test_what_cannot_be_called_is_refused():
    with pytest.raises(BadRequest, match="Call was given 3, which cannot be called"):
        Call(3)


def test_the_next_landing_is_the_nearest_of_all_sinks_in_either_direction():
    sinks = [RecordingSink(Thinning(at=(7.0, 2.5))), RecordingSink(Thinning(every_time=4.0)), RecordingSink()]
    forward = delivery(*sinks)
    assert list(forward.landings()) == [0.0, 2.5, 4.0, 7.0, 8.0]
    assert [forward.next_landing(t) for t in (0.0, 2.4, 2.5, 4.0, 7.5, 8.0)] == [
        2.5,
        2.5,
        4.0,
        7.0,
        8.0,
        None,
    ]
    backward = delivery(*sinks, start=10.0, stop=0.0)
    assert list(backward.landings()) == [10.0, 7.0, 6.0, 2.5, 2.0]
    assert [backward.next_landing(t) for t in (10.0, 7.0, 2.1, 2.0)] == [7.0, 6.0, 2.0, None]


def test_without_asked_times_there_is_no_landing():
    assert delivery(RecordingSink(), RecordingSink(Thinning(every_steps=2))).next_landing(0.0) is None


def test_landings_are_computed_as_they_are_read():
    out = delivery(RecordingSink(Thinning(every_time=1e-9)))
    assert list(itertools.islice(out.landings(), 3)) == [0.0, 1e-9, 2e-9]


def test_a_thinning_that_a_plugin_made_is_checked_too():
    with pytest.raises(BadRequest, match="every_steps=0"):
        delivery(RecordingSink(Thinning(every_steps=0)))


def test_two_sinks_may_not_write_to_one_file(tmp_path):
    (tmp_path / "link").symlink_to(tmp_path)
    with pytest.raises(BadRequest, match="two sinks write to one file") as caught:
        delivery(Csv(tmp_path / "a"), Memory(), JsonLines(tmp_path / "link" / "a"))
    assert str(tmp_path / "link" / "a") in str(caught.value)


def test_the_same_sink_twice_is_refused():
    memory = Memory()
    with pytest.raises(BadRequest, match="the same Memory twice"):
        delivery(memory, memory)


def test_names_are_paths_or_what_the_sink_calls_itself(tmp_path):
    sinks = (Csv(tmp_path / "a.csv"), Memory(), Call(print))
    assert delivery(*sinks).names == (str(tmp_path / "a.csv"), "memory", "call of print")


def test_a_full_memory_ends_with_the_row_that_fills_it_and_all_sinks_have_that_row():
    memory, other, thinned = (
        Memory(limit=16 * 300),
        RecordingSink(),
        RecordingSink(Thinning(every_steps=1000)),
    )
    out = delivery(memory, other, thinned, stop=1e6)
    out.open()
    with pytest.raises(MemoryFull):
        fill(out)
    assert out.last_time == 299.0
    out.close(Ended("memory", 299.0))
    assert memory.times.tolist() == list(range(300))
    assert other.times == list(range(300))
    assert thinned.times == [0, 299]
    assert out.counts == (300, 300, 2)


def test_a_memory_that_the_last_row_just_fills_is_no_event():
    memory = Memory(limit=16 * 11)
    march(memory)
    assert len(memory.times) == 11


def test_a_thinned_memory_fills_by_the_rows_that_it_gets():
    memory = Memory(limit=16 * 3, every_steps=10)
    out = delivery(memory, stop=1e6)
    out.open()
    with pytest.raises(MemoryFull):
        fill(out)
    out.close(Ended("memory", out.last_time))
    assert memory.times.tolist() == [0, 10, 20]


def test_a_memory_that_the_last_row_fills_at_the_close_is_no_event():
    memory = Memory(limit=16 * 3, every_steps=10)
    march(memory, steps=15, tell_last=False)
    assert memory.times.tolist() == [0, 10, 15]


def test_a_march_of_known_length_is_refused_by_the_sink_that_cannot_hold_it():
    delivery(Memory(limit=16 * 11), Memory(limit=100, every_steps=5), RecordingSink()).require_room(10)
    with pytest.raises(BadRequest, match="12 rows of 1 float64 need 192 bytes; the limit is 176 bytes"):
        delivery(Memory(limit=16 * 11)).require_room(11)


def test_a_sink_that_fails_is_named_with_what_is_kept_and_the_others_have_all():
    before, after = RecordingSink(), RecordingSink()
    failing = FailingSink("write", OSError(28, "No space left on device"), after=1)
    out = delivery(before, failing, after, stop=1000.0)
    out.open()
    with pytest.raises(OutputFailed) as caught:
        fill(out)
    assert (out.last_time, caught.value.path) == (511.0, "FailingSink")
    assert str(caught.value) == (
        "FailingSink: no space left on device, in the rows from t = 256.0 to 511.0\n"
        "  Kept: 256 rows up to t = 255.0; what may follow them there is part of a block.\n"
        "  Make room or give another place, and march again."
    )
    out.close(Ended("failed", 511.0))
    assert before.times == after.times == list(range(512))
    assert out.counts == (512, 256, 512)
    assert out.safe_times == (511.0, 255.0, 511.0)
    assert [len(sink.ended) for sink in (before, failing, after)] == [1, 1, 1]
    assert failing.blocks == [256]


def test_an_error_of_the_sinks_own_code_keeps_its_cause():
    def look(t, y):
        raise ZeroDivisionError("in my plot")

    memory = Memory()
    out = delivery(memory, Call(look))
    out.open()
    with pytest.raises(OutputFailed, match="write raised ZeroDivisionError: in my plot") as caught:
        out.row(0.0, np.array([1.0]))
    assert isinstance(caught.value.__cause__, ZeroDivisionError)
    out.close(Ended("failed", 0.0))
    assert memory.times.tolist() == [0.0]


def test_every_sink_is_closed_where_closing_one_fails_and_the_first_failure_is_told():
    sinks = [RecordingSink(), FailingSink("close", OSError(5, "Input/output error")), RecordingSink()]
    sinks.append(FailingSink("close", OSError(28, "second")))
    with pytest.raises(OutputFailed, match=r"input/output error\n  11 rows up to t = 10\.0 were handed over"):
        march(*sinks)
    assert [len(sink.ended) for sink in sinks] == [1, 1, 1, 1]


def test_closing_twice_closes_once_and_an_error_is_told_once():
    sink = FailingSink("write", OSError(28, "No space left on device"))
    out = delivery(sink)
    out.open()
    out.row(0.0, np.array([1.0]))
    with pytest.raises(OutputFailed):
        out.flush()
    out.close(STOP)
    out.close(STOP)
    assert len(sink.ended) == 1


def test_a_sink_that_failed_and_cannot_close_either_is_told_once():
    class Hopeless(FailingSink):
        def close(self, ended):
            super().close(ended)
            raise OSError(5, "Input/output error")

    sink = Hopeless("write", OSError(28, "No space left on device"))
    out = delivery(sink)
    out.open()
    out.row(0.0, np.array([1.0]))
    with pytest.raises(OutputFailed, match="no space left"):
        out.flush()
    out.close(Ended("failed", 0.0))
    assert len(sink.ended) == 1


def test_a_delivery_that_never_opened_closes_nothing():
    sink = RecordingSink()
    delivery(sink).close(STOP)
    assert sink.ended == []


def test_where_one_sink_cannot_open_new_files_are_removed_and_old_ones_untouched(tmp_path):
    (tmp_path / "old.csv").write_text("old")
    (tmp_path / "third.csv").write_text("in the way")
    first = RecordingSink()
    sinks = (
        first,
        Csv(tmp_path / "new.csv"),
        JsonLines(tmp_path / "old.csv", overwrite=True),
        Csv(tmp_path / "third.csv"),
    )
    with pytest.raises(OutputExists, match=r"third\.csv exists already; nothing was written"):
        delivery(*sinks).open()
    assert sorted(path.name for path in tmp_path.iterdir()) == ["old.csv", "third.csv"]
    assert (tmp_path / "old.csv").read_text() == "old"
    assert [ended.reason for ended in first.ended] == ["failed"]


def test_a_sink_that_cannot_open_is_named_and_an_error_in_taking_back_does_not_hide_it():
    stubborn = FailingSink("close", ValueError("no"))
    failing = FailingSink("open", PermissionError(13, "Permission denied"))
    never = RecordingSink()
    with pytest.raises(
        OutputFailed, match="FailingSink: permission denied; nothing was run\n  Give a place where"
    ):
        delivery(stubborn, failing, never).open()
    assert len(stubborn.ended) == 1
    assert never.heads == []


def test_a_failed_march_keeps_the_rows_in_its_files(tmp_path):
    out = delivery(Csv(tmp_path / "a.csv"))
    out.open()
    out.row(0.0, np.array([1.0]))
    out.row(1.0, np.array([2.0]))
    out.close(Ended("failed", 1.0))
    assert (tmp_path / "a.csv").read_text().splitlines()[-1] == "1.0,2.0,"


class Interrupted(RecordingSink):
    """Ctrl-C arrives while it takes a block."""

    def write(self, times, states, events):
        import signal

        super().write(times, states, events)
        signal.raise_signal(signal.SIGINT)


def test_ctrl_c_within_a_block_comes_after_every_sink_has_it():
    first, second = Interrupted(), RecordingSink()
    out = delivery(first, second)
    out.open()
    out.row(0.0, np.array([1.0]))
    with pytest.raises(KeyboardInterrupt):
        out.flush()
    assert first.times == second.times == [0.0]
    out.row(1.0, np.array([2.0]))
    with pytest.raises(KeyboardInterrupt):
        out.close(Ended("interrupted", 1.0))
    assert first.times == second.times == [0.0, 1.0]
    assert len(first.ended) == len(second.ended) == 1


def test_a_second_ctrl_c_goes_through_a_sink_that_hangs():
    import signal

    class Hanging(RecordingSink):
        def write(self, times, states, events):
            super().write(times, states, events)
            for _ in range(2):
                signal.raise_signal(signal.SIGINT)
            raise AssertionError("still hanging")

    hanging, other = Hanging(), RecordingSink()
    out = delivery(hanging, other)
    out.open()
    out.row(0.0, np.array([1.0]))
    with pytest.raises(KeyboardInterrupt):
        out.flush()
    out.close(Ended("interrupted", 0.0))
    assert hanging.times == other.times == [0.0]
    assert signal.getsignal(signal.SIGINT) is signal.default_int_handler


def test_ctrl_c_within_a_call_comes_at_once():
    import signal

    seen = []

    def look(t, y):
        signal.raise_signal(signal.SIGINT)
        seen.append(t)

    memory = Memory()
    out = delivery(Call(look), memory)
    out.open()
    with pytest.raises(KeyboardInterrupt):
        out.row(0.0, np.array([1.0]))
    out.close(Ended("interrupted", 0.0))
    assert seen == []


def test_a_lost_output_is_told_even_where_ctrl_c_comes_with_it():
    class Both(FailingSink):
        def write(self, times, states, events):
            import signal

            signal.raise_signal(signal.SIGINT)
            super().write(times, states, events)

    out = delivery(Both("write", OSError(28, "No space left on device")))
    out.open()
    out.row(0.0, np.array([1.0]))
    with pytest.raises(OutputFailed):
        out.flush()


@settings(deadline=None, derandomize=True, max_examples=80)
@given(
    steps=st.integers(1, 700),
    every=st.integers(1, 50),
    flushes=st.sets(st.integers(0, 700), max_size=5),
    marks=st.sets(st.integers(0, 700), max_size=5),
)
def test_thinned_rows_are_a_selection_of_all_rows_whatever_the_blocks(steps, every, flushes, marks):
    full, thinned = Memory(), Memory(every_steps=every)
    out = delivery(full, thinned, stop=float(steps))
    out.open()
    for n in range(steps + 1):
        out.row(float(n), np.array([n * 3.0]), "mark" if n in marks else "")
        if n in flushes:
            out.flush()
    out.close(STOP)
    want = [n for n in range(steps + 1) if n % every == 0 or n in marks or n == steps]
    assert full.times.tolist() == list(range(steps + 1))
    assert thinned.times.tolist() == want
    assert thinned.states[:, 0].tolist() == [3.0 * n for n in want]
    assert [i for i, label in zip(want, thinned.events, strict=True) if label] == sorted(
        m for m in marks if m <= steps
    )
