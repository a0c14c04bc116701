"""CSV and JSON lines: what is in the files, digit by digit."""

import csv
import json
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from newel.errors import OutputExists
from newel.protocols import Head
from newel.results.run import Ended
from newel.results.sinks import Csv, JsonLines
from newel.testing import check_sink_contract, head_for

pytestmark = pytest.mark.core

STOP = Ended("stop", 1.0)


def written(sink, head, times, states, events=None):
    sink.open(head)
    sink.write(np.asarray(times), np.asarray(states), events or ("",) * len(times))
    sink.close(STOP)
    with open(sink.path, encoding="utf-8", newline="") as file:
        return file.read()


def numbers(words, head):
    """Entries of the head's dtype out of the words of one row."""
    values = [float(word) for word in words]
    if head.dtype.kind == "c":
        values = [complex(a, b) for a, b in zip(values[::2], values[1::2], strict=True)]
    return np.array(values, dtype=head.dtype).reshape(head.shape)


class Keep:
    """A file sink with the head that it was opened with, so that its rows can be read back."""

    def __init__(self, sink):
        self.sink, self.head = sink, None

    def open(self, head):
        self.head = head
        self.sink.open(head)

    def __getattr__(self, name):
        return getattr(self.sink, name)


def split_csv(kept):
    with open(kept.path, encoding="utf-8", newline="") as file:
        rows = list(csv.reader(file))[1:]
    words = [row[1:-1] if kept.head.has_events else row[1:] for row in rows]
    return np.array([float(row[0]) for row in rows]), np.array([numbers(row, kept.head) for row in words])


def split_json(kept):
    with open(kept.path, encoding="utf-8") as file:
        rows = [json.loads(line) for line in file][1:]
    words = [row[1:-1] if kept.head.has_events else row[1:] for row in rows]
    return np.array([row[0] for row in rows]), np.array([numbers(row, kept.head) for row in words])


@pytest.mark.parametrize(("kind", "read"), [(Csv, split_csv), (JsonLines, split_json)])
def test_they_keep_the_sink_contract_and_every_number_reads_back_the_same(tmp_path, kind, read):
    names = iter(range(1000))
    check_sink_contract(lambda: Keep(kind(tmp_path / f"rows-{next(names)}")), read_back=read)


def test_csv_has_a_row_of_names_shortest_digits_and_lines_that_end_as_rfc_4180_says(tmp_path):
    # RFC 4180, section 2, rule 1: CRLF ends each record.
    text = written(
        Csv(tmp_path / "a.csv"), head_for(has_events=False), [0.0, 0.1], [[1.0, 1 / 3], [1e22, -5e-324]]
    )
    assert text == "t,y[0],y[1]\r\n0.0,1.0,0.3333333333333333\r\n0.1,1e+22,-5e-324\r\n"


def test_csv_quotes_what_rfc_4180_says_must_be_quoted(tmp_path):
    # RFC 4180, section 2, rules 6 and 7: fields with commas, quotes and line breaks; quotes are doubled.
    head = Head(("level, m", 'the "head"'), (), "s", (2,), np.dtype(float), True, {})
    text = written(Csv(tmp_path / "a.csv"), head, [0.0], [[1.0, 2.0]], ('full, at "last"\n',))
    assert text == 't,"level, m","the ""head""",event\r\n0.0,1.0,2.0,"full, at ""last""\n"\r\n'


def test_csv_has_a_column_for_events_exactly_when_the_model_has_some(tmp_path):
    text = written(Csv(tmp_path / "a.csv"), head_for((1,)), [0.0, 1.0], [[1.0], [2.0]], ("", "full"))
    assert text == "t,y[0],event\r\n0.0,1.0,\r\n1.0,2.0,full\r\n"


def test_csv_is_utf_8(tmp_path):
    head = Head(("Δh",), (), "s", (1,), np.dtype(float), False, {})
    written(Csv(tmp_path / "a.csv"), head, [0.0], [[1.0]])
    assert (tmp_path / "a.csv").read_bytes().startswith("t,Δh".encode())


def test_csv_gives_a_complex_entry_two_columns(tmp_path):
    text = written(Csv(tmp_path / "a.csv"), head_for((1,), complex, False), [0.5], [[1 - 2j]])
    assert text == "t,y[0].re,y[0].im\r\n0.5,1.0,-2.0\r\n"


def test_csv_writes_single_precision_in_its_own_shortest_digits(tmp_path):
    text = written(Csv(tmp_path / "a.csv"), head_for((1,), np.float32, False), [0.1], np.float32([[0.1]]))
    assert text == "t,y[0]\r\n0.1,0.1\r\n"


def test_csv_writes_nan_and_infinity_as_python_reads_them(tmp_path):
    text = written(Csv(tmp_path / "a.csv"), head_for(has_events=False), [0.0], [[np.nan, -np.inf]])
    assert text.splitlines()[1] == "0.0,nan,-inf"


def test_csv_of_object_states_holds_what_str_gives(tmp_path):
    states = np.array([[Fraction(1, 3)]], dtype=object)
    text = written(
        Csv(tmp_path / "a.csv"), head_for((1,), object, False), np.array([Fraction(1, 2)], object), states
    )
    assert text == "t,y[0]\r\n1/2,1/3\r\n"


