"""The proof: laws that it obeys, and three outcomes that are never mixed up."""

from __future__ import annotations

import json
from fractions import Fraction
from typing import Any

import attrs
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from newel.errors import BadRequest, BadTableau
from newel.methods.coefficients import Coefficients
from newel.methods.exact import Exact
from newel.methods.order_conditions import Verdict, proof_key, prove, prove_coefficients
from newel.methods.tableau import Notes, Tableau

pytestmark = pytest.mark.core

calm = settings(deadline=None, derandomize=True, max_examples=25)

KUTTA = {"matrix": [[], ["1/2"], [0, "1/2"], [0, 0, 1]], "weights": ["1/6", "1/3", "1/3", "1/6"]}
FEHLBERG_MATRIX = [
    [],
    ["1/4"],
    ["3/32", "9/32"],
    ["1932/2197", "-7200/2197", "7296/2197"],
    ["439/216", "-8", "3680/513", "-845/4104"],
    ["-8/27", "2", "-3544/2565", "1859/4104", "-11/40"],
]
FEHLBERG_FOUR = ["25/216", "0", "1408/2565", "2197/4104", "-1/5", "0"]
FEHLBERG_FIVE = ["16/135", "0", "6656/12825", "28561/56430", "-9/50", "2/55"]
BOGACKI_SHAMPINE: dict[str, Any] = {
    "matrix": [[], ["1/2"], [0, "3/4"], ["2/9", "1/3", "4/9"]],
    "weights": ["2/9", "1/3", "4/9", "0"],
    "embedded_weights": ["7/24", "1/4", "1/3", "1/8"],
    "continuous_weights": [
        ["1", "-4/3", "5/9"],
        ["0", "1", "-2/3"],
        ["0", "4/3", "-8/9"],
        ["0", "-1", "1"],
    ],
}


def kutta(**changes: Any) -> Tableau:
    return Tableau("kutta", **{"order": 4, **KUTTA, **changes})


def bogacki_shampine(**changes: Any) -> Tableau:
    claims = {"order": 3, "embedded_order": 2, "continuous_order": 3}
    return Tableau("bogacki-shampine", **{**claims, **BOGACKI_SHAMPINE, **changes})


def fehlberg() -> Tableau:
    return Tableau(
        "fehlberg",
        order=4,
        embedded_order=5,
        matrix=FEHLBERG_MATRIX,
        weights=FEHLBERG_FOUR,
        embedded_weights=FEHLBERG_FIVE,
    )


def parts(verdict: Verdict) -> list[str]:
    return [failure.part for failure in verdict.failures]


def test_an_exact_tableau_whose_claims_hold_is_exact() -> None:
    verdict = prove(kutta())
    assert verdict
    assert (verdict.outcome, verdict.order, verdict.failures, verdict.digits) == ("exact", 4, (), None)
    assert (verdict.embedded_order, verdict.continuous_order) == (None, None)


def test_a_claim_beyond_the_proven_order_fails_and_names_the_trees() -> None:
    verdict = prove(kutta(order=5))
    assert not verdict
    assert (verdict.outcome, verdict.order) == ("fails", 4)
    assert parts(verdict)[-1] == "claim"
    assert verdict.failures[-1].message == "weights: order 5 is claimed, order 4 is proved"
    conditions = [failure.condition for failure in verdict.failures[:-1]]
    # By hand: b·c⁴ = (1/3)(1/16)·2 + 1/6 = 5/24, not 1/5; b·c²(Ac) = 5/48, not 1/10.
    assert conditions[:2] == ["[τ,τ,τ,τ]", "[τ,τ,[τ]]"]
    assert verdict.failures[0].residual == pytest.approx(1 / 120)
    assert [failure.residual_text for failure in verdict.failures[:2]] == ["1/120", "1/240"]
    assert len(conditions) <= 5


def test_failures_are_those_of_the_first_order_that_fails() -> None:
    verdict = prove(kutta(weights=["1/6", "1/3", "1/6", "1/3"]))
    orders = {
        failure.condition.count("τ") + failure.condition.count("[") for failure in verdict.failures[:-1]
    }
    assert orders == {2}
    assert verdict.order == 1


def test_weights_that_do_not_sum_to_one_are_of_order_zero() -> None:
    verdict = prove(kutta(weights=["1/6", "1/3", "1/3", "1/5"]))
    assert verdict.order == 0
    assert (verdict.failures[0].condition, verdict.failures[0].residual_text) == ("τ", "1/30")


