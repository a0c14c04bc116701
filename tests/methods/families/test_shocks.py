"""Closed-form strong-stability-preserving methods: the files' numbers, their form, their coefficient."""

from __future__ import annotations

import pytest

from newel.catalogue.registry import Registry
from newel.catalogue.shipped import tableau_files
from newel.errors import BadRequest
from newel.methods.families.shocks import ssp_2, ssp_3
from newel.methods.order_conditions import prove
from newel.methods.tableau_file import parse_tableau

pytestmark = pytest.mark.core


@pytest.mark.parametrize("slug", ["ssp-2-stages-3", "ssp-2-stages-4", "ssp-3-stages-4", "ssp-3-stages-9"])
def test_the_rule_gives_the_numbers_of_the_files(slug: str) -> None:
    made = (ssp_2 if slug.startswith("ssp-2") else ssp_3)(int(slug.rsplit("-", 1)[1]))
    assert made.digest == parse_tableau(tableau_files()[slug].read_text(encoding="utf-8")).digest


@pytest.mark.parametrize("stages", [2, 5, 12])
def test_order_2_is_proved_with_its_storage_form(stages: int) -> None:
    verdict = prove(ssp_2(stages))
    assert (verdict.outcome, verdict.order) == ("exact", 2)


@pytest.mark.parametrize("stages", [4, 16, 25])
def test_order_3_is_proved_with_its_storage_form(stages: int) -> None:
    verdict = prove(ssp_3(stages))
    assert (verdict.outcome, verdict.order) == ("exact", 3)


def test_the_storage_form_is_convex() -> None:
    for tableau in (ssp_2(7), ssp_3(16)):
        form = tableau.storage
        assert form is not None
        assert form.alpha is not None
        assert all(x >= 0 for row in form.alpha for x in row)
        assert all(sum(row) == 1 for row in form.alpha)


def test_a_file_of_the_same_slug_stays_in_force() -> None:
    registry = Registry(folders=[], plugins=False, cache=None)
    assert registry.load("ssp-3-stages-9").year == 2008
    assert registry.load("ssp-3-stages-16").stages == 16


@pytest.mark.parametrize("stages", [-4, 0, 1, 5, 289, 1_000_000])
def test_a_number_of_stages_that_is_no_square_in_range_is_refused(stages: int) -> None:
    with pytest.raises(BadRequest, match="square number from 4 to 256"):
        ssp_3(stages)


@pytest.mark.parametrize("stages", [1, 257])
def test_order_2_has_its_limits(stages: int) -> None:
    with pytest.raises(BadRequest, match="from 2 to 256"):
        ssp_2(stages)
