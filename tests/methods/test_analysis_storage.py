"""Memory, low-storage forms, stage order and the price of accuracy."""

from __future__ import annotations

from fractions import Fraction

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from newel.methods.analysis.error_norms import error_norm
from newel.methods.analysis.pair_quality import (
    embedded_error_ratio,
    estimate_error_ratio,
    solution_error_ratio,
)
from newel.methods.analysis.properties import PROPERTIES, property_named
from newel.methods.analysis.storage_needs import low_storage_form, registers, slab_bytes
from newel.methods.analysis.structure import dominant_stage_order, stage_order
from newel.methods.analysis.work import calls_for_digits
from newel.methods.tableau import Tableau

pytestmark = pytest.mark.core

KUTTA = Tableau(
    "kutta-4", order=4, matrix=[[], ["1/2"], [0, "1/2"], [0, 0, 1]], weights=["1/6", "1/3", "1/3", "1/6"]
)
number = st.fractions(-2, 2, max_denominator=9).filter(bool)


@settings(deadline=None, derandomize=True, max_examples=60)
@given(st.lists(st.tuples(number, number), min_size=2, max_size=6))
def test_what_runs_in_two_registers_by_williamsons_rule_is_told(
    pairs: list[tuple[Fraction, Fraction]],
) -> None:
    S, u = [Fraction(0)] * len(pairs), [Fraction(0)] * len(pairs)
    rows = []
    for i, (A, B) in enumerate(pairs):
        rows.append(u[:i])
        S = [(A if i else Fraction(0)) * x for x in S]
        S[i] += 1
        u = [x + B * y for x, y in zip(u, S, strict=True)]
    made = Tableau("made-1", order=1, matrix=rows, weights=u)
    assert low_storage_form(made) == "williamson"
    assert registers(made) == 2


@settings(deadline=None, derandomize=True, max_examples=30)
@given(st.lists(number, min_size=3, max_size=6), st.data())
def test_what_repeats_its_weights_is_van_der_houwens_form(b: list[Fraction], data: st.DataObject) -> None:
    steps = [data.draw(number) for _ in b[1:]]
    rows = [[], *([*b[: i - 1], steps[i - 1]] for i in range(1, len(b)))]
    assert low_storage_form(Tableau("made-1", order=1, matrix=rows, weights=b)) in (
        "van-der-houwen",
        "williamson",
    )
    assert registers(Tableau("made-1", order=1, matrix=rows, weights=b)) == 2


def test_one_entry_that_is_off_is_no_low_storage_form() -> None:
    rows = [[], ["1/3"], ["-3/16", "15/16"]]
    weights = ["1/6", "3/10", "8/15"]  # Williamson 1980
    assert low_storage_form(Tableau("w-3", order=3, matrix=rows, weights=weights)) == "williamson"
    off = [[], ["1/3"], ["-3/16 + 1/1000000000000", "15/16"]]
    assert low_storage_form(Tableau("w-3", order=3, matrix=off, weights=weights)) is None
    assert low_storage_form(KUTTA) is None


def test_registers_count_what_must_be_held() -> None:
    assert registers(KUTTA) == 3  # the state, the sum, one rate: the usual count of the classical method
    euler = Tableau("euler-1", order=1, matrix=[[]], weights=[1])
    assert registers(euler) == 2
    full = Tableau(
        "full-1", order=1, matrix=[[], [1], [1, 2], [1, 2, 5]], weights=["1/4", "1/4", "1/4", "1/4"]
    )
    assert registers(full) == 5
    pair = Tableau(
        "pair-1", order=1, embedded_order=1, matrix=[[], [1]], weights=[0, 1], embedded_weights=[1, 0]
    )
    assert registers(pair) == 3
    assert slab_bytes(KUTTA, 1000, itemsize=4) == 20000


def test_the_stage_order_is_the_least_of_all_stages() -> None:
    assert (stage_order(KUTTA), dominant_stage_order(KUTTA)) == (1, 1)
    # The second stage is of order 1, as it must be; the third integrates c exactly, and has the weight.
    two_thirds = Tableau("a-2", order=2, matrix=[[], ["1/3"], [0, "2/3"]], weights=["1/4", 0, "3/4"])
    assert (stage_order(two_thirds), dominant_stage_order(two_thirds)) == (1, 2)
    mixed = Tableau("b-1", order=1, matrix=[[], ["sqrt(2)"], [0, "sqrt(3)"]], weights=[0, 0, 1])
    assert stage_order(mixed) == 1


def test_the_price_of_accuracy_is_calls_over_the_step_that_meets_it() -> None:
    norm = error_norm(KUTTA)
    assert norm is not None
    calls = calls_for_digits(KUTTA, 6)
    assert calls is not None
    assert norm * (4 / calls) ** 4 == pytest.approx(1e-6)
    still = Tableau("still-1", order=1, matrix=[[], ["1/2"]], weights=[0, 1])
    assert calls_for_digits(still, 3) is None or error_norm(still) != 0


def test_a_pair_the_other_way_round_has_no_figures() -> None:
    turned = Tableau(
        "a-1-2", order=1, embedded_order=2, matrix=[[], [1]], weights=[1, 0], embedded_weights=["1/2", "1/2"]
    )
    for figure in (embedded_error_ratio, estimate_error_ratio, solution_error_ratio):
        assert figure(turned) is None
        assert figure(KUTTA) is None


def test_short_names_are_names_of_one_property_each() -> None:
    names = [each.name for each in PROPERTIES] + [each.short for each in PROPERTIES if each.short]
    assert len(set(names)) == len(names)
    assert property_named("ssp") is property_named("ssp_coefficient")
    assert property_named("nothing") is None
    assert {each.kind for each in PROPERTIES} == {"number", "yes or no", "word", "polynomial"}


def test_titles_fit_where_they_are_shown() -> None:
    assert max(len(each.title) for each in PROPERTIES) <= 36