def test_a_higher_order_than_claimed_is_remarked() -> None:
    verdict = prove(kutta(order=3))
    assert (verdict.outcome, verdict.order) == ("exact", 4)
    assert "the weights are of order 4, claimed 3" in verdict.remarks


def test_embedded_and_continuous_claims_are_proved_too() -> None:
    verdict = prove(bogacki_shampine())
    assert (verdict.outcome, verdict.order) == ("exact", 3)
    assert (verdict.embedded_order, verdict.continuous_order) == (2, 3)
    assert verdict.remarks == ()


def test_a_false_embedded_claim_fails_in_its_own_part() -> None:
    verdict = prove(bogacki_shampine(embedded_order=3))
    assert (verdict.outcome, verdict.order, verdict.embedded_order) == ("fails", 3, 2)
    assert parts(verdict) == ["embedded", "embedded", "claim"]


def test_one_wrong_continuous_coefficient_is_found_by_power_and_at_the_end_of_the_step() -> None:
    rows = [list(row) for row in BOGACKI_SHAMPINE["continuous_weights"]]
    rows[1][2] = "-1/3"
    verdict = prove(bogacki_shampine(continuous_weights=rows))
    assert (verdict.order, verdict.embedded_order, verdict.continuous_order) == (3, 2, 0)
    assert {failure.part for failure in verdict.failures} == {"continuous", "claim"}
    conditions = [failure.condition for failure in verdict.failures]
    assert "end of the step, stage 2" in conditions
    assert "τ θ^3" in conditions


def test_continuous_weights_that_miss_the_weights_at_the_end_fail_though_each_order_holds() -> None:
    """b(θ) = θ is of order 1 for any split among the stages, yet θ = 1 must give the weights."""
    t = Tableau(
        "split", order=2, matrix=[[], [1]], weights=["1/2", "1/2"], continuous_weights=[[1], [0]],
        continuous_order=1,
    )  # fmt: skip
    verdict = prove(t)
    assert (verdict.outcome, verdict.continuous_order) == ("fails", 1)
    assert [failure.condition for failure in verdict.failures] == [
        "end of the step, stage 1",
        "end of the step, stage 2",
    ]


def test_a_continuous_claim_beyond_its_degree_fails() -> None:
    """With one stage at c = 0, no condition on the power θ sees that θ² is missing."""
    t = Tableau("euler", order=1, matrix=[[]], weights=[1], continuous_weights=[[1]], continuous_order=2)
    verdict = prove(t)
    assert (verdict.outcome, verdict.continuous_order) == ("fails", 1)
    assert verdict.failures[0].condition == "[τ] θ^2"
    right = prove(
        Tableau("euler", order=1, matrix=[[]], weights=[1], continuous_weights=[[1]], continuous_order=1)
    )
    assert (right.outcome, right.continuous_order) == ("exact", 1)


def test_a_node_that_is_no_row_sum_fails_and_names_the_row_and_both_values() -> None:
    verdict = prove(kutta(nodes=["0", "1/2", "1/3", "1"]))
    assert verdict.order == 4  # the trees are judged by the matrix
    assert verdict.outcome == "fails"
    (failure,) = verdict.failures
    assert (failure.part, failure.condition, failure.residual_text) == ("row sum", "row 3", "1/6")
    assert "the node is 1/3, the sum of the row is 1/2" in failure.message


@calm
@given(st.permutations(range(6)))
def test_a_permutation_of_the_stages_changes_nothing(order: list[int]) -> None:
    t = fehlberg()
    verdict, permuted = (
        prove_coefficients(
            Coefficients(
                matrix=[[t.matrix[i][j] for j in places] for i in places],
                weights=[t.weights[i] for i in places],
                embedded=[t.embedded_weights[i] for i in places],  # type: ignore[index]  # it has them
                nodes=[t.nodes[i] for i in places],
                order=4,
                embedded_order=5,
            )
        )
        for places in (range(6), order)
    )
    assert (permuted.outcome, permuted.order, permuted.embedded_order) == ("exact", 4, 5)
    assert permuted.remarks == verdict.remarks
    assert permuted.working_floor == pytest.approx(verdict.working_floor, rel=1e-9)


