"""Drafts: a skeleton that can be filled in, rows out of a document, and weights that were missing."""

import re
import tomllib

import pytest

import newel
from newel.errors import BadRequest, BadTableau, OutputExists
from newel.methods.drafting import draft
from newel.methods.order_conditions import prove
from newel.methods.pasted import read_pasted
from newel.methods.tableau_file import load_tableau

pytestmark = pytest.mark.core

LAYOUTS = {
    "bar": """
        0   │
        1/2 │ 1/2
        3/4 │ 0    3/4
        1   │ 2/9  1/3  4/9
        ────┼────────────────
            │ 2/9  1/3  4/9  0
            │ 7/24 1/4  1/3  1/8""",
    "plain bar, labels": """
        0 |
        1/2 | 1/2
        3/4 | 0 3/4
        1 | 2/9 1/3 4/9
        b | 2/9 1/3 4/9 0
        b* | 7/24 1/4 1/3 1/8""",
    "nodes in front": """
        0
        1/2 1/2
        3/4 0 3/4
        1 2/9 1/3 4/9
        2/9 1/3 4/9 0
        7/24 1/4 1/3 1/8""",
    "no nodes": """
        1/2
        0 3/4
        2/9 1/3 4/9
        2/9 1/3 4/9 0
        7/24 1/4 1/3 1/8""",
    "full rows": """
        0 0 0 0 0
        1/2 1/2 0 0 0
        3/4 0 3/4 0 0
        1 2/9 1/3 4/9 0
        2/9 1/3 4/9 0
        7/24 1/4 1/3 1/8""",
    "broken lines, odd spaces and slashes": """
        0
        \u00bd\u2003\u00bd
        3\u20444 0 3 / 4
        1 2/9
        1\u22153 4/9
        2/9 1/3 4/9
        0 7/24 1/4 1/3 1/8""",
    "LaTeX": r"""
        0 & & & & \\
        \frac{1}{2} & \frac{1}{2} \\
        \frac{3}{4} & 0 & \frac{3}{4} \\
        1 & \frac{2}{9} & \frac{1}{3} & \frac{4}{9} \\ \hline
        & \frac{2}{9} & \frac{1}{3} & \frac{4}{9} & 0 \\
        & \frac{7}{24} & \frac{1}{4} & \frac{1}{3} & \frac{1}{8}""",
}


@pytest.mark.parametrize("layout", LAYOUTS)
def test_rows_are_read_however_they_come_out_of_a_document(layout, tmp_path):
    """The pair of Bogacki and Shampine 1989, laid out in seven ways."""
    made = draft(tmp_path / "mine-3-2.toml", pasted=LAYOUTS[layout])
    published = newel.Registry(cache=None).load("bogacki-shampine-3-2")
    found = load_tableau(tmp_path / "mine-3-2.toml")
    assert found.matrix == published.matrix
    assert found.nodes == published.nodes
    assert (found.weights, found.embedded_weights) == (published.weights, published.embedded_weights)
    assert (found.order, found.embedded_order) == (3, 2)
    assert (made.passed_over, made.misfits) == ((), ())
    assert made.understood[0].startswith("4 stages, ")
    assert prove(found).outcome == "exact"


def printed(row):
    """A sum stands in parentheses, as nothing else would part it from its neighbours."""
    return " ".join(f"({x.canonical})" if " " in x.canonical else x.canonical for x in row)


def test_the_rows_of_catalogue_methods_are_read_back():
    """With nodes in front and without a bar, in the characters of a document; exact ones up to order 6."""
    registry = newel.Registry(cache=None)
    for slug in registry.names():
        method = registry.load(slug)
        if not method.is_exact or method.order > 6 or not 2 <= method.stages <= 9:
            continue
        heads = enumerate(zip(method.nodes, method.matrix, strict=True))
        rows = [printed((c, *row[:i])) for i, (c, row) in heads] + [printed(method.weights)]
        rows += [] if method.embedded_weights is None else [printed(method.embedded_weights)]
        text = "\n".join(rows).replace("-", "−").replace("sqrt", "√").replace("/", " ⁄ ")
        found = read_pasted(text)
        assert found.nodes == method.nodes, slug
        assert found.matrix == tuple(row[:i] for i, row in enumerate(method.matrix)), slug
        assert found.weights[0] == method.weights, slug
        assert (found.passed_over, found.misfits) == ((), ()), slug


