"""Every built-in pair on the non-stiff problems of 1972.

T. E. Hull, W. H. Enright, B. M. Fellen, A. E. Sedgwick, SIAM J. Numer. Anal. 9 (1972) 603-637: 25 problems
over t from 0 to 20, at rel_tol = abs_tol = 1e-3, 1e-6 and 1e-9. The whole table is made by `python -m
tests.problems.nonstiff_table` and committed; here its claims are read, and a sample that the methods'
digests fix is marched anew. The references come from tests/problems/references.json.
"""

from __future__ import annotations

import math
from functools import cache
from typing import Any

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from tests.problems.nonstiff_1972 import NONSTIFF, STOP, references
from tests.problems.nonstiff_table import march_one, pairs, read_table, tolerances_of

PAIRS = pairs()
TIGHT = ("1e-6", "1e-9")

# On all 25 problems: one of each kind that a user is likely to take.
IN_FULL = (
    "bogacki-shampine-3-2",
    "fehlberg-4-5",
    "cash-karp-5-4",
    "dormand-prince-5-4",
    "verner-1978-6-5",
    "prince-dormand-8-7",
)

# Pairs whose estimate is too small, as their files say: it compares two stages at one early node, or two
# formulas that nearly agree.
FAR_OFF = {"feagin-10-8": 1e5, "fehlberg-3-2": 1e5}

# Another order of rounding moves an error below the tolerance about; where stability sets the steps (C2), by
# factors of ten and more. So an error is compared with the committed one or with the tolerance itself.
SMALLEST_ERROR = 1.0
GROWTH = 3.0

table = cache(read_table)


def sample() -> list[tuple[str, str]]:
    """Each pair with one problem of each class, chosen by the digits of its digest."""
    return [
        (slug, f"{letter}{int(tableau.digest[2 * i : 2 * i + 2], 16) % 5 + 1}")
        for slug, tableau in PAIRS.items()
        for i, letter in enumerate("ABCDE")
    ]


def assert_as_committed(slug: str, name: str) -> None:
    committed = table()[slug]["problems"][name]["1e-6"]
    figure = march_one(NONSTIFF[name], PAIRS[slug], "1e-6")
    assert figure["ended"] == "stop"
    assert figure["error"] <= GROWTH * max(committed["error"], SMALLEST_ERROR)
    assert figure["calls"] <= GROWTH * committed["calls"]


def figures() -> list[tuple[str, str, str, dict[str, Any]]]:
    return [
        (slug, name, tolerance, figure)
        for slug, entry in table().items()
        for name, row in entry["problems"].items()
        for tolerance, figure in row.items()
    ]


def test_table_has_exactly_the_pairs_of_the_registry_and_no_stale_digest() -> None:
    """Renew it by `python -m tests.problems.nonstiff_table`."""
    assert {slug: entry["digest"] for slug, entry in table().items()} == {
        slug: tableau.digest for slug, tableau in PAIRS.items()
    }


def test_table_holds_every_problem_and_tolerance() -> None:
    for slug, entry in table().items():
        assert list(entry["problems"]) == list(NONSTIFF)
        assert all(tuple(row) == tolerances_of(PAIRS[slug]) for row in entry["problems"].values())


def test_every_march_at_tight_tolerances_reaches_the_stop() -> None:
    assert [entry[:3] for entry in figures() if entry[2] in TIGHT and entry[3]["ended"] != "stop"] == []


def test_every_march_at_the_loose_tolerance_ends_or_says_why() -> None:
    for slug, name, tolerance, figure in figures():
        assert figure["ended"] == "stop" or figure["ended"].startswith("failed: "), (slug, name, tolerance)
        assert len(figure["ended"]) > len("failed: ") or figure["ended"] == "stop"


def test_pairs_that_carry_the_higher_order_on_keep_within_ten_thousand_tolerances() -> None:
    """But for those in FAR_OFF."""
    for slug, name, tolerance, figure in figures():
        if tolerance in TIGHT and PAIRS[slug].order > PAIRS[slug].embedded_order:
            assert figure["error"] <= FAR_OFF.get(slug, 1e4), (slug, name, tolerance)


def test_a_tighter_tolerance_gives_a_smaller_error() -> None:
    """From 1e-3 to 1e-9 the median error shrinks with every pair about as order 2 lets it, by tol^(2/3)."""
    for slug, entry in table().items():
        rows = [row for row in entry["problems"].values() if {"1e-3", "1e-9"} <= set(row)]
        both = [(row["1e-3"]["error"], row["1e-9"]["error"]) for row in rows]
        gain = [math.log10(loose * 1e-3 / (tight * 1e-9)) for loose, tight in both if loose and tight]
        assert not gain or sorted(gain)[len(gain) // 2] > 3.9, slug


@pytest.mark.parametrize(("slug", "name"), sample())
def test_every_pair_on_one_problem_of_each_class(slug: str, name: str) -> None:
    assert_as_committed(slug, name)


@pytest.mark.parametrize("slug", IN_FULL)
def test_chosen_pairs_on_all_problems(slug: str) -> None:
    for name in NONSTIFF:
        assert_as_committed(slug, name)


@pytest.mark.parametrize(
    ("slug", "method"),
    [("bogacki-shampine-3-2", "RK23"), ("dormand-prince-5-4", "RK45")],
    ids=lambda text: text,
)
def test_scipy_with_the_same_tableau_takes_about_as_many_calls_for_about_the_error(
    slug: str, method: str
) -> None:
    """SciPy at 1e-6 on all 25 problems; other controllers, so factors, not figures (common practice: two)."""
    calls, errors = [], []
    for name, problem in NONSTIFF.items():
        solved = solve_ivp(problem.rate, (0.0, STOP), problem.state, method=method, rtol=1e-6, atol=1e-6)
        expected = references(name)[STOP]
        error = np.max(np.abs(solved.y[:, -1] - expected) / (1e-6 * (1.0 + np.abs(expected))))
        figure = table()[slug]["problems"][name]["1e-6"]
        calls.append(figure["calls"] / solved.nfev)
        errors.append(figure["error"] / error)
    assert min(calls) > 0.5
    assert max(calls) < 2.0
    assert np.median(errors) < 2.0
    assert max(errors) < 20.0