@calm
@given(st.integers(0, 5), st.fractions(-3, 3, max_denominator=9), st.fractions(-3, 3, max_denominator=9))
def test_splitting_a_stage_in_two_changes_no_order(stage: int, share: Fraction, other: Fraction) -> None:
    """The copy has the same row; weights and columns are shared out, unequally row by row."""
    t = fehlberg()

    def shared(row: tuple[Exact, ...], part: Fraction) -> list[Exact]:
        return [*row[:stage], row[stage] * part, *row[stage + 1 :], row[stage] * (1 - part)]

    rows = [shared(row, share if i % 2 else other) for i, row in enumerate(t.matrix)]
    verdict = prove_coefficients(
        Coefficients(
            matrix=[*rows, shared(t.matrix[stage], other)],
            weights=shared(t.weights, share),
            embedded=shared(t.embedded_weights or (), other),
            nodes=[*t.nodes, t.nodes[stage]],
            order=4,
            embedded_order=5,
        )
    )
    assert (verdict.outcome, verdict.order, verdict.embedded_order) == ("exact", 4, 5)


@calm
@given(st.integers(0, 5), st.integers(0, 5), st.sampled_from([1, -1]))
def test_a_changed_coefficient_is_never_taken_for_exact(row: int, column: int, sign: int) -> None:
    """Not even a change by 10⁻⁹⁰⁰, far below the fixed point's digits, with the node changed along."""
    matrix = [list(entries) for entries in fehlberg().matrix]
    weights = list(fehlberg().weights)
    tiny = Fraction(sign, 10**900)
    if row == 0:
        weights[column] = weights[column] + tiny
    else:
        matrix[row][column % row] = matrix[row][column % row] + tiny
    verdict = prove_coefficients(
        Coefficients(matrix=matrix, weights=weights, embedded=FEHLBERG_FIVE, order=4, embedded_order=5)
    )
    assert verdict.outcome == "fails"
    assert "less than 1e-300, but not zero" in [failure.residual_text for failure in verdict.failures]


def test_surds_are_proved_exactly_and_a_wrong_sign_of_a_root_fails() -> None:
    """Gill's method (S. Gill, Proc. Camb. Phil. Soc. 47 (1951) 96-108), from memory."""
    gill: dict[str, Any] = {
        "matrix": [
            [],
            ["1/2"],
            ["(sqrt(2)-1)/2", "(2-sqrt(2))/2"],
            [0, "-sqrt(2)/2", "(2+sqrt(2))/2"],
        ],
        "weights": ["1/6", "(2-sqrt(2))/6", "(2+sqrt(2))/6", "1/6"],
    }
    verdict = prove(Tableau("gill", order=4, **gill))
    assert (verdict.outcome, verdict.order) == ("exact", 4)
    gill["weights"] = ["1/6", "(2+sqrt(2))/6", "(2-sqrt(2))/6", "1/6"]
    wrong = prove(Tableau("gill", order=4, **gill))
    assert (wrong.outcome, wrong.order) == ("fails", 2)
    # By hand, as both inner nodes are 1/2 and only [[τ]] sees it: (2 − √2)²/24 + 1/12 − 1/6.
    assert wrong.failures[0].residual_text == "(1 - sqrt(2))/6"


def gauss() -> Coefficients:
    a = [
        ["5/36", "2/9 - sqrt(15)/15", "5/36 - sqrt(15)/30"],
        ["5/36 + sqrt(15)/24", "2/9", "5/36 - sqrt(15)/24"],
        ["5/36 + sqrt(15)/30", "2/9 + sqrt(15)/15", "5/36"],
    ]
    nodes = ["1/2 - sqrt(15)/10", "1/2", "1/2 + sqrt(15)/10"]
    return Coefficients(matrix=a, weights=["5/18", "4/9", "5/18"], nodes=nodes, order=6)


def test_implicit_arrays_are_proved_too() -> None:
    """Gauss methods are of order 2s (J. C. Butcher, Math. Comp. 18 (1964) 50-64); three stages need √15."""
    verdict = prove_coefficients(gauss())
    assert (verdict.outcome, verdict.order) == ("exact", 6)
    assert not any("claimed" in remark for remark in verdict.remarks)


