"""A name that nobody knows gets the answer that its author was after."""

from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from newel.catalogue.registry import Registry
from newel.catalogue.suggestions import folded, near_names, unknown_method, unknown_name
from newel.errors import UnknownMethod
from tests.catalogue.tiny import two_stages, write

pytestmark = pytest.mark.core

KNOWN = ("kutta-3", "kutta-4", "kutta-three-eighths-4", "dormand-prince-5-4", "doubled-{method}")
USUAL = {"kutta-4": ("Classical fourth-order", "RK4"), "dormand-prince-5-4": ("Dormand–Prince 5(4)",)}


def test_a_usual_name_leads_to_its_slug_and_its_neighbours() -> None:
    said = str(unknown_method("rk4", KNOWN, USUAL))
    assert said == (
        "unknown method 'rk4'\n"
        "  That usual name belongs to kutta-4. Near slugs: kutta-3, kutta-three-eighths-4."
        "     newel list --text kutta"
    )


@pytest.mark.parametrize("typed", ["Dormand-Prince 5(4)", "DORMAND–PRINCE 5(4)", "dormand_prince_5_4"])
def test_case_spaces_and_hyphens_of_a_usual_name_do_not_matter(typed: str) -> None:
    assert "belongs to dormand-prince-5-4." in str(unknown_method(typed, KNOWN, USUAL))


def test_a_slip_of_the_finger_finds_the_near_slugs() -> None:
    error = unknown_method("kuta-4", KNOWN, USUAL)
    assert error.near[0] == "kutta-4"
    assert "Near slugs: kutta-4" in str(error)


def test_a_near_usual_name_counts_too() -> None:
    assert unknown_method("clasical fourth order", KNOWN, USUAL).near == ("kutta-4",)


def test_nothing_near_says_so_and_points_at_the_list() -> None:
    error = unknown_method("zzzzzz", KNOWN, USUAL)
    assert error.near == ()
    assert str(error).endswith("No slug is near it.     newel list")


def test_the_registry_knows_usual_names_from_files_not_yet_read_and_from_python(tmp_path: Path) -> None:
    write(tmp_path, "mine-2", node="2/3", name="Weir", also='"Old Weir"')
    (tmp_path / "broken-2.toml").write_text("nonsense")
    stand = Registry(folders=[tmp_path], plugins=False, cache=None)
    stand.register(two_stages("made-2"))
    for typed, slug in (("old weir", "mine-2"), ("made 2", "made-2"), ("Kutta 4", "kutta-4")):
        with pytest.raises(UnknownMethod, match=f"belongs to {slug}"):
            stand.find(typed)


def test_an_unknown_name_lists_what_there_is() -> None:
    error = unknown_name("controller", "gustafson", ["elementary", "gustafsson-pi"], remedy="Do this.")
    assert error.near == ("gustafsson-pi",)
    assert str(error) == (
        "unknown controller 'gustafson'\n  Near names: gustafsson-pi.\n"
        "  Known: elementary, gustafsson-pi.  Do this."
    )


@settings(deadline=None, derandomize=True, max_examples=60)
@given(st.text(max_size=400))
def test_any_text_at_all_gets_an_answer_of_bounded_length(typed: str) -> None:
    """However odd the text, a search ends in the error itself, never in another one."""
    assert len(str(unknown_method(typed, KNOWN, USUAL))) < 2500
    assert len(near_names(typed, KNOWN)) <= 3


@settings(deadline=None, derandomize=True, max_examples=60)
@given(st.text(max_size=40))
def test_folding_twice_changes_nothing_and_spaces_never_count(name: str) -> None:
    assert folded(folded(name)) == folded(name)
    assert folded(" ".join(name)) == folded(name)
