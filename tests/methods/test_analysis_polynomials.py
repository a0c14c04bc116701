"""Roots isolated exactly: against known roots, numpy's, and Sturm's count."""

from __future__ import annotations

from fractions import Fraction
from functools import reduce
from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from newel.methods.analysis.polynomials import first_descent, positive_roots, sign_at, square_free

pytestmark = pytest.mark.core


def product(p: list[int], q: list[int]) -> list[int]:
    result = [0] * (len(p) + len(q) - 1)
    for i, x in enumerate(p):
        for j, y in enumerate(q):
            result[i + j] += x * y
    return result


def with_roots(roots: list[Fraction]) -> list[int]:
    return reduce(product, ([-x.numerator, x.denominator] for x in roots), [1])


fractions = st.fractions(-4, 4, max_denominator=12)


@settings(deadline=None, derandomize=True, max_examples=80)
@given(st.lists(fractions, min_size=1, max_size=7))
def test_every_positive_root_is_alone_in_its_interval_and_they_ascend(roots: list[Fraction]) -> None:
    found = list(positive_roots(square_free(with_roots(roots))))
    wanted = sorted({x for x in roots if x > 0})
    assert len(found) == len(wanted)
    for root, x in zip(found, wanted, strict=True):
        assert root.low < x < root.high
    assert all(a.high <= b.low for a, b in pairwise(found))


@settings(deadline=None, derandomize=True, max_examples=80)
@given(st.lists(fractions, min_size=1, max_size=6), st.lists(fractions, max_size=3))
def test_square_free_keeps_each_root_once(once: list[Fraction], again: list[Fraction]) -> None:
    roots = once + [x for x in once for y in again if x != y]
    simple = square_free(with_roots(roots))
    wanted = with_roots(sorted(set(once)))
    assert len(simple) == len(wanted)
    assert [x * wanted[-1] for x in simple] == [x * simple[-1] for x in wanted]


@settings(deadline=None, derandomize=True, max_examples=60)
@given(st.lists(st.integers(-9, 9), min_size=2, max_size=9).filter(lambda p: p[-1] != 0))
def test_the_first_descent_is_where_numpy_sees_the_sign_change(p: list[int]) -> None:
    found = first_descent(p)
    if found is None:
        assert all(np.polyval(p[::-1], x) >= -1e-9 for x in np.linspace(0.0, 3000.0, 3001))
        return
    # Never negative before it; negative just behind it.
    if found:
        assert all(np.polyval(p[::-1], float(found) * x) >= -1e-7 for x in np.linspace(0.0, 0.999, 200))
    assert sign_at(p, found + Fraction(1, 10**15)) < 0
    if found:
        assert sign_at(p, found - found / 10**15) >= 0


def test_a_root_that_is_only_touched_is_passed() -> None:
    touched = product(product([1, -1], [1, -1]), [3, -1])  # (1 − x)²(3 − x)
    assert first_descent(touched) == pytest.approx(3)
    assert float(first_descent(touched) or 0) == 3.0


def test_two_roots_that_float64_cannot_tell_apart_are_two() -> None:
    close = [Fraction(1), 1 + Fraction(1, 10**30)]
    first, second = positive_roots(with_roots(close))
    assert first.high <= second.low
    assert first_descent(with_roots(close)) == pytest.approx(1)


def test_no_root_is_no_descent_and_a_negative_start_is_zero() -> None:
    assert first_descent([1, 0, 1]) is None
    assert first_descent([0, 0, 0]) is None
    assert first_descent([-1, 5]) == 0
    assert first_descent([0, 0, -1, 5]) == 0


def test_long_common_divisors_are_found() -> None:
    long = [Fraction(k, 10**40 + k) for k in range(1, 6)]
    simple = square_free(with_roots(long * 3))
    assert len(simple) == 6
    assert all(sign_at(simple, x) == 0 for x in long)