def test_two_square_roots_in_one_tableau_are_refused() -> None:
    with pytest.raises(BadTableau, match=r"sqrt\(2\) and sqrt\(3\)"):
        prove(Tableau("two", order=1, matrix=[[], ["sqrt(2)"]], weights=["sqrt(3)", "1 - sqrt(3)"]))


def test_numbers_that_no_float_can_follow_are_refused() -> None:
    for number in ("1e101", "-1e400"):
        with pytest.raises(BadTableau, match="beyond 1e100") as caught:
            prove(Tableau("huge", order=1, matrix=[[], [number]], weights=[1, 0], digits=3))
        assert caught.value.key == "matrix"


def test_large_numbers_are_decided_all_the_same() -> None:
    big = "1" + "0" * 90
    verdict = prove(Tableau("big", order=2, matrix=[[], [big]], weights=[f"1 - 1/(2*{big})", f"1/(2*{big})"]))
    assert (verdict.outcome, verdict.order) == ("exact", 2)


class TestRounded:
    """Digits are stated: a residual may be as large as twice its own rounding bound, and 1e-12 at most."""

    def verdict(self, weight: str, **digits: Any) -> Verdict:
        return prove(Tableau("one", order=1, matrix=[[]], weights=[weight], **digits))

    def test_a_residual_within_the_bound_is_rounded(self) -> None:
        verdict = self.verdict("0.99999999999997", digits=13)  # off by 3e-14, half a unit is 5e-14
        assert verdict
        assert (verdict.outcome, verdict.order, verdict.digits) == ("rounded", 1, 13)

    def test_a_residual_beyond_twice_the_bound_fails(self) -> None:
        verdict = self.verdict("0.99999999999997", digits=14)  # twice half a unit is 1e-14
        assert (verdict.outcome, verdict.order) == ("fails", 0)
        assert verdict.failures[0].residual == pytest.approx(-3e-14)
        assert verdict.failures[0].bound == pytest.approx(1e-14)

    def test_between_once_and_twice_the_bound_is_rounded(self) -> None:
        assert self.verdict("0.999999999999993", digits=14).outcome == "rounded"  # 7e-15 of 5e-15

    def test_few_digits_excuse_nothing_beyond_the_cap(self) -> None:
        assert self.verdict("0.9999999999995", digits=3).outcome == "rounded"
        capped = self.verdict("0.999999999998", digits=3)
        assert capped.outcome == "fails"
        assert capped.failures[0].bound == 1e-12

    def test_residuals_of_zero_do_not_make_stated_digits_exact(self) -> None:
        t = Tableau("halves", order=2, matrix=[[], ["0.5"]], weights=[0, 1], digits=16)
        assert prove(t).outcome == "rounded"

    def test_digits_that_touch_no_entry_leave_the_tableau_exact(self) -> None:
        verdict = prove(kutta(digits=16))
        assert (verdict.outcome, verdict.digits) == ("exact", None)

    def test_the_least_trusted_digits_are_reported(self) -> None:
        t = Tableau(
            "two",
            order=2,
            matrix=[[], ["0.5"]],
            weights=["0.00", "1.00"],
            digits={"weights": 16, "matrix": 13},
        )
        assert prove(t).digits == 13

    def test_rounded_embedded_weights_excuse_nothing_in_exact_weights(self) -> None:
        near = Fraction(1, 6) + Fraction(1, 10**14)
        t = kutta(
            weights=[near, "1/3", "1/3", "1/6"],
            embedded_weights=["0.25", "0.25", "0.25", "0.25"],
            embedded_order=1,
            digits={"embedded": 3},
        )
        verdict = prove(t)
        assert (verdict.outcome, verdict.order, verdict.embedded_order) == ("fails", 0, 2)

    def test_rounded_weights_do_not_excuse_a_stage_that_they_do_not_touch(self) -> None:
        """The bound is each residual's own: b·c uses a21 and b2, both exact here; only b1 is rounded."""
        weights = ["0.50000000000001", "1/2"]
        t = Tableau("a", order=2, matrix=[[], [1]], weights=weights, digits={"weights[1]": 13})
        assert prove(t).outcome == "rounded"
        wrong = Tableau(
            "a",
            order=2,
            matrix=[[], [1 + Fraction(1, 10**14)]],
            weights=weights,
            digits={"weights[1]": 13},
        )
        assert (prove(wrong).outcome, prove(wrong).order) == ("fails", 1)

    def test_the_bound_carries_the_matrix_through_the_tree(self) -> None:
        """∂(b·c)/∂a21 = b2 = 1000: one unit in the fourteenth digit of a21 weighs a thousandfold."""
        a21 = Fraction(1, 2000) + Fraction(1, 10**17)
        t = Tableau(
            "steep", order=2, matrix=[[], [str(float(a21))]], weights=[-999, 1000], digits={"matrix": 13}
        )
        assert prove(t).outcome == "rounded"
        finer = Tableau(
            "steep", order=2, matrix=[[], [str(float(a21))]], weights=[-999, 1000], digits={"matrix": 16}
        )
        assert prove(finer).order == 1

    def test_row_sums_are_judged_by_their_own_rounding(self) -> None:
        for digits, outcome in ((8, "rounded"), (9, "fails")):
            t = Tableau(
                "third",
                order=1,
                matrix=[[], ["0.000033333333"]],  # 3.3e-13 below 1/30000
                weights=[1, 0],
                nodes=[0, "1/30000"],
                digits={"matrix": digits},
            )
            assert prove(t).outcome == outcome


