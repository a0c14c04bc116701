"""The misprint finder: which change it finds, how it ranks several, and what it says where there is none."""

from __future__ import annotations

from fractions import Fraction
from typing import Any

import pytest

from newel.errors import BadTableau
from newel.methods.exact import Exact
from newel.methods.misprint_bench import Bench, Place, changed
from newel.methods.misprint_rows import row_from_conditions
from newel.methods.misprints import Search, find_repairs, repaired
from newel.methods.order_conditions import prove
from newel.methods.repair_file import repaired_text, write_repair
from newel.methods.repairs import Change, Repair
from newel.methods.spelling import decimal_text, nearest_spelling, text_distance
from newel.methods.tableau import Tableau
from newel.methods.tableau_file import format_tableau, load_tableau, write_tableau

pytestmark = pytest.mark.core


def kutta(**different: Any) -> Tableau:
    """Kutta's classical method, with other arrays where a test wants them."""
    arrays: dict[str, Any] = {
        "nodes": ["0", "1/2", "1/2", "1"],
        "matrix": [[], ["1/2"], ["0", "1/2"], ["0", "0", "1"]],
        "weights": ["1/6", "1/3", "1/3", "1/6"],
        **different,
    }
    return Tableau("kutta", order=4, **arrays)


def told(search: Search) -> list[tuple[str, str, str, int]]:
    return [(each.where, each.printed, each.value, each.distance) for each in search.repairs]


@pytest.mark.parametrize(
    ("different", "expected"),
    [
        ({"weights": ["1/6", "1/3", "1/6", "1/6"]}, ("weights[3]", "1/6", "1/3", 1)),
        ({"weights": ["1/6", "-1/3", "1/3", "1/6"]}, ("weights[2]", "-1/3", "1/3", 1)),
        ({"weights": ["6", "1/3", "1/3", "1/6"]}, ("weights[1]", "6", "1/6", 1)),
        ({"matrix": [[], ["1/2"], ["0", "1/3"], ["0", "0", "1"]]}, ("matrix[3][2]", "1/3", "1/2", 1)),
        ({"matrix": [[], ["1/2"], ["1/7", "1/2"], ["0", "0", "1"]]}, ("matrix[3][1]", "1/7", "0", 3)),
        ({"nodes": ["0", "1/2", "1/3", "1"]}, ("nodes[3]", "1/3", "1/2", 1)),
        ({"nodes": ["1", "1/2", "1/2", "1"]}, ("nodes[1]", "1", "0", 1)),
    ],
)
def test_a_single_slip_is_found_where_it_is_and_put_right_exactly(
    different: dict[str, Any], expected: tuple[str, str, str, int]
) -> None:
    assert told(find_repairs(kutta(**different))) == [expected]


def test_a_repair_is_carried_out_and_proves() -> None:
    wrong = kutta(weights=["1/6", "1/3", "1/6", "1/6"])
    assert not prove(wrong)
    (repair,) = find_repairs(wrong).repairs
    assert prove(repaired(wrong, repair)).outcome == "exact"
    assert repaired(wrong, repair).weights == kutta().weights
    assert repair.text == "weights[3] is 1/6, and 1/3 makes every condition hold"


def test_a_repair_of_another_tableau_is_refused() -> None:
    (repair,) = find_repairs(kutta(weights=["1/6", "1/3", "1/6", "1/6"])).repairs
    with pytest.raises(BadTableau, match=r"weights\[3\].*1/3 stands there, not 1/6"):
        repaired(kutta(), repair)


def test_repairs_are_ranked_by_the_text_and_not_by_the_size_of_the_change() -> None:
    """At order 1 every entry of the row, and the node, can make good what it lacks."""
    method = Tableau(
        "first",
        order=1,
        matrix=[[], ["1/2"], ["10", "-1/2"]],
        nodes=["0", "1/2", "1/2"],
        weights=["0", "0", "1"],
    )
    found = find_repairs(method).repairs
    assert [each.where for each in found] == ["matrix[3][1]", "nodes[3]", "matrix[3][2]"]
    assert [each.distance for each in found] == sorted(each.distance for each in found)
    sizes = [abs(Exact.of(each.value) - Exact.of(each.printed)) for each in found]
    assert sizes == [9, 9, 9]
    signs = Tableau("second", order=1, matrix=[[], ["9"]], nodes=["0", "-9"], weights=["1", "0"])
    assert [(each.where, each.value, each.distance) for each in find_repairs(signs).repairs] == [
        ("nodes[2]", "9", 1),
        ("matrix[2][1]", "-9", 1),
    ]


