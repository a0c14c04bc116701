"""A wrong coefficient does not pass the proof, wherever it is and however it is disguised.

The whole is run by `python -m tests.mutation`, its outcome committed; here a sample of the changes, drawn by
digest, is tried anew, and the committed outcome is held against the files of today.
"""

from __future__ import annotations

import tomllib

import pytest

from newel.errors import BadTableau
from newel.methods.order_conditions import PROOF_VERSION, Verdict
from tests.independent.documents import Place, open_document
from tests.mutation import trials
from tests.mutation.moves import COMPENSATED, HALF_UNIT, SINGLE, Move, moves
from tests.mutation.outcome import MOST_UNITS, is_fresh, made_from, read_outcome, totals_of
from tests.mutation.trials import TABLEAUX, Trial, all_moves, as_tableau, drawn, files, tried, workshop

ONE_IN = 128
RENEW = "python -m tests.mutation --stale"


def trial(slug: str, kind: str, way: str, *direction: tuple[str, int, int, int]) -> Trial:
    places = tuple((Place(array, row, column), sign) for array, row, column, sign in direction)
    found = tried(workshop(files()[slug]), Move(slug, kind, way, places), every=1)
    assert found is not None
    return found


@pytest.mark.parametrize("slug", files())
def test_a_change_passes_the_proof_only_where_the_tree_formulas_find_it_valid(slug: str) -> None:
    file = files()[slug]
    found = [tried(workshop(file), move, every=1) for move in drawn(file, ONE_IN)]
    differing = [each for each in found if each is not None and not each.agreed]
    assert differing == []


@pytest.mark.parametrize("slug", files())
def test_the_committed_outcome_was_made_from_the_numbers_and_moves_of_today(slug: str) -> None:
    outcome = read_outcome()
    assert slug in outcome["methods"], f"{slug} was never tried: {RENEW}"
    assert is_fresh(slug, outcome["methods"][slug]), f"{slug} is stale: {RENEW}"


def test_the_committed_outcome_leaves_nothing_unexplained() -> None:
    outcome = read_outcome()
    assert outcome["proof_version"] == PROOF_VERSION
    assert sorted(outcome["methods"]) == sorted(files())
    assert [each["unexplained"] for each in outcome["methods"].values() if each["unexplained"]] == []
    assert totals_of(outcome["methods"]) == outcome["totals"]
    for each in outcome["methods"].values():
        assert sum(each["outcomes"].values()) == sum(each["mutants"].values())
        assert all(finding and mutants for finding, mutants in each["survivors"].items())


def test_a_single_wrong_coefficient_shows_before_a_relative_change_of_1e_9() -> None:
    """Small entries beside large ones show up to four digits late: a unit is one of their own last digit."""
    least = {
        slug: each["least_change_in_units"]["single"]
        for slug, each in read_outcome()["methods"].items()
        if "least_change_in_units" in each
    }
    assert least
    for slug, units in least.items():
        if units > MOST_UNITS:
            digits = as_tableau(workshop(files()[slug]).document).digits
            assert units * 10.0 ** (1 - digits) < 1e-9, slug


def test_half_a_unit_is_accepted_unless_the_limit_of_1e_12_forbids_it() -> None:
    methods = read_outcome()["methods"]
    findings = [finding for each in methods.values() for finding in each["half_units_not_accepted"]]
    assert all(finding.endswith("allowed 1e-12") for finding in findings)


def test_what_no_condition_sees_is_listed_with_the_proof() -> None:
    listed = tomllib.loads((TABLEAUX / "proved.toml").read_text(encoding="utf-8"))["method"]
    shown = {entry["slug"]: entry["verdict"]["undetermined"] for entry in listed}
    assert {slug: each["undetermined"] for slug, each in read_outcome()["methods"].items()} == shown
    assert shown["jameson-schmidt-turkel-2"] == ["matrix[2][1]", "matrix[3][1]", "matrix[3][2]"]


def test_every_coefficient_of_a_pair_with_continuous_weights_is_changed_alone_and_in_compensation() -> None:
    document = open_document(files()["bogacki-shampine-3-2"])
    tried_on: dict[str, set[Place]] = {SINGLE: set(), COMPENSATED: set()}
    for move in moves(document):
        tried_on[move.kind] |= {place for place, _ in move.direction}
    assert tried_on[SINGLE] == set(document.texts)
    assert tried_on[COMPENSATED] == set(document.texts) - {Place("nodes", 1)}  # the first row is empty