def test_roots_and_spaced_signs_are_read():
    """Gill 1951, as it is printed."""
    rows = "0 |\n1/2 | 1/2\n1/2 | (√2 − 1)/2 (2 - √ 2) / 2\n1 | 0 − √2/2 1+√2/2\n"
    found = read_pasted(rows + " | 1/6 (2−√2)/6 (2+√2)/6 1/6")
    assert found.misfits == ()
    assert found.matrix[3][1].canonical == "-sqrt(2)/2"


RALSTON_1962 = """
0 |
.4 | .4
.45573725421878943 | .29697760924775360 .15875964497103583
1 | .21810038822592047 −3.05096514869293080 3.83286476046701030
 | .17476028226269037 − .55148066287873294 1.20553559939652350 .17118478121951903
"""


def test_long_decimals_are_trusted_as_printed_and_short_ones_are_exact(tmp_path):
    """A. Ralston, Math. Comp. 16 (1962) 431-437 (from memory): order 4, proved as rounded."""
    made = draft(tmp_path / "ralston.toml", pasted=RALSTON_1962)
    found = load_tableau(tmp_path / "ralston.toml")
    assert made.understood[-1] == "weights: order 4 is proved"
    assert dict(found.digits) == {"nodes": 17, "matrix": 17, "weights": 17}
    assert str(found.matrix[1][0]) == "2/5"
    assert prove(found).outcome == "rounded"


def test_last_digits_that_are_wrong_are_not_trusted(tmp_path):
    made = draft(
        tmp_path / "ralston.toml", pasted=RALSTON_1962.replace(".17118478121951903", ".17118478121951920")
    )
    assert made.understood[-2:] == (
        "weights: order 4 is proved",
        "long decimals: the last digit of each is not trusted",
    )
    assert load_tableau(tmp_path / "ralston.toml").digits["weights"] == 16


def test_a_misprint_is_reported_with_its_row(tmp_path):
    text = RALSTON_1962.replace("3.0509", "3.0599")
    made = draft(tmp_path / "ralston.toml", pasted=text, order=4)
    assert made.misfits[0].startswith("row 4 sums to 0.991")
    assert made.misfits[0].endswith("its node is 1")
    assert made.misfits[1] == "order 4 is claimed, order 1 is proved"


def test_lines_of_words_are_passed_over_and_told(tmp_path):
    made = draft(tmp_path / "mine-2.toml", pasted="Table 7. Midpoint\n0 |\n1/2 | 1/2\n | 0 1\nsee text")
    assert [line.split(" was")[0] for line in made.passed_over] == ["line 1", "line 5"]
    assert made.tableau.order == 2


@pytest.mark.parametrize("text", ["", "no numbers here", "1 2 3\n4 5", "0 |\n1/2 | 1/2\n"])
def test_what_is_no_tableau_is_refused_and_nothing_is_written(text, tmp_path):
    with pytest.raises(BadRequest, match="no tableau can be made out"):
        draft(tmp_path / "mine.toml", pasted=text)
    assert not list(tmp_path.iterdir())


def test_a_long_text_is_refused_at_once():
    with pytest.raises(BadRequest, match="200,001 characters"):
        read_pasted("1" * 200_001)


# ---------------------------------------------------------------- skeletons


def test_a_skeleton_is_toml_with_its_keys_explained_and_refused_until_filled_in(tmp_path):
    made = draft(tmp_path / "mine-5-4.toml", stages=7, order=5, embedded=4)
    data = tomllib.loads(made.text)
    assert (data["slug"], data["order"], data["embedded"]["order"]) == ("mine-5-4", 5, 4)
    assert [len(row) for row in data["matrix"]] == list(range(7))
    assert len(data["weights"]) == len(data["embedded"]["weights"]) == len(data["nodes"]) == 7
    assert made.text.count("#") >= 10
    with pytest.raises(BadTableau, match=r"\?"):
        load_tableau(tmp_path / "mine-5-4.toml")


