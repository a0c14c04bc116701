"""Tableau files: what is written reads back the same, and every bad file is refused in words."""

from __future__ import annotations

import contextlib
import os
import tomllib
from importlib.resources import files
from pathlib import Path

import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st

from newel.errors import BadTableau, OutputExists, OutputFailed
from newel.methods.tableau import Notes, Tableau
from newel.methods.tableau_file import MOST_BYTES, format_tableau, load_tableau, parse_tableau, write_tableau

pytestmark = pytest.mark.core

BAD = sorted((Path(__file__).parent / "bad_tableaux").glob("*.toml"))

GOOD = """\
schema = "newel-tableau/1"
slug = "bogacki-shampine-3-2"
name = "Bogacki–Shampine 3(2)"
also_called = ["BS 3(2)"]
authors = ["P. Bogacki", "L. F. Shampine"]
year = 1989
source = "A 3(2) pair of Runge–Kutta formulas, Appl. Math. Lett. 2 (1989) 321-325"
numbers = "from memory: the paper's table"
order = 3
nodes = ["0", "1/2", "0.750", "1"]
matrix = [
  [],
  ["1⁄2"],
  ["0", "3/4"],
  ["2/9", "1/3", "4/9"],
]
weights = ["2/9", "1/3", "4/9", "0"]
digits = { nodes = 18, "nodes[3]" = "exact" }

[embedded]
order = 2
weights = ["7/24", "1/4", "1/3", "1/8"]

[continuous]
order = 3
weights = [
  ["1", "−4/3", "5/9"],
  ["0", "1", "-2/3"],
  ["0", "4/3", "-8/9"],
  ["0", "-1", "1"],
]

[notes]
strengths = ["four stages, three calls a step"]
"""


def printed(tableau: Tableau) -> list[str]:
    """Every number of a tableau as it is printed."""
    rows = [*tableau.matrix, tableau.weights, tableau.nodes, tableau.embedded_weights or ()]
    rows += list(tableau.continuous_weights or ())
    return [str(x) for row in rows for x in row]


def expected_text(file: Path) -> str:
    """The error that a bad file holds as its leading comment."""
    lines = []
    for line in file.read_bytes().decode("utf-8", "replace").split("\n"):
        if not line.startswith("# "):
            break
        lines.append(line[2:])
    return "\n".join(lines)


def minimal(slug: str = "mine-1", **changes: str) -> str:
    """The text of the smallest good file, with keys changed."""
    keys = {
        "schema": '"newel-tableau/1"',
        "slug": f'"{slug}"',
        "name": '"Mine"',
        "source": '""',
        "numbers": '"derived"',
        "order": "1",
        "matrix": "[[]]",
        "weights": "[1]",
    } | changes
    return "".join(f"{key} = {value}\n" for key, value in keys.items())


@pytest.mark.parametrize("file", BAD, ids=lambda file: file.stem)
def test_a_bad_file_is_refused_with_the_words_at_its_head(file: Path) -> None:
    with pytest.raises(BadTableau) as caught:
        load_tableau(file)
    assert str(caught.value).replace(str(file), file.name) == expected_text(file)
    assert caught.value.file == str(file)


def test_the_folder_of_bad_files_is_not_empty_and_each_has_its_words() -> None:
    assert len(BAD) > 50
    assert all(expected_text(file).startswith(file.name) for file in BAD)


def test_every_part_of_a_good_file_arrives(tmp_path: Path) -> None:
    file = tmp_path / "bogacki-shampine-3-2.toml"
    file.write_text(GOOD, encoding="utf-8")
    t = load_tableau(file)
    assert (t.slug, t.name, t.order, t.embedded_order, t.continuous_order) == (
        "bogacki-shampine-3-2",
        "Bogacki–Shampine 3(2)",
        3,
        2,
        3,
    )
    assert t.authors == ("P. Bogacki", "L. F. Shampine")
    assert (t.year, t.also_called, t.numbers) == (1989, ("BS 3(2)",), "from memory: the paper's table")
    assert t.notes.strengths == ("four stages, three calls a step",)
    assert dict(t.digits) == {"nodes": 18, "nodes[3]": "exact"}
    assert str(t.nodes[2]) == "0.750"
    assert str(t.matrix[1][0]) == "1⁄2"
    assert t.continuous_weights[0][1] == -t.continuous_weights[2][1]
    assert t.origin == str(file)


