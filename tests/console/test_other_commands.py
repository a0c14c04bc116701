"""`newel examine`, `newel plugins`, `newel guide`."""

import subprocess
import sys
from pathlib import Path

import pytest

import newel
from tests.console.driver import DECAY, own, say

pytestmark = pytest.mark.core


def test_examine_shows_the_model_and_finds_nothing_wrong_with_the_lock():
    said = say("examine", "example:lock")
    assert said.status == 0
    assert "  breaks    20, 80, 150\n" in said.out
    assert "  events    gates may be opened\n" in said.out
    assert said.out.endswith("Nothing spoils a march.\n")


def test_examine_is_status_1_where_something_spoils_a_march():
    Path("bad.py").write_text(DECAY.replace("-rate * y", "None"))
    said = say("examine", "bad.py")
    assert said.status == 1
    assert "  error     rate: returned None" in said.out
    data = say("examine", "bad.py", "--json").data
    assert data["schema"] == "newel-examination/1"
    assert (data["ok"], data["findings"][0]["severity"]) == (False, "error")


def test_examine_passes_settings_on():
    Path("decay.py").write_text(DECAY)
    assert say("examine", "decay.py:build", "--set", "rate=3.0").status == 0
    said = say("examine", "decay.py:build", "--set", "rat=3.0")
    assert said.status == 2
    assert "no setting 'rat'" in said.err


def test_plugins_shows_what_newel_itself_brings():
    said = say("plugins")
    assert said.status == 0
    assert "gustafsson-pi" in said.out
    assert "sinks        memory, csv, json-lines, call" in said.out
    assert max(map(len, said.out.splitlines())) <= 80


def test_plugins_shows_what_was_left_out_and_why_once_and_is_status_1():
    Path("mine").mkdir()
    Path("mine/kutta-4.toml").write_text(own("kutta-4"))
    said = say("plugins", "--tableaux", "mine")
    assert said.status == 1
    assert said.err == ""
    assert "  left out     tableau 'kutta-4' is offered by newel itself" in said.out
    data = say("plugins", "--tableaux", "mine", "--json").data
    assert data["schema"] == "newel-plugins/1"
    folder = data["origins"][1]
    assert folder["origin"]["kind"] == "folder"
    assert (folder["tableaux"], len(folder["problems"])) == (["kutta-4"], 1)


def test_guide_lists_topics_and_shows_each_as_it_is_written():
    from newel.guide import topics

    out = say("guide").out
    assert topics()
    for topic, title in topics().items():
        assert f"- `newel guide {topic}`: {title}\n" in out
        assert say("guide", topic).out == newel.guide(topic)
    assert [each["topic"] for each in say("guide", "--json").data["topics"]] == list(topics())


def test_a_guide_is_drawn_on_a_terminal():
    drawn = say("guide", "march-a-model", color=True).out
    assert "\x1b[" in drawn
    assert "```" not in drawn


def test_a_guide_that_is_not_there_is_answered_with_the_nearest():
    said = say("guide", "march-a-modell")
    assert said.status == 2
    assert said.err.startswith("unknown guide 'march-a-modell'\n  Near names: march-a-model")


@pytest.mark.parametrize(
    "first", ["import newel.guide", "import newel; newel.guide", "from newel.guide import topics"]
)
def test_newel_guide_can_be_called_whoever_imported_its_folder_first(first):
    code = f"{first}; import newel; print(newel.guide('march-a-model').splitlines()[0])"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout == "# March a model\n"
