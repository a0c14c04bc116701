"""Published tableaux that are nearly, but not quite, what they are said to be.

Every coefficient below is from memory of the publication named beside it, and was proved by the checks here.

- E. B. Shanks, "Solutions of differential equations by evaluations of functions", Math. Comp. 20 (1966) 21.
- R. H. Merson, Proc. Symp. Data Processing, Weapons Research Establishment, Salisbury (1957).
- A. Ralston, "Runge-Kutta methods with minimum error bounds", Math. Comp. 16 (1962) 431-437.
- E. J. Nyström, Acta Soc. Sci. Fenn. 50 (1925) no. 13, correcting W. Kutta, Z. Math. Phys. 46 (1901) 435-453.
- P. J. Prince, J. R. Dormand, J. Comput. Appl. Math. 7 (1981) 67-75.
- E. Fehlberg, NASA TR R-287 (1968), and Computing 4 (1969) 93-106.
- M. H. Carpenter, C. A. Kennedy, "Fourth-order 2N-storage Runge-Kutta schemes", NASA TM 109112 (1994).
- J. Berland, C. Bogey, C. Bailly, Comput. Fluids 35 (2006) 1459-1463.
- J. C. Butcher, Numerical Methods for Ordinary Differential Equations, two methods of order 5.
"""

from __future__ import annotations

from fractions import Fraction
from importlib.resources import as_file, files
from typing import Any

import pytest

from newel.methods.exact import Exact
from newel.methods.order_conditions import prove
from newel.methods.tableau import Tableau
from newel.methods.tableau_file import load_tableau

pytestmark = pytest.mark.core


def shipped(order: int, slug: str) -> Tableau:
    with as_file(files("newel.tableaux") / f"order-{order}" / f"{slug}.toml") as path:
        return load_tableau(path)


SHANKS: dict[str, Any] = {
    "nodes": ["0", "1/9000", "3/10", "3/4", "1"],
    "matrix": [
        [],
        ["1/9000"],
        ["-4047/10", "4050/10"],
        ["20241/8", "-20250/8", "15/8"],
        ["-931041/81", "931500/81", "-490/81", "112/81"],
    ],
    "weights": ["105/1134", "0", "500/1134", "448/1134", "81/1134"],
}


def test_five_stages_said_to_be_of_order_five_are_of_order_four() -> None:
    """Shanks misses order 5 by 1.543e-6, on purpose; no five stages have order 5 (J. C. Butcher 1964)."""
    verdict = prove(Tableau("shanks", order=5, **SHANKS))
    assert (verdict.outcome, verdict.order) == ("fails", 4)
    found = [failure for failure in verdict.failures if failure.part == "weights"]
    assert max(abs(failure.residual) for failure in found) == pytest.approx(1.543e-6, rel=1e-3)
    assert all(abs(failure.residual) < 1.6e-6 for failure in found)
    assert verdict.failures[-1].part == "claim"


def test_the_same_five_stages_claimed_as_order_four_are_exact() -> None:
    verdict = prove(Tableau("shanks", order=4, **SHANKS))
    assert (verdict.outcome, verdict.order) == ("exact", 4)


def test_few_stated_digits_do_not_turn_order_four_into_five() -> None:
    """Residuals of 1.5e-6 are beyond the cap of 1e-12, whatever digits are stated."""
    decimals = {
        "matrix": [[str(float(Fraction(x))) for x in row] for row in SHANKS["matrix"]],
        "weights": [str(float(Fraction(x))) for x in SHANKS["weights"]],
    }
    for digits in (3, 6):
        verdict = prove(Tableau("shanks", order=5, digits=digits, **decimals))
        assert (verdict.outcome, verdict.order) == ("fails", 4)


def merson(**embedded: Any) -> Tableau:
    return Tableau(
        "merson",
        order=4,
        matrix=[[], ["1/3"], ["1/6", "1/6"], ["1/8", 0, "3/8"], ["1/2", 0, "-3/2", 2]],
        weights=["1/6", 0, 0, "2/3", "1/6"],
        **embedded,
    )


COMPARISON = ["1/10", 0, "3/10", "2/5", "1/5"]


def test_mersons_comparison_formula_is_of_order_five_on_linear_problems_only() -> None:
    verdict = prove(merson(embedded_weights=COMPARISON, embedded_order=3))
    assert (verdict.outcome, verdict.order, verdict.embedded_order) == ("exact", 4, 3)
    assert (
        "the embedded weights are of order 3, but of order 5 on linear problems with constant coefficients"
        in verdict.remarks
    )


def test_mersons_comparison_formula_claimed_as_order_five_fails_at_three_of_four_trees_of_order_four() -> (
    None
):
    verdict = prove(merson(embedded_weights=COMPARISON, embedded_order=5))
    assert (verdict.outcome, verdict.embedded_order) == ("fails", 3)
    trees = [failure.condition for failure in verdict.failures if failure.part == "embedded"]
    assert trees == ["[τ,τ,τ]", "[τ,[τ]]", "[[τ,τ]]"]  # [[[τ]]] is the one that linear problems see


