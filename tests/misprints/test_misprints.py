"""The finder names a planted misprint: all by `python -m tests.misprints`, here 200 drawn by digest.

The full outcome is committed with the digests of the methods that it was made from.
"""

from __future__ import annotations

from functools import lru_cache

from tests.misprints.outcome import FIRST_SHARE, digests, read_outcome
from tests.misprints.planting import Outcome, files, misprints, tried

SAMPLE = 200
RENEW = "python -m tests.misprints"


@lru_cache(maxsize=1)
def sample() -> tuple[Outcome, ...]:
    """The misprints with the least draws over today's catalogue, but for those that break no claim."""
    drawn = sorted((planted for slug in files() for planted in misprints(slug)), key=lambda each: each.draw)
    found: list[Outcome] = []
    for planted in drawn:
        outcome = tried(planted)
        found += [] if outcome is None else [outcome]
        if len(found) == SAMPLE:
            break
    return tuple(found)


def test_the_right_value_is_in_the_list_for_every_misprint_of_the_sample() -> None:
    assert len(sample()) == SAMPLE
    assert [str(each.planted) for each in sample() if not each.rank] == []


def test_the_right_value_is_the_first_repair_for_98_in_100_of_order_3_and_up() -> None:
    upper = [each for each in sample() if each.order >= 3]
    assert len(upper) > 150
    assert sum(each.rank == 1 for each in upper) >= FIRST_SHARE * len(upper)


def test_the_committed_outcome_keeps_to_what_is_asked_of_the_finder() -> None:
    totals = read_outcome()["totals"]
    assert totals["planted"] >= 2000
    assert totals["first_share_of_order_3_and_up"] >= FIRST_SHARE
    assert totals["not_listed"] == 0
    assert min(totals["by_kind"].values()) >= 150


def test_a_miss_that_is_not_in_the_committed_list_is_seen() -> None:
    """Misses are few and known by name: a new one means that the finder or a file has changed."""
    outcome = read_outcome()
    known = {each["misprint"] for each in outcome["missed"]}
    tried_then = outcome["methods"]
    new = [each for each in sample() if each.rank != 1 and each.planted.slug in tried_then]
    assert [str(each.planted) for each in new if str(each.planted) not in known] == [], RENEW


def test_the_committed_outcome_was_made_from_the_numbers_of_today() -> None:
    then, now = read_outcome()["methods"], digests()
    assert {slug for slug in then if slug in now and then[slug] != now[slug]} == set(), RENEW
