"""Fenced blocks of a Markdown document, run in order in a folder of their own.

`sh` blocks are run by bash and stop at the first command that fails. `python` blocks share one namespace, as
in one session. A block whose first line is a comment with a file name (`# plant.py`) is written to that file
instead. A `text` block that follows holds what was printed; `…` in it stands for anything.
"""

from __future__ import annotations

import json
import os
import re
import shlex
import subprocess
import sys
from pathlib import Path

import attrs

from tests.installing import pip_into

__all__ = [
    "GUIDES",
    "README",
    "ROOT",
    "RUN",
    "Block",
    "Outcome",
    "agrees",
    "documents",
    "faults",
    "read_blocks",
    "runnable",
]

ROOT = Path(__file__).parents[2]
README = ROOT / "README.md"
GUIDES = ROOT / "src" / "newel" / "guide"
INSTALLS = 2
RUN = ("sh", "python")
FILE = re.compile(r"# (?P<name>[\w./-]+\.(?:py|toml|md))")
FENCE = re.compile(r"^```(?P<language>\w*)\n(?P<text>.*?)^```$", re.MULTILINE | re.DOTALL)
UNITS = re.compile(r"(\d+)(?= units in the last place)")

# Runs the blocks that it is given as JSON, and returns as JSON what each printed, to the first that fails.
DRIVER = """
import contextlib, io, json, subprocess, sys, traceback
namespace, printed = {"__name__": "__main__"}, []
for language, line, text in json.load(sys.stdin):
    wrong = ""
    if language == "sh":
        done = subprocess.run(["bash", "-e", "-c", text], stdin=subprocess.DEVNULL, stdout=subprocess.PIPE,
                              stderr=subprocess.STDOUT, text=True)
        output = done.stdout
        wrong = f"exit status {done.returncode}" if done.returncode else ""
    else:
        sink = io.StringIO()
        with contextlib.redirect_stdout(sink):
            try:
                exec(compile("\\n" * line + text, "guide", "exec"), namespace)
            except BaseException:
                wrong = traceback.format_exc()
        output = sink.getvalue()
    printed.append([output, wrong])
    if wrong:
        break
json.dump(printed, sys.stdout)
"""


@attrs.frozen
class Block:
    """One fenced block: its language, text, the line of its fence, and the file that it fills, or None."""

    language: str
    text: str
    line: int
    file: str | None


def documents() -> list[Path]:
    """The README and every guide."""
    return [README, *sorted(GUIDES.glob("*.md"))]


def read_blocks(path: Path) -> list[Block]:
    """Return the fenced blocks of a document in order."""
    text = path.read_text(encoding="utf-8")
    blocks = []
    for found in FENCE.finditer(text):
        body = found["text"]
        file = FILE.fullmatch(body.partition("\n")[0])
        line = text.count("\n", 0, found.start()) + 1
        blocks.append(Block(found["language"], body, line, file["name"] if file else None))
    return blocks


def runnable(path: Path) -> list[Block]:
    """Return the blocks of a document without the two at the head of the README, which install newel."""
    return read_blocks(path)[INSTALLS:] if path == README else read_blocks(path)


@attrs.frozen
class Outcome:
    """What a block printed: the block, the `text` block that shows it (or None), the output, and an error."""

    block: Block
    shown: Block | None
    output: str
    error: str

    @property
    def agrees(self) -> bool:
        """Whether nothing failed and the document shows what was printed."""
        return not self.error and (self.shown is None or agrees(self.shown.text, self.output))

    def __str__(self) -> str:
        if self.error or self.shown is None:
            return f"line {self.block.line}: {self.error}\n{self.output}"
        return (
            f"line {self.shown.line} shows\n{self.shown.text}"
            f"but line {self.block.line} printed\n{self.output}"
        )


def faults(blocks: list[Block], folder: Path) -> list[Outcome]:
    """Run the blocks in a folder and return what differs from what the document shows."""
    for block in (each for each in blocks if each.file):
        place = folder / str(block.file)
        place.parent.mkdir(parents=True, exist_ok=True)
        place.write_text(block.text, encoding="utf-8")
    running = [(i, b) for i, b in enumerate(blocks) if b.language in RUN and b.file is None]
    asked = json.dumps([[b.language, b.line, b.text] for _, b in running])
    done = subprocess.run(
        [sys.executable, "-W", "error", "-c", DRIVER],
        input=asked,
        capture_output=True,
        text=True,
        cwd=folder,
        env=_environment(folder),
        timeout=600,
    )
    if done.returncode != 0 or done.stderr:
        raise RuntimeError(f"the session ended with {done.returncode}:\n{done.stderr}")
    outcomes = []
    for (i, block), (output, error) in zip(running, json.loads(done.stdout), strict=False):
        following = blocks[i + 1] if i + 1 < len(blocks) else None
        shown = following if following is not None and following.language == "text" else None
        outcomes.append(Outcome(block, shown, output, error))
    return [outcome for outcome in outcomes if not outcome.agrees]


def agrees(shown: str, printed: str) -> bool:
    """Whether a document shows what was printed; spaces at the ends of lines do not count.

    A count of units in the last place depends on the order in which a machine sums: up to ten times what is
    shown agrees.
    """
    expected, got = _lines(shown), _lines(printed)
    for before, now in zip(UNITS.findall(expected), UNITS.findall(got), strict=False):
        if int(now) > 10 * max(int(before), 1):
            return False
    expected, got = UNITS.sub("few", expected), UNITS.sub("few", got)
    pattern = ".*?".join(re.escape(part) for part in expected.split("…"))
    return re.fullmatch(pattern, got, re.DOTALL) is not None


def _lines(text: str) -> str:
    return "\n".join(line.rstrip() for line in text.strip("\n").splitlines())


def _environment(folder: Path) -> dict[str, str]:
    """A terminal of 100 columns without colour; this Python's commands; a cache and a `pip` of its own.

    The `pip` installs into a folder of the test, so that the Python that runs the tests stays as it is.
    """
    site, commands = folder / ".site", folder / ".commands"
    commands.mkdir()
    command, options = pip_into(site)
    pip = commands / "pip"
    pip.write_text(f'#!/bin/sh\nexec {shlex.join(command)} "$@" {shlex.join(options)}\n')
    pip.chmod(0o755)
    before = [os.path.abspath(each) for each in os.environ.get("PYTHONPATH", "").split(os.pathsep) if each]
    kept = {key: value for key, value in os.environ.items() if not key.startswith(("NEWEL_", "PYTEST_"))}
    return {
        **kept,
        "PATH": os.pathsep.join([str(commands), str(Path(sys.executable).parent), os.environ["PATH"]]),
        "PYTHONPATH": os.pathsep.join([str(site), *before]),
        "NEWEL_CACHE": str(folder / ".cache"),
        "COLUMNS": "100",
        "NO_COLOR": "1",
        "TERM": "dumb",
        "PYTHONUTF8": "1",
    }
