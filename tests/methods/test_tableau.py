"""The tableau: its form is checked, its numbers are exact, its float views are correctly rounded."""

from __future__ import annotations

import copy
import pickle
from fractions import Fraction
from typing import Any

import attrs
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from newel.errors import BadTableau
from newel.methods.digits import Digits, decimal_exponent
from newel.methods.exact import Exact
from newel.methods.tableau import ARRAYS, Notes, Tableau

pytestmark = pytest.mark.core

# Bogacki and Shampine, Appl. Math. Lett. 2 (1989) 321-325; from memory.
BS32: dict[str, Any] = {
    "name": "Bogacki–Shampine 3(2)",
    "order": 3,
    "matrix": [[], ["1/2"], ["0", "3/4"], ["2/9", "1/3", "4/9"]],
    "weights": ["2/9", "1/3", "4/9", "0"],
    "embedded_weights": ["7/24", "1/4", "1/3", "1/8"],
    "embedded_order": 2,
    "authors": ["P. Bogacki", "L. F. Shampine"],
    "year": 1989,
    "numbers": "from memory",
}


def bs32(**changes: Any) -> Tableau:
    return Tableau("bogacki-shampine-3-2", **(BS32 | changes))


def small(**changes: Any) -> Tableau:
    return Tableau("small-1", **({"order": 1, "matrix": [[], ["1/2"]], "weights": ["1/4", "3/4"]} | changes))


def named(value: Any) -> str | None:
    """The name of a test's case: the keys that it changes."""
    return "+".join(value) if isinstance(value, dict) else None


def test_rows_left_of_the_diagonal_and_full_rows_make_the_same_tableau() -> None:
    full = [["0"] * 4, ["1/2", 0, 0, 0], ["0", "3/4", 0, "0"], ["2/9", "1/3", "4/9", 0]]
    assert bs32(matrix=full) == bs32()
    assert bs32(matrix=np.array(full, dtype=object)).digest == bs32().digest
    assert all(len(row) == 4 for row in bs32().matrix)


@pytest.mark.parametrize("value", [1, "1", Fraction(1), Exact.of(1), np.int64(1), np.float64(1.0), 1.0])
def test_every_kind_of_number_is_taken_and_is_the_same(value: Any) -> None:
    t = Tableau("euler-1", order=1, matrix=[[]], weights=[value], digits={"weights": "exact"})
    assert t.weights == (Exact.of(1),)
    assert t.digest == Tableau("euler-1", order=1, matrix=[[]], weights=[1]).digest


@pytest.mark.parametrize("value", [True, np.bool_(True), None, 1j, [1], object(), "x", float("nan")])
def test_what_is_no_number_is_refused_by_its_place(value: Any) -> None:
    with pytest.raises(BadTableau) as caught:
        small(weights=["1/4", value])
    assert caught.value.key == "weights[2]"


def test_float_views_are_correctly_rounded_and_read_only() -> None:
    t = bs32()
    np.testing.assert_array_equal(t.A[3], [2 / 9, 1 / 3, 4 / 9, 0.0])
    np.testing.assert_array_equal(t.b, [2 / 9, 1 / 3, 4 / 9, 0.0])
    np.testing.assert_array_equal(t.c, [0.0, 0.5, 0.75, 1.0])
    assert t.b_embedded is not None
    np.testing.assert_array_equal(t.b_embedded, [7 / 24, 0.25, 1 / 3, 0.125])
    for array in (t.A, t.b, t.c, t.b_embedded):
        assert array.dtype == np.float64
        assert not array.flags.writeable
    assert t.A is t.A
    assert small().b_embedded is None


def test_nodes_come_from_the_exact_row_sums_and_not_from_floats() -> None:
    t = small(matrix=[[], ["1/10"], ["1/10", "2/10"]], weights=["1/4", "1/4", "1/2"])
    assert t.nodes[2] == Fraction(3, 10)
    assert t.c[2] == 0.3 != 0.1 + 0.2


