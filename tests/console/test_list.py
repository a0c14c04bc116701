"""`newel list`: which methods there are, in a table that stays readable."""

import pytest

import newel
from tests.console.driver import own, process, say, uncolored

pytestmark = pytest.mark.core


def rows(said):
    return [line.split()[0] for line in said.out.splitlines()[2:] if line and line[0].islower()]


def test_every_method_has_one_line_and_the_last_lines_count_them():
    said = say("list")
    assert said.status == 0
    assert said.err == ""
    slugs = newel.names()
    assert sorted(rows(said)) == sorted(slugs)
    assert f"{len(slugs)} methods.  In full: newel inspect SLUG" in said.out
    assert "Families: doubled-{method}" in said.out


@pytest.mark.parametrize("width", [80, 110, 200])
def test_no_line_is_wider_than_the_terminal_and_no_slug_is_cut(width):
    said = say("list", width=width)
    assert max(map(len, said.out.splitlines())) <= width
    assert "papakostas-papageorgiou-second-5-4 " in said.out


def test_names_are_shown_where_there_is_room():
    assert "Dormand–Prince 5(4)" in say("list", width=130).out
    assert "Dormand–Prince 5(4)" not in say("list", width=80).out


def test_color_says_nothing_that_the_words_do_not_say():
    plain, colored = say("list"), say("list", color=True)
    assert "\x1b[" in colored.out
    assert "\x1b[" not in plain.out
    assert [line.rstrip() for line in uncolored(colored.out).splitlines()] == plain.out.splitlines()


def test_filters_join_and_the_count_says_of_how_many():
    said = say("list", "--order", "4..5", "--stages", "6,7", "--embedded", "--text", "prince")
    assert rows(said) == [
        "dormand-prince-six-stage-5-4",
        "dormand-prince-5-4",
        "dormand-prince-stable-5-4",
    ]
    assert f"3 methods of {len(newel.names())}." in said.out
    assert "Families" not in said.out


def test_embedded_and_its_opposite_share_out_all_methods():
    pairs, others = rows(say("list", "--embedded")), rows(say("list", "--no-embedded"))
    assert "dormand-prince-5-4" in pairs
    assert "kutta-4" in others
    assert sorted([*pairs, *others]) == sorted(newel.names())


def test_text_finds_usual_names_and_authors_without_accents_and_case():
    assert "kutta-4" in rows(say("list", "--text", "rk4"))
    assert rows(say("list", "--text", "NYSTROM")) == ["nystrom-3", "nystrom-5"]


def test_runge_kutta_is_the_name_of_all_and_finds_no_namesake_alone():
    assert len(rows(say("list", "--text", "Runge-Kutta"))) == len(newel.names())
    assert "gill-4" not in rows(say("list", "--text", "kutta"))


@pytest.mark.parametrize(
    ("by", "first"), [("year", "euler-1"), ("slug", "allampalli-hixon-4-stages-6"), ("stages", "euler-1")]
)
def test_sort_decides_which_comes_first(by, first):
    assert rows(say("list", "--sort", by))[0] == first


def test_sort_by_floor_never_goes_down():
    floors = [method["working_floor"] for method in say("list", "--sort", "floor", "--json").data["methods"]]
    assert floors == sorted(floors)


def test_nothing_found_is_said_and_is_no_error():
    said = say("list", "--order", "4", "--text", "xyzzy")
    assert (said.status, said.out) == (
        0,
        f"0 methods of {len(newel.names())}.  In full: newel inspect SLUG\n",
    )


def test_json_is_one_document_with_all_fields():
    data = say("list", "--order", "8", "--json").data
    assert data["schema"] == "newel-list/1"
    entry = next(each for each in data["methods"] if each["slug"] == "prince-dormand-8-7")
    assert (entry["order"], entry["embedded_order"], entry["stages"], entry["outcome"]) == (
        8,
        7,
        13,
        "rounded",
    )
    assert {"doubled-{method}", "chebyshev-2-stages-{stages}"} < set(data["families"])


def test_a_folder_of_ones_own_is_listed_with_its_place(tmp_path):
    (tmp_path / "mine").mkdir()
    (tmp_path / "mine" / "two-thirds-2.toml").write_text(own())
    for words in (("--tableaux", "mine", "list"), ("list", "--tableaux", "mine")):
        said = say(*words)
        assert "two-thirds-2 * " in said.out
        assert f"* two-thirds-2: {tmp_path / 'mine' / 'two-thirds-2.toml'}" in said.out
        assert f"{len(newel.names()) + 1} methods." in said.out


def test_the_variable_lists_folders_too(tmp_path, monkeypatch):
    (tmp_path / "mine").mkdir()
    (tmp_path / "mine" / "two-thirds-2.toml").write_text(own())
    monkeypatch.setenv("NEWEL_TABLEAUX", str(tmp_path / "mine"))
    assert "two-thirds-2 *" in process("list", "--text", "thirds").out


def test_a_method_that_does_not_hold_is_left_out_with_a_notice(tmp_path):
    (tmp_path / "mine").mkdir()
    (tmp_path / "mine" / "two-thirds-2.toml").write_text(own(node="2/5"))
    said = say("list", "--tableaux", "mine", "--text", "thirds")
    assert said.status == 0
    assert "two-thirds-2" not in said.out
    assert said.err.startswith("notice: tableau 'two-thirds-2' of folder")
    assert "a claim does not hold" in said.err


def test_a_list_imports_neither_numpy_nor_any_engine():
    import subprocess
    import sys

    code = (
        "import sys; from newel.console.main import main; main(['list', '--json']);"
        "print(sorted({m.split('.')[0] for m in sys.modules} & {'numpy', 'rich', 'scipy'}), file=sys.stderr);"
        "print([m for m in sys.modules if m.startswith('newel.marching')], file=sys.stderr)"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stderr == "[]\n[]\n"
