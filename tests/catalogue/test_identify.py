"""A method is known by its numbers, whatever its name and the order of its stages; no two files hold one."""

from __future__ import annotations

from itertools import combinations
from typing import Any

import attrs
import pytest

import newel
from newel.catalogue.identify import compared, identify, identities
from newel.catalogue.registry import Registry
from newel.methods.tableau import Tableau

pytestmark = pytest.mark.core


@pytest.fixture(scope="module")
def registry() -> Registry:
    return Registry(folders=[], plugins=False, cache=None)


def test_a_method_under_another_name_is_known(registry: Registry) -> None:
    other = attrs.evolve(registry.load("kutta-5"), slug="mine", name="Mine")
    assert identify(other, registry=registry) == "kutta-5"
    assert identities(other, registry)[0].relation == "same"


def test_stages_in_another_order_are_the_same_method(registry: Registry) -> None:
    """Stages 2 and 3 of Ralston's form of order 3, after which a stage that nobody uses may stand."""
    t = Tableau(
        "reordered",
        order=2,
        matrix=[[], ["2/3"], ["1/3", "0"]],
        weights=["0", "1/2", "1/2"],
    )
    same = Tableau("same", order=2, matrix=[[], ["1/3"], ["2/3", "0"]], weights=["0", "1/2", "1/2"])
    assert compared(t, same) == "reordered"
    assert compared(t, attrs.evolve(t, slug="again")) == "same"
    different = Tableau("no", order=1, matrix=[[], ["1/3"], ["2/3", "1/9"]], weights=["0", "1/2", "1/2"])
    assert compared(t, different) is None


def test_every_legal_order_of_the_stages_of_a_method_is_known(registry: Registry) -> None:
    known = registry.load("butcher-5")
    for i, k in combinations(range(1, known.stages), 2):
        if any(known.matrix[k][i:k]) or any(known.matrix[j][i] for j in range(i + 1, k + 1)):
            continue
        order = list(range(known.stages))
        order[i], order[k] = k, i
        moved = Tableau(
            "moved",
            order=5,
            nodes=[known.nodes[j] for j in order],
            matrix=[[known.matrix[a][b] for b in order] for a in order],
            weights=[known.weights[j] for j in order],
        )
        assert identify(moved, registry=registry) == "butcher-5"


def test_other_embedded_weights_are_told_apart_from_the_same_method(registry: Registry) -> None:
    pair = registry.load("cash-karp-5-4")
    alone = attrs.evolve(pair, slug="alone", embedded_weights=None, embedded_order=None)
    (found,) = identities(alone, registry)
    assert (found.slug, found.relation) == ("cash-karp-5-4", "other embedded weights")
    assert found.text.endswith("other embedded weights: here none, there of order 4")
    assert identify(alone, registry=registry) == "cash-karp-5-4"


def test_a_stage_that_only_the_embedded_weights_use_may_be_missing(registry: Registry) -> None:
    pair: Any = registry.load("dormand-prince-5-4")
    six = Tableau(
        "six",
        order=5,
        nodes=pair.nodes[:6],
        matrix=[row[:i] for i, row in enumerate(pair.matrix[:6])],
        weights=pair.weights[:6],
    )
    assert identify(six, registry=registry) == "dormand-prince-5-4"


def test_rounded_numbers_agree_within_their_digits_and_no_further(registry: Registry) -> None:
    values: dict[str, Any] = {"order": 2, "matrix": [[], ["0.666667"]], "weights": ["0.25", "0.75"]}
    assert identify(Tableau("near", digits=6, **values), registry=registry) == "ralston-2"
    values["matrix"] = [[], ["0.666677"]]
    assert identify(Tableau("off", digits=6, **values), registry=registry) is None


def test_a_method_that_nobody_knows_is_none(registry: Registry) -> None:
    own = Tableau("own", order=2, matrix=[[], ["3/5"]], weights=["1/6", "5/6"])
    assert identify(own, registry=registry) is None
    assert newel.identify(own, registry=registry) is None


def test_no_two_built_in_files_hold_one_method(registry: Registry) -> None:
    """Equal, or equal but for the order of the stages."""
    methods = [registry.load(slug) for slug in registry.names()]
    twice = [
        (one.slug, other.slug)
        for one, other in combinations(methods, 2)
        if compared(one, other) in ("same", "reordered")
    ]
    assert twice == []