def test_the_working_floor_is_the_largest_residual_of_the_float_numbers() -> None:
    """Against Fractions of the floats, by formulas written out for the four conditions of order 3."""
    t = Tableau(
        "heun",
        order=3,
        matrix=[[], ["1/3"], [0, "2/3"]],
        weights=["1/4", 0, "3/4"],
        nodes=[0, "1/3", "2/3"],
    )
    a, b, c = ([Fraction(x) for x in array.ravel().tolist()] for array in (t.A, t.b, t.c))
    sums = [Fraction(0), a[3], a[6] + a[7]]
    residuals = [
        sum(b) - 1,
        sum(x * y for x, y in zip(b, sums, strict=True)) - Fraction(1, 2),
        sum(x * y**2 for x, y in zip(b, sums, strict=True)) - Fraction(1, 3),
        b[2] * a[7] * sums[1] - Fraction(1, 6),
        *(x - y for x, y in zip(sums, c, strict=True)),
    ]
    expected = float(max(map(abs, residuals)))
    assert 0 < expected < 1e-15
    assert prove(t).working_floor == pytest.approx(expected, rel=1e-12)


def test_dyadic_coefficients_have_no_working_floor_to_speak_of() -> None:
    verdict = prove(Tableau("midpoint", order=2, matrix=[[], ["1/2"]], weights=[0, 1]))
    assert 0 <= verdict.working_floor < 1e-30


def test_large_coefficients_raise_the_working_floor() -> None:
    """Weights near 10⁸ are wrong by up to 7.5e-9 each in float64 (half a unit in the last place at 2²⁶)."""
    b1, b2 = Fraction(10**8, 3), Fraction(10**8, 7)
    t = Tableau("poor", order=1, matrix=[[], [1], [1, 0]], weights=[b1, b2, 1 - b1 - b2])
    verdict = prove(t)
    assert verdict.outcome == "exact"
    residual = float(abs(sum(map(Fraction, t.b.tolist())) - 1))
    assert residual > 1e-10
    assert verdict.working_floor == pytest.approx(residual, rel=1e-12)


def test_a_coefficient_that_no_condition_sees_is_listed() -> None:
    unused = kutta(
        matrix=[*KUTTA["matrix"], ["1/7", 0, 0, "2/7"]],
        weights=[*KUTTA["weights"], 0],
    )
    verdict = prove(unused)
    assert verdict.outcome == "exact"
    assert verdict.undetermined == tuple(f"matrix[5][{column}]" for column in range(1, 5))


def test_a_stage_that_only_the_embedded_weights_use_is_determined() -> None:
    t = kutta(
        matrix=[*KUTTA["matrix"], ["1/2", 0, 0, 0]],
        weights=[*KUTTA["weights"], 0],
        embedded_weights=[0, 0, 0, 0, 1],
        embedded_order=2,
    )
    verdict = prove(t)
    assert verdict.outcome == "exact"
    assert verdict.undetermined == ()


def test_a_stage_of_small_weight_is_determined() -> None:
    small = Fraction(1, 10**6)
    b2 = Fraction(1, 2) - small / 2
    t = Tableau("light", order=2, matrix=[[], [1], ["1/2", 0]], weights=[1 - b2 - small, b2, small])
    verdict = prove(t)
    assert (verdict.outcome, verdict.undetermined) == ("exact", ())


