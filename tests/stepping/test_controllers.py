"""The digital filter: its recursion, its limits, and what follows a rejection."""

from __future__ import annotations

import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from newel.errors import BadRequest
from newel.stepping.controllers import (
    NAMED,
    FilterController,
    elementary,
    gustafsson_pi,
    soderlind_h211b,
    soderlind_h312b,
)
from newel.testing import check_controller_contract

pytestmark = pytest.mark.core

errors = st.floats(1e-3, 1.0)


@pytest.mark.parametrize("name", NAMED)
def test_every_named_controller_keeps_the_contract(name: str) -> None:
    check_controller_contract(NAMED[name]())
    check_controller_contract(NAMED[name](limiter="arctangent"))
    check_controller_contract(NAMED[name](safety=1.0, largest=2.0, smallest=0.5))
    assert NAMED[name]().name == name


@pytest.mark.parametrize("name", NAMED)
@settings(deadline=None, derandomize=True, max_examples=20)
@given(history=st.lists(errors, min_size=3, max_size=6), order=st.integers(2, 9))
def test_the_factor_is_the_formula_of_the_filter(name: str, history: list[float], order: int) -> None:
    """The recursion written out, with the exponents read from the controller; no limits in the way."""
    controller = NAMED[name](safety=0.9, smallest=1e-9, largest=1e9)
    memory, step, steps = controller.start(), 1.0, []
    for n, error in enumerate(history):
        accepted, factor, memory = controller.decide(error, step, order, memory)
        assert accepted
        steps.append(step)
        if n >= 2:
            b1, b2, b3 = controller.errors
            a2, a3 = controller.steps
            want = (
                0.9
                * history[n] ** (-b1 / order)
                * history[n - 1] ** (-b2 / order)
                * history[n - 2] ** (-b3 / order)
                * (steps[n] / steps[n - 1]) ** -a2
                * (steps[n - 1] / steps[n - 2]) ** -a3
            )
            assert factor == pytest.approx(want, rel=1e-12)
        step *= factor


def test_the_first_factor_is_elementary() -> None:
    for controller in (gustafsson_pi(), soderlind_h312b()):
        _, factor, _ = controller.decide(0.5, 1.0, 5, controller.start())
        assert factor == pytest.approx(0.9 * 0.5 ** (-1 / 5))


def test_a_rejection_shortens_by_the_elementary_factor_is_forgotten_and_growth_waits() -> None:
    pi = gustafsson_pi()
    _, _, before = pi.decide(0.25, 1.0, 5, pi.start())
    accepted, factor, memory = pi.decide(10.0, 1.2, 5, before)
    assert not accepted
    assert factor == pytest.approx(0.9 * 10.0 ** (-1 / 5))
    accepted, factor, after = pi.decide(1e-3, 0.7, 5, memory)
    assert accepted
    assert factor == 1.0
    free, grown, _ = pi.decide(1e-3, 0.7, 5, before)
    assert free
    assert grown > 1.0
    assert after[:2] == (1e-3, 0.25)
    _, later, _ = pi.decide(1e-3, 0.7, 5, after)
    assert later > 1.0


def test_a_rejection_at_the_very_start_holds_growth_back_too() -> None:
    pi = gustafsson_pi()
    _, _, memory = pi.decide(50.0, 1.0, 5, pi.start())
    accepted, factor, _ = pi.decide(1e-3, 0.3, 5, memory)
    assert (accepted, factor) == (True, 1.0)


def test_a_rejected_step_is_always_shortened() -> None:
    """One unit in the last place above 1, with nothing kept for safety, is a rejection all the same."""
    bold = elementary(safety=1.0)
    accepted, factor, _ = bold.decide(math.nextafter(1.0, 2.0), 1.0, 9, bold.start())
    assert not accepted
    assert factor < 1.0


def test_factors_stay_between_their_bounds() -> None:
    tight = gustafsson_pi(smallest=0.5, largest=2.0)
    assert tight.decide(1e12, 1.0, 5, tight.start())[1] == 0.5
    assert tight.decide(0.0, 1.0, 5, tight.start())[1] == 2.0


def test_one_lucky_step_does_not_throttle_the_next() -> None:
    """An error of zero is remembered as 1e-4 (common practice)."""
    pi = gustafsson_pi()
    _, _, memory = pi.decide(0.0, 1.0, 5, pi.start())
    _, factor, _ = pi.decide(0.5, 1.0, 5, memory)
    assert factor == pytest.approx(0.9 * (0.5**0.7 * 1e-4**-0.4) ** (-1 / 5))
    assert factor > 0.4


BAD = (
    ({"safety": 0.0}, "safety"),
    ({"safety": 1.5}, "safety"),
    ({"smallest": 0.0}, "smallest"),
    ({"smallest": 1.0}, "smallest"),
    ({"largest": 1.0}, "largest"),
    ({"largest": math.inf}, "largest"),
    ({"growth_after_rejection": 0.5}, "growth_after_rejection"),
    ({"growth_after_rejection": 9.0}, "growth_after_rejection"),
    ({"limiter": "soft"}, "limiter"),
    ({"safety": math.nan}, "safety"),
)


@pytest.mark.parametrize(("arguments", "named"), BAD)
def test_limits_out_of_range_are_named(arguments: dict[str, float], named: str) -> None:
    with pytest.raises(BadRequest, match=named) as caught:
        gustafsson_pi(**arguments)
    assert caught.value.argument == named
    assert "gustafsson-pi" in str(caught.value)


def test_b_out_of_range_and_too_many_exponents_are_refused() -> None:
    for make in (soderlind_h211b, soderlind_h312b):
        with pytest.raises(BadRequest, match=r"b=1\.0"):
            make(b=1.0)
        with pytest.raises(BadRequest, match="b=nan"):
            make(b=math.nan)
    with pytest.raises(BadRequest, match="at most 3 error exponents"):
        FilterController("mine", (1.0, 1.0, 1.0, 1.0))
