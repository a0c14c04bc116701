"""Parameters are copied in wherever that is possible, and named where it is not."""

from __future__ import annotations

import dataclasses
import types
from collections import namedtuple
from pathlib import Path

import attrs
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from newel.models.intake import copy_params, differs
from newel.models.model import Model

pytestmark = pytest.mark.core

Pair = namedtuple("Pair", "low high")


@dataclasses.dataclass(frozen=True)
class Pump:
    curve: np.ndarray
    name: str = "p1"


@attrs.frozen
class Valve:
    _loss: list
    open: bool = True


class Opaque:
    pass


leaves = st.one_of(st.integers(), st.floats(), st.text(max_size=3), st.none(), st.booleans()) | st.builds(
    lambda values: np.array(values, dtype=float), st.lists(st.floats(), max_size=3)
)
nested = st.recursive(
    leaves,
    lambda inner: (
        st.lists(inner, max_size=3)
        | st.dictionaries(st.text(max_size=2), inner, max_size=3)
        | st.tuples(inner, inner)
        | st.builds(Valve, st.lists(inner, max_size=2))
        | st.builds(Pair, inner, inner)
    ),
    max_leaves=8,
)


@settings(deadline=None, derandomize=True)
@given(nested)
def test_a_copy_of_containers_is_equal_and_keeps_nothing_as_given(params):
    copy, kept = copy_params(params)
    assert kept == ()
    assert not differs(copy, params)
    assert type(copy) is type(params)


def test_no_change_of_what_was_given_reaches_the_model():
    params = {"pump": Pump(np.ones(2)), "valve": Valve([1.0]), "free": types.SimpleNamespace(k=[2.0])}
    model = Model(lambda t, y, p: -y, start=0, stop=1, state=[1.0], params=params)
    params["pump"].curve[0] = 7.0
    params["valve"]._loss[0] = 7.0
    params["free"].k.append(7.0)
    params["new"] = 7.0
    assert model.params["pump"].curve.tolist() == [1.0, 1.0]
    assert model.params["valve"]._loss == [1.0]
    assert model.params["free"].k == [2.0]
    assert "new" not in model.params
    assert model.notes == ()


def test_what_cannot_be_copied_is_kept_and_named_with_its_place():
    thing = Opaque()
    model = Model(lambda t, y, p: -y, start=0, stop=1, state=[1.0], params={"pumps": [1.0, thing]})
    assert model.params["pumps"][1] is thing
    assert len(model.notes) == 1
    assert model.notes[0].startswith("params['pumps'][1] (Opaque) is kept as given")


def test_paths_are_values_and_draw_no_note():
    assert copy_params({"file": Path("a.csv")})[1] == ()


def test_a_thing_given_twice_stays_one_thing_and_a_loop_ends():
    shared = [1.0]
    copy, _ = copy_params({"a": shared, "b": shared})
    assert copy["a"] is copy["b"]
    assert copy["a"] is not shared
    loop: list = []
    loop.append(loop)
    ring, _ = copy_params(loop)
    assert ring[0] is ring
    assert not differs(ring, loop)


@pytest.mark.parametrize(
    ("one", "other"),
    [
        ([1.0], [2.0]),
        ({"a": 1}, {"a": 1, "b": 2}),
        (np.ones(2), np.array([1.0, 1.5])),
        (np.ones(2), np.ones(3)),
        (np.ones(2), np.ones(2, dtype="f4")),
        (Valve([1.0]), Valve([2.0])),
        (1, 1.0),
        (np.array([1, None], dtype=object), np.array([1, 2], dtype=object)),
        ({1}, {2}),
    ],
)
def test_a_difference_is_seen_wherever_it_hides(one, other):
    assert differs(one, other)


def test_nan_does_not_differ_from_nan():
    assert not differs([float("nan"), np.array([np.nan])], [float("nan"), np.array([np.nan])])
