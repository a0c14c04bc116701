"""The committed list of proofs is the one that a full proof of every file gives today."""

import tomllib
from pathlib import Path

import pytest

from newel.catalogue.proofs import listed_proofs
from newel.catalogue.registry import Registry
from newel.catalogue.summaries import Summary
from tests import prove_tableaux
from tests.catalogue.tiny import write


def test_every_file_is_proved_anew_and_the_list_says_the_same() -> None:
    """On a difference: python -m tests.prove_tableaux"""
    entries, failed = prove_tableaux.prove_all(prove_tableaux.DATA)
    assert failed == []
    listed = tomllib.loads(prove_tableaux.LIST.read_text(encoding="utf-8"))
    fresh = tomllib.loads(prove_tableaux.render(entries))
    assert [entry["slug"] for entry in listed["method"]] == [entry["slug"] for entry in fresh["method"]]
    for old, new in zip(listed["method"], fresh["method"], strict=True):
        assert old == new, f"{old['slug']} is stale: python -m tests.prove_tableaux"
    assert listed == fresh


def test_the_list_summarises_a_method_as_the_method_itself_does() -> None:
    stand = Registry(folders=[], plugins=False, cache=None)
    summaries = stand.summaries()
    assert [each.slug for each in summaries] == list(stand.names())
    assert len(listed_proofs()) == len(summaries)
    for summary in summaries:
        assert summary == Summary.of(stand.find(summary.slug))


def test_a_file_that_fails_is_named_and_nothing_is_written(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    write(tmp_path / "order-2", "true-2")
    write(tmp_path / "order-3", "false-3", order=3)
    write(tmp_path / "order-3", "misplaced-2")
    monkeypatch.setattr(prove_tableaux, "DATA", tmp_path)
    monkeypatch.setattr(prove_tableaux, "LIST", tmp_path / "proved.toml")
    assert prove_tableaux.main([]) == 1
    said = capsys.readouterr().err
    assert "false-3" in said
    assert "misplaced-2" in said
    assert not (tmp_path / "proved.toml").exists()


def test_the_command_writes_a_list_that_reads_back(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    write(tmp_path / "order-2", "true-2", name=r"With \"quotes\" and τ")
    monkeypatch.setattr(prove_tableaux, "DATA", tmp_path)
    monkeypatch.setattr(prove_tableaux, "LIST", tmp_path / "proved.toml")
    assert prove_tableaux.main(["--check"]) == 1
    assert prove_tableaux.main([]) == 0
    assert prove_tableaux.main(["--check"]) == 0
    data = tomllib.loads((tmp_path / "proved.toml").read_text(encoding="utf-8"))
    assert data["method"][0]["name"] == 'With "quotes" and τ'
    assert data["method"][0]["verdict"]["outcome"] == "exact"
