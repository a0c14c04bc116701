"""Real processes, pipes, devices and signals: where results go, and how a command ends."""

import os
import signal
import subprocess
import sys
from pathlib import Path

import pytest

from tests.console.driver import LOCK, process

pytestmark = [
    pytest.mark.core,
    pytest.mark.skipif(sys.platform == "win32", reason="signals and devices of POSIX"),
]

NEWEL = [sys.executable, "-m", "newel"]

INTERRUPTED = """
import os, signal
import newel

calls = 0

def rate(t, y):
    global calls
    calls += 1
    if calls == {at}:
        os.kill(os.getpid(), signal.SIGINT)
    return -y

model = newel.Model(rate, start=0.0, stop=10.0, state=[1.0], labels=["x"], time_unit="s")
"""

STEPS = ("--method", "kutta-4", "--step", "0.5")


def test_results_go_to_stdout_and_nothing_else_does():
    said = process(*LOCK, "--to", "lock.csv")
    assert said.status == 0
    assert said.err == ""
    assert said.out.startswith("example:lock by dormand-prince-5-4\n")
    assert Path("lock.csv").exists()


@pytest.mark.parametrize(
    "words", [("list",), ("list", "--json"), ("inspect", "kutta-4"), ("guide", "march-a-model")]
)
def test_a_pipe_that_is_closed_at_once_is_silent_and_0(words):
    reader, writer = os.pipe()
    os.close(reader)
    done = subprocess.run([*NEWEL, *words], stdout=writer, stderr=subprocess.PIPE, timeout=120)
    os.close(writer)
    assert (done.returncode, done.stderr) == (0, b"")


def test_a_reader_that_takes_one_line_is_enough():
    with subprocess.Popen([*NEWEL, "list"], stdout=subprocess.PIPE, stderr=subprocess.PIPE) as started:
        assert started.stdout.readline().startswith(b"slug")
        started.stdout.close()
        assert started.stderr.read() == b""
        assert started.wait(timeout=120) == 0


@pytest.mark.skipif(not os.path.exists("/dev/full"), reason="no device that is always full")
@pytest.mark.parametrize("words", [("list",), ("check", "kutta-4", "--json"), ("--help",)])
def test_a_full_disk_under_stdout_is_said_and_status_1(words):
    with open("/dev/full", "wb") as full:
        done = subprocess.run([*NEWEL, *words], stdout=full, stderr=subprocess.PIPE, timeout=120, text=True)
    assert done.returncode == 1
    assert done.stderr == "stdout: No space left on device; the result is not complete\n"


@pytest.mark.skipif(not os.path.exists("/dev/full"), reason="no device that is always full")
def test_a_full_disk_under_an_output_is_said_with_what_is_kept():
    os.symlink("/dev/full", "full.csv")
    said = process(*LOCK, "--to", "full.csv", "--to", "good.csv")
    assert said.status == 1
    assert "full.csv" in said.err
    assert "Traceback" not in said.err
    assert len(Path("good.csv").read_text().splitlines()) >= 1


def test_ctrl_c_in_a_march_keeps_the_rows_and_says_that_it_cannot_be_resumed():
    Path("slow.py").write_text(INTERRUPTED.format(at=30))
    said = process("march", "slow.py", *STEPS, "--to", "slow.csv")
    assert said.status == 3
    assert "Traceback" not in said.err
    assert said.err.startswith("stopped by Ctrl-C at t = 3.5\n  Kept: 7 steps up to t = 3.5")
    assert said.err.splitlines()[-1] == "  It cannot be resumed.  The rows so far are in slow.csv."
    assert "  ended     by Ctrl-C, before its stop at 10 s\n" in said.out
    rows = Path("slow.csv").read_text().splitlines()
    assert rows[0] == "t,x"
    assert [float(row.split(",")[0]) for row in rows[1:]] == [0.5 * n for n in range(8)]


def test_ctrl_c_in_a_march_without_output_gives_a_whole_json_document():
    Path("slow.py").write_text(INTERRUPTED.format(at=30))
    said = process("march", "slow.py", *STEPS, "--json")
    assert said.status == 3
    assert said.data["ended"]["reason"] == "interrupted"
    assert said.data["accepted"] == 7
    assert said.err.splitlines()[-1] == "  It cannot be resumed.  No rows were kept."


def test_ctrl_c_while_a_model_is_loaded_is_status_3():
    Path("early.py").write_text("import os, signal\nos.kill(os.getpid(), signal.SIGINT)\nwhile True: pass\n")
    said = process("march", "early.py", *STEPS, "--to", "early.csv")
    assert said.status == 3
    assert said.err.startswith("stopped by Ctrl-C\n")
    assert "Traceback" not in said.err
    assert not Path("early.csv").exists()


def test_a_stdout_that_knows_ascii_alone_is_written_with_escapes():
    said = process("inspect", "kutta-4", env={**os.environ, "PYTHONIOENCODING": "ascii", "PYTHONUTF8": "0"})
    assert said.status == 0
    assert "Kutta\\u2019s fourth-order method" in said.out


def test_a_closed_stdout_and_a_closed_stderr_are_no_crash():
    for closing in ("exec 1>&-", "exec 2>&-", "exec 1>&- 2>&-"):
        line = f'{closing}; exec "{sys.executable}" -m newel check kutta-4'
        done = subprocess.run(["sh", "-c", line], capture_output=True, timeout=120)
        assert done.returncode in (0, 1)
        assert b"Traceback" not in done.stderr


def test_an_interrupt_leaves_the_signal_as_python_has_it():
    from tests.console.driver import say

    before = signal.getsignal(signal.SIGINT)
    say("list")
    assert signal.getsignal(signal.SIGINT) is before
