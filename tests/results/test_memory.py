"""The memory sink: what it keeps, how much, and what it refuses."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from newel.errors import BadRequest
from newel.results.run import Ended
from newel.results.sinks import Memory
from newel.results.sinks import memory as memory_module
from newel.results.sinks.memory import MemoryFull, bytes_as_text, free_memory
from newel.testing import blocks, check_sink_contract, head_for

pytestmark = pytest.mark.core

STOP = Ended("stop", 1.0)


def rows(count, first=0, size=2):
    times = np.arange(first, first + count, dtype=float)
    return times, np.outer(times, np.arange(1.0, size + 1)), ("",) * count


def test_it_keeps_the_sink_contract():
    check_sink_contract(Memory, read_back=lambda memory: (memory.times, memory.states))


@settings(deadline=None, derandomize=True, max_examples=60)
@given(pieces=st.lists(blocks((2, 2)), max_size=6))
def test_what_is_written_in_any_blocks_is_read_back_in_order(pieces):
    memory = Memory()
    memory.open(head_for((2, 2)))
    for times, states in pieces:
        memory.write(times, states, ("",) * len(times))
    memory.close(STOP)
    want = np.concatenate([np.empty(0), *(times for times, _ in pieces)])
    assert np.array_equal(memory.times, want)
    assert np.array_equal(
        memory.states, np.concatenate([np.empty((0, 2, 2)), *(states for _, states in pieces)])
    )


def test_rows_are_right_across_many_pieces_of_different_sizes(monkeypatch):
    monkeypatch.setattr(memory_module, "_CHUNK", 24 * 300)
    memory = Memory()
    memory.open(head_for())
    for first in range(0, 2000, 100):
        memory.write(*rows(100, first))
    memory.close(STOP)
    assert np.array_equal(memory.times, np.arange(2000.0))
    assert np.array_equal(memory.states[:, 1], 2 * np.arange(2000.0))


def test_it_can_be_read_while_it_is_open_and_goes_on_afterwards():
    memory = Memory()
    memory.open(head_for())
    memory.write(*rows(3))
    assert memory.times.tolist() == [0, 1, 2]
    memory.write(*rows(2, 3))
    memory.close(STOP)
    assert memory.times.tolist() == [0, 1, 2, 3, 4]
    assert memory.states[:, 0].tolist() == [0, 1, 2, 3, 4]


def test_reading_it_in_between_loses_nothing_in_a_later_piece():
    memory = Memory()
    memory.open(head_for())
    for first in range(0, 1000, 100):
        memory.write(*rows(100, first))
        assert len(memory.states) == first + 100
    memory.close(STOP)
    assert np.array_equal(memory.times, np.arange(1000.0))


def test_size_is_that_of_times_and_states():
    assert Memory.size_of(10, (3, 4), np.float32) == 10 * (8 + 12 * 4)
    assert Memory.size_of(1, (), complex) == 24


def test_at_the_limit_it_keeps_the_rows_that_fit_and_signals():
    memory = Memory(limit=5 * 24 + 23)
    memory.open(head_for())
    memory.write(*rows(3))
    assert memory.room == 2
    with pytest.raises(MemoryFull, match="5 rows fill the memory sink; its limit is 143 bytes") as caught:
        memory.write(*rows(4, 3))
    assert (caught.value.rows, caught.value.limit) == (5, 143)
    memory.close(Ended("memory", 4.0))
    assert memory.times.tolist() == [0, 1, 2, 3, 4]
    assert memory.states.shape == (5, 2)


def test_the_default_limit_is_a_quarter_of_the_free_memory_and_at_most_4_gib(monkeypatch):
    monkeypatch.setattr(memory_module, "free_memory", lambda: 4000)
    assert Memory().limit == 1000
    monkeypatch.setattr(memory_module, "free_memory", lambda: 1 << 50)
    assert Memory().limit == 4 << 30


def test_free_memory_is_that_of_a_real_machine():
    assert 1 << 20 < free_memory() < 1 << 50


@pytest.mark.parametrize("limit", [0, -1, True, float("nan"), float("inf"), "4 GiB", [1]])
def test_a_limit_that_is_no_number_of_bytes_is_refused_with_its_value(limit):
    with pytest.raises(BadRequest, match="limit=") as caught:
        Memory(limit=limit)
    assert repr(limit) in str(caught.value)
    assert caught.value.argument == "limit"


def test_a_limit_may_be_written_as_a_float():
    assert Memory(limit=2e9).limit == 2_000_000_000


def test_a_march_of_known_length_that_cannot_fit_is_refused_with_size_and_ways_out():
    with pytest.raises(BadRequest) as caught:
        Memory(limit=4 << 30).require_room(20_001, (1000, 1000), np.float32)
    assert str(caught.value) == (
        "20,001 rows of 1,000,000 float32 need 75 GiB; the limit is 4.0 GiB. Nothing was run.\n"
        '  at=[...], every_steps=100, sinks="rows.csv", or sinks=newel.sinks.Memory(limit=...)'
    )


def test_a_march_that_just_fits_is_not_refused():
    Memory(limit=10 * 24).require_room(10, (2,), float)
    with pytest.raises(BadRequest):
        Memory(limit=10 * 24 - 1).require_room(10, (2,), float)


def test_it_does_not_open_where_not_one_row_fits():
    with pytest.raises(BadRequest, match="1 row of 2 float64 need 24 bytes; the limit is 23 bytes"):
        Memory(limit=23).open(head_for())


def test_events_are_kept_by_row_and_are_none_where_the_model_has_none():
    memory = Memory()
    memory.open(head_for())
    memory.write(*rows(2)[:2], ("", "full"))
    memory.write(*rows(2)[:2], ("empty", ""))
    memory.close(STOP)
    assert memory.events == ("", "full", "empty", "")
    memory.open(head_for(has_events=False))
    assert memory.events is None


def test_a_second_march_leaves_the_first_ones_rows_alone():
    memory = Memory()
    memory.open(head_for())
    memory.write(*rows(3))
    memory.close(STOP)
    first = memory.states
    memory.open(head_for())
    memory.write(*rows(3, 100))
    memory.close(STOP)
    assert first[:, 0].tolist() == [0, 1, 2]
    assert memory.states[:, 0].tolist() == [100, 101, 102]


def test_times_of_object_states_stay_exact():
    from fractions import Fraction

    memory = Memory()
    memory.open(head_for((1,), object))
    third = Fraction(1, 3)
    memory.write(np.array([third], dtype=object), np.array([[third]], dtype=object), ("",))
    memory.close(STOP)
    assert memory.times[0] == third
    assert memory.states[0, 0] == third


@pytest.mark.parametrize(
    ("count", "text"),
    [
        (0, "0 bytes"),
        (1023, "1023 bytes"),
        (1024, "1.0 KiB"),
        (10 << 20, "10 MiB"),
        (4 << 30, "4.0 GiB"),
        (1 << 52, "4,096 TiB"),
    ],
)
def test_sizes_are_written_as_people_read_them(count, text):
    assert bytes_as_text(count) == text
