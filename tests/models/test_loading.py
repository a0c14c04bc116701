"""A text names a model; what does not work is said in the user's own terms."""

from __future__ import annotations

import os

import pytest

from newel.errors import BadModel
from newel.models.loading import example_names, load_model

pytestmark = pytest.mark.core

GOOD = """
import newel

pond = newel.Model(lambda t, y: -y, start=0.0, stop=1.0, state=[1.0])
model = pond.replace(stop=2.0)

def build(paddle=1.0, *, width=2.0):
    return pond.replace(state=[paddle, width])
"""


@pytest.fixture
def here(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)

    def write(name, text):
        path = tmp_path / name
        path.parent.mkdir(exist_ok=True)
        path.write_text(text, encoding="utf-8")
        return str(path)

    write("plant.py", GOOD)
    return write


def refusal(text, **settings):
    with pytest.raises(BadModel) as caught:
        load_model(text, **settings)
    return str(caught.value)


def test_a_file_gives_its_model_or_the_one_named(here):
    assert load_model("plant.py").stop == 2.0
    assert load_model("plant.py:pond").stop == 1.0
    assert load_model("plant.py:build").state.tolist() == [1.0, 2.0]
    assert load_model("plant.py:build", paddle=0.5, width=3).state.tolist() == [0.5, 3.0]
    assert load_model(here("deep/plant.py", GOOD)).stop == 2.0


def test_a_module_on_the_path_or_in_this_folder_gives_its_model(here):
    here("station_north.py", GOOD)
    assert load_model("station_north:pond").stop == 1.0
    assert "no 'ponds'  Did you mean pond" in refusal("station_north:ponds")
    assert "there is no module station_south" in refusal("station_south:pond")
    here("station_east.py", "import no_such_thing_at_all")
    message = refusal("station_east:pond")
    assert "station_east.py:1: ModuleNotFoundError: No module named 'no_such_thing_at_all'" in message


def test_a_file_finds_its_neighbours_and_leaves_the_path_as_it_was(here):
    import sys

    before = list(sys.path)
    here("other/curves_of_pumps.py", "STOP = 7.0")
    text = "from curves_of_pumps import STOP\n" + GOOD + "\nmodel = pond.replace(stop=STOP)\n"
    assert load_model(here("other/station.py", text)).stop == 7.0
    assert sys.path == before


def test_an_edit_is_seen_though_the_clock_stands_still(here):
    path = here("plant.py", GOOD)
    load_model("plant.py")
    stamp = os.stat(path)
    here("plant.py", GOOD.replace("stop=2.0", "stop=3.0"))
    os.utime(path, ns=(stamp.st_atime_ns, stamp.st_mtime_ns))
    assert load_model("plant.py").stop == 3.0


def test_examples_are_found_by_name():
    assert "lock" in example_names()
    assert load_model("example:lock", paddle=0.5).params.paddle == 0.5
    message = refusal("example:lok")
    assert "no example 'lok'  Did you mean lock?" in message
    assert "There are: " in message


def test_a_tableau_is_sent_to_the_command_for_tableaux():
    assert refusal("mine.toml") == (
        "mine.toml is a tableau, not a model.\n  For a tableau: newel check mine.toml"
    )


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("plnat.py", "there is no file plnat.py\n  Near it: plant.py."),
        ("nowhere/at/all.py", "there is no file nowhere/at/all.py"),
        ("folder", "folder is a folder"),
        ("folder.py", "folder.py is a folder"),
        ("notes.txt", "notes.txt is no Python file"),
        ("plant", "'plant' names no model"),
        ("", "'' names no model"),
        ("plant.py:3x", "'3x' is no name"),
        ("a b:c", "'a b:c' names no model"),
        ("plant.py:ponds", "plant.py has no 'ponds'  Did you mean pond?"),
        ("plant.py:newel", "plant.py:newel is a module, not a model"),
    ],
)
def test_a_text_that_names_nothing_is_answered_with_what_is_there(here, tmp_path, text, words):
    (tmp_path / "folder").mkdir()
    (tmp_path / "folder.py").mkdir()
    here("notes.txt", "not Python")
    assert words in refusal(text)


@pytest.mark.parametrize(
    ("source", "words"),
    [
        ("x = 1\ndef f(:\n", "bad.py:2: "),
        ("x = '\0'\n", "bad.py"),
        ("x = 1\nx.y\n", "bad.py:2: AttributeError: 'int' object has no attribute 'y'"),
        ("import nothing_of_that_name\n", "bad.py:1: ModuleNotFoundError"),
        ("import sys\nsys.exit('bye')\n", "bad.py:2: SystemExit: bye"),
        ("import json\n\njson.loads('{')\n", "bad.py:3: JSONDecodeError"),
        (GOOD + "\npond.replace(stop=0.0)\n", "bad.py:10: stop equals start (0.0)"),
        ("x = 1\n", "bad.py has no 'model'\n  It has no Model and no function."),
        (
            GOOD.replace("model =", "other ="),
            "bad.py has no 'model'\n  It has: pond (a Model), other (a Model), build (a function).",
        ),
        ("model = 3.0\n", "bad.py:model is a float, not a model"),
        ("def model():\n    return 3.0\n", "bad.py:model returned a float, not a model"),
        ("def model():\n    return 1 / 0\n", "bad.py:2: ZeroDivisionError"),
    ],
)
def test_a_file_that_does_not_give_a_model_is_named_with_its_line(here, source, words):
    here("bad.py", source)
    assert words in refusal("bad.py")


def test_a_file_that_failed_leaves_no_module_behind(here):
    import sys

    here("bad.py", "1 / 0")
    before = set(sys.modules)
    refusal("bad.py")
    assert set(sys.modules) == before


def test_settings_are_checked_against_the_function(here):
    message = refusal("plant.py:build", padle=0.5)
    assert "no setting 'padle'  Did you mean paddle?" in message
    assert "It takes: paddle, width." in message
    assert "is a Model and takes no settings, such as 'paddle'" in refusal("plant.py", paddle=0.5)
    here("needs.py", GOOD + "\ndef model(head, **others):\n    return pond.replace(stop=head)\n")
    assert "needs.py:model needs head" in refusal("needs.py")
    assert load_model("needs.py", head=4.0, anything=1).stop == 4.0
