"""Proofs are remembered, and a bad memory costs time, never an answer."""

import json
import os
from collections.abc import Callable
from pathlib import Path

import attrs
import pytest

from newel.catalogue import proofs
from newel.catalogue.checking import check
from newel.catalogue.proofs import Proofs, user_cache_folder
from newel.catalogue.registry import Registry
from newel.catalogue.shipped import tableau_files
from newel.catalogue.summaries import listed_summary
from newel.methods import order_conditions
from newel.methods.order_conditions import proof_key
from newel.methods.tableau import Tableau
from tests.catalogue.tiny import two_stages

pytestmark = pytest.mark.core


@pytest.fixture
def proved(monkeypatch: pytest.MonkeyPatch) -> list[str]:
    """The slugs that were really proved, in order."""
    made: list[str] = []
    real = order_conditions.prove

    def prove(
        tableau: Tableau, progress: Callable[[int, int], None] | None = None
    ) -> order_conditions.Verdict:
        made.append(tableau.slug)
        return real(tableau, progress)

    monkeypatch.setattr(order_conditions, "prove", prove)
    return made


def kept(folder: Path) -> list[Path]:
    return sorted((folder / "proofs").glob("*"))


def test_a_proof_is_made_once_and_then_read_from_the_cache(tmp_path: Path, proved: list[str]) -> None:
    first = Proofs(tmp_path).verdict(two_stages("mine-2"))
    again = Proofs(tmp_path).verdict(two_stages("mine-2"))
    assert again == first
    assert proved == ["mine-2"]
    assert [file.name for file in kept(tmp_path)] == [f"{proof_key(two_stages('mine-2'))}.json"]


def test_a_proof_is_remembered_in_memory_too(proved: list[str]) -> None:
    memory = Proofs(None)
    assert memory.verdict(two_stages("mine-2")) is memory.verdict(two_stages("mine-2"))
    assert proved == ["mine-2"]


def test_a_failed_proof_is_remembered_with_its_failures(tmp_path: Path, proved: list[str]) -> None:
    false = two_stages("mine-3", order=3)
    first, again = Proofs(tmp_path).verdict(false), Proofs(tmp_path).verdict(false)
    assert again == first
    assert not again
    assert again.failures
    assert proved == ["mine-3"]


def test_another_claim_of_the_same_numbers_is_proved_by_itself(tmp_path: Path, proved: list[str]) -> None:
    memory = Proofs(tmp_path)
    assert memory.verdict(two_stages("mine-2"))
    assert not memory.verdict(attrs.evolve(two_stages("mine-2"), order=3))
    assert len(proved) == 2


@pytest.mark.parametrize(
    "damage", ["", "{", "[]", "null", '{"schema": "newel-proof/1"}', "\x00\xff", "[" * 10**5]
)
def test_a_damaged_cache_is_proved_anew_and_mended(tmp_path: Path, proved: list[str], damage: str) -> None:
    first = Proofs(tmp_path).verdict(two_stages("mine-2"))
    kept(tmp_path)[0].write_bytes(damage.encode("latin-1"))
    assert Proofs(tmp_path).verdict(two_stages("mine-2")) == first
    assert Proofs(tmp_path).verdict(two_stages("mine-2")) == first
    assert len(proved) == 2


def test_a_verdict_altered_in_the_cache_is_not_believed(tmp_path: Path, proved: list[str]) -> None:
    """One changed figure breaks the checksum."""
    Proofs(tmp_path).verdict(two_stages("mine-3", order=3))
    file = kept(tmp_path)[0]
    data = json.loads(file.read_text())
    data["verdict"]["outcome"] = "exact"
    file.write_text(json.dumps(data))
    assert not Proofs(tmp_path).verdict(two_stages("mine-3", order=3))


def test_a_verdict_of_another_tableau_in_the_place_is_not_believed(tmp_path: Path) -> None:
    Proofs(tmp_path).verdict(two_stages("mine-2"))
    false = two_stages("mine-3", order=3)
    kept(tmp_path)[0].rename(tmp_path / "proofs" / f"{proof_key(false)}.json")
    assert not Proofs(tmp_path).verdict(false)


def test_a_cache_that_cannot_be_written_hurts_nobody(tmp_path: Path, proved: list[str]) -> None:
    """A file stands where the folder should be: no rights can help, not even those of the superuser."""
    (tmp_path / "cache").write_text("in the way")
    assert Proofs(tmp_path / "cache").verdict(two_stages("mine-2"))
    assert proved == ["mine-2"]


