"""Progress is for terminals: what it shows there, and that it is silent elsewhere."""

import io
import subprocess
import sys

import pytest
from rich.console import Console

from newel.results import progress as progress_module
from newel.results.progress import open_progress

pytestmark = pytest.mark.core


def terminal(**options):
    return Console(file=io.StringIO(), force_terminal=True, width=110, color_system=None, **options)


def test_on_a_terminal_it_shows_time_steps_and_step_length(monkeypatch):
    monkeypatch.setattr(progress_module, "_EVERY_SECONDS", 0.0)
    console = terminal()
    with open_progress(True, 0.0, 200.0, "s", console=console) as progress:
        progress.update(50.0, 1234, 5, 0.025)
    assert " 25 %" in console.file.getvalue()
    assert "t = 50 s   1,234 steps, 5 rejected   step 0.025 s" in console.file.getvalue()


def test_a_march_backwards_fills_the_bar_too_and_a_unit_in_brackets_is_shown_as_it_is(monkeypatch):
    monkeypatch.setattr(progress_module, "_EVERY_SECONDS", 0.0)
    console = terminal()
    with open_progress(True, 10.0, 0.0, "[d]", console=console) as progress:
        progress.update(2.5, 3, 0, -0.5)
    assert " 75 %" in console.file.getvalue()
    assert "t = 2.5 [d]   3 steps   step 0.5 [d]" in console.file.getvalue()


def test_it_draws_at_most_ten_times_a_second(monkeypatch):
    now = [100.0]
    monkeypatch.setattr(progress_module.clock, "monotonic", lambda: now[0])
    console = terminal(get_time=lambda: now[0])
    with open_progress(True, 0.0, 100.0, "s", console=console) as progress:
        for step in range(100):
            now[0] += 0.01
            progress.update(float(step), step, 0, 1.0)
    drawn = {n for n in range(100) if f"t = {n} s" in console.file.getvalue()}
    assert 9 <= len(drawn) <= 11


def test_where_it_is_not_wanted_there_is_none():
    assert open_progress(False, 0.0, 1.0, "s", console=terminal()) is None


def test_where_the_console_is_no_terminal_there_is_none():
    assert open_progress(True, 0.0, 1.0, "s", console=Console(file=io.StringIO())) is None


def test_in_a_pipe_nothing_is_shown_and_rich_is_not_even_imported():
    code = (
        "import sys; from newel.results.progress import open_progress;"
        "print(open_progress(True, 0.0, 1.0, 's'), 'rich' in sys.modules)"
    )
    done = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, check=True, timeout=60
    )
    assert (done.stdout, done.stderr) == ("None False\n", "")
