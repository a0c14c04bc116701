"""What a result was made from can be told."""

from __future__ import annotations

import functools
import hashlib
import json
import platform
from pathlib import Path

import numpy as np
import pytest

from newel.errors import BadModel
from newel.models.model import Model
from newel.models.provenance import machine, model_origin, source_file

pytestmark = pytest.mark.core


class Pump:
    def __call__(self, t, y):
        return -y

    def rate(self, t, y):
        return -y


def rate(t, y):
    return -y


@pytest.mark.parametrize("function", [rate, Pump(), Pump().rate, functools.partial(rate), lambda t, y: -y])
def test_the_file_of_a_rate_is_found_however_it_is_wrapped(function):
    assert source_file(function) == Path(__file__)


def test_a_compiled_rate_has_no_source_file():
    model = Model(np.add, start=0, stop=1, state=[1.0])
    assert model_origin(model) == {"source": None, "digest": None, "files": {}}


def test_digests_are_sha256_of_the_bytes(tmp_path):
    table = tmp_path / "table.csv"
    table.write_bytes(b"1,2\n")
    origin = model_origin(Model(rate, start=0, stop=1, state=[1.0], files=[table]))
    assert origin["source"] == "test_provenance.py"
    assert origin["digest"] == hashlib.sha256(Path(__file__).read_bytes()).hexdigest()
    assert origin["files"] == {str(table): hashlib.sha256(b"1,2\n").hexdigest()}


def test_a_file_that_is_not_there_is_named():
    with pytest.raises(BadModel, match=r"files: gone\.csv cannot be read"):
        model_origin(Model(rate, start=0, stop=1, state=[1.0], files="gone.csv"))


def test_the_machine_is_described_by_texts_and_follows_the_environment(monkeypatch):
    monkeypatch.setenv("OPENBLAS_NUM_THREADS", "3")
    facts = machine()
    assert json.loads(json.dumps(facts)) == facts
    assert facts["python"] == platform.python_version()
    assert facts["numpy"] == np.__version__
    assert facts["blas_threads"] == "3"
    monkeypatch.delenv("OPENBLAS_NUM_THREADS")
    monkeypatch.delenv("MKL_NUM_THREADS", raising=False)
    monkeypatch.delenv("OMP_NUM_THREADS", raising=False)
    assert int(machine()["blas_threads"]) >= 1