def test_a_failing_rename_leaves_no_half_file_behind(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def full(*_: object) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(os, "replace", full)
    assert Proofs(tmp_path).verdict(two_stages("mine-2"))
    assert kept(tmp_path) == []


def test_without_a_folder_nothing_is_written(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("NEWEL_CACHE", str(tmp_path))
    Registry(folders=[], plugins=False, cache=None).find(two_stages("mine-2"))
    assert list(tmp_path.iterdir()) == []
    Registry(folders=[], plugins=False).find(two_stages("mine-2"))
    assert kept(tmp_path)


def test_the_cache_folder_is_the_named_one_or_the_platforms(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(proofs.sys, "platform", "linux")
    monkeypatch.setenv("HOME", "/home/someone")
    monkeypatch.setenv("NEWEL_CACHE", "/elsewhere")
    assert user_cache_folder() == Path("/elsewhere")
    monkeypatch.delenv("NEWEL_CACHE")
    monkeypatch.setenv("XDG_CACHE_HOME", "/caches")
    assert user_cache_folder() == Path("/caches/newel")
    monkeypatch.setenv("XDG_CACHE_HOME", "not/absolute")
    assert user_cache_folder() == Path("/home/someone/.cache/newel")
    monkeypatch.setattr(proofs.sys, "platform", "darwin")
    assert user_cache_folder() == Path("/home/someone/Library/Caches/newel")


def test_a_built_in_method_in_the_list_needs_no_proof(proved: list[str]) -> None:
    found = Registry(folders=[], plugins=False, cache=None).find("kutta-4")
    assert found.proof is not None
    assert found.proof.order == 4
    assert proved == []


def test_the_list_is_only_a_memory(monkeypatch: pytest.MonkeyPatch, proved: list[str]) -> None:
    """Without a list, or with a spoilt one, a built-in method is proved at first use."""
    for spoilt in ({}, {proof_key(two_stages("mine-2")): {"slug": "mine-2"}}):
        monkeypatch.setattr(proofs, "listed_proofs", lambda spoilt=spoilt: spoilt)
        stand = Registry(folders=[], plugins=False, cache=None)
        assert stand.find("kutta-4").proof
        assert stand.find(two_stages("mine-2")).proof
    assert proved == ["kutta-4", "mine-2"] * 2


@pytest.mark.parametrize(
    "text",
    ['schema = "newel-proofs/9"\n[[method]]\nkey = "a"', "not = = TOML", 'schema = "newel-proofs/1"', "\xff"],
)
def test_a_list_that_cannot_be_understood_is_empty(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, text: str
) -> None:
    import importlib.resources

    (tmp_path / "proved.toml").write_bytes(text.encode("latin-1"))
    monkeypatch.setattr(importlib.resources, "files", lambda _: tmp_path)
    assert proofs.listed_proofs.__wrapped__() == {}


def test_a_summary_is_believed_only_of_the_very_file_it_was_made_from(tmp_path: Path) -> None:
    file = tableau_files()["kutta-4"]
    copy = tmp_path / "kutta-4.toml"
    copy.write_bytes(file.read_bytes())
    assert listed_summary("kutta-4", copy) is not None
    copy.write_bytes(file.read_bytes() + b"\n")
    assert listed_summary("kutta-4", copy) is None
    assert listed_summary("kutta-4", tmp_path / "gone.toml") is None


# check


def test_check_proves_for_itself_what_the_list_says_and_remembers_it(
    tmp_path: Path, proved: list[str]
) -> None:
    stand = Registry(folders=[], plugins=False, cache=tmp_path)
    assert check("kutta-4", registry=stand).order == 4
    assert proved == ["kutta-4"]
    assert check("kutta-4", registry=stand).order == 4
    assert proved == ["kutta-4"]
    assert check("kutta-4", registry=stand, anew=True).order == 4
    assert proved == ["kutta-4"] * 2


def test_check_returns_a_failing_verdict_and_raises_nothing() -> None:
    verdict = check(two_stages("mine-3", order=3), registry=Registry(folders=[], plugins=False, cache=None))
    assert verdict.outcome == "fails"
    assert verdict.order == 2


def test_progress_is_handed_on_to_the_proof() -> None:
    calls: list[tuple[int, int]] = []
    stand = Registry(folders=[], plugins=False, cache=None)
    check(two_stages("mine-2"), registry=stand, progress=lambda done, of: calls.append((done, of)))
    assert calls
    assert calls[-1][0] == calls[-1][1]
