"""A colleague's package is installed, and its method, controller and sink are used from Python by name."""

import os
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

from tests.installing import pip_into

PACKAGE = Path(__file__).parents[1] / "example_plugin"

PROGRAM = """
import newel

lock = newel.load_model("example:lock", paddle=0.5)
registry = newel.Registry()
halving = registry.controller("halving", room=0.25)
steps = newel.Adaptive(rel_tol=1e-6, abs_tol=1e-8, controller=halving, first=1.0)

run = newel.march(lock, "winding-3", steps=steps, sinks="lock.ledger")
print(run.method, run.estimator, run.settings["controller"], run.ended.label)

plain = newel.march(lock, "even-stairs-2-stages-5", step=1.0)
print(plain.method, plain.estimator, plain.ended.label)

same = newel.march(lock, "winding-3", rel_tol=1e-9, abs_tol=1e-11)
print(abs(run.last_time - same.last_time) < 1e-3)
"""


@pytest.fixture(scope="module")
def site(tmp_path_factory):
    """A folder with the installed package and nothing else."""
    folder = tmp_path_factory.mktemp("colleague")
    left_out = shutil.ignore_patterns("__pycache__", "build")
    source = shutil.copytree(PACKAGE, folder / "source", ignore=left_out)
    pip, options = pip_into(folder / "site")
    subprocess.run([*pip, "install", *options, str(source)], check=True, timeout=300)
    return folder / "site"


@pytest.fixture(scope="module")
def session(site, tmp_path_factory):
    """The folder in which the program ran, and what it printed."""
    folder = tmp_path_factory.mktemp("work")
    before = [os.path.abspath(each) for each in os.environ.get("PYTHONPATH", "").split(os.pathsep) if each]
    path = os.pathsep.join([str(site), *before])
    done = subprocess.run(
        [sys.executable, "-W", "error", "-c", PROGRAM],
        capture_output=True,
        text=True,
        cwd=folder,
        timeout=120,
        env=os.environ | {"PYTHONPATH": path, "NEWEL_CACHE": str(folder / "c")},
    )
    assert done.returncode == 0, done.stderr
    return folder, done.stdout.splitlines()


def test_the_program_uses_all_that_the_package_brings(session):
    _, printed = session
    assert printed == [
        "winding-3 embedded halving gates may be opened",
        "even-stairs-2-stages-5 none gates may be opened",
        "True",
    ]


def test_the_steps_are_those_of_the_controller_and_the_rows_those_of_the_sink(session):
    folder, _ = session
    lines = (folder / "lock.ledger").read_text(encoding="utf-8").splitlines()
    assert lines[0] == "| t | upper level | chamber level | volume |"
    assert lines[-1] == "| ended | event |"
    assert lines[1].startswith("| 0.0 | 34.6 | ")
    assert float(lines[2].split("|")[1]) == 1.0, "the first step was asked for"
    assert float(lines[3].split("|")[1]) == 3.0, "while all is shut the error is zero and steps double"