def test_long_doubles_keep_their_digits(tmp_path):
    third = np.longdouble(1) / 3
    text = written(Csv(tmp_path / "a.csv"), head_for((1,), np.longdouble, False), [0.0], np.array([[third]]))
    assert np.longdouble(text.splitlines()[1].split(",")[1]) == third


def test_json_lines_begin_with_a_head_that_says_what_the_rows_are(tmp_path):
    lines = written(JsonLines(tmp_path / "a.jsonl"), head_for(), [0.0], [[1.0, 2.0]], ("full",)).splitlines()
    assert json.loads(lines[0]) == {
        "schema": "newel-rows/1",
        "method": "kutta-4",
        "digest": "0" * 64,
        "columns": ["t", "y[0]", "y[1]", "event"],
        "labels": ["y[0]", "y[1]"],
        "units": ["m", "m"],
        "time_unit": "s",
        "shape": [2],
        "dtype": "float64",
        "settings": {"steps": "fixed", "step": 0.1},
    }
    assert lines[1:] == ['[0.0,1.0,2.0,"full"]']


def no_constant(name):
    raise AssertionError(f"{name} is no JSON")


def test_json_lines_hold_nan_and_infinity_as_text_in_rows_and_head(tmp_path):
    head = Head(
        ("x", "v"),
        (),
        "s",
        (2,),
        np.dtype(float),
        False,
        {"settings": {"largest": np.inf, "names": ("a", np.float64(2))}},
    )
    text = written(JsonLines(tmp_path / "a.jsonl"), head, [0.0, 1.0], [[np.nan, -np.inf], [1.0, np.inf]])
    lines = [json.loads(line, parse_constant=no_constant) for line in text.splitlines()]
    assert lines[0]["settings"] == {"largest": "inf", "names": ["a", 2.0]}
    assert lines[1:] == [[0.0, "nan", "-inf"], [1.0, 1.0, "inf"]]


def test_json_lines_hold_entries_of_object_states_as_text(tmp_path):
    states = np.array([[Fraction(1, 3)]], dtype=object)
    text = written(
        JsonLines(tmp_path / "a"), head_for((1,), object, False), np.array([Fraction(1, 2)], object), states
    )
    assert text.splitlines()[1] == '["1/2","1/3"]'


@settings(deadline=None, derandomize=True, max_examples=100)
@given(values=st.lists(st.floats(), min_size=1, max_size=30))
def test_any_double_is_the_same_to_the_bit_when_it_is_read_from_either_file(tmp_path_factory, values):
    folder = tmp_path_factory.mktemp("doubles")
    head, column = head_for((1,), has_events=False), np.array(values)[:, None]
    times = np.arange(len(values), dtype=float)
    rows = written(Csv(folder / "a.csv"), head, times, column).splitlines()[1:]
    lines = written(JsonLines(folder / "a.jsonl"), head, times, column).splitlines()[1:]
    for value, row, line in zip(values, rows, lines, strict=True):
        assert np.array_equal(float(row.split(",")[1]), value, equal_nan=True)
        assert np.array_equal(float(json.loads(line)[1]), value, equal_nan=True)


@pytest.mark.parametrize("kind", [Csv, JsonLines])
def test_a_file_that_is_there_is_not_overwritten(tmp_path, kind):
    path = tmp_path / "rows"
    path.write_text("old")
    with pytest.raises(OutputExists) as caught:
        kind(path).open(head_for())
    assert caught.value.path == str(path)
    assert path.read_text() == "old"


@pytest.mark.parametrize("kind", [Csv, JsonLines])
def test_a_longer_file_is_replaced_in_whole_where_that_is_asked_for(tmp_path, kind):
    fresh, used = kind(tmp_path / "fresh"), kind(tmp_path / "used", overwrite=True)
    (tmp_path / "used").write_text("old" * 1000)
    want = written(fresh, head_for(), [0.0], [[1.0, 2.0]])
    assert written(used, head_for(), [0.0], [[1.0, 2.0]]) == want


@pytest.mark.parametrize("kind", [Csv, JsonLines])
def test_an_old_file_stays_until_the_first_rows_come_and_through_a_discard(tmp_path, kind):
    path = tmp_path / "rows"
    path.write_text("old")
    sink = kind(path, overwrite=True)
    sink.open(head_for())
    assert path.read_text() == "old"
    sink.discard()
    assert path.read_text() == "old"


@pytest.mark.parametrize("kind", [Csv, JsonLines])
def test_a_march_without_a_row_leaves_the_head_alone(tmp_path, kind):
    sink = kind(tmp_path / "rows")
    sink.open(head_for())
    sink.close(Ended("failed", 0.0))
    assert len((tmp_path / "rows").read_text().splitlines()) == 1


def test_several_blocks_follow_one_head(tmp_path):
    sink = Csv(tmp_path / "rows")
    sink.open(head_for((1,), has_events=False))
    sink.write(np.array([0.0]), np.array([[1.0]]), ("",))
    sink.write(np.array([1.0]), np.array([[2.0]]), ("",))
    sink.close(STOP)
    assert (tmp_path / "rows").read_bytes() == b"t,y[0]\r\n0.0,1.0\r\n1.0,2.0\r\n"