def test_every_coefficient_of_the_classical_method_is_determined() -> None:
    assert prove(kutta()).undetermined == ()


def test_an_order_of_one_determines_no_stage() -> None:
    t = Tableau("one", order=1, matrix=[[], ["1/3"]], weights=["1/4", "3/4"])
    assert prove(t).undetermined == ("matrix[2][1]",)


class TestRemarks:
    def test_equal_embedded_weights_are_remarked(self) -> None:
        """A tableau refuses them; bare arrays are judged."""
        t = kutta()
        twice = Coefficients(
            matrix=t.matrix, weights=t.weights, order=4, embedded=t.weights, embedded_order=4
        )
        assert prove_coefficients(twice).remarks == (
            "the embedded weights equal the weights: the error estimate is always zero",
        )

    def test_formulas_of_the_same_order_are_remarked(self) -> None:
        t = kutta(order=4, embedded_weights=["1/6", "2/3", 0, "1/6"], embedded_order=2)
        assert not any("same order" in remark for remark in prove(t).remarks)
        euler = Tableau(
            "euler", order=1, matrix=[[], [1]], weights=[1, 0], embedded_weights=[0, 1], embedded_order=1
        )
        assert "weights and embedded weights are of the same order, 1" in prove(euler).remarks

    def test_an_estimator_whose_equal_nodes_cancel_is_blind_to_quadrature(self) -> None:
        """The inner nodes of Kutta's method are both 1/2: weight moved between them shows nothing."""
        t = kutta(embedded_weights=["1/6", "2/3", 0, "1/6"], embedded_order=2)
        assert any("blind to pure quadrature" in remark for remark in prove(t).remarks)

    def test_an_estimator_that_misses_the_leading_quadrature_error_is_remarked(self) -> None:
        """b − b̂ ∝ (1, −3, 3, −1) at 0, 1/3, 2/3, 1 kills every quadratic; b̂Ac = 1/12 keeps b̂ at order 2."""
        t = Tableau(
            "third-difference",
            order=4,
            matrix=[[], ["1/3"], ["-1/3", 1], [1, -1, 1]],
            weights=["1/8", "3/8", "3/8", "1/8"],
            embedded_weights=[0, "3/4", 0, "1/4"],
            embedded_order=2,
        )
        verdict = prove(t)
        assert (verdict.outcome, verdict.order, verdict.embedded_order) == ("exact", 4, 2)
        assert verdict.remarks == (
            "the error estimate is zero for the quadrature y' = t^2, where it should show the error",
        )

    def test_a_healthy_estimator_is_not_remarked(self) -> None:
        assert not any("estimate" in remark for remark in prove(fehlberg()).remarks)

    def test_a_higher_order_on_linear_problems_is_remarked(self) -> None:
        """b = e4 with a chain 1/4, 1/3, 1/2 has bA^(k−1)1 = 1/k! up to 4, but Σ b c² = 1/4."""
        t = Tableau("chain", order=2, matrix=[[], ["1/4"], [0, "1/3"], [0, 0, "1/2"]], weights=[0, 0, 0, 1])
        assert prove(t).remarks == (
            "the weights are of order 2, but of order 4 on linear problems with constant coefficients",
        )

    def test_one_order_more_on_linear_problems_is_remarked_too(self) -> None:
        t = Tableau("chain", order=2, matrix=[[], ["1/3"], [0, "1/2"]], weights=[0, 0, 1])
        assert prove(t).remarks == (
            "the weights are of order 2, but of order 3 on linear problems with constant coefficients",
        )

    def test_blindness_is_seen_through_rounding(self) -> None:
        rounded = ["0.1666666666666667", "0.6666666666666667", 0, "0.1666666666666667"]
        t = kutta(embedded_weights=rounded, embedded_order=2, digits={"embedded": 16})
        verdict = prove(t)
        assert verdict.outcome == "rounded"
        assert any("blind to pure quadrature" in remark for remark in verdict.remarks)

    def test_a_stage_outside_the_step_is_remarked(self) -> None:
        t = Tableau("out", order=2, matrix=[[], ["4/3"]], weights=["5/8", "3/8"])
        assert prove(t).remarks == ("stage 2 lies outside the step, at c = 4/3",)

    def test_a_plain_method_has_nothing_to_trip_over(self) -> None:
        assert prove(kutta()).remarks == ()


