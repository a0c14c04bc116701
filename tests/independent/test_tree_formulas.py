"""The second opinion is itself held to published counts, identities and error norms.

Counts: OEIS A000081 (from memory). Error norms: J. R. Dormand and P. J. Prince, J. Comput. Appl. Math. 6
(1980) 19-26, and A. Ralston, Math. Comp. 16 (1962) 431-437, for the values 3.99e-4 and 1/6 (from memory); the
further digits and the other norms were computed by other code. Shanks: E. B. Shanks, Math. Comp. 20 (1966)
21-38 (from memory): five stages that miss order 5 by 1.5e-6.
"""

from __future__ import annotations

from fractions import Fraction
from pathlib import Path

import mpmath
import pytest

from tests.independent.tree_formulas import (
    density,
    error_norm,
    evaluate,
    from_document,
    load,
    main,
    orders,
    rooted_trees,
    size,
    symmetry,
)

TABLEAUX = Path(__file__).parents[2] / "tableaux"

SHANKS = {
    "order": 4,
    "matrix": [
        [],
        ["1/9000"],
        ["-4047/10", "4050/10"],
        ["20241/8", "-20250/8", "15/8"],
        ["-931041/81", "931500/81", "-490/81", "112/81"],
    ],
    "weights": ["105/1134", "0", "500/1134", "448/1134", "81/1134"],
}

DORMAND_PRINCE = {
    "order": 5,
    "matrix": [
        [],
        ["1/5"],
        ["3/40", "9/40"],
        ["44/45", "-56/15", "32/9"],
        ["19372/6561", "-25360/2187", "64448/6561", "-212/729"],
        ["9017/3168", "-355/33", "46732/5247", "49/176", "-5103/18656"],
    ],
    "weights": ["35/384", "0", "500/1113", "125/192", "-2187/6784", "11/84"],
}


def test_the_trees_are_as_many_as_cayley_counted_and_all_differ() -> None:
    assert [len(set(rooted_trees(nodes))) for nodes in range(1, 11)] == [1, 1, 2, 4, 9, 20, 48, 115, 286, 719]
    assert all(size(tree) == nodes for nodes in range(1, 9) for tree in rooted_trees(nodes))


@pytest.mark.parametrize("nodes", range(1, 9))
def test_symmetries_and_densities_add_up_to_one_over_the_order(nodes: int) -> None:
    total = sum(Fraction(1, symmetry(tree) * density(tree)) for tree in rooted_trees(nodes))
    assert total == Fraction(1, nodes)


@pytest.mark.parametrize(
    ("text", "value"),
    [
        ("35/384", 35 / 384),
        ("-0.25", -0.25),
        ("(5 - sqrt(5))/10", 0.276393202250021),
        ("-2^2/3", -4 / 3),
        (7, 7.0),
    ],
)
def test_number_texts_are_read_as_written(text: str | int, value: float) -> None:
    assert float(evaluate(text)) == pytest.approx(value, rel=1e-15)


@pytest.mark.parametrize("text", ["1/2)", "(1/2", "x"])
def test_a_text_that_is_no_number_is_refused(text: str) -> None:
    with pytest.raises((AssertionError, ValueError, IndexError)):
        evaluate(text)


@pytest.mark.parametrize(
    ("file", "norm"),
    [
        ("order-2/midpoint-2", 0.1717960677),
        ("order-2/ralston-2", 1 / 6),
        ("order-3/heun-3", 0.0462962963),
        ("order-3/williamson-3", 19 / 432),
        ("order-4/kutta-4", 0.01450458234),
        ("order-4/merson-4-3", 0.005705443307),
        ("order-4/fehlberg-4-5", 0.001839243418),
    ],
)
def test_principal_error_norms_agree_with_published_ones(file: str, norm: float) -> None:
    data = load(TABLEAUX / f"{file}.toml")
    assert float(error_norm(data, data["weights"], data["order"] + 1)) == pytest.approx(norm, rel=1e-9)


def test_the_best_known_pair_of_order_five_has_its_published_error_norm() -> None:
    data = from_document(DORMAND_PRINCE)
    assert float(error_norm(data, data["weights"], 6)) == pytest.approx(3.990801609e-4, rel=1e-9)


def test_a_near_miss_counts_as_order_five_only_under_a_loose_tolerance() -> None:
    data = from_document(SHANKS)
    assert orders(data).weights.order == 4
    assert orders(data, tolerance=1e-10).weights.order == 4
    assert orders(data, tolerance=1e-5).weights.order == 5
    assert float(orders(data).weights.residuals[5]) == pytest.approx(1.543e-6, rel=1e-3)


def test_one_changed_coefficient_is_seen_in_rows_weights_and_continuous_weights() -> None:
    changed = load(TABLEAUX / "order-3" / "bogacki-shampine-3-2.toml")
    changed["matrix"][2][1] += mpmath.mpf(10) ** -12
    changed["embedded"][0] += mpmath.mpf(10) ** -12
    changed["continuous"][0][1] += mpmath.mpf(10) ** -12
    report = orders(changed)
    assert report.embedded is not None
    assert report.continuous is not None
    assert float(report.row_sums) == pytest.approx(1e-12)
    assert (report.weights.order, report.embedded.order, report.continuous.order) == (1, 0, 0)


def test_the_command_prints_the_orders_and_fails_on_a_missed_claim(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    good = TABLEAUX / "order-4" / "kutta-4.toml"
    assert main([str(good)]) == 0
    assert "weights: order 4 as claimed" in capsys.readouterr().out
    bad = tmp_path / "bad.toml"
    bad.write_text(good.read_text(encoding="utf-8").replace("order = 4", "order = 5", 1), encoding="utf-8")
    assert main([str(bad)]) == 1
    assert "order 4 BUT CLAIMED 5" in capsys.readouterr().out
