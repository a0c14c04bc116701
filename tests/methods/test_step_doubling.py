"""Step doubling as a tableau: what two half steps and one full step do, and no digit too many."""

from __future__ import annotations

from fractions import Fraction
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from newel.catalogue.shipped import tableau_files
from newel.errors import BadRequest
from newel.methods.analysis.error_norms import error_terms
from newel.methods.exact import Exact
from newel.methods.families.step_doubling import doubled
from newel.methods.order_conditions import prove
from newel.methods.tableau import Tableau
from newel.methods.tableau_file import format_tableau, parse_tableau

pytestmark = pytest.mark.core


def kutta() -> Tableau:
    # W. Kutta, Z. Math. Phys. 46 (1901) 435-453; from memory.
    matrix = [[], ["1/2"], [0, "1/2"], [0, 0, 1]]
    return Tableau("kutta-4", order=4, matrix=matrix, weights=["1/6", "1/3", "1/3", "1/6"])


def step(tableau: Tableau, weights: Any, rate: Any, t: Fraction, y: Fraction, h: Fraction) -> Fraction:
    """One step in rational arithmetic, written out from the definition of a Runge–Kutta method."""
    k: list[Fraction] = []
    for row, c in zip(tableau.matrix, tableau.nodes, strict=True):
        stage = y + h * sum((a.rational * x for a, x in zip(row, k, strict=False)), Fraction(0))
        k.append(rate(t + c.rational * h, stage))
    return y + h * sum((b.rational * x for b, x in zip(weights, k, strict=True)), Fraction(0))


def test_doubled_kutta_4_has_11_stages_and_order_5() -> None:
    pair = doubled(kutta())
    assert (pair.slug, pair.stages, pair.order, pair.embedded_order) == ("doubled-kutta-4", 11, 5, 4)
    for order in range(1, 6):
        assert max(abs(term) for term in error_terms(pair, order) or ()) < Fraction(1, 10**100)
    assert max(abs(term) for term in error_terms(pair, 6) or ()) > Fraction(1, 10**6)
    for order in range(1, 5):
        terms = error_terms(pair, order, embedded=True)
        assert max(abs(term) for term in terms or ()) < Fraction(1, 10**100)
    assert max(abs(term) for term in error_terms(pair, 5, embedded=True) or ()) > Fraction(1, 10**6)


def test_its_claims_are_proved() -> None:
    verdict = prove(doubled(kutta()))
    assert (verdict.outcome, verdict.order, verdict.embedded_order) == ("exact", 5, 4)


@pytest.mark.parametrize("slug", ["carpenter-kennedy-4", "ssp-3-stages-5", "tsitouras-2011-5-4"])
def test_the_pair_of_a_rounded_method_is_proved_as_rounded(slug: str) -> None:
    method = parse_tableau(tableau_files()[slug].read_text(encoding="utf-8"))
    verdict = prove(doubled(method))
    assert (verdict.outcome, verdict.order, verdict.embedded_order) == (
        "rounded",
        method.order + 1,
        method.order,
    )


def test_its_numbers_are_exact_where_those_of_the_method_are() -> None:
    pair = doubled(kutta())
    assert pair.is_exact
    assert pair.digits is None
    assert pair.nodes == tuple(sum(row, Exact.of(0)) for row in pair.matrix)


small = st.fractions(-2, 2, max_denominator=9)


@st.composite
def methods(draw: st.DrawFn) -> Tableau:
    s = draw(st.integers(1, 4))
    matrix = [draw(st.lists(small, min_size=i, max_size=i)) for i in range(s)]
    weights = draw(st.lists(small, min_size=s, max_size=s))
    # The pair of a method without weights would estimate nothing, which a tableau refuses.
    weights[-1] = draw(small.filter(bool))
    return Tableau("any", order=draw(st.integers(1, 6)), matrix=matrix, weights=weights)


@settings(deadline=None, derandomize=True, max_examples=50)
@given(methods(), small, small, small)
def test_a_step_of_the_pair_is_two_half_steps_and_the_extrapolated_value(
    method: Tableau, t: Fraction, y: Fraction, h: Fraction
) -> None:
    def rate(t: Fraction, y: Fraction) -> Fraction:
        return t * y - y / 3 + 2 * t + 1

    pair = doubled(method)
    b = method.weights
    middle = step(method, b, rate, t, y, h / 2)
    two = step(method, b, rate, t + h / 2, middle, h / 2)
    one = step(method, b, rate, t, y, h)
    assert pair.stages == 3 * method.stages - 1
    assert pair.embedded_weights is not None
    assert step(pair, pair.embedded_weights, rate, t, y, h) == two
    assert step(pair, pair.weights, rate, t, y, h) == two + (two - one) / (2**method.order - 1)