def test_a_skeleton_that_was_filled_in_is_a_tableau(tmp_path):
    text = draft(tmp_path / "mine-2.toml", stages=2, order=2).text
    text = text.replace('nodes = ["0", "?"]', 'nodes = ["0", "1/2"]').replace('  ["?"],', '  ["1/2"],')
    (tmp_path / "mine-2.toml").write_text(text.replace('weights = ["?", "?"]', 'weights = ["0", "1"]'))
    assert prove(load_tableau(tmp_path / "mine-2.toml")).outcome == "exact"


@pytest.mark.parametrize(
    ("settings", "says"),
    [
        ({}, "what to draft?"),
        ({"stages": 2, "complete": True}, "what to draft?"),
        ({"stages": 0}, "stages=0: a whole number from 1 to 64"),
        ({"stages": 65}, "stages=65"),
        ({"stages": True}, "stages=True"),
        ({"stages": 2, "order": 99}, "order=99: a whole number from 1 to"),
        ({"stages": 2, "embedded": 0}, "embedded=0"),
    ],
)
def test_requests_that_do_not_fit_are_refused(settings, says, tmp_path):
    with pytest.raises(BadRequest, match=re.escape(says)):
        draft(tmp_path / "mine.toml", **settings)
    assert not list(tmp_path.iterdir())


def test_the_name_is_a_slug_with_the_right_ending(tmp_path):
    with pytest.raises(BadTableau, match=r"ends in \.txt"):
        draft(tmp_path / "mine.txt", stages=2)
    with pytest.raises(BadTableau, match="no slug"):
        draft(tmp_path / "My Method.toml", stages=2)


def test_nothing_is_overwritten_unasked(tmp_path):
    draft(tmp_path / "mine.toml", stages=2)
    before = (tmp_path / "mine.toml").read_text("utf-8")
    with pytest.raises(OutputExists):
        draft(tmp_path / "mine.toml", stages=3)
    assert (tmp_path / "mine.toml").read_text("utf-8") == before
    draft(tmp_path / "mine.toml", stages=3, overwrite=True)
    assert (tmp_path / "mine.toml").read_text("utf-8") != before


# ---------------------------------------------------------------- completed drafts

OPEN = """
schema = "newel-tableau/1"
slug = "mine-3-2"
name = "Mine"
source = ""
numbers = "derived"
order = 3
matrix = [[], ["1/2"], ["0", "3/4"], ["2/9", "1/3", "4/9"]]
weights = {weights}
[embedded]
order = 2
[continuous]
order = 3
weights = [["?"], ["?"], ["?"], ["?"]]
"""


def test_what_is_open_is_solved_for_and_shown_before_it_is_written(tmp_path):
    place = tmp_path / "mine-3-2.toml"
    place.write_text(OPEN.format(weights='["?", "?", "?", "?"]'))
    shown = draft(place, complete=True)
    assert not shown.written
    assert "?" in place.read_text("utf-8")
    written = draft(place, complete=True, overwrite=True)
    assert written.written
    found = load_tableau(place)
    assert [str(x) for x in found.weights] == ["2/9", "1/3", "4/9", "0"]
    verdict = prove(found)
    assert verdict.outcome == "exact"
    assert (verdict.order, verdict.embedded_order, verdict.continuous_order) == (3, 2, 3)
    assert [line.split(",")[0] for line in written.understood] == [
        "weights: order 3",
        "embedded: order 2",
        "continuous: order 3",
    ]


def test_a_claim_beyond_what_the_matrix_allows_is_told(tmp_path):
    place = tmp_path / "mine-3-2.toml"
    place.write_text(OPEN.format(weights='["?"]').replace("order = 3\nmatrix", "order = 5\nmatrix"))
    assert draft(place, complete=True).misfits == ("order 5 was claimed; the matrix allows order 3",)


def test_a_draft_with_nothing_open_or_a_lone_question_mark_is_refused(tmp_path):
    place = tmp_path / "mine-3-2.toml"
    place.write_text(OPEN.format(weights='["?", "1/3", "4/9", "0"]'))
    with pytest.raises(BadTableau, match=r"weights\[1\]"):
        draft(place, complete=True)
    place.write_text(OPEN.format(weights='["2/9", "1/3", "4/9", "0"]').partition("[embedded]")[0])
    with pytest.raises(BadRequest, match="nothing is missing"):
        draft(place, complete=True)