def test_the_text_that_is_written_is_the_one_that_a_person_would_write() -> None:
    assert format_tableau(parse_tableau(GOOD)) == GOOD


def test_a_byte_order_mark_and_windows_line_ends_are_passed_over(tmp_path: Path) -> None:
    file = tmp_path / "mine-1.toml"
    file.write_bytes(b"\xef\xbb\xbf" + minimal().replace("\n", "\r\n").encode())
    assert load_tableau(file).slug == "mine-1"


def readme_example() -> str:
    text = (files("newel.tableaux") / "README.md").read_text(encoding="utf-8")
    return text.split("```toml\n")[1].split("```")[0]


def test_the_example_of_the_readme_is_a_good_file(tmp_path: Path) -> None:
    file = tmp_path / "bogacki-shampine-3-2.toml"
    file.write_text(readme_example(), encoding="utf-8")
    t = load_tableau(file)
    assert t.first_same_as_last
    assert format_tableau(t) == readme_example()


def test_the_readme_tells_every_key_that_the_reader_knows() -> None:
    text = (files("newel.tableaux") / "README.md").read_text(encoding="utf-8")
    with pytest.raises(BadTableau) as caught:
        parse_tableau(minimal(zzz="1"))
    known = str(caught.value).split("Known: ")[1].rstrip(".").split(", ")
    assert len(known) == 17
    assert [key for key in known if f"`{key}`" not in text and f"`[{key}]`" not in text] == []


def test_plain_toml_integers_are_numbers() -> None:
    assert parse_tableau(minimal(weights="[1]")).weights[0] == 1


def test_nodes_left_out_are_the_row_sums() -> None:
    t = parse_tableau(minimal(matrix='[[], ["1/3"], ["1/6", "1/4"]]', weights="[0, 0, 1]"))
    assert [str(c) for c in t.nodes] == ["0", "1/3", "5/12"]


def test_a_model_is_told_from_a_tableau() -> None:
    with pytest.raises(BadTableau) as caught:
        load_tableau("plant.py")
    assert str(caught.value) == "plant.py is a model, not a tableau. For a model: newel examine plant.py"


def test_a_missing_file_is_named_with_its_neighbour(tmp_path: Path) -> None:
    (tmp_path / "kutta-4.toml").write_text("", encoding="utf-8")
    missing = tmp_path / "kuta-4.toml"
    with pytest.raises(BadTableau, match="there is no such file") as caught:
        load_tableau(missing)
    assert str(tmp_path / "kutta-4.toml") in str(caught.value)
    assert caught.value.file == str(missing)


def test_a_folder_a_device_and_another_ending_are_no_tableau_files(tmp_path: Path) -> None:
    folder = tmp_path / "folder.toml"
    folder.mkdir()
    with pytest.raises(BadTableau, match="is a folder"):
        load_tableau(folder)
    with pytest.raises(BadTableau, match="device or pipe"):
        load_tableau("/dev/null")
    other = tmp_path / "mine.json"
    other.write_text("{}", encoding="utf-8")
    with pytest.raises(BadTableau, match=r"ends in \.json"):
        load_tableau(other)
    with pytest.raises(BadTableau, match="cannot be read"):
        load_tableau(other / "below.toml")
    with pytest.raises(BadTableau, match="cannot be read"):
        load_tableau("a\0b.toml")


def test_a_pipe_is_refused_without_waiting_for_it(tmp_path: Path) -> None:
    pipe = tmp_path / "pipe.toml"
    os.mkfifo(pipe)
    with pytest.raises(BadTableau, match="device or pipe"):
        load_tableau(pipe)