def test_equally_near_repairs_are_all_listed() -> None:
    wrong = Tableau("sum", order=1, matrix=[[], ["1/2"], ["0", "1/2"]], weights=["1/3", "1/3", "1/4"])
    found = find_repairs(wrong).repairs
    assert {each.where for each in found} == {"weights[1]", "weights[2]", "weights[3]"}


def test_a_sign_slip_in_a_root_is_put_right_inside_the_field() -> None:
    r = "sqrt(2)"
    wrong = Tableau(
        "gill",
        order=4,
        nodes=["0", "1/2", "1/2", "1"],
        matrix=[[], ["1/2"], [f"({r}+1)/2", f"(2-{r})/2"], ["0", f"-{r}/2", f"(2+{r})/2"]],
        weights=["1/6", f"(2-{r})/6", f"(2+{r})/6", "1/6"],
    )
    assert told(find_repairs(wrong)) == [("matrix[3][1]", f"({r}+1)/2", f"({r}-1)/2", 1)]


def nystrom(**different: Any) -> Tableau:
    arrays: dict[str, Any] = {
        "matrix": [
            [],
            ["1/3"],
            ["4/25", "6/25"],
            ["1/4", "-3", "15/4"],
            ["2/27", "10/9", "-50/81", "8/81"],
            ["2/25", "12/25", "2/15", "8/75", "0"],
        ],
        "weights": ["23/192", "0", "125/192", "0", "-27/64", "125/192"],
        **different,
    }
    return Tableau("six-stages", order=5, **arrays)


@pytest.mark.parametrize(("i", "j"), [(1, 0), (2, 1), (3, 0), (4, 2), (5, 3)])
def test_without_printed_nodes_the_value_is_a_common_root_of_the_conditions(i: int, j: int) -> None:
    right = nystrom()
    place = Place("matrix", i, j)
    text = str((right.matrix[i][j] + Fraction(1, 81)).canonical)
    wrong = changed(right, {place: text}, nodes_printed=False)
    assert not Bench(wrong).nodes_printed
    found = find_repairs(wrong).repairs
    assert [each.where for each in found] == [str(place)]
    assert Exact.of(found[0].value) == right.matrix[i][j]
    mended = repaired(wrong, found[0])
    assert mended.nodes == right.nodes
    assert prove(mended)


def test_without_printed_nodes_it_says_what_it_does_not_try() -> None:
    matrix = [list(map(str, row[:i])) for i, row in enumerate(nystrom().matrix)]
    matrix[3], matrix[4] = ["1/4", "-2", "15/4"], ["3/27", "10/9", "-50/81", "8/81"]
    search = find_repairs(nystrom(matrix=matrix))
    assert search.repairs == ()
    assert "no change of a single coefficient" in search.undecided[0]
    assert "without printed nodes only changes of one coefficient" in search.undecided[1]


NODES = ["0", "1/3", "2/5", "1", "2/3", "4/5"]


def test_two_changed_entries_of_one_row_are_found_where_the_node_disagrees() -> None:
    matrix = [list(map(str, row[:i])) for i, row in enumerate(nystrom().matrix)]
    matrix[4] = ["2/27", "10/7", "-50/18", "8/81"]
    search = find_repairs(nystrom(matrix=matrix, nodes=NODES))
    assert told(search)[0] == ("matrix[5][2], matrix[5][3]", "10/7, -50/18", "10/9, -50/81", 2)
    assert search.undecided[0].startswith("no change of a single coefficient")


def test_two_entries_in_each_others_place_keep_the_row_sum_and_are_found_all_the_same() -> None:
    matrix = [list(map(str, row[:i])) for i, row in enumerate(nystrom().matrix)]
    matrix[2] = ["6/25", "4/25"]
    search = find_repairs(nystrom(matrix=matrix, nodes=NODES))
    assert [each.where for each in search.repairs] == ["matrix[3][1], matrix[3][2]"]
    assert [each.value for each in search.repairs] == ["4/25, 6/25"]