def test_mersons_other_comparison_formula_is_of_order_three() -> None:
    verdict = prove(merson(embedded_weights=["1/2", 0, "-3/2", 2, 0], embedded_order=3))
    assert (verdict.outcome, verdict.embedded_order) == ("exact", 3)


RALSTON_SURDS: dict[str, Any] = {
    "nodes": [0, "2/5", "7/8 - 3*sqrt(5)/16", 1],
    "matrix": [
        [],
        ["2/5"],
        ["(-2889 + 1428*sqrt(5))/1024", "(3785 - 1620*sqrt(5))/1024"],
        ["(-3365 + 2094*sqrt(5))/6040", "(-975 - 3046*sqrt(5))/2552", "(467040 + 203968*sqrt(5))/240845"],
    ],
    "weights": [
        "(263 + 24*sqrt(5))/1812",
        "(125 - 1000*sqrt(5))/3828",
        "1024*(3346 + 1623*sqrt(5))/5924787",
        "(30 - 4*sqrt(5))/123",
    ],
}
RALSTON_DECIMALS: dict[str, Any] = {
    "matrix": [
        [],
        ["0.4"],
        ["0.29697760924775360", "0.15875964497103583"],
        ["0.21810038822592047", "-3.05096514869293080", "3.83286476046701030"],
    ],
    "weights": ["0.17476028226269037", "-0.55148066287873294", "1.20553559939652350", "0.17118478121951903"],
}


def test_ralstons_surds_are_exact_and_his_printed_decimals_are_rounded() -> None:
    exact = prove(Tableau("ralston", order=4, **RALSTON_SURDS))
    assert (exact.outcome, exact.order) == ("exact", 4)
    rounded = prove(Tableau("ralston", order=4, digits=16, **RALSTON_DECIMALS))
    assert (rounded.outcome, rounded.order, rounded.digits) == ("rounded", 4, 16)


def test_ralstons_decimals_are_the_surds_to_seventeen_places() -> None:
    surds = [x for row in RALSTON_SURDS["matrix"] for x in row] + RALSTON_SURDS["weights"]
    decimals = [x for row in RALSTON_DECIMALS["matrix"] for x in row] + RALSTON_DECIMALS["weights"]
    for surd, decimal in zip(surds, decimals, strict=True):
        assert abs(Exact.of(surd) - Exact.of(decimal)) < Fraction(6, 10**17)


def test_ralstons_decimals_taken_as_exact_fail() -> None:
    fractions = {key: _as_fractions(value) for key, value in RALSTON_DECIMALS.items()}
    verdict = prove(Tableau("ralston", order=4, **fractions))
    assert (verdict.outcome, verdict.order) == ("fails", 0)


def _as_fractions(value: Any) -> Any:
    return [_as_fractions(x) for x in value] if isinstance(value, list) else Fraction(value)


NYSTROM: dict[str, Any] = {
    "matrix": [
        [],
        ["1/3"],
        ["4/25", "6/25"],
        ["1/4", -3, "15/4"],
        ["2/27", "10/9", "-50/81", "8/81"],
        ["2/25", "12/25", "2/15", "8/75", 0],
    ],
    "weights": ["23/192", 0, "125/192", 0, "-27/64", "125/192"],
}


def test_nystroms_correction_of_kuttas_fifth_order_is_exact() -> None:
    verdict = prove(Tableau("nystrom", order=5, **NYSTROM))
    assert (verdict.outcome, verdict.order) == ("exact", 5)


@pytest.mark.parametrize(
    ("row", "column", "order"),
    [(i, j, {2: 4, 4: 2}.get(i, 1)) for i in range(2, 7) for j in range(1, i)],
)
def test_a_slip_of_one_part_in_eighty_one_costs_nystroms_matrix_its_order(
    row: int, column: int, order: int
) -> None:
    """With nodes as row sums the order falls to 4 for a21, 2 for row 4, 1 for rows 3, 5 and 6."""
    matrix = [[Fraction(x) for x in entries] for entries in NYSTROM["matrix"]]
    matrix[row - 1][column - 1] += Fraction(1, 81)
    verdict = prove(Tableau("nystrom", order=5, matrix=matrix, weights=NYSTROM["weights"]))
    assert (verdict.outcome, verdict.order) == ("fails", order)
    assert not any(failure.part == "row sum" for failure in verdict.failures)


def test_a_lost_sign_of_a_weight_leaves_no_order_at_all() -> None:
    """With b5 = +27/64 the weights sum to 59/32."""
    weights = [*NYSTROM["weights"][:4], "27/64", NYSTROM["weights"][5]]
    verdict = prove(Tableau("nystrom", order=5, matrix=NYSTROM["matrix"], weights=weights))
    assert verdict.order == 0
    assert verdict.failures[0].residual_text == "27/32"


BUTCHER_WEIGHTS = ["7/90", 0, "32/90", "12/90", "32/90", "7/90"]
BUTCHER_HEAD = [[], ["1/4"], ["1/8", "1/8"]]
BUTCHER_A = [[0, "-1/2", 1], ["3/16", 0, 0, "9/16"], ["-3/7", "2/7", "12/7", "-12/7", "8/7"]]
BUTCHER_B = [[0, 0, "1/2"], ["3/16", "-3/8", "3/8", "9/16"], ["-3/7", "8/7", "6/7", "-12/7", "8/7"]]


