"""The command, run inside this process with an injected screen, or as a process of its own."""

import io
import json
import re
import subprocess
import sys

from newel.console.main import main
from newel.console.screen import Screen

LOCK = ("march", "example:lock", "--method", "dormand-prince-5-4", "--rel-tol", "1e-6", "--abs-tol", "1e-9")

DECAY = """
import newel

def build(rate=1.0):
    return newel.Model(lambda t, y: -rate * y, start=0.0, stop=1.0, state=[1.0], labels=["x[0]"])

model = build()
"""

OWN = """
schema = "newel-tableau/1"
slug = "{slug}"
name = "Two thirds"
authors = ["A. Nobody"]
year = 2020
source = "made for a test"
numbers = "derived"
order = {order}
nodes = ["0", "{node}"]
matrix = [[], ["{node}"]]
weights = ["1/4", "3/4"]
"""


def own(slug="two-thirds-2", order=2, node="2/3"):
    return OWN.format(slug=slug, order=order, node=node)


class Said:
    """What a command said, and its exit status."""

    def __init__(self, status, out, err):
        self.status, self.out, self.err = status, out, err

    @property
    def data(self):
        return json.loads(self.out, parse_constant=_refuse)


def _refuse(name):
    raise AssertionError(f"{name} is not JSON")


def say(*words, width=80, color=False):
    """Run the command with a console of a fixed width."""
    settings = {"width": width, "force_terminal": color, "color_system": "standard" if color else None}
    out, err = io.StringIO(), io.StringIO()
    status = main(list(words), screen=Screen(out, err, **settings))
    return Said(status, out.getvalue(), err.getvalue())


def process(*words, **settings):
    """Run the command as a process."""
    done = subprocess.run(
        [sys.executable, "-m", "newel", *words],
        capture_output=True,
        timeout=120,
        encoding="utf-8",
        stdin=subprocess.DEVNULL,
        **settings,
    )
    return Said(done.returncode, done.stdout, done.stderr)


def uncolored(text):
    return re.sub(r"\x1b\[[0-9;]*m", "", text)
