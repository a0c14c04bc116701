"""A tableau is typed from a paper, with misprints; the proof finds them, and the method is put to use.

The pair is that of J. R. Cash and A. H. Karp, ACM Transactions on Mathematical Software 16 (1990) 201–222;
coefficients from memory, held against the tableau that newel ships under its own slug.
"""

import math
from itertools import pairwise

import pytest

import newel

pytestmark = pytest.mark.core

AS_TYPED = """\
schema = "newel-tableau/1"
slug = "typed-from-paper-5-4"
name = "Cash-Karp 5(4), typed from the paper"
authors = ["J. R. Cash", "A. H. Karp"]
year = 1990
source = "ACM Transactions on Mathematical Software 16 (1990) 201-222"
numbers = "published"
order = 5
nodes = ["0", "1/5", "3/10", "3/5", "1", "7/8"]
matrix = [
  [],
  ["1/5"],
  ["3/40", "9/40"],
  ["3/10", "-9/10", "6/5"],
  ["-11/45", "5/2", "-70/27", "35/27"],
  ["1631/55296", "175/512", "575/13824", "44275/110592", "253/4096"],
]
weights = ["37/378", "0", "250/621", "125/594", "0", "512/1771"]

[embedded]
order = 4
weights = ["2825/27648", "0", "18575/48384", "13525/55296", "277/14366", "1/4"]
"""


@pytest.fixture
def typed(tmp_path):
    path = tmp_path / "typed-from-paper-5-4.toml"
    path.write_text(AS_TYPED, encoding="utf-8")
    return path


@pytest.fixture
def registry(tmp_path):
    return newel.Registry(folders=[], plugins=False, cache=tmp_path / "proofs")


def correct(path, wrong, right):
    text = path.read_text(encoding="utf-8")
    assert text.count(wrong) == 1
    path.write_text(text.replace(wrong, right), encoding="utf-8")


def test_from_the_page_to_the_first_march(typed, registry):
    # The first check: the fifth row does not sum to its node, and the embedded weights do not sum to 1.
    verdict = newel.check(typed, registry=registry)
    assert not verdict
    assert verdict.outcome == "fails"
    rows = [failure for failure in verdict.failures if failure.part == "row sum"]
    assert [row.condition for row in rows] == ["row 5"]
    assert rows[0].residual_text in ("11/270", "-11/270")  # 11/45 - 11/54, by hand

    # Nobody can march with it by accident.
    model = newel.Model(lambda t, y: [y[1], -y[0]], start=0.0, stop=10.0, state=[1.0, 0.0])
    with pytest.raises(newel.errors.NotProved, match="row 5"):
        newel.march(model, typed, step=0.1, registry=registry)

    # The page says 11/54. What is left is in the embedded weights alone.
    correct(typed, '"-11/45"', '"-11/54"')
    verdict = newel.check(typed, registry=registry)
    assert {failure.part for failure in verdict.failures if failure.part != "claim"} == {"embedded"}
    assert verdict.order == 5

    # The page says 14336.
    correct(typed, "277/14366", "277/14336")
    verdict = newel.check(typed, registry=registry)
    assert (verdict.outcome, verdict.order, verdict.embedded_order) == ("exact", 5, 4)

    # It is the shipped pair, number for number, under a slug of our own.
    tableau = registry.register(newel.read_tableau(typed, registry=registry))
    assert tableau.digest == newel.find("cash-karp-5-4", registry=registry).digest
    assert tableau.source == "ACM Transactions on Mathematical Software 16 (1990) 201-222"

    # And it marches with the order that it claims.
    errors = []
    for step in (0.2, 0.1, 0.05):
        run = newel.march(model, "typed-from-paper-5-4", step=step, registry=registry)
        errors.append(math.hypot(run.last_state[0] - math.cos(10.0), run.last_state[1] + math.sin(10.0)))
    orders = [math.log2(coarse / fine) for coarse, fine in pairwise(errors)]
    assert orders == pytest.approx([5.0, 5.0], abs=0.3)


def test_a_misprint_that_keeps_every_sum_is_found_by_the_trees(typed, registry):
    correct(typed, '"-11/45"', '"-11/54"')
    correct(typed, "277/14366", "277/14336")
    # Two entries of one row, typed in each other's place: the row sum stays.
    correct(typed, '["3/40", "9/40"]', '["9/40", "3/40"]')
    verdict = newel.check(typed, registry=registry)
    assert not verdict
    assert verdict.order < 5
    assert all(failure.part != "row sum" for failure in verdict.failures)
    assert any("[[τ]]" in failure.condition for failure in verdict.failures)