def test_two_methods_of_butcher_hold_and_a_mixture_of_their_rows_does_not() -> None:
    """They share nodes, weights and row sums, so that only the trees can tell a mixture."""
    for choice in range(8):
        rows = [(BUTCHER_A, BUTCHER_B)[choice >> i & 1][i] for i in range(3)]
        verdict = prove(Tableau("butcher", order=5, matrix=BUTCHER_HEAD + rows, weights=BUTCHER_WEIGHTS))
        if choice in (0, 7):
            assert (verdict.outcome, verdict.order) == ("exact", 5)
        else:
            assert verdict.outcome == "fails"
            assert verdict.order < 5


class TestPrinceDormand:
    """The published rationals of 8(7) are approximations of about 18 digits."""

    def test_it_is_rounded_and_keeps_both_orders(self) -> None:
        verdict = prove(shipped(8, "prince-dormand-8-7"))
        assert (verdict.outcome, verdict.order, verdict.embedded_order) == ("rounded", 8, 7)

    def test_taken_as_exact_it_misses_even_the_sum_of_the_weights(self) -> None:
        """Σb − 1 is −3.685314673e-18 for the weights and 7.710972675e-19 for the embedded ones."""
        t = shipped(8, "prince-dormand-8-7")
        bare = Tableau(
            "bare",
            order=8,
            matrix=t.matrix,
            weights=t.weights,
            embedded_weights=t.embedded_weights,
            embedded_order=7,
        )
        verdict = prove(bare)
        assert (verdict.outcome, verdict.order, verdict.embedded_order) == ("fails", 0, 0)
        sums = {failure.part: failure.residual for failure in verdict.failures if failure.condition == "τ"}
        assert sums["weights"] == pytest.approx(-3.685314673e-18, rel=1e-9)
        assert sums["embedded"] == pytest.approx(7.710972675e-19, rel=1e-9)


@pytest.mark.parametrize("slug", ["fehlberg-7-8", "fehlberg-8-7"])
def test_fehlbergs_estimators_of_order_seven_and_eight_are_blind_to_quadrature(slug: str) -> None:
    verdict = prove(shipped(int(slug[9]), slug))
    assert verdict.outcome == "exact"
    assert {verdict.order, verdict.embedded_order} == {7, 8}
    assert any("blind to pure quadrature" in remark for remark in verdict.remarks)


LOW_STORAGE_A = """0 -567301805773/1357537059087 -2404267990393/2016746695238 -3550918686646/2091501179385
    -1275806237668/842570457699"""
LOW_STORAGE_B = """1432997174477/9575080441755 5161836677717/13612068292357 1720146321549/2090206949498
    3134564353537/4481467310338 2277821191437/14882151754819"""


def from_low_storage(a: list[Fraction], b: list[Fraction]) -> tuple[list[list[Fraction]], list[Fraction]]:
    """Unroll d = A d + h f(u), u = u + B d into the rows and weights of a tableau."""
    increment, state, rows = [Fraction(0)] * len(a), [Fraction(0)] * len(a), []
    for stage in range(len(a)):
        rows.append(state)
        increment = [a[stage] * x for x in increment]
        increment[stage] += 1
        state = [x + b[stage] * d for x, d in zip(state, increment, strict=True)]
    return rows, state


def test_carpenter_and_kennedys_rationals_hold_to_1e24_and_not_exactly() -> None:
    a, b = ([Fraction(x) for x in text.split()] for text in (LOW_STORAGE_A, LOW_STORAGE_B))
    matrix, weights = from_low_storage(a, b)
    printed = prove(Tableau("printed", order=4, matrix=matrix, weights=weights))
    assert (printed.outcome, printed.order) == ("fails", 0)
    assert all(abs(failure.residual) < 1e-24 for failure in printed.failures if failure.part == "weights")
    trusted = prove(Tableau("trusted", order=4, matrix=matrix, weights=weights, digits=24))
    assert (trusted.outcome, trusted.order) == ("rounded", 4)


def test_the_shipped_form_of_carpenter_and_kennedys_method_has_the_same_coefficients() -> None:
    t = shipped(4, "carpenter-kennedy-4")
    a, b = ([Fraction(x) for x in text.split()] for text in (LOW_STORAGE_A, LOW_STORAGE_B))
    matrix, weights = from_low_storage(a, b)
    for ours, row in zip([*t.matrix, t.weights], [*matrix, weights], strict=True):
        assert all(abs(x - y) < Fraction(1, 10**23) for x, y in zip(ours, row, strict=True))
    assert prove(t).outcome == "rounded"


def test_berland_bogey_and_baillys_twelve_decimals_hold_to_their_digits() -> None:
    """Order 4 holds to 6.5e-13 only, which is also what float64 can have of it."""
    verdict = prove(shipped(4, "berland-bogey-bailly-4"))
    assert (verdict.outcome, verdict.order) == ("rounded", 4)
    assert verdict.working_floor == pytest.approx(6.5e-13, rel=0.05)
