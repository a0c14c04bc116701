"""The order of convergence of every built-in method, measured on problems with closed-form solutions.

The definition: halving the step divides the error by 2^p in the limit (any textbook, e.g. E. Hairer, S. P.
Norsett, G. Wanner, Solving Ordinary Differential Equations I, section II.3). The problems and their
solutions are in tests/problems/closed_forms.py; a claimed order that the march does not show, either way,
fails here.
"""

from __future__ import annotations

from fractions import Fraction
from functools import cache
from itertools import pairwise
from pathlib import Path
from typing import Any

import mpmath
import numpy as np
import pytest

import newel
from newel.catalogue.registry import Registry
from tests.independent.tree_formulas import load
from tests.problems.arithmetic import Array
from tests.problems.closed_forms import CLOSED_FORMS, SWITCHED, WARPED, Known, measured_order

# Their errors reach the rounding of float64 before a slope can be read, by their order or by large entries.
# In mpmath they are marched over this part of the span of `warped`: small where the leading error shows late,
# large where the digits of the file end early.
BEYOND_FLOATS = {
    "verner-2010-efficient-6-5": 1 / 16,
    "tanaka-muramatsu-yamashita-7-6": 1 / 64,
    "fehlberg-8-9": 1.0,
    "verner-1991-8-7": 1.0,
    "verner-2010-8-7": 1 / 16,
    "fehlberg-9-8": 1.0,
    "verner-2010-9-8": 1.0,
    "feagin-10-8": 1.0,
    "feagin-12-10": 1 / 16,
}
ROUNDED = 1e-10

REGISTRY = Registry(folders=(), plugins=False)
ALL = REGISTRY.names()
SLUGS = [slug for slug in ALL if slug not in BEYOND_FLOATS]
FILES = {path.stem: path for path in (Path(__file__).parents[2] / "tableaux").glob("order-*/*.toml")}

# Common practice: a measured slope within a quarter of the order is taken to show it.
SLACK = 0.25


# Conditions beyond the claim fail by so little (E. B. Shanks, Math. Comp. 20 (1966) 21-38, has near misses)
# that the steps which rounding leaves clear show a higher order.
NEARLY_HIGHER = ("shanks-five-evaluations-4",)


@cache
def tableau(slug: str) -> Any:
    return REGISTRY.find(slug)


def model_of(known: Known, breaks: tuple[float, ...] | None = None) -> newel.Model:
    return newel.Model(
        known.rate,
        start=known.start,
        stop=known.stop,
        state=known.state,
        breaks=known.breaks if breaks is None else breaks,
    )


def slope(known: Known, method: Any, breaks: tuple[float, ...] | None = None) -> float:
    """The measured order of one method in equal steps; each piece between breaks is cut into as many."""
    model, span, pieces = model_of(known, breaks), known.stop - known.start, len(known.breaks) + 1
    proof = method.proof
    floor = proof.working_floor if proof is not None and proof.outcome == "rounded" else 0.0

    def error_of(count: int) -> Array:
        run = newel.march(model, method, step=span / (count * pieces), sinks=[])
        assert run.accepted == count * pieces
        return known.error(run.last_state)

    return measured_order(error_of, method.order, floor, most=128 if method.order < 3 else 64)


@pytest.mark.parametrize("name", list(CLOSED_FORMS))
def test_solutions_satisfy_their_equations(name: str) -> None:
    """Central differences of the solution against the rate, away from the breaks."""
    known, h = CLOSED_FORMS[name], 1e-5
    for t in np.linspace(known.start + 0.01, known.stop - 0.01, 12):
        differences = (known.solution(t + h) - known.solution(t - h)) / (2 * h)
        assert known.rate(float(t), known.solution(t)) == pytest.approx(differences, rel=1e-8, abs=1e-8)


def test_solutions_are_continuous_at_their_breaks() -> None:
    (switch,) = SWITCHED.breaks
    before = SWITCHED.solution(float(np.nextafter(switch, 0.0)))
    assert SWITCHED.solution(switch) == pytest.approx(before, rel=1e-14)


