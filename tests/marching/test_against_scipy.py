"""Results at equal tolerance against SciPy's integrators, which serve as an outside reference only."""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

import newel

integrate = pytest.importorskip("scipy.integrate")

# The same tableaux where SciPy has them; the control of the step differs.
PAIRS = {"dormand-prince-5-4": "RK45", "bogacki-shampine-3-2": "RK23", "hairer-norsett-wanner-8-5": "DOP853"}


def lotka(t: float, y: Any) -> Any:
    """Problem B1 of Hull, Enright, Fellen and Sedgwick (1972)."""
    return np.array([2.0 * (y[0] - y[0] * y[1]), -(y[1] - y[0] * y[1])])


def kepler(t: float, y: Any) -> Any:
    cube = (y[0] ** 2 + y[1] ** 2) ** 1.5
    return np.array([y[2], y[3], -y[0] / cube, -y[1] / cube])


def forced(t: float, y: Any) -> Any:
    return np.array([y[1], -4.0 * y[0] + math.cos(3.0 * t)])


PROBLEMS: dict[str, tuple[Callable[..., Any], list[float], float]] = {
    "lotka": (lotka, [1.0, 3.0], 10.0),
    "kepler": (kepler, [0.7, 0.0, 0.0, math.sqrt(1.3 / 0.7)], 10.0),
    "forced": (forced, [1.0, 0.0], 10.0),
}


@pytest.mark.parametrize("name", PROBLEMS)
@pytest.mark.parametrize("method", PAIRS)
@pytest.mark.parametrize("tolerance", [1e-4, 1e-7])
def test_error_and_work_are_those_of_the_same_tableau_elsewhere(
    name: str, method: str, tolerance: float
) -> None:
    """Within a factor of 30 in error and of 2.5 in calls: the controls differ (common practice)."""
    rate, state, stop = PROBLEMS[name]
    truth = integrate.solve_ivp(rate, (0.0, stop), state, method="DOP853", rtol=1e-13, atol=1e-13).y[:, -1]
    other = integrate.solve_ivp(
        rate, (0.0, stop), state, method=PAIRS[method], rtol=tolerance, atol=tolerance
    )
    model = newel.Model(rate, start=0.0, stop=stop, state=state)
    run = newel.march(model, method, rel_tol=tolerance, abs_tol=tolerance)
    theirs = float(np.max(np.abs(other.y[:, -1] - truth)))
    ours = float(np.max(np.abs(run.last_state - truth)))
    assert ours < 30.0 * theirs + 1e-12
    assert run.calls < 2.5 * other.nfev


def test_dense_rows_agree_at_the_times_asked() -> None:
    rate, state, stop = PROBLEMS["lotka"]
    times = np.linspace(0.5, stop, 20)
    other = integrate.solve_ivp(
        rate, (0.0, stop), state, method="DOP853", t_eval=times, rtol=1e-12, atol=1e-12
    )
    model = newel.Model(rate, start=0.0, stop=stop, state=state)
    run = newel.march(
        model, "prince-dormand-8-7", rel_tol=1e-10, abs_tol=1e-10, sinks=newel.sinks.Memory(at=times)
    )
    assert run.times.tolist() == times.tolist()
    np.testing.assert_allclose(run.states, other.y.T, atol=1e-7)


def test_event_times_agree() -> None:
    rate, state, stop = PROBLEMS["lotka"]

    def level(t: float, y: Any) -> float:
        return float(y[0] - 1.0)

    other = integrate.solve_ivp(
        rate, (0.0, stop), state, method="DOP853", events=level, rtol=1e-12, atol=1e-12
    )
    model = newel.Model(rate, start=0.0, stop=stop, state=state, events=[newel.StateEvent("level", level)])
    run = newel.march(model, "prince-dormand-8-7", rel_tol=1e-11, abs_tol=1e-11)
    # SciPy's first event is the start itself, where the level is zero: newel does not arm that one.
    theirs = [t for t in other.t_events[0] if t > 1e-6]
    assert [event.time for event in run.events] == pytest.approx(theirs, abs=1e-8)


def test_complex_states_agree() -> None:
    def rate(t: float, y: Any) -> Any:
        return (1j + 0.1 * t) * y * np.array([1.0, 2.0])

    state = [1.0 + 0.5j, -0.25j]
    other = integrate.solve_ivp(rate, (0.0, 3.0), state, method="RK45", rtol=1e-8, atol=1e-8)
    run = newel.march(
        newel.Model(rate, start=0.0, stop=3.0, state=state), "dormand-prince-5-4", rel_tol=1e-8, abs_tol=1e-8
    )
    np.testing.assert_allclose(run.last_state, other.y[:, -1], rtol=1e-5)
    exact = np.array(state) * np.exp((3j + 0.45) * np.array([1.0, 2.0]))
    np.testing.assert_allclose(run.last_state, exact, rtol=1e-6)
