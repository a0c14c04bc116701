"""`recover`: loops are named, or their slip is; what is no such step is refused with what broke."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest

import newel
from newel.catalogue.recognition import recover
from newel.catalogue.registry import Registry
from newel.errors import BadRequest, NotRecovered
from tests.catalogue import loops
from tests.catalogue.compiled_loops import compiled, compilers, wrapped

pytestmark = pytest.mark.core


@pytest.fixture(scope="module")
def registry() -> Registry:
    return Registry(folders=[], plugins=False, cache=None)


@pytest.mark.parametrize(
    ("step", "slug", "outcome", "length"),
    [
        (loops.classical, "kutta-4", "exact", 24),
        (loops.convex_sums, "ssp-3-stages-3", "exact", 24),
        (loops.two_registers, "williamson-3", "exact", 24),
        (loops.gill, "gill-4", "rounded", 24),
        (loops.on_lists, "heun-2", "exact", 24),
        (loops.two_unknowns, "midpoint-2", "exact", 2),
        (loops.one_number, "ralston-2", "exact", 0),
        (loops.into_out, "midpoint-2", "exact", 24),
        (loops.classical_without_time, "kutta-4", "exact", 24),
        (loops.prints, "euler-1", "exact", 24),
    ],
)
def test_a_loop_is_named(step: Any, slug: str, outcome: str, length: int, registry: Registry) -> None:
    found = recover(step, registry=registry)
    assert (found.same_as, found.verdict.outcome, found.length) == (slug, outcome, length)
    assert found.repairs == ()
    assert str(found).startswith(f"your loop is {slug} ({outcome}: order {newel.find(slug).order}, ")
    assert found.tableau.proof is not None


@pytest.mark.parametrize(
    ("step", "order", "where", "printed", "value", "becomes"),
    [
        (loops.classical_one_weight_wrong, 0, "weights[3]", "1/6", "1/3", "kutta-4"),
        (loops.wrong_constant, 1, "matrix[2][1]", "1/3", "1/2", "kutta-4"),
        (loops.overwrites, 0, "weights[1]", "1/2", "0", "midpoint-2"),
    ],
)
def test_a_wrong_loop_learns_which_coefficient_is_wrong(
    step: Any, order: int, where: str, printed: str, value: str, becomes: str, registry: Registry
) -> None:
    found = recover(step, registry=registry)
    assert not found
    assert found.verdict.order == order
    (change,) = found.repairs[0].changes
    assert (change.where, change.printed, change.value) == (where, printed, value)
    assert found.becomes == becomes
    assert f"not {newel.find(becomes).order}: {where} is {printed}, and {value} makes every" in str(found)
    assert found.verdict.repairs == found.repairs


def test_a_stage_that_starts_from_the_wrong_rate_is_named_when_the_order_is_told(registry: Registry) -> None:
    found = recover(loops.classical_one_stage_wrong, order=4, registry=registry)
    assert [each.where for each in found.repairs] == ["matrix[3][1], matrix[3][2]"]
    assert found.repairs[0].value == "0, 1/2"
    assert found.becomes == "kutta-4"


def test_a_slip_in_a_low_storage_constant_is_an_order_that_falls_short(registry: Registry) -> None:
    """One constant of two registers enters several coefficients, so that no single one mends it."""
    found = recover(loops.two_registers_sign_lost, order=3, registry=registry)
    assert not found
    assert found.verdict.order == 0
    assert str(found).startswith("your loop is of order 0, not 3")


def test_what_else_was_seen_is_told(registry: Registry, capsys: pytest.CaptureFixture[str]) -> None:
    assert any("it prints" in each for each in recover(loops.prints, registry=registry).remarks)
    assert capsys.readouterr().out == ""
    remarks = recover(loops.classical_without_time, registry=registry).remarks
    assert any("the time of the start of the step" in each for each in remarks)
    assert any("it overwrites the y" in each for each in recover(loops.overwrites, registry=registry).remarks)
    assert recover(loops.classical, registry=registry).remarks == ()


@pytest.mark.parametrize(
    ("step", "reason", "text"),
    [
        (loops.Multistep(), "memory", "it remembers something of earlier calls"),
        (loops.clipped, "branch", "stage 2 is not y"),
        (loops.repeats_where_large, "branch", "1 times for one state and 2 times for another"),
        (loops.taylor, "branch", "its coefficients depend on the data, or on h"),
        (loops.never_calls, "never calls", "it never calls its rate"),
        (loops.raises, "raises", r"it raises ValueError: no table for this range \(loops.py:"),
        (loops.other_order, "signature", r"rate\(y, t\)"),
        (loops.returns_nothing, "no state", "it returns nothing and leaves y as it was"),
        (loops.goes_on, "calls", "more than 512 times"),
        (lambda rate, t, y, h: rate(t, y).sum(), "no state", "where the new state has"),
        (lambda rate, t, y, h: y + rate(t, y) * (1 / 0), "raises", "ZeroDivisionError"),
        (lambda rate, t, y, h: y * float("nan") + rate(t, y), "not finite", "NaN or infinity"),
    ],
)
def test_what_is_no_such_step_is_refused_with_what_broke(
    step: Any, reason: str, text: str, registry: Registry
) -> None:
    with pytest.raises(NotRecovered, match=text) as error:
        recover(step, registry=registry)
    assert error.value.reason == reason


def test_a_state_that_is_overwritten_while_it_is_needed_is_the_reason_where_a_probe_fails(
    registry: Registry,
) -> None:
    def step(rate: Any, t: float, y: Any, h: float) -> Any:
        k = rate(t, y)
        y *= 2.0
        return y + h * k

    with pytest.raises(NotRecovered, match="it overwrites the state") as error:
        recover(step, registry=registry)
    assert error.value.reason == "overwritten"


def test_bad_requests_are_told_before_anything_is_called(registry: Registry) -> None:
    for wrong in ({"order": 0}, {"order": 17}, {"length": -1}):
        with pytest.raises(BadRequest, match=str(next(iter(wrong.values())))):
            recover(loops.classical, registry=registry, **wrong)
    with pytest.raises(BadRequest, match="a int is no step function"):
        recover(7, registry=registry)  # type: ignore[arg-type]


def test_the_recovered_tableau_marches_as_the_loop_did(registry: Registry) -> None:
    found = recover(loops.convex_sums, registry=registry)
    model = newel.Model(lambda t, y: [y[1], -y[0] + t], start=0.0, stop=1.0, state=[1.0, 0.5])
    run = newel.march(model, found.tableau, step=0.125)
    import numpy as np

    y = np.array([1.0, 0.5])
    for n in range(8):
        y = loops.convex_sums(lambda t, y: np.array([y[1], -y[0] + t]), n * 0.125, y, 0.125)
    assert run.last_state == pytest.approx(y, abs=1e-14)


@pytest.fixture(scope="module")
def built(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return tmp_path_factory.mktemp("loops")


def library(language: str, folder: Path, *options: str) -> Any:
    if compilers()[language] is None:
        pytest.skip(f"this machine has no {language} compiler: its loops were not tried")
    return compiled(language, folder, *options)


def test_a_loop_in_c_is_named(built: Path, registry: Registry) -> None:
    found = recover(wrapped(library("C", built).three_eighths), registry=registry)
    assert (found.same_as, found.verdict.outcome) == ("kutta-three-eighths-4", "exact")


def test_a_wrong_weight_in_c_is_found(built: Path, registry: Registry) -> None:
    found = recover(wrapped(library("C", built, "-DLAST=2.0").three_eighths), registry=registry)
    assert (found.repairs[0].where, found.repairs[0].value) == ("weights[4]", "1/8")
    assert found.becomes == "kutta-three-eighths-4"


def test_a_loop_in_c_for_two_numbers_is_read_by_repeated_probes(built: Path, registry: Registry) -> None:
    found = recover(wrapped(library("C", built).pendulum), length=2, registry=registry)
    assert (found.same_as, found.length) == ("kutta-3", 2)
    assert recover(wrapped(library("C", built).pendulum), registry=registry).same_as == "kutta-3"


def test_a_loop_in_c_that_works_in_place_is_named(built: Path, registry: Registry) -> None:
    found = recover(wrapped(library("C", built).falling_fractions), registry=registry)
    assert found.same_as == "jameson-schmidt-turkel-2"


def test_a_loop_in_fortran_is_named(built: Path, registry: Registry) -> None:
    found = recover(wrapped(library("Fortran", built).heun_third), registry=registry)
    assert (found.same_as, found.verdict.outcome) == ("heun-3", "exact")


def test_a_wrong_row_in_fortran_is_found(built: Path, registry: Registry) -> None:
    found = recover(wrapped(library("Fortran", built).single_precision_constant), registry=registry)
    assert (found.repairs[0].where, found.repairs[0].value) == ("matrix[3][2]", "2/3")
    assert found.becomes == "heun-3"