@pytest.mark.parametrize("slug", SLUGS)
def test_measured_order_is_the_claimed_order(slug: str) -> None:
    found = slope(WARPED, tableau(slug)) - tableau(slug).order
    assert found > -SLACK
    assert found < SLACK or slug in NEARLY_HIGHER


@pytest.mark.parametrize("slug", SLUGS)
def test_order_is_kept_across_a_break_on_a_step_end(slug: str) -> None:
    """But for methods with a node outside the step: what lies beyond the break is not the same equation."""
    inside = all(0 <= node <= 1 for node in tableau(slug).nodes)
    kept = tableau(slug).order if inside else 1
    assert slope(SWITCHED, tableau(slug)) > kept - SLACK


def error_in_sixty_digits(slug: str, count: int) -> Any:
    """The error of one member of `warped`, in `count` equal steps of a plain loop over mpmath numbers."""
    numbers, stop = load(FILES[slug], dps=60), mpmath.mpf(3) / 2 * BEYOND_FLOATS[slug]
    used = [[(j, a) for j, a in enumerate(row) if a] for row in numbers["matrix"]]
    h, y = stop / count, (mpmath.mpf(1), mpmath.mpf(1))
    for step in range(count):
        first, second = [], []
        for node, row in zip(numbers["nodes"], used, strict=True):
            pace = 1 + h * (step + node) / 2
            u = y[0] + h * mpmath.fsum(a * first[j] for j, a in row)
            v = y[1] + h * mpmath.fsum(a * second[j] for j, a in row)
            first.append(u * v * pace)
            second.append(-mpmath.log(abs(u)) * pace)
        weights = numbers["weights"]
        y = (y[0] + h * mpmath.fdot(weights, first), y[1] + h * mpmath.fdot(weights, second))
    end = stop + stop**2 / 4
    return mpmath.matrix([y[0] - mpmath.exp(mpmath.sin(end)), y[1] - mpmath.cos(end)])


@pytest.mark.parametrize("slug", BEYOND_FLOATS)
def test_measured_order_is_the_claimed_order_in_sixty_digits(slug: str) -> None:
    order = tableau(slug).order
    with mpmath.workdps(60):
        errors = [error_in_sixty_digits(slug, count) for count in (24, 48, 96)]
        sizes = [mpmath.norm(2 ** (order + 1) * fine - coarse) for coarse, fine in pairwise(errors)]
        assert abs(mpmath.log(sizes[0] / sizes[1], 2) - order) < SLACK


@pytest.mark.parametrize("slug", BEYOND_FLOATS)
@pytest.mark.parametrize("known", [WARPED, SWITCHED], ids=lambda known: known.name)
def test_a_march_that_reaches_rounding_stays_there_across_a_declared_break(known: Known, slug: str) -> None:
    run = newel.march(model_of(known), tableau(slug), step=(known.stop - known.start) / 96, sinks=[])
    assert np.abs(known.error(run.last_state)).max() < ROUNDED


def test_what_lies_beyond_floats_is_of_the_registry() -> None:
    assert set(BEYOND_FLOATS) < set(ALL)


@pytest.mark.parametrize("name", ["logistic", "oscillator", "paced-growth"])
@pytest.mark.parametrize("slug", ["bogacki-shampine-3-2", "kutta-4", "dormand-prince-5-4"])
def test_order_is_not_lost_on_special_problems(slug: str, name: str) -> None:
    assert slope(CLOSED_FORMS[name], tableau(slug)) > tableau(slug).order - 2 * SLACK


def test_without_the_declared_break_the_order_is_lost() -> None:
    """A stage at the far side of the jump makes Kutta's fourth order first order."""
    assert slope(SWITCHED, tableau("kutta-4"), breaks=()) < 1.5


def test_one_wrong_coefficient_costs_the_order() -> None:
    """A fifth moved between the weights of equal nodes keeps every quadrature condition; order 3 is lost."""
    right = tableau("kutta-4")
    weights = list(right.weights)
    weights[1], weights[2] = weights[1] + Fraction(1, 5), weights[2] - Fraction(1, 5)
    wrong = newel.Tableau("wrong-4", name="wrong", order=2, matrix=right.matrix, weights=weights)
    assert slope(WARPED, wrong) < 2.5