def test_two_rows_that_are_mixed_up_are_found() -> None:
    """Rows 2 and 3 of a method whose third stage uses the first alone."""
    nodes, weights = ["0", "1/3", "2/3"], ["1/4", "0", "3/4"]
    right = Tableau("right", order=2, nodes=nodes, matrix=[[], ["1/3"], ["2/3", "0"]], weights=weights)
    mixed = Tableau("mixed", order=2, nodes=nodes, matrix=[[], ["2/3"], ["1/3", "0"]], weights=weights)
    assert prove(right)
    found = find_repairs(mixed).repairs
    (repair,) = [each for each in found if each.text.startswith("rows 2 and 3 are mixed up; ")]
    assert repaired(mixed, repair).matrix == right.matrix


def test_two_nodes_that_are_mixed_up_are_found() -> None:
    search = find_repairs(nystrom(nodes=["0", "2/5", "1/3", "1", "2/3", "4/5"]))
    assert told(search)[0][:3] == ("nodes[2], nodes[3]", "2/5, 1/3", "1/3, 2/5")


def test_wrong_entries_in_two_rows_are_found_together() -> None:
    matrix = [list(map(str, row[:i])) for i, row in enumerate(nystrom().matrix)]
    matrix[3], matrix[5] = ["1/4", "-3", "15/7"], ["2/52", "12/25", "2/15", "8/75", "0"]
    search = find_repairs(nystrom(matrix=matrix, nodes=NODES))
    assert told(search)[0] == ("matrix[4][3], matrix[6][1]", "15/7, 2/52", "15/4, 2/25", 2)


def test_a_whole_row_follows_from_the_conditions_that_are_linear_in_it() -> None:
    matrix = [list(map(str, row[:i])) for i, row in enumerate(nystrom().matrix)]
    matrix[5] = ["0", "0", "0", "0", "4/5"]
    bench = Bench(nystrom(matrix=matrix, nodes=NODES))
    assert row_from_conditions(bench, 5) == list(nystrom().matrix[5][:5])


def test_slips_in_the_matrix_and_in_the_embedded_weights_are_mended_in_turn() -> None:
    pair: dict[str, Any] = {
        "nodes": ["0", "1/2", "3/4", "1"],
        "matrix": [[], ["1/2"], ["0", "3/4"], ["2/9", "1/3", "4/9"]],
        "weights": ["2/9", "1/3", "4/9", "0"],
        "embedded_weights": ["7/24", "1/4", "1/3", "1/8"],
        "embedded_order": 2,
    }
    assert prove(Tableau("pair", order=3, **pair))
    pair["matrix"][2] = ["0", "4/3"]
    pair["embedded_weights"] = ["7/42", "1/4", "1/3", "1/8"]
    search = find_repairs(Tableau("pair", order=3, **pair))
    assert [each.changes for each in search.repairs] == [
        (Change("matrix[3][2]", "4/3", "3/4"), Change("embedded[1]", "7/42", "7/24"))
    ]


def test_where_a_claim_is_too_high_no_repair_is_invented() -> None:
    """Two stages never have order 3 (J. C. Butcher 1964)."""
    search = find_repairs(
        Tableau("two", order=3, nodes=[0, "2/3"], matrix=[[], ["2/3"]], weights=["1/4", "3/4"])
    )
    assert search.repairs == ()
    assert search.undecided[0].startswith("no change of a single coefficient makes every condition")


def test_a_decimal_is_repaired_to_the_digits_that_the_conditions_determine() -> None:
    ralston: dict[str, Any] = {
        "nodes": ["0", "0.4", "0.45573725421878943", "1"],
        "matrix": [
            [],
            ["0.4"],
            ["0.29697760924775360", "0.15875964497103583"],
            ["0.21810038822592047", "-3.05096514869293080", "3.83286476046701030"],
        ],
        "weights": [
            "0.17476028226269037",
            "-0.55148066287873294",
            "1.20553559939652350",
            "0.17118478121951903",
        ],
        "digits": 16,
    }
    assert prove(Tableau("ralston", order=4, **ralston)).outcome == "rounded"
    slip = {**ralston, "matrix": [*ralston["matrix"][:3], ["0.21810038822592047", "-3.0509", "3.8"]]}
    slip["matrix"][3] = ["0.21810038822592047", "-3.05096514869293080", "3.38286476046701030"]
    (repair,) = find_repairs(Tableau("ralston", order=4, **slip)).repairs
    assert (repair.where, repair.value) == ("matrix[4][3]", "3.83286476046701030")
    assert "(determined to 15 digits)" in repair.text
    other = {**ralston, "weights": ["1/7", *ralston["weights"][1:]]}
    (repair,) = find_repairs(Tableau("ralston", order=4, **other)).repairs
    assert float(repair.value) == pytest.approx(0.17476028226269037, abs=1e-15)