def test_a_file_of_ten_megabytes_is_refused_unread(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    file = tmp_path / "huge.toml"
    with file.open("wb") as stream:
        stream.truncate(10_000_000)
    monkeypatch.setattr(Path, "open", lambda *_, **__: pytest.fail("the file was opened"))
    with pytest.raises(BadTableau, match=f"10,000,000 bytes; a tableau file has at most {MOST_BYTES:,}"):
        load_tableau(file)


def test_a_number_of_ten_megabytes_is_refused_by_size_and_named_short() -> None:
    with pytest.raises(BadTableau, match="10,000,1") as caught:
        parse_tableau(minimal(weights='["' + "1" * 10_000_000 + '"]'))
    assert len(str(caught.value)) < 200


def test_brackets_nested_by_the_thousand_do_not_break_the_reader() -> None:
    with pytest.raises(BadTableau):
        parse_tableau(minimal(nodes="[" * 20_000 + "]" * 20_000))


def test_more_stages_than_the_limit_are_refused() -> None:
    rows = ", ".join(["[]"] * 513)
    with pytest.raises(BadTableau, match="513 weights; a tableau has from 1 to 512 stages"):
        parse_tableau(minimal(matrix=f"[{rows}]", weights=str([0] * 513)))


@settings(deadline=None, derandomize=True)
@given(st.text(max_size=200))
@example('schema = "newel-tableau/1"\nslug = 1979-13-45')
@example("\r")
@example("a = 1e999999999999")
def test_no_text_at_all_makes_the_reader_raise_anything_but_its_own_error(text: str) -> None:
    with pytest.raises(BadTableau) as caught:
        parse_tableau(text, file="x.toml")
    assert not isinstance(caught.value, tomllib.TOMLDecodeError)
    assert str(caught.value).startswith("x.toml")


@settings(deadline=None, derandomize=True, max_examples=200)
@given(st.data())
def test_a_good_file_with_one_character_changed_is_read_or_refused(data: st.DataObject) -> None:
    at = data.draw(st.integers(0, len(GOOD) - 1))
    text = GOOD[:at] + data.draw(st.characters()) + GOOD[at + 1 :]
    with contextlib.suppress(BadTableau):
        parse_tableau(text)


texts = st.text(st.characters(exclude_categories=["Cs"]), max_size=40)
lists = st.lists(texts, max_size=3)
numbers = st.one_of(
    st.fractions(max_denominator=10**8),
    st.integers(-(10**20), 10**20),
    st.sampled_from(["1⁄3", "−2/7", "(5 - sqrt(5))/10", "0.30000", "  1 / 3 ", "2.50e-3", "sqrt(8)"]),
    st.floats(-1e6, 1e6),
)


@st.composite
def tableaux(draw: st.DrawFn) -> Tableau:
    s = draw(st.integers(1, 4))
    row = st.lists(numbers, min_size=s, max_size=s)
    b = draw(row)
    # A pair whose two solutions are one is refused, so that the last weight is moved.
    pair = draw(st.booleans())
    embedded = ["1/9", *draw(row)[1:]] if pair and str(b[0]) != "1/9" else None
    continuous = draw(st.none() | st.lists(st.lists(numbers, min_size=2, max_size=2), min_size=s, max_size=s))
    digits = st.one_of(st.just(9), st.just("exact"))
    places = {"nodes": 9, "matrix": draw(digits), "weights": 12, "weights[1]": draw(digits)}
    if embedded is not None:
        places["embedded"] = draw(digits)
    if continuous is not None:
        places["continuous"] = draw(digits)
    return Tableau(
        draw(st.sampled_from(["a", "heun-2", "ssp-4-stages-10"])),
        name=draw(st.sampled_from(["Heun’s", 'say "x"', "back\\slash"])),
        order=draw(st.integers(1, 16)),
        matrix=[draw(st.lists(numbers, min_size=i, max_size=i)) for i in range(s)],
        weights=b,
        nodes=draw(row),
        embedded_weights=embedded,
        embedded_order=None if embedded is None else draw(st.integers(1, 16)),
        continuous_weights=continuous,
        continuous_order=None if continuous is None else draw(st.integers(1, 16)),
        also_called=draw(lists),
        authors=draw(lists),
        year=draw(st.none() | st.integers(1600, 2200)),
        source=draw(texts),
        numbers=draw(st.sampled_from(["published", "derived: by hand", 'from memory: "half"\n'])),
        digits=draw(st.sampled_from([places, 15])),
        notes=Notes(
            strengths=draw(lists), weaknesses=draw(lists), known_failures=draw(lists), remarks=draw(lists)
        ),
    )


@settings(deadline=None, derandomize=True, max_examples=200)
@given(tableaux())
def test_reading_what_was_written_gives_the_same_tableau_and_texts(tableau: Tableau) -> None:
    again = parse_tableau(format_tableau(tableau))
    assert again == tableau
    assert printed(again) == printed(tableau)
    assert again.digest == tableau.digest
    assert [again.half_units(a) for a in ("matrix", "weights")] == [
        tableau.half_units(a) for a in ("matrix", "weights")
    ]
    assert format_tableau(again) == format_tableau(tableau)


@settings(deadline=None, derandomize=True, max_examples=300)
@given(texts)
@example('"""\\ \n\r\t\x00\x1f\x7f\x85\u2028\u2029\ufeff\U0001f4a7"')
def test_any_note_survives_a_file(note: str) -> None:
    tableau = Tableau("a", order=1, matrix=[[]], weights=[1], notes=Notes(remarks=[note]))
    assert parse_tableau(format_tableau(tableau)).notes.remarks == (note,)


def test_a_written_file_can_be_loaded_and_nothing_else_is_left_in_its_folder(tmp_path: Path) -> None:
    tableau = parse_tableau(GOOD)
    file = tmp_path / "bogacki-shampine-3-2.toml"
    write_tableau(tableau, file)
    assert load_tableau(file) == tableau
    assert list(tmp_path.iterdir()) == [file]


def test_an_existing_file_is_kept_unless_it_may_be_replaced(tmp_path: Path) -> None:
    file = tmp_path / "bogacki-shampine-3-2.toml"
    file.write_text("precious", encoding="utf-8")
    with pytest.raises(OutputExists) as caught:
        write_tableau(parse_tableau(GOOD), file)
    assert caught.value.path == str(file)
    assert file.read_text(encoding="utf-8") == "precious"
    write_tableau(parse_tableau(GOOD), file, overwrite=True)
    assert file.read_text(encoding="utf-8") == GOOD
    assert list(tmp_path.iterdir()) == [file]


def test_a_file_that_comes_between_the_check_and_the_writing_is_kept(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    file = tmp_path / "bogacki-shampine-3-2.toml"
    real = os.fsync

    def meanwhile(descriptor: int) -> None:
        real(descriptor)
        file.write_text("precious", encoding="utf-8")

    monkeypatch.setattr(os, "fsync", meanwhile)
    with pytest.raises(OutputExists):
        write_tableau(parse_tableau(GOOD), file)
    assert file.read_text(encoding="utf-8") == "precious"
    assert list(tmp_path.iterdir()) == [file]


def test_a_file_system_without_hard_links_serves_too(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def refuse(*_: object) -> None:
        raise PermissionError(1, "Operation not permitted")

    monkeypatch.setattr(Path, "hardlink_to", refuse)
    file = tmp_path / "bogacki-shampine-3-2.toml"
    write_tableau(parse_tableau(GOOD), file)
    assert list(tmp_path.iterdir()) == [file]
    with pytest.raises(OutputExists):
        write_tableau(parse_tableau(GOOD), file)


def test_a_failed_write_leaves_the_old_file_and_no_rest(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    file = tmp_path / "bogacki-shampine-3-2.toml"
    file.write_text("precious", encoding="utf-8")

    def full(_: int) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(os, "fsync", full)
    with pytest.raises(OutputFailed, match="No space left on device; nothing was written"):
        write_tableau(parse_tableau(GOOD), file, overwrite=True)
    assert file.read_text(encoding="utf-8") == "precious"
    assert list(tmp_path.iterdir()) == [file]


def test_where_a_file_cannot_stand_is_told(tmp_path: Path) -> None:
    tableau = parse_tableau(GOOD)
    with pytest.raises(OutputFailed, match=r"is a folder; name the file: .*bogacki-shampine-3-2\.toml"):
        write_tableau(tableau, tmp_path)
    with pytest.raises(OutputFailed, match="there is no folder"):
        write_tableau(tableau, tmp_path / "missing" / "bogacki-shampine-3-2.toml")
    with pytest.raises(BadTableau, match=r"is named bogacki-shampine-3-2\.toml"):
        write_tableau(tableau, tmp_path / "other.toml")
    assert list(tmp_path.iterdir()) == []