def test_the_digest_is_over_the_numbers_alone() -> None:
    same = bs32(
        name="another", notes=Notes(remarks=["better"]), order=2, digits=12, source="elsewhere", year=None
    )
    printed = bs32(weights=["4/18", "0 + 1/3", "4/9", "0"])
    assert same.digest == bs32().digest == printed.digest
    assert len(bs32().digest) == 64


@pytest.mark.parametrize(
    "changes",
    [
        {"weights": ["2/9", "1/3", "4/9", "1/1000000"]},
        {"nodes": ["0", "1/2", "3/4", "999/1000"]},
        {"matrix": [[], ["1/2"], ["1/100", "3/4"], ["2/9", "1/3", "4/9"]]},
        {"matrix": [[], ["1/2"], ["0", "3/4"], ["2/9", "4/9", "1/3"]]},
        {"embedded_weights": ["7/24", "1/4", "1/3", "0"]},
        {"embedded_weights": None, "embedded_order": None},
        {"continuous_weights": [["1"], ["0"], ["0"], ["0"]], "continuous_order": 1},
    ],
    ids=named,
)
def test_every_number_takes_part_in_the_digest_and_in_equality(changes: dict[str, Any]) -> None:
    assert bs32(**changes).digest != bs32().digest
    assert bs32(**changes) != bs32()


def test_origin_and_proof_take_no_part_in_equality() -> None:
    proved = bs32(origin="a.toml").with_proof(None)
    assert proved == bs32()
    assert hash(proved) == hash(bs32())
    assert proved.origin == "a.toml"


def test_a_proof_is_added_to_a_copy_and_shown() -> None:
    @attrs.frozen
    class Outcome:
        outcome: str = "exact"

    t = bs32()
    proved = t.with_proof(Outcome())  # type: ignore[arg-type]  # a stand-in for the verdict
    assert t.proof is None
    assert "not proved yet" in str(t)
    assert "proof: exact" in str(proved)


def test_a_tableau_cannot_be_changed() -> None:
    with pytest.raises(attrs.exceptions.FrozenInstanceError):
        bs32().order = 4  # type: ignore[misc]  # the point of the test


def test_a_pickled_tableau_is_equal_and_still_read_only() -> None:
    t = bs32(digits={"nodes": 12})
    assert t.A is not None
    again = pickle.loads(pickle.dumps(t))
    assert again == t == copy.deepcopy(t)
    assert not again.A.flags.writeable
    assert again.digest == t.digest
    assert again.digits == t.digits


def test_first_same_as_last_needs_the_last_row_to_be_the_weights_at_node_one() -> None:
    assert bs32().first_same_as_last
    assert not bs32(
        weights=["7/24", "1/4", "1/3", "1/8"], embedded_weights=BS32["weights"]
    ).first_same_as_last
    assert not bs32(nodes=["0", "1/2", "3/4", "1/2"]).first_same_as_last
    assert not Tableau("euler-1", order=1, matrix=[[]], weights=[1]).first_same_as_last


