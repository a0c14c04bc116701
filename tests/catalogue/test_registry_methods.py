"""Methods out of one registry: found, proved, refused, and told apart."""

from pathlib import Path

import attrs
import pytest

from newel.catalogue.checking import check
from newel.catalogue.registry import Registry, default_registry
from newel.errors import (
    BadRequest,
    BadTableau,
    ClashWarning,
    NotProved,
    PluginWarning,
    SlugTaken,
    UnknownMethod,
)
from tests.catalogue.tiny import two_stages, write

pytestmark = pytest.mark.core


def registry(*folders: Path) -> Registry:
    return Registry(folders=folders, plugins=False, cache=None)


def test_a_slug_a_path_and_a_tableau_find_the_same_proven_method(tmp_path: Path) -> None:
    file = write(tmp_path, "mine-2", node="2/3")
    stand = registry(tmp_path)
    by_slug, by_path, by_text = stand.find("mine-2"), stand.find(file), stand.find(str(file))
    by_object = stand.find(attrs.evolve(by_slug, proof=None))
    for found in (by_slug, by_path, by_text, by_object):
        assert found.digest == by_slug.digest
        assert found.proof is not None
        assert found.proof.outcome == "exact"
        assert found.proof.order == 2


def test_a_stale_proof_on_an_altered_tableau_is_not_believed() -> None:
    """`attrs.evolve` carries the old proof along; the registry goes by the numbers."""
    proven = registry().find(two_stages("mine-2"))
    altered = attrs.evolve(proven, weights=["1", "0"])
    assert altered.proof is not None
    with pytest.raises(NotProved):
        registry().find(altered)


def test_a_proof_carried_over_from_other_numbers_is_replaced() -> None:
    kutta, midpoint = registry().find("kutta-4"), registry().find("midpoint-2")
    found = registry().find(attrs.evolve(kutta, proof=midpoint.proof))
    assert found.proof == kutta.proof


def test_names_read_no_file(tmp_path: Path) -> None:
    (tmp_path / "broken-1.toml").write_text("this is = = no TOML")
    stand = registry(tmp_path)
    assert "broken-1" in stand.names()
    with pytest.raises(BadTableau, match=r"broken-1\.toml"):
        stand.find("broken-1")


def test_a_false_claim_is_refused_with_the_condition_that_fails(tmp_path: Path) -> None:
    write(tmp_path, "false-3", order=3)
    with pytest.raises(NotProved, match="false-3") as caught:
        registry(tmp_path).find("false-3")
    assert caught.value.slug == "false-3"
    assert caught.value.verdict.order == 2
    assert caught.value.verdict.failures[0].message in str(caught.value)


def test_files_may_lie_one_folder_deep_and_hidden_ones_are_none(tmp_path: Path) -> None:
    write(tmp_path / "order-2", "deep-2")
    write(tmp_path / ".git", "hidden-2")
    names = registry(tmp_path).names()
    assert "deep-2" in names
    assert "hidden-2" not in names