def test_surds_stay_exact() -> None:
    # S. Gill, Proc. Cambridge Philos. Soc. 47 (1951) 96-108; from memory.
    gill = Tableau(
        "gill-4",
        order=4,
        matrix=[[], ["1/2"], ["(sqrt(2) - 1)/2", "(2 - sqrt(2))/2"], [0, "-sqrt(2)/2", "(2 + sqrt(2))/2"]],
        weights=["1/6", "(2 - sqrt(2))/6", "(2 + sqrt(2))/6", "1/6"],
    )
    pair = doubled(gill)
    assert pair.is_exact
    assert pair.matrix[2][1] == Exact.of("(2 - sqrt(2))/4")
    assert max(abs(term) for term in error_terms(pair, 5) or ()) < Fraction(1, 10**100)


@settings(deadline=None, derandomize=True, max_examples=40)
@given(st.data())
def test_the_digits_of_a_rounded_method_cover_its_rounding_and_no_digit_is_given_away(
    data: st.DataObject,
) -> None:
    decimal = st.decimals("-3", "3", places=6).filter(lambda x: abs(x) > 1e-3).map(str)
    method = Tableau(
        "rounded-5",
        order=5,
        matrix=[[], [data.draw(decimal).lstrip("-")], [data.draw(decimal), "1/3"]],
        weights=[data.draw(decimal), data.draw(decimal), "1/4"],
        digits=6,
    )
    pair = doubled(method)
    assert not pair.is_exact
    factors = {
        ("matrix", 1, 0): (method.half_units("matrix")[1][0], Fraction(1, 2)),
        ("matrix", 4, 0): (method.half_units("weights")[0], Fraction(1, 2)),
        ("matrix", 6, 0): (method.half_units("matrix")[1][0], Fraction(1)),
        ("embedded", 3, None): (method.half_units("weights")[0], Fraction(1, 2)),
        ("weights", 0, None): (method.half_units("weights")[0], Fraction(15, 31)),
        ("weights", 1, None): (method.half_units("weights")[1], Fraction(16, 31)),
        ("weights", 6, None): (method.half_units("weights")[1], Fraction(1, 31)),
        ("nodes", 4, None): (method.half_units("nodes")[1], Fraction(1, 2)),
    }
    for (array, i, j), (unit, factor) in factors.items():
        stated = pair.half_units(array)[i]
        stated = stated if j is None else stated[j]
        if stated:
            assert unit * factor <= stated < 10 * unit * factor
        else:
            assert not unit or not _entry(pair, array, i, j)


def _entry(pair: Tableau, array: str, i: int, j: int | None) -> Exact:
    rows = {
        "matrix": pair.matrix,
        "weights": pair.weights,
        "nodes": pair.nodes,
        "embedded": pair.embedded_weights,
    }
    entry: Any = rows[array][i]  # type: ignore[index]  # a pair has embedded weights
    return entry if j is None else entry[j]


def test_exact_entries_of_a_rounded_method_stay_exact() -> None:
    method = Tableau(
        "r", order=1, matrix=[[], ["0.333"]], weights=["1/4", "3/4"], nodes=[0, "0.333"], digits=3
    )
    pair = doubled(method)
    assert list(pair.digits or ()) == [
        *("nodes[2]", "nodes[4]", "nodes[5]"),
        *("matrix[2][1]", "matrix[4][3]", "matrix[5][1]"),
    ]
    assert all(unit == 0 for unit in pair.half_units("weights"))


def test_the_pair_survives_a_file() -> None:
    method = Tableau("r", order=1, matrix=[[], ["0.333"]], weights=["0.25", "3/4"], digits=3)
    for pair in (doubled(kutta()), doubled(method)):
        assert parse_tableau(format_tableau(pair)) == pair


def test_where_the_numbers_come_from_is_told() -> None:
    pair = doubled(kutta())
    assert pair.numbers == "derived: by step doubling from kutta-4"
    assert pair.source.startswith("step doubling of kutta-4")


@pytest.mark.parametrize("changes", [{"order": 16}, {"stages": 172}, {"slug": "a" * 73}], ids=str)
def test_what_would_grow_beyond_a_tableau_is_refused(changes: dict[str, Any]) -> None:
    asked = {"slug": "large", "order": 1, "stages": 2} | changes
    s = asked["stages"]
    method = Tableau(asked["slug"], order=asked["order"], matrix=[[0] * i for i in range(s)], weights=[1] * s)
    with pytest.raises(BadRequest, match="cannot be doubled"):
        doubled(method)


def test_a_method_of_no_trusted_digit_is_refused() -> None:
    method = Tableau("r", order=1, matrix=[[], ["0.2"]], weights=[0, 1], nodes=[0, "-0.99"], digits=1)
    with pytest.raises(BadRequest, match="too few of its digits"):
        doubled(method)