@pytest.mark.parametrize(
    ("changes", "key", "words"),
    [
        ({"matrix": [[0, 0], ["1/4", "1/4"]]}, "matrix[2][2]", "on the diagonal: this tableau is implicit"),
        ({"matrix": [[0, "1/4"], [0, 0]]}, "matrix[1][2]", "above the diagonal: this tableau is implicit"),
        ({"matrix": [[], []]}, "matrix[2]", "0 entries; write the 1 left of the diagonal, or all 2"),
        ({"matrix": [["1/2"]]}, "matrix", "1 row, but 2 weights"),
        ({"matrix": ["00", "00"]}, "matrix[1]", "no list of numbers"),
        ({"matrix": 1}, "matrix", "no list of rows"),
        ({"nodes": [0, 1, 2]}, "nodes", "3 entries; 2 are needed"),
        ({"order": 0}, "order", "from 1 to 16"),
        ({"order": 17}, "order", "from 1 to 16"),
        ({"order": True}, "order", "from 1 to 16"),
        ({"order": 10**5000}, "order", "thousands of digits"),
        ({"embedded_order": 1}, "embedded.weights", "missing"),
        ({"embedded_weights": [1, 0]}, "embedded.order", "missing"),
        ({"embedded_weights": ["1/4", "3/4"], "embedded_order": 1}, "embedded.weights", "always zero"),
        ({"continuous_order": 1}, "continuous.weights", "missing"),
        ({"continuous_weights": [[1], [0]]}, "continuous.order", "missing"),
        ({"weights": [10**5000, 1]}, "weights[1]", "bits"),
        ({"weights": [Fraction(1, 10**2000), 1]}, "weights[1]", "bits"),
        ({"name": ""}, "name", "one line"),
        ({"source": b"x"}, "source", "no text"),
        ({"source": "\ud800"}, "source", "surrogate"),
        ({"authors": "me"}, "authors", "no list of texts"),
        ({"year": 1989.0}, "year", "no year"),
        ({"numbers": "made up"}, "numbers", "published, derived, from memory"),
        ({"notes": {"strengths": []}}, "notes", "Notes"),
        ({"digits": True}, "digits", "number of digits"),
        ({"digits": {3: 4}}, "digits", "unknown key 3"),
        ({"digits": {"weights[3]": 4}}, "digits['weights[3]']", "no entry"),
        ({"digits": {"weights[1][1]": 4}}, "digits['weights[1][1]']", "no entry"),
        ({"digits": {"weights[0]": 4}}, "digits['weights[0]']", "from 1"),
    ],
    ids=named,
)
def test_a_broken_rule_names_the_key_and_what_is_allowed(
    changes: dict[str, Any], key: str, words: str
) -> None:
    with pytest.raises(BadTableau) as caught:
        small(**changes)
    assert caught.value.key == key
    assert words in str(caught.value)
    assert len(str(caught.value)) < 300


@pytest.mark.parametrize("slug", ["RK4", "a_b", "-a", "a-", "a--b", "", "ä", "a" * 81, None, "a\n"])
def test_a_slug_is_lower_case_words_joined_by_hyphens(slug: Any) -> None:
    with pytest.raises(BadTableau, match="no slug"):
        Tableau(slug, order=1, matrix=[[]], weights=[1])


def test_the_largest_tableau_is_made_and_the_next_is_refused() -> None:
    assert (
        Tableau("large", order=1, matrix=[[]] + [[0] * i for i in range(1, 512)], weights=[0] * 512).stages
        == 512
    )
    with pytest.raises(BadTableau, match="513 weights"):
        Tableau("large", order=1, matrix=[], weights=[0] * 513)


