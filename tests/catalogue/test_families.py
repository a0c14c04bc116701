"""The families that ship: each has members to be proved, and nonsense is refused in bounded time."""

from __future__ import annotations

import pytest

from newel.catalogue.offers import family_arguments
from newel.catalogue.registry import Registry
from newel.catalogue.shipped import FAMILY_SAMPLES
from newel.errors import BadRequest

pytestmark = pytest.mark.core


def stand() -> Registry:
    return Registry(folders=[], plugins=False, cache=None)


FAMILIES = stand().families()


@pytest.mark.parametrize("family", FAMILIES)
def test_each_family_has_samples_at_two_sizes(family: str) -> None:
    members = [slug for slug in FAMILY_SAMPLES if family_arguments(family, slug) is not None]
    assert len(members) >= (1 if "bulirsch" in family or "romberg" in family else 2), family


@pytest.mark.parametrize("slug", FAMILY_SAMPLES)
def test_each_sample_is_a_member_of_one_family_alone(slug: str) -> None:
    assert sum(family_arguments(family, slug) is not None for family in FAMILIES) == 1


@pytest.mark.parametrize("family", [family for family in FAMILIES if "{method}" not in family])
@pytest.mark.parametrize("size", ["0", "-3", "999999999"])
def test_an_absurd_size_is_refused_with_the_range(family: str, size: str) -> None:
    word = family[family.index("{") : family.index("}") + 1]
    with pytest.raises(BadRequest, match=r"(?i)(from|to|give) ") as caught:
        stand().find(family.replace(word, size))
    assert caught.value.argument == word.strip("{}")
