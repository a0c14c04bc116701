"""`newel export` and `newel draft`: files that leave, and files that are begun."""

import pytest

import newel
from tests.console.driver import say

pytestmark = pytest.mark.core

ROWS = "0 |\n1/2 | 1/2\n | 0 1\n"


def test_export_writes_to_stdout_what_the_function_returns():
    said = say("export", "kutta-4", "--as", "c", "--digits", "20", "--with-step")
    assert (said.status, said.err) == (0, "")
    assert said.out == newel.export("kutta-4", "c", digits=20, with_step=True)


def test_export_writes_a_file_once(tmp_path):
    assert say("export", "kutta-4", "--as", "fortran", "--to", "kutta.f90").out == "wrote kutta.f90\n"
    before = (tmp_path / "kutta.f90").read_text("utf-8")
    assert before == newel.export("kutta-4", "fortran")
    again = say("export", "heun-2", "--as", "fortran", "--to", "kutta.f90")
    assert again.status == 2
    assert "kutta.f90 exists already; nothing was written" in again.err
    assert (tmp_path / "kutta.f90").read_text("utf-8") == before
    assert say("export", "heun-2", "--as", "fortran", "--to", "kutta.f90", "--force").status == 0
    assert (tmp_path / "kutta.f90").read_text("utf-8") == newel.export("heun-2", "fortran")


def test_export_as_json_holds_the_text():
    data = say("export", "kutta-4", "--as", "bibtex", "--json").data
    assert data["schema"] == "newel-export/1"
    assert data["text"] == newel.export("kutta-4", "bibtex")


@pytest.mark.parametrize(
    ("words", "status", "says"),
    [
        (("kutta-4",), 2, "--as"),
        (("kutta-4", "--as", "cobol"), 2, "'cobol': no language of an export\n  Languages: latex, toml, c"),
        (("kutta-4", "--as", "c", "--digits", "0"), 2, "digits=0"),
        (("kutta-4", "--as", "c", "--digits", "many"), 2, "--digits"),
        (("kutta-4", "--as", "toml", "--with-step"), 2, "toml has no routines"),
        (("kutta-44", "--as", "c"), 2, "kutta-4"),
        (("kutta-4", "--as", "c", "--to", "no/such/file.c"), 1, "there is no folder no/such"),
        (("kutta-4", "--as", "c", "--to", "."), 1, "is a folder"),
    ],
)
def test_export_explains_what_it_cannot_do(words, status, says):
    said = say("export", *words)
    assert (said.status, said.out) == (status, "")
    assert says in said.err
    assert "Traceback" not in said.err


def test_draft_writes_a_skeleton_once():
    said = say("draft", "mine.toml", "--stages", "7", "--order", "5", "--embedded", "4")
    assert (said.status, said.out, said.err) == (0, "wrote mine.toml\n", "")
    assert say("draft", "mine.toml", "--stages", "3").status == 2
    assert say("draft", "mine.toml", "--stages", "3", "--force").status == 0
    refused = say("check", "mine.toml")
    assert refused.status == 2
    assert "'?'" in refused.err


def test_draft_reads_pasted_rows_and_says_how(tmp_path):
    (tmp_path / "pasted.txt").write_text("Table 1\n" + ROWS)
    said = say("draft", "mine-2.toml", "--from", "pasted.txt")
    assert said.status == 0
    assert "2 stages, nodes left of a bar" in said.out
    assert "line 1 was passed over" in said.out
    assert say("check", "mine-2.toml").status == 0
    (tmp_path / "pasted.txt").write_text(ROWS.replace("| 1/2", "| 1/3"))
    wrong = say("draft", "mine-2.toml", "--from", "pasted.txt", "--force")
    assert wrong.status == 1
    assert "row 2 sums to 1/3, its node is 1/2" in wrong.out


def test_draft_completes_a_file_and_writes_it_only_when_told(tmp_path):
    say("draft", "mine-2.toml", "--stages", "2", "--order", "2")
    text = (tmp_path / "mine-2.toml").read_text("utf-8")
    (tmp_path / "mine-2.toml").write_text(text.replace('  ["?"],', '  ["2/3"],'))
    shown = say("draft", "mine-2.toml", "--complete")
    assert shown.status == 0
    assert 'weights = ["1/4", "3/4"]' in shown.out
    assert shown.err.startswith("nothing was written; --force writes it\n")
    assert say("check", "mine-2.toml").status == 2
    assert say("draft", "mine-2.toml", "--complete", "--force").status == 0
    assert say("check", "mine-2.toml").status == 0


def test_draft_as_json_holds_the_text_and_the_report(tmp_path):
    (tmp_path / "pasted.txt").write_text(ROWS)
    data = say("draft", "mine-2.toml", "--from", "pasted.txt", "--json").data
    assert data["schema"] == "newel-draft/1"
    assert data["written"]
    assert data["text"] == (tmp_path / "mine-2.toml").read_text("utf-8")
    assert data["misfits"] == []


@pytest.mark.parametrize(
    ("words", "says"),
    [
        (("mine.toml",), "what to draft?"),
        (("mine.toml", "--from", "nowhere.txt"), "--from nowhere.txt: cannot be read: No such file"),
        (("mine.toml", "--from", "."), "--from .: cannot be read"),
        (("mine.txt", "--stages", "3"), "ends in .txt"),
        (("mine.toml", "--complete"), "mine.toml: there is no such file"),
        (("mine.toml", "--stages", "-1"), "stages=-1"),
    ],
)
def test_draft_explains_what_it_cannot_do(words, says):
    said = say("draft", *words)
    assert (said.status, said.out) == (2, "")
    assert says in said.err
    assert "Traceback" not in said.err