class TestDigits:
    """What digits mean: half a unit in the last trusted significant digit."""

    def test_without_digits_every_number_is_exact(self) -> None:
        t = bs32()
        assert t.is_exact
        assert all(unit == 0 for unit in t.half_units("weights"))

    @pytest.mark.parametrize("value", ["0.5", 0.5, "5e-1"])
    def test_a_decimal_without_digits_is_refused_with_the_way_out(self, value: Any) -> None:
        with pytest.raises(BadTableau, match=r"digits = \{ matrix = 16 \}") as caught:
            small(matrix=[[], [value]])
        assert caught.value.key == "matrix[2][1]"

    def test_half_a_unit_in_the_last_significant_digit(self) -> None:
        t = small(matrix=[[], ["0.01234"]], weights=["-12.34", "99.999"], digits=4)
        assert t.half_units("matrix")[1][0] == Fraction(5, 10**6)
        assert t.half_units("weights") == (Fraction(5, 10**3), Fraction(5, 10**3))
        assert not t.is_exact

    def test_integers_surds_and_short_fractions_stay_exact_and_long_fractions_do_not(self) -> None:
        values = ["1", "sqrt(2)", "1/999999", "1/1000000", "0.000", "0.25"]
        matrix = [[0] * i for i in range(6)]
        t = Tableau("a", order=1, matrix=matrix, weights=values, digits=10)
        assert [unit > 0 for unit in t.half_units("weights")] == [False, False, False, True, False, True]
        assert t.half_units("weights")[3] == Fraction(5, 10**16)

    def test_an_entry_goes_before_its_array(self) -> None:
        t = small(
            matrix=[[], ["0.5"]],
            weights=["0.25", "0.75"],
            digits={"weights": 16, "weights[2]": "exact", "matrix[2][1]": 3},
        )
        assert t.half_units("weights") == (Fraction(5, 10**17), 0)
        assert t.half_units("matrix")[1] == (Fraction(5, 10**4), 0)

    def test_an_array_of_exact_decimals_is_exact(self) -> None:
        t = small(weights=["0.25", "0.75"], digits={"weights": "exact"})
        assert t.is_exact
        assert t.digits is not None

    def test_nodes_that_are_row_sums_are_trusted_as_far_as_their_row(self) -> None:
        t = small(
            matrix=[[], ["0.3333333333"], ["0.1", "0.2333333333"]],
            weights=["1/4", "1/2", "1/4"],
            digits={"matrix": 10, "matrix[3][1]": 4, "matrix[3][2]": 6},
        )
        assert {k: v for k, v in (t.digits or {}).items() if "nodes" in k} == {"nodes": 10, "nodes[3]": 4}
        assert t.half_units("nodes") == (0, Fraction(5, 10**11), Fraction(5, 10**5))

    def test_the_mapping_is_immutable_ordered_and_equal_to_a_plain_one(self) -> None:
        given_order = {"weights[2]": 3, "weights[10]": 3, "matrix": "exact", "weights": 5}
        digits = Digits.of(given_order)
        assert list(digits) == ["matrix", "weights", "weights[2]", "weights[10]"]
        assert digits == given_order
        assert hash(digits) == hash(Digits.of(dict(reversed(given_order.items()))))
        assert digits["weights"] == 5
        with pytest.raises(KeyError):
            digits["nodes"]

    def test_an_unknown_array_is_refused_by_half_units(self) -> None:
        with pytest.raises(BadTableau, match="no array 'A'"):
            bs32().half_units("A")

    def test_half_units_have_the_shape_of_their_array(self) -> None:
        t = bs32(continuous_weights=[["0.5", "1"]] * 4, continuous_order=1, digits=3)
        shapes = {name: np.array(t.half_units(name), dtype=object).shape for name in ARRAYS}
        assert shapes == {
            "nodes": (4,),
            "matrix": (4, 4),
            "weights": (4,),
            "embedded": (4,),
            "continuous": (4, 2),
        }
        assert small().half_units("embedded") == ()


@settings(deadline=None, derandomize=True)
@given(st.fractions().filter(bool), st.integers(-400, 400), st.sampled_from([1, 2, 10**12 - 1]))
def test_the_decimal_exponent_is_exact_for_all_sizes_and_surds(
    x: Fraction, scale: int, radicand: int
) -> None:
    value = Exact(0, x * Fraction(10) ** scale, radicand)
    e = decimal_exponent(value)
    assert Fraction(10) ** e <= abs(value) < Fraction(10) ** (e + 1)


@pytest.mark.parametrize("e", [-300, -1, 0, 1, 15, 300])
def test_the_decimal_exponent_of_a_power_of_ten_and_just_below(e: int) -> None:
    power = Fraction(10) ** e
    assert decimal_exponent(Exact(power)) == e
    assert decimal_exponent(Exact(power - power / 10**40)) == e - 1


def test_a_tableau_shows_itself_in_one_line_three_lines_and_a_table() -> None:
    t = bs32()
    assert repr(t) == "<Tableau bogacki-shampine-3-2: order 3(2), 4 stages>"
    assert str(t).split("\n") == [
        "Bogacki–Shampine 3(2) (bogacki-shampine-3-2)",
        "  order 3(2), 4 stages, first same as last; not proved yet",
        "  exact numbers, from memory; P. Bogacki, L. F. Shampine 1989",
    ]
    html = t._repr_html_()
    assert html.startswith("<table>")
    assert html.count("<tr>") == 6
    assert "<tr><th>3/4</th><td>0</td><td>3/4</td></tr>" in html


def test_no_text_of_a_tableau_breaks_its_three_lines_or_its_table() -> None:
    t = small(name="<b>&", authors=["two\nlines"], numbers="derived: with\na break")
    assert len(str(t).split("\n")) == 3
    assert "<b>" not in t._repr_html_()
