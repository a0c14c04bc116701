"""Where the error estimate comes from, and what is carried on."""

from __future__ import annotations

import math
from pathlib import Path
from typing import Any

import numpy as np
import pytest

import newel
from newel.catalogue.registry import default_registry

pytestmark = pytest.mark.core

ADAPTIVE = {"rel_tol": 1e-7, "abs_tol": 1e-7}


def model(**more: Any) -> newel.Model:
    return newel.Model(lambda t, y: -y + math.sin(t), **{"start": 0.0, "stop": 3.0, "state": [1.0], **more})


def test_a_pair_embeds_a_single_method_is_doubled_and_fixed_steps_estimate_nothing() -> None:
    assert newel.march(model(), "dormand-prince-5-4", **ADAPTIVE).estimator == "embedded"
    doubled = newel.march(model(), "kutta-4", **ADAPTIVE)
    assert doubled.estimator == "step doubling"
    assert doubled.method == "kutta-4"
    assert doubled.settings["estimator"] == "step doubling"
    assert newel.march(model(), "dormand-prince-5-4", step=0.1).estimator == "none"


def test_step_doubling_carries_the_extrapolated_value_on() -> None:
    """Two half steps and a whole one: y + (y₂ − y₁)/(2⁴ − 1) of order 5; 11 calls a step, C. Runge's rule."""
    h, t, y = 0.5, 0.0, np.array([1.0])
    rate = model().rate
    whole, _ = newel.one_step(rate, t, y, h, "kutta-4")
    half, _ = newel.one_step(rate, t, y, h / 2, "kutta-4")
    halves, _ = newel.one_step(rate, t + h / 2, half, h / 2, "kutta-4")
    stepper = newel.Stepper(model(), "kutta-4", **ADAPTIVE)
    before = stepper.calls
    trial = stepper.propose(h)
    assert trial.state == pytest.approx(halves + (halves - whole) / 15, rel=1e-14)
    assert trial.error == pytest.approx((halves - whole) / 15, rel=1e-9)
    assert stepper.calls - before == 10


@pytest.mark.parametrize("form", ["slug", "tableau", "path"])
def test_every_way_to_name_a_method_is_doubled_alike(form: str, tmp_path: Path) -> None:
    tableau = default_registry().find("kutta-4")
    path = tmp_path / "mine-4.toml"
    own = newel.Tableau(slug="mine-4", name="Mine", order=4, matrix=tableau.matrix, weights=tableau.weights)
    newel.write_tableau(own, path)
    method = {"slug": "kutta-4", "tableau": own, "path": path}[form]
    run, plain = newel.march(model(), method, **ADAPTIVE), newel.march(model(), "kutta-4", **ADAPTIVE)
    assert run.estimator == "step doubling"
    assert run.times.tolist() == plain.times.tolist()
    assert run.states.tolist() == plain.states.tolist()


def test_an_estimator_that_is_blind_to_a_pure_quadrature_still_ends_and_reports_its_steps() -> None:
    """y' = f(t): where an estimate vanishes, the factor is bounded and the march ends at stop.

    merson-4-3's estimate is of order 5 for linear problems (R. H. Merson, 1957; from memory).
    """
    for method in ("merson-4-3", "dormand-prince-5-4", "bogacki-shampine-3-2"):
        run = newel.march(
            newel.Model(lambda t, y: [1.0 + 2.0 * t], start=0.0, stop=3.0, state=[0.0]), method, **ADAPTIVE
        )
        assert run.last_state[0] == pytest.approx(12.0, rel=1e-12)
        assert run.rejected == 0


def test_the_higher_order_is_carried_on_where_the_weights_say_so() -> None:
    """fehlberg-4-5 carries 4 on, fehlberg-5-4 5: one file's embedded weights are the other's weights."""
    four, five = default_registry().find("fehlberg-4-5"), default_registry().find("fehlberg-5-4")
    assert [float(w) for w in four.embedded_weights] == [float(w) for w in five.weights]
    low, high = (newel.one_step(model().rate, 0.0, [1.0], 0.5, m) for m in ("fehlberg-4-5", "fehlberg-5-4"))
    assert high[0] - low[0] == pytest.approx(high[1], rel=1e-9)
    assert high[1] == pytest.approx(-low[1], rel=1e-9)


def test_an_unproven_method_is_noted() -> None:
    """order 4 is claimed, and taken on trust, of weights that are of order 1."""
    registry = newel.Registry(plugins=False)
    wrong = newel.Tableau(slug="wrong-4", name="Wrong", order=4, matrix=[[], ["1/2"]], weights=["1/3", "2/3"])
    registry.register(wrong, trust=True)
    run = newel.march(model(), "wrong-4", step=0.1, registry=registry)
    assert [note.text for note in run.notes] == ["wrong-4 is unproven: it was taken on trust"]
    with pytest.raises(newel.errors.NotProved):
        newel.march(model(), wrong, step=0.1)