class TestVerdictAsData:
    @pytest.mark.parametrize("order", [4, 5])
    def test_a_verdict_survives_json(self, order: int) -> None:
        verdict = prove(kutta(order=order))
        assert Verdict.from_data(json.loads(json.dumps(verdict.to_data()))) == verdict

    def test_a_full_verdict_survives_json(self) -> None:
        verdict = prove(bogacki_shampine(nodes=[0, "1/2", "3/4", "2/3"], embedded_order=3))
        assert Verdict.from_data(json.loads(json.dumps(verdict.to_data()))) == verdict
        assert "continuous_order" in verdict.to_data()

    def test_absent_orders_are_left_out_as_toml_has_no_null(self) -> None:
        assert None not in prove(kutta()).to_data().values()

    @pytest.mark.parametrize(
        "data",
        [
            {},
            {"outcome": "exact"},
            {"outcome": "fine", "order": 4, "working_floor": 0.0},
            {"outcome": "exact", "order": "4", "working_floor": 0.0},
            {"outcome": "exact", "order": 4, "working_floor": "small"},
            {"outcome": "exact", "order": 4, "working_floor": 0.0, "more": 1},
            {"outcome": "fails", "order": 4, "working_floor": 0.0, "failures": [{"part": "claim"}]},
        ],
    )
    def test_data_that_is_no_verdict_is_refused(self, data: dict[str, Any]) -> None:
        with pytest.raises(BadRequest, match="no stored"):
            Verdict.from_data(data)

    def test_the_text_of_a_verdict_tells_outcome_orders_and_failures(self) -> None:
        text = str(prove(bogacki_shampine(embedded_order=3)))
        assert text.startswith("fails: order 3(2), continuous 3, float64 to ")
        assert "embedded: order 3 is claimed, order 2 is proved" in text


class TestProofKey:
    def test_it_rests_on_numbers_claims_and_digits(self) -> None:
        keys = {
            proof_key(t)
            for t in (
                kutta(),
                kutta(order=3),
                kutta(digits=16),
                kutta(digits={"matrix": 16}),
                kutta(weights=["1/6", "1/3", "1/3", "1/5"]),
                bogacki_shampine(),
                bogacki_shampine(embedded_order=1),
                bogacki_shampine(continuous_order=2),
            )
        }
        assert len(keys) == 8

    def test_it_does_not_rest_on_notes_and_names(self) -> None:
        assert proof_key(kutta()) == proof_key(kutta(name="Kutta", notes=Notes(remarks=["old"])))


def test_progress_counts_conditions_up_to_the_claims() -> None:
    calls: list[tuple[int, int]] = []
    prove(bogacki_shampine(), lambda done, total: calls.append((done, total)))
    assert calls[-1] == (10, 10)  # 4 trees up to order 3, 2 up to order 2, 4 again
    assert all(done <= total for done, total in calls)


def test_progress_is_told_in_between_where_there_is_much_to_do() -> None:
    calls: list[int] = []
    prove_coefficients(
        attrs.evolve(gauss(), embedded=gauss().weights, embedded_order=6),
        progress=lambda done, total: calls.append(done),
    )
    assert calls == [64, 74]  # twice the 37 conditions of order 6


def test_progress_does_not_pass_the_total_when_a_method_is_better_than_claimed() -> None:
    calls: list[tuple[int, int]] = []
    prove(kutta(order=1), lambda done, total: calls.append((done, total)))
    assert calls == [(1, 1)]


def test_too_few_trusted_digits_are_told_with_the_number_needed() -> None:
    """Where all that fails is rounding, the verdict says how many digits would do; of a slip it does not."""

    def third_order(last_weight: str, digits: int) -> Tableau:
        return Tableau(
            "short",
            order=3,
            matrix=[[], ["0.33333333"], [0, "0.66666667"]],
            weights=["0.25", 0, last_weight],
            digits=digits,
        )

    short = prove(third_order("0.75", 8))
    assert not short
    assert short.remarks[0].startswith("8 trusted digits leave conditions off by up to 3e-09")
    assert short.remarks[0].endswith("about 12 digits are needed")
    wrong = prove(third_order("0.73", 8))
    assert not wrong
    assert not any("digits are needed" in remark for remark in wrong.remarks)