@pytest.mark.parametrize("slug", ["kutta-4", "dormand-prince-5-4", "prince-dormand-8-7", "owren-zennaro-3-2"])
def test_compensated_changes_keep_row_sums_and_the_sum_of_the_weights(slug: str) -> None:
    shop = workshop(files()[slug])
    ways = {}
    for move in all_moves(files()[slug]):
        if move.kind == COMPENSATED:
            ways[move.way] = move
    for way, move in ways.items():
        mutant = shop.mutant(move)
        assert mutant is not None
        before, after = shop.document.values, mutant.document.values
        change = {place: after[place] - before[place] for place in mutant.texts}
        assert all(change.values())
        if way == "with the node":
            assert len(set(change.values())) == 1
        else:
            assert sum(change.values()) == 0


class TestKnownChanges:
    def test_a_numerator_by_one_is_rejected(self) -> None:
        assert trial("kutta-4", SINGLE, "numerator by one", ("weights", 2, 0, 1)).outcome == "rejected"

    def test_a_change_within_a_row_is_valid_where_only_the_node_counts(self) -> None:
        # Order 2 asks for the node of stage 3 alone.
        found = trial(
            "ssp-2-stages-3", COMPENSATED, "within a row", ("matrix", 3, 1, 1), ("matrix", 3, 2, -1)
        )
        assert (found.outcome, found.agreed, found.survived) == ("accepted", True, True)
        assert found.finding.startswith("all 5 row sums, ends and tree conditions hold exactly")

    def test_another_root_makes_no_tableau(self) -> None:
        swapped = Move("luther-6", SINGLE, "digits swapped, least", ((Place("nodes", 5), 1),))
        assert tried(workshop(files()["luther-6"]), swapped) is not None
        mixed = workshop(files()["luther-6"]).document.changed({Place("nodes", 5): "(7-sqrt(12))/14"})
        with pytest.raises(BadTableau, match="square root"):
            trials.verdict_of(mixed)

    @pytest.mark.parametrize("sign", [1, -1])
    def test_half_a_unit_is_accepted_and_twice_the_least_that_shows_is_not(self, sign: int) -> None:
        place = ("matrix", 7, 4, sign)
        half = trial("prince-dormand-8-7", HALF_UNIT, "half a unit", place)
        twice = trial("prince-dormand-8-7", SINGLE, "twice the least that shows", place)
        assert (half.outcome, half.agreed) == ("accepted", True)
        assert (twice.outcome, twice.agreed) == ("rejected", True)

    def test_the_limit_forbids_half_a_unit_of_ten_digits(self) -> None:
        found = trial("berland-bogey-bailly-4", HALF_UNIT, "half a unit", ("weights", 1, 0, 1))
        assert (found.outcome, found.agreed, found.by_cap) == ("rejected", True, True)


class TestTheTrialItself:
    """A proof that errs would be noticed."""

    @pytest.mark.parametrize("kind", [SINGLE, COMPENSATED])
    def test_a_proof_that_accepts_what_is_wrong_is_contradicted(
        self, kind: str, monkeypatch: pytest.MonkeyPatch
    ) -> None:
        blind = Verdict(outcome="exact", order=4, working_floor=0.0)
        monkeypatch.setattr(trials, "verdict_of", lambda document: blind)
        direction = [("weights", 2, 0, 1), ("weights", 3, 0, -1)][: 1 if kind == SINGLE else 2]
        found = trial("kutta-three-eighths-4", kind, "numerator by one", *direction)
        assert (found.outcome, found.agreed) == ("accepted", False)

    def test_a_proof_that_rejects_half_a_unit_is_contradicted(self, monkeypatch: pytest.MonkeyPatch) -> None:
        monkeypatch.setattr(
            trials, "verdict_of", lambda document: Verdict(outcome="fails", order=0, working_floor=1.0)
        )
        found = trial("calvo-montijano-randez-6-5", HALF_UNIT, "half a unit", ("weights", 1, 0, 1))
        assert (found.outcome, found.agreed) == ("rejected", False)

    def test_digests_tell_other_numbers_apart(self) -> None:
        facts = made_from("heun-2")
        assert is_fresh("heun-2", facts)
        assert not any(is_fresh("heun-2", {**facts, name: "0" * 64}) for name in facts)

    def test_a_move_has_the_same_draw_on_every_machine(self) -> None:
        first = next(moves(open_document(files()["heun-2"])))
        assert str(first) == "heun-2: single, numerator by one: + matrix[2][1]"
        assert first.draw == 2421705168947005629
