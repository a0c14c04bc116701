"""A layout names the parts of a flat state without copying them."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from newel.errors import BadModel
from newel.models.layout import Layout

pytestmark = pytest.mark.core

shapes = st.lists(st.integers(1, 4), max_size=3).map(tuple)
names = st.sampled_from(["level", "conc", "head", "flow", "parts", "self"])
layouts = st.dictionaries(names, shapes, min_size=1, max_size=4)


@settings(deadline=None, derandomize=True)
@given(layouts, st.sampled_from(["f4", "f8", "D", "O"]))
def test_views_read_back_what_was_packed_in_every_dtype(parts, dtype):
    layout = Layout(**parts)
    values = {
        name: np.arange(math.prod(shape)).reshape(shape).astype(dtype) + i
        for i, (name, shape) in enumerate(parts.items())
    }
    y = layout.pack(**values)
    assert (y.shape, y.dtype) == ((layout.size,), np.dtype(dtype))
    for name, view in vars(layout.views(y)).items():
        assert view.shape == parts[name]
        assert np.array_equal(view, values[name])
        assert np.shares_memory(view, y)


@settings(deadline=None, derandomize=True)
@given(layouts)
def test_labels_are_distinct_and_name_the_entry_that_they_stand_at(parts):
    layout = Layout(**parts)
    assert len(set(layout.labels)) == len(layout.labels) == layout.size
    y = np.arange(layout.size, dtype=float)
    views = vars(layout.views(y))
    for i, (label, owner) in enumerate(zip(layout.labels, layout.owners(), strict=True)):
        name, _, index = label.rstrip("]").partition("[")
        assert name == owner
        place = tuple(int(n) for n in index.split(",")) if index else ()
        assert views[name][place] == i


def test_writing_a_view_writes_the_state_even_a_strided_one():
    layout = Layout(level=(), grid=(2, 3))
    y = np.zeros(14)[::2]
    views = layout.views(y)
    views.level[...] = 5.0
    views.grid[1, 2] = 7.0
    assert y.tolist() == [5.0, 0.0, 0.0, 0.0, 0.0, 0.0, 7.0]


def test_labels_read_as_in_code():
    assert Layout(level=(), conc=18, grid=(2, 2)).labels[:2] == ("level", "conc[0]")
    assert Layout(conc=18).labels[17] == "conc[17]"
    assert Layout(grid=(2, 2)).labels[2] == "grid[1,0]"


def test_integers_pack_as_float64_and_one_value_fills_a_part():
    y = Layout(level=(), conc=3).pack(level=1, conc=2)
    assert (y.dtype, y.tolist()) == (np.float64, [1.0, 2.0, 2.0, 2.0])


def test_equal_layouts_are_equal_and_order_counts():
    assert Layout(a=(), b=2) == Layout(a=(), b=(2,))
    assert hash(Layout(a=(), b=2)) == hash(Layout(a=(), b=(2,)))
    assert Layout(a=(), b=()) != Layout(b=(), a=())
    assert repr(Layout(a=(), b=2)) == "Layout(a=(), b=(2,))"


@pytest.mark.parametrize(
    ("parts", "words"),
    [
        ({}, "without parts"),
        ({"conc": 0}, "shape of conc is 0"),
        ({"conc": (2, -1)}, "shape of conc is"),
        ({"conc": True}, "shape of conc is True"),
        ({"conc": 2.5}, "shape of conc is 2.5"),
        ({"t": ()}, "part named 't'"),
        ({"event": ()}, "part named 'event'"),
        ({"_x": ()}, "part named '_x'"),
    ],
)
def test_what_is_no_layout_is_refused(parts, words):
    with pytest.raises(BadModel, match=words):
        Layout(**parts)


def test_pack_and_views_refuse_what_does_not_fit():
    layout = Layout(level=(), conc=3)
    with pytest.raises(BadModel, match="no value for conc"):
        layout.pack(level=1.0)
    with pytest.raises(BadModel, match=r"'cnoc' is no part.*Did you mean conc"):
        layout.pack(level=1.0, cnoc=2.0)
    with pytest.raises(BadModel, match=r"conc has shape \(2,\), its part \(3,\)"):
        layout.pack(level=1.0, conc=[1.0, 2.0])
    with pytest.raises(BadModel, match="dtype <U"):
        layout.pack(level="a", conc=1.0)
    with pytest.raises(BadModel, match=r"shape \(3,\)"):
        layout.views(np.zeros(3))