def test_the_variable_lists_several_folders(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    import os

    one, two = tmp_path / "one", tmp_path / "two"
    write(one, "first-2")
    write(two, "second-2", node="1")
    monkeypatch.setenv("NEWEL_TABLEAUX", f"{one}{os.pathsep}{two}")
    names = Registry(plugins=False, cache=None).names()
    assert {"first-2", "second-2"} <= set(names)


def test_a_missing_folder_is_an_error_by_argument_and_a_warning_by_variable(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    gone = tmp_path / "gone"
    with pytest.raises(BadRequest, match="gone"):
        registry(gone).names()
    monkeypatch.setenv("NEWEL_TABLEAUX", str(gone))
    stand = Registry(plugins=False, cache=None)
    with pytest.warns(PluginWarning, match="NEWEL_TABLEAUX"):
        assert stand.find("kutta-4").order == 4


@pytest.mark.parametrize(
    ("method", "said"),
    [
        ("plant.py", "plant.py is a model, not a tableau. For a model: newel examine plant.py"),
        ("plant.py:pump", "newel examine plant.py:pump"),
        (Path("notes.txt"), "ends in .toml"),
    ],
)
def test_what_is_no_method_is_told_apart(method: str | Path, said: str) -> None:
    with pytest.raises(UnknownMethod, match=said):
        registry().find(method)


@pytest.mark.parametrize("method", [None, 4, ["kutta-4"]])
def test_other_types_are_refused_by_name(method: object) -> None:
    with pytest.raises(BadRequest, match=type(method).__name__):
        registry().find(method)  # type: ignore[arg-type]  # the wrong type is what is tested


def test_read_refuses_what_is_no_tableau_file(tmp_path: Path) -> None:
    with pytest.raises(UnknownMethod, match="is a model"):
        registry().read("plant.py")
    with pytest.raises(BadTableau):
        registry().read(tmp_path / "none.toml")


# register


def test_a_registered_tableau_is_found_by_slug_with_its_proof() -> None:
    stand = registry()
    made = stand.register(two_stages("mine-2"))
    assert made.proof is not None
    assert stand.find("mine-2") is made
    assert "mine-2" in stand.names()


def test_a_failed_proof_registers_nothing() -> None:
    stand = registry()
    with pytest.raises(NotProved):
        stand.register(two_stages("mine-3", order=3))
    assert "mine-3" not in stand.names()


def test_a_taken_slug_is_an_error_at_once_and_leaves_the_first_in_force() -> None:
    stand = registry()
    with pytest.raises(SlugTaken, match="kutta-4") as caught:
        stand.register(two_stages("kutta-4"))
    assert caught.value.origins == ("built-in",)
    first = stand.register(two_stages("mine-2"))
    with pytest.raises(SlugTaken, match="mine-2"):
        stand.register(attrs.evolve(two_stages("mine-2"), weights=["1", "0"], order=1))
    assert stand.find("mine-2") == first


def test_a_taken_slug_is_told_before_any_proof() -> None:
    with pytest.raises(SlugTaken):
        registry().register(two_stages("kutta-4", order=3))


def test_a_slug_taken_while_the_proof_ran_is_not_taken_twice() -> None:
    """Another thread may register in between; here the progress of the proof itself does."""
    stand, rival = registry(), attrs.evolve(two_stages("mine-2"), weights=["1", "0"], order=1)
    with pytest.raises(SlugTaken, match="mine-2"):
        stand.register(two_stages("mine-2"), progress=lambda done, of: stand.register(rival) and None)
    assert stand.find("mine-2").digest == rival.digest


def test_the_same_numbers_under_the_same_slug_are_no_clash() -> None:
    stand = registry()
    first = stand.register(two_stages("mine-2"))
    again = stand.register(attrs.evolve(two_stages("mine-2"), name="A better name"))
    assert again is first
    assert stand.names().count("mine-2") == 1


def test_a_member_of_a_family_takes_its_slug() -> None:
    with pytest.raises(SlugTaken, match="doubled-kutta-4"):
        registry().register(two_stages("doubled-kutta-4"))


def test_a_broken_file_keeps_its_slug_taken(tmp_path: Path) -> None:
    (tmp_path / "mine-2.toml").write_text("nonsense")
    with pytest.raises(SlugTaken, match=r"mine-2\.toml"):
        registry(tmp_path).register(two_stages("mine-2"))


def test_register_takes_tableaux_only(tmp_path: Path) -> None:
    with pytest.raises(BadRequest, match="str"):
        registry().register("kutta-4")  # type: ignore[arg-type]  # the wrong type is what is tested


# trust


def test_trust_skips_the_proof_and_leaves_the_method_unproven() -> None:
    stand = registry()
    false = two_stages("mine-3", order=3)
    assert stand.register(false, trust=True).proof is None
    assert stand.find("mine-3").proof is None
    assert stand.find(false).proof is None
    borrowed = attrs.evolve(false, proof=stand.find("kutta-4").proof)
    assert stand.find(borrowed).proof is None
    assert check("mine-3", registry=stand).outcome == "fails"


def test_trust_reaches_only_the_registry_that_was_asked() -> None:
    false = two_stages("mine-3", order=3)
    registry().register(false, trust=True)
    with pytest.raises(NotProved):
        registry().find(false)


def test_a_file_is_read_on_trust_or_proved(tmp_path: Path) -> None:
    stand = registry()
    file = write(tmp_path, "false-3", order=3)
    with pytest.raises(NotProved):
        stand.read(file)
    trusted = stand.read(file, trust=True)
    assert trusted.proof is None
    assert stand.find(trusted).proof is None
    proven = stand.read(write(tmp_path, "true-2"))
    assert proven.proof is not None


def test_a_family_built_on_a_trusted_method_is_trusted() -> None:
    stand = registry()
    stand.register(two_stages("mine-3", order=3), trust=True)
    assert stand.find("doubled-mine-3").proof is None


# clashes


def test_a_built_in_stays_in_force_and_the_clash_names_both(tmp_path: Path) -> None:
    file = write(tmp_path, "kutta-4")
    stand = registry(tmp_path)
    with pytest.warns(ClashWarning, match="newel itself") as caught:
        found = stand.find("kutta-4")
    assert found.stages == 4
    assert str(file) in str(caught[0].message)
    assert caught[0].filename == __file__
    assert "kutta-4" in stand.names()


def test_a_copy_of_a_built_in_is_no_clash(tmp_path: Path) -> None:
    """Equal numbers under an equal slug are the same method; warnings are errors here."""
    write(tmp_path, "midpoint-2", name="Mid-point, our copy")
    stand = registry(tmp_path)
    assert stand.find("midpoint-2").origin == "built-in"
    assert all(not report.problems for report in stand.plugins())


def test_two_outside_origins_clash_only_when_the_slug_is_asked_for(tmp_path: Path) -> None:
    one, two = write(tmp_path / "one", "mine-2"), write(tmp_path / "two", "mine-2", node="1")
    write(tmp_path / "two", "other-2", node="1")
    stand = registry(one.parent, two.parent)
    assert stand.names().count("mine-2") == 1
    assert stand.find("other-2").order == 2
    with pytest.raises(SlugTaken, match="Neither is used") as caught:
        stand.find("mine-2")
    assert str(one) in str(caught.value)
    assert str(two) in str(caught.value)
    assert stand.find(one).order == 2


def test_a_broken_file_behind_a_good_one_is_left_out_with_a_warning(tmp_path: Path) -> None:
    write(tmp_path / "one", "mine-2")
    (tmp_path / "two").mkdir()
    (tmp_path / "two" / "mine-2.toml").write_text("nonsense")
    stand = registry(tmp_path / "one", tmp_path / "two")
    with pytest.warns(PluginWarning, match="mine-2"):
        assert stand.find("mine-2").order == 2


def test_a_broken_built_in_is_never_replaced_from_outside(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    from newel.catalogue import shipped

    data = tmp_path / "spoilt_methods" / "order-2"
    data.mkdir(parents=True)
    (data.parent / "__init__.py").write_text("")
    (data / "mine-2.toml").write_text("nonsense")
    monkeypatch.syspath_prepend(str(tmp_path))
    monkeypatch.setattr(shipped, "PACKAGE", "spoilt_methods")
    write(tmp_path / "outside", "mine-2")
    with pytest.raises(BadTableau, match="spoilt_methods"):
        registry(tmp_path / "outside").find("mine-2")


def test_lists_leave_out_what_does_not_stand_and_go_on(tmp_path: Path) -> None:
    write(tmp_path, "false-3", order=3)
    write(tmp_path, "true-2")
    stand = registry(tmp_path)
    with pytest.warns(PluginWarning, match="false-3"):
        summaries = {each.slug: each for each in stand.summaries()}
    assert "false-3" not in summaries
    assert summaries["true-2"].outcome == "exact"
    assert summaries["true-2"].stages == 2
    assert str(tmp_path) in summaries["true-2"].origin
    assert summaries["kutta-4"].origin == "built-in"
    problems = [report.problems for report in stand.plugins() if report.origin.kind == "folder"]
    assert "false-3" in problems[0][0]


# families


def test_a_family_makes_a_proven_method_out_of_another() -> None:
    doubled = registry().find("doubled-kutta-4")
    assert doubled.slug == "doubled-kutta-4"
    assert doubled.proof is not None
    assert (doubled.proof.order, doubled.proof.embedded_order, doubled.stages) == (5, 4, 11)


def test_families_are_not_listed_among_the_names() -> None:
    stand = registry()
    assert "doubled-{method}" in stand.families()
    assert not [name for name in stand.names() if "{" in name]


def test_families_in_families_end_at_two() -> None:
    with pytest.raises(BadRequest, match="deep"):
        registry().find("doubled-doubled-doubled-euler-1")


def test_families_in_families_end_at_two_whatever_was_asked_for_before() -> None:
    stand = registry()
    for slug in ("doubled-euler-1", "doubled-doubled-euler-1"):
        assert stand.find(slug).slug == slug
    with pytest.raises(BadRequest, match="deep"):
        stand.find("doubled-doubled-doubled-euler-1")


def test_an_absurdly_long_slug_is_simply_unknown() -> None:
    with pytest.raises(UnknownMethod) as caught:
        registry().find("doubled-" * 5000 + "euler-1")
    assert len(str(caught.value)) < 500


def test_a_family_of_an_unknown_method_names_that_method() -> None:
    with pytest.raises(UnknownMethod, match="'kuta-4'") as caught:
        registry().find("doubled-kuta-4")
    assert "kutta-4" in caught.value.near


# the default registry, and many threads


def test_there_is_one_default_registry() -> None:
    assert default_registry() is default_registry()


def test_threads_that_ask_at_once_get_the_same_method() -> None:
    from concurrent.futures import ThreadPoolExecutor

    stand = registry()
    with ThreadPoolExecutor(8) as pool:
        found = list(pool.map(lambda _: stand.find("kutta-4"), range(32)))
    assert {each.digest for each in found} == {found[0].digest}
    assert stand.names().count("kutta-4") == 1