@pytest.mark.parametrize(
    ("printed", "repaired_to", "slips"),
    [
        ("1/6", "-1/6", 1),
        ("−1/6", "1/6", 1),
        ("3/2", "2/3", 1),
        ("-3/2", "-2/3", 1),
        ("5", "1/5", 1),
        ("11/45", "11/54", 1),
        ("0.123", "0.132", 1),
        ("1/6", "1/3", 1),
        ("1/6", "1/16", 1),
        ("1/6", "1/6", 0),
        ("1 / 6", "1/6", 0),
        ("12/34", "5/6", 4),
    ],
)
def test_the_distance_counts_slips(printed: str, repaired_to: str, slips: int) -> None:
    assert text_distance(printed, repaired_to) == slips


def test_a_value_is_spelled_as_the_page_would() -> None:
    assert nearest_spelling("4060/10", Exact.of(405), Fraction(0), None) == "4050/10"
    assert nearest_spelling("1/2", Exact.of(1), Fraction(0), None) == "1"
    assert nearest_spelling("28/81", Exact.of("1/3"), Fraction(0), None) == "27/81"
    assert nearest_spelling("7/9", Exact.of(0), Fraction(0), None) == "0"
    assert nearest_spelling("0.76", Exact.of("0.3333333"), Fraction(1, 10**6), 5) in ("1/3", "0.33333")
    assert decimal_text(Exact.of("-2/3"), 4) == "-0.6667"
    assert decimal_text(Exact.of(1234), 2) == "1234.0"


FILE = """# as printed on page 7
schema = "newel-tableau/1"
slug = "kutta"
name = "Kutta"   # ["no", "array"]
source = "a page"
numbers = "published"
order = 4
nodes = ["0", "1/2", "1/2", "1"]
matrix = [
  [],          # "none"
  ["1/2"],
  ["0",
   '1/3'],     # blurred [
  [0, 0, 1],
]
weights = ["1/6", "1/3", "1/3", "1/6"]
"""


def test_a_repair_changes_one_text_in_the_file_and_keeps_the_comments(tmp_path: Any) -> None:
    path = tmp_path / "kutta.toml"
    path.write_text(FILE, encoding="utf-8")
    (repair,) = find_repairs(load_tableau(path)).repairs
    write_repair(path, repair)
    assert path.read_text(encoding="utf-8") == FILE.replace("'1/3'", '"1/2"')
    assert prove(load_tableau(path))
    assert [file.name for file in tmp_path.iterdir()] == ["kutta.toml"]


def test_a_repair_of_an_unquoted_integer_and_of_other_tables_is_placed(tmp_path: Any) -> None:
    text = FILE + '\n[embedded]\norder = 1\nweights = ["1", "0", "0", "1"]\n'
    slip = Repair(
        changes=(Change("embedded[4]", "1", "0"), Change("matrix[4][3]", "1", "2")), distance=2, text=""
    )
    assert repaired_text(text, slip) == text.replace('"0", "1"]\n', '"0", "0"]\n', 2).replace(
        'nodes = ["0", "1/2", "1/2", "0"]', 'nodes = ["0", "1/2", "1/2", "1"]'
    ).replace("[0, 0, 1]", '[0, 0, "2"]')
    with pytest.raises(BadTableau, match=r"weights\[9\]"):
        repaired_text(text, Repair(changes=(Change("weights[9]", "1", "0"),), distance=1, text=""))


def test_a_file_that_says_something_else_is_left_alone(tmp_path: Any) -> None:
    path = tmp_path / "kutta.toml"
    write_tableau(kutta(), path)
    repair = Repair(changes=(Change("weights[3]", "1/6", "1/3"),), distance=1, text="")
    with pytest.raises(BadTableau, match="1/3 stands there, not 1/6"):
        write_repair(path, repair)
    assert path.read_text(encoding="utf-8") == format_tableau(kutta())
