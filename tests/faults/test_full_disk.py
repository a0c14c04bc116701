"""Outputs that fail: full disks, limits on a file's size, places where nothing can be written."""

import os
import subprocess
import sys
import textwrap

import numpy as np
import pytest

from newel.errors import NewelError, OutputExists, OutputFailed
from newel.results.delivery import Delivery
from newel.results.run import Ended
from newel.results.sinks import Csv, JsonLines, Memory
from newel.testing import FailingSink, RecordingSink, head_for

pytestmark = pytest.mark.core

FILES = pytest.mark.parametrize("kind", [Csv, JsonLines])
ON_LINUX = pytest.mark.skipif(not os.path.exists("/dev/full"), reason="this system has no /dev/full")


def start(*sinks):
    delivery = Delivery(sinks, head_for((1,), has_events=False), True, 0.0, 1e6)
    delivery.open()
    return delivery


def march(delivery, rows):
    for n in range(rows):
        delivery.row(float(n), np.array([n / 3]))


@ON_LINUX
@FILES
def test_a_full_disk_is_told_with_path_and_reason_and_the_other_sinks_have_every_row(kind, tmp_path):
    memory, good = Memory(), Csv(tmp_path / "good.csv")
    delivery = start(memory, kind("/dev/full"), good)
    with pytest.raises(OutputFailed, match=r"^/dev/full: no space left on device") as caught:
        march(delivery, 1000)
    assert caught.value.path == "/dev/full"
    assert isinstance(caught.value, OSError)
    assert "Kept: no rows; " in str(caught.value)
    assert str(caught.value).endswith("Make room or give another place, and march again.")
    delivery.close(Ended("failed", delivery.last_time))
    assert memory.times.tolist() == list(range(256))
    assert len((tmp_path / "good.csv").read_text().splitlines()) == 257


@ON_LINUX
@FILES
def test_a_disk_that_is_full_only_at_the_end_is_told_when_the_sinks_are_closed(kind):
    memory = Memory()
    delivery = start(kind("/dev/full"), memory)
    march(delivery, 10)
    with pytest.raises(OutputFailed, match=r"in the rows from t = 0\.0 to 9\.0"):
        delivery.close(Ended("stop", 9.0))
    assert len(memory.times) == 10


@FILES
def test_at_a_limit_on_the_files_size_the_file_ends_with_the_last_whole_block(kind, tmp_path):
    pytest.importorskip("resource", reason="this system has no limits on a file's size")
    code = f"""
        import resource
        import numpy as np
        from newel.errors import OutputFailed
        from newel.results.delivery import Delivery
        from newel.results.run import Ended
        from newel.results.sinks import {kind.__name__}
        from newel.testing import head_for

        delivery = Delivery([{kind.__name__}("rows")], head_for((1,), has_events=False), True, 0.0, 1e6)
        delivery.open()
        resource.setrlimit(resource.RLIMIT_FSIZE, (20_000, 20_000))
        try:
            for n in range(100_000):
                delivery.row(float(n), np.array([n / 3]))
        except OutputFailed as error:
            print(error)
        delivery.close(Ended("failed", float(n)))
    """
    command = [sys.executable, "-c", textwrap.dedent(code)]
    done = subprocess.run(command, capture_output=True, text=True, check=True, timeout=60, cwd=tmp_path)
    lines = (tmp_path / "rows").read_text().splitlines()
    rows = len(lines) - 1
    assert rows % 256 == 0
    assert rows > 0
    assert repr((rows - 1) / 3) in lines[-1]
    assert done.stdout.startswith("rows: file too large, in the rows from t = ")
    assert (
        f"Kept: {rows:,} rows up to t = {float(rows - 1)!r}; nothing half-written follows them."
        in done.stdout
    )


@FILES
def test_a_folder_that_is_not_there_is_told_before_anything_runs(kind, tmp_path):
    with pytest.raises(
        OutputFailed, match="no such file or directory; nothing was run\n  Make the folder first"
    ):
        start(kind(tmp_path / "missing" / "rows.csv"))


@FILES
def test_a_path_below_a_file_is_told(kind, tmp_path):
    (tmp_path / "file").write_text("")
    with pytest.raises(OutputFailed, match="not a directory; nothing was run"):
        start(kind(tmp_path / "file" / "rows.csv"))


@pytest.mark.skipif(not os.path.isdir("/proc/self"), reason="this system has no /proc")
@FILES
def test_a_folder_where_nothing_can_be_written_is_told(kind):
    with pytest.raises(OutputFailed, match=r"^/proc/self/rows\.csv: .*; nothing was run"):
        start(kind("/proc/self/rows.csv"))


@FILES
@pytest.mark.parametrize("overwrite", [False, True])
def test_a_directory_in_place_of_a_file_is_told_and_left_alone(kind, overwrite, tmp_path):
    with pytest.raises(
        OutputFailed, match="is a directory; nothing was run\n  Give the name of a file in it"
    ):
        start(kind(tmp_path, overwrite=overwrite))
    assert tmp_path.is_dir()


@FILES
def test_an_output_that_is_there_is_refused_and_untouched(kind, tmp_path):
    path = tmp_path / "rows"
    path.write_text("precious")
    with pytest.raises(OutputExists, match="exists already; nothing was written") as caught:
        start(kind(path))
    assert isinstance(caught.value, FileExistsError)
    assert path.read_text() == "precious"


def test_a_link_that_leads_nowhere_is_not_written_through(tmp_path):
    (tmp_path / "link").symlink_to(tmp_path / "elsewhere")
    with pytest.raises(NewelError):
        start(Csv(tmp_path / "link"))
    assert not (tmp_path / "elsewhere").exists()


@ON_LINUX
def test_a_device_needs_no_permission_to_overwrite():
    delivery = start(Csv("/dev/null"))
    march(delivery, 3)
    delivery.close(Ended("stop", 2.0))
    assert delivery.counts == (3,)


def test_a_sink_that_raises_in_the_middle_leaves_the_others_closed_and_whole(tmp_path):
    failing = FailingSink("write", RuntimeError("broken"), after=2)
    sinks = (RecordingSink(), failing, Csv(tmp_path / "rows.csv"), RecordingSink())
    delivery = start(*sinks)
    with pytest.raises(OutputFailed, match="FailingSink: write raised RuntimeError: broken"):
        march(delivery, 5000)
    delivery.close(Ended("failed", delivery.last_time))
    assert delivery.counts == (768, 512, 768, 768)
    assert [len(sink.ended) for sink in (sinks[0], failing, sinks[3])] == [1, 1, 1]
    assert len((tmp_path / "rows.csv").read_text().splitlines()) == 769


@pytest.mark.skipif(not os.path.isdir("/proc/self/fd"), reason="this system does not list open files")
def test_no_file_stays_open_after_a_failure(tmp_path):
    (tmp_path / "third.csv").write_text("")
    before = len(os.listdir("/proc/self/fd"))
    with pytest.raises(OutputExists):
        start(Csv(tmp_path / "a.csv"), JsonLines(tmp_path / "b.jsonl"), Csv(tmp_path / "third.csv"))
    delivery = start(Csv(tmp_path / "c.csv"), FailingSink("write", OSError(5, "Input/output error")))
    march(delivery, 3)
    with pytest.raises(OutputFailed):
        delivery.close(Ended("failed", 2.0))
    assert len(os.listdir("/proc/self/fd")) == before
