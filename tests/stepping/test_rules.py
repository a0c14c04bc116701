"""One step rule, and its numbers in range."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest

import newel
from newel.errors import BadRequest
from newel.stepping.rules import chosen_rule

pytestmark = pytest.mark.core


def test_no_step_rule_shows_the_forms() -> None:
    with pytest.raises(BadRequest) as caught:
        chosen_rule(None, None, None, None)
    first, *forms = str(caught.value).splitlines()
    assert first == "no step rule: give one of"
    assert [line.split()[0] for line in forms] == ["step=0.01", "rel_tol=1e-6,", "steps=newel.Given([...])"]


@pytest.mark.parametrize(
    ("given", "words"),
    [
        ({"step": 0.1, "rel_tol": 1e-3}, "step and rel_tol together are more than one step rule"),
        ({"step": 0.1, "steps": newel.Fixed(0.1)}, "step and steps together"),
        (
            {"rel_tol": 0.1, "abs_tol": 0.1, "steps": newel.Fixed(0.1)},
            "rel_tol and abs_tol and steps together",
        ),
        ({"rel_tol": 1e-3}, "abs_tol is missing"),
        ({"abs_tol": 1e-3}, "rel_tol is missing"),
        ({"steps": 0.1}, "steps=0.1 is not a step rule"),
    ],
)
def test_another_number_of_rules_than_one_is_refused(given: dict[str, Any], words: str) -> None:
    with pytest.raises(BadRequest, match=words) as caught:
        chosen_rule(**{"step": None, "rel_tol": None, "abs_tol": None, "steps": None, **given})
    assert "rel_tol=1e-6, abs_tol=1e-9" in str(caught.value)


@pytest.mark.parametrize("step", [0.0, -0.1, math.nan, math.inf, "long", None, [0.1, 0.2]])
def test_a_step_that_is_no_positive_number_is_refused(step: Any) -> None:
    with pytest.raises(BadRequest, match="step=") as caught:
        newel.Fixed(step)
    assert caught.value.argument == "step"


@pytest.mark.parametrize("tolerance", [0.0, -1e-6, math.nan, math.inf, "small"])
def test_tolerances_that_are_no_positive_numbers_are_refused(tolerance: Any) -> None:
    with pytest.raises(BadRequest, match="rel_tol="):
        newel.Adaptive(rel_tol=tolerance, abs_tol=1e-6)
    with pytest.raises(BadRequest, match="abs_tol=") as caught:
        newel.Adaptive(rel_tol=1e-6, abs_tol=tolerance)
    assert caught.value.argument == "abs_tol"


def test_one_zero_among_many_absolute_tolerances_is_refused() -> None:
    with pytest.raises(BadRequest, match="even where the state is zero"):
        newel.Adaptive(rel_tol=1e-6, abs_tol=[1e-6, 0.0])


@pytest.mark.parametrize("name", ["first", "smallest", "largest"])
def test_bounds_of_the_step_are_positive(name: str) -> None:
    with pytest.raises(BadRequest, match=f"{name}=-1"):
        newel.Adaptive(rel_tol=1e-6, abs_tol=1e-6, **{name: -1})


def test_bounds_of_the_step_do_not_contradict_each_other() -> None:
    with pytest.raises(BadRequest, match="smallest=2 is above largest=1"):
        newel.Adaptive(rel_tol=1e-6, abs_tol=1e-6, smallest=2, largest=1)
    with pytest.raises(BadRequest, match="first=1 is below smallest=2"):
        newel.Adaptive(rel_tol=1e-6, abs_tol=1e-6, smallest=2, first=1)


@pytest.mark.parametrize(
    ("times", "words"),
    [
        ([], "at least one time"),
        ([1.0, math.nan], "finite"),
        ([1.0, 3.0, 2.0], "time 3, 2, does not come after time 2, 3"),
        ([1.0, 1.0], "time 2, 1, does not come after"),
        (["late"], "times='late' is not a number"),
    ],
)
def test_given_times_go_strictly_one_way(times: list[Any], words: str) -> None:
    with pytest.raises(BadRequest, match=words):
        newel.Given(times)


def test_given_times_may_go_backwards() -> None:
    assert newel.Given(np.array([3.0, 1.0, -2.0])).times == (3.0, 1.0, -2.0)


def test_settings_are_plain_data() -> None:
    """They go into files as they are."""
    import json

    def longer(t: float, y: Any) -> float:
        return 0.1

    for rule in (
        newel.Fixed(np.float64(0.5)),
        newel.Fixed(longer),
        newel.Given([1.0, 2.0]),
        newel.Adaptive(rel_tol=1e-6, abs_tol=np.array([1e-6, 1e-3]), norm=lambda e, s: 0.0),
    ):
        json.dumps(rule.settings())
    assert newel.Fixed(longer).settings()["step"].endswith("longer")
    assert newel.Adaptive(rel_tol=1e-6, abs_tol=1e-6).settings()["controller"] == "gustafsson-pi"
