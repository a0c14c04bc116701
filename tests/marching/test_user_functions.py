"""When the model's own functions are called, with what, and what they may change."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest

import newel
from newel.errors import BadModel

pytestmark = pytest.mark.core

METHODS = ("euler-1", "kutta-4", "dormand-prince-5-4", "bogacki-shampine-3-2")


def march(
    method: str = "kutta-4", rate: Any = lambda t, y: -y, state: Any = (1.0,), **more: Any
) -> newel.Run:
    rule = more.pop("rule", {"step": 0.25})
    return newel.march(newel.Model(rate, start=0.0, stop=1.0, state=state, **more), method, **rule)


@pytest.mark.parametrize("method", METHODS)
def test_after_step_sees_each_accepted_state_once(method: str) -> None:
    seen: list[tuple[float, float]] = []

    def after(t: float, y: Any) -> None:
        assert not y.flags.writeable
        seen.append((t, float(y[0])))

    for rule in ({"step": 0.25}, {"rel_tol": 1e-4, "abs_tol": 1e-4}):
        seen.clear()
        run = march(method, after_step=after, rule=rule)
        assert seen == list(zip(run.times[1:].tolist(), run.states[1:, 0].tolist(), strict=True))


@pytest.mark.parametrize("method", METHODS)
def test_a_state_that_after_step_returns_is_kept_and_evaluated_anew(method: str) -> None:
    """Clipped at 0.5 the rate is that at 0.5, in first-same-as-last methods too."""
    run = march(
        method, rate=lambda t, y: 1.0 + 0 * y, state=[0.0], after_step=lambda t, y: np.minimum(y, 0.5)
    )
    assert run.states[:, 0] == pytest.approx([0.0, 0.25, 0.5, 0.5, 0.5])
    seen: list[float] = []

    def rate(t: float, y: Any) -> Any:
        seen.append(float(y[0]))
        return 0 * y

    march(method, rate=rate, after_step=lambda t, y: y + 1.0)
    assert {1.0, 2.0, 3.0, 4.0} <= set(seen)
    assert sorted(seen) == seen


@pytest.mark.parametrize("method", METHODS)
def test_params_that_after_step_writes_to_act_from_the_next_step_on(method: str) -> None:
    """The rate 1, 2, 4, 8 in four steps of 1/4: the end is 15/4, whichever method remembers its last rate."""

    def after(t: float, y: Any, p: Any) -> None:
        p["k"] *= 2.0

    params = {"k": 1.0}
    model = newel.Model(
        lambda t, y, p: [p["k"]], start=0.0, stop=1.0, state=[0.0], params=params, after_step=after
    )
    for _ in range(2):
        run = newel.march(model, method, step=0.25)
        assert run.last_state[0] == pytest.approx(15 / 4)
    assert params == model.params == {"k": 1.0}


@pytest.mark.parametrize("method", METHODS)
def test_after_stage_sees_every_stage_state_and_the_new_state(method: str) -> None:
    tableau = newel.Registry(plugins=False).find(method)
    seen: list[float] = []

    def after(t: float, y: Any) -> None:
        assert not y.flags.writeable
        seen.append(t)

    march(method, after_stage=after, rule={"step": 1.0})
    nodes = [float(c) for c in tableau.nodes[1:]]
    assert seen == pytest.approx(nodes if tableau.first_same_as_last else [*nodes, 1.0])


@pytest.mark.parametrize("method", METHODS)
def test_a_state_that_after_stage_returns_is_what_the_rate_sees(method: str) -> None:
    seen: list[float] = []

    def rate(t: float, y: Any) -> Any:
        seen.append(float(y[0]))
        return [5.0]

    run = march(method, rate=rate, state=[0.0], after_stage=lambda t, y: np.minimum(y, 0.5))
    assert max(seen) == 0.5
    assert run.last_state[0] == 0.5


def test_a_stage_state_that_is_changed_is_so_before_it_is_judged() -> None:
    """The projection keeps the state within, though the bare step would leave it."""
    run = march(
        "dormand-prince-5-4",
        rate=lambda t, y: [5.0],
        state=[0.0],
        within=(0.0, 0.5),
        after_stage=lambda t, y: np.minimum(y, 0.5),
        rule={"rel_tol": 1e-3, "abs_tol": 1e3},
    )
    assert run.rejected == 0
    assert run.last_state[0] == 0.5


@pytest.mark.parametrize("name", ["after_step", "after_stage"])
@pytest.mark.parametrize(
    ("given", "words"),
    [
        (np.zeros(2), r"returned shape \(2,\), and the state has shape \(1,\)"),
        ([1j], "dtype complex128, and the .*state has dtype float64"),
        (["high"], "dtype <U4"),
    ],
)
def test_what_does_not_fit_the_state_is_named(name: str, given: Any, words: str) -> None:
    with pytest.raises((BadModel, newel.MarchFailed), match=f"{name} .*{words}"):
        march(**{name: lambda t, y: given})


def test_a_state_that_after_step_makes_no_number_is_named_at_once() -> None:
    with pytest.raises(
        newel.MarchFailed, match=r"after_step returned a state that is not finite at t = 0\.5"
    ) as caught:
        march(after_step=lambda t, y: [math.nan] if t == 0.5 else None)
    assert np.isfinite(caught.value.run.states).all()


def test_a_fixed_step_that_leaves_within_ends_the_march_with_the_entry() -> None:
    with pytest.raises(
        newel.MarchFailed, match=r"'v' = 3 leaves within at t = 0\.5 \(entry 2 of 2\)"
    ) as caught:
        march(rate=lambda t, y: [0.0, 4.0], state=[0.0, 1.0], labels=("x", "v"), within=(-5.0, [1.0, 2.5]))
    assert caught.value.reason == "within"
    assert caught.value.run.times.tolist() == [0.0, 0.25]
    with pytest.raises(BadModel, match="outside within"):
        march(within=(2.0, 3.0))


def test_the_user_is_told_which_of_the_functions_raised_and_where() -> None:
    def odd(t: float, *rest: Any) -> Any:
        raise KeyError("table")

    for name in ("after_step", "after_stage", "within"):
        with pytest.raises(
            newel.MarchFailed, match=rf"{name} raised KeyError: 'table' \(test_user_functions\.py:\d+\)"
        ):
            march(**{name: odd})
    with pytest.raises(newel.MarchFailed, match="rate raised KeyError"):
        march(rate=odd)


def test_a_compiled_rate_that_raises_is_named_at_any_stage() -> None:
    """It leaves no frame of its own."""
    for method in METHODS:
        for start, kept in ((0.0, 0), (1.0, 2)):
            powers = newel.Model(math.pow, start=start, stop=start - 3.0, state=-0.25)
            with pytest.raises(
                newel.MarchFailed, match=r"rate raised ValueError: math domain error \(pow\)"
            ) as caught:
                newel.march(powers, method, step=0.5)
            assert caught.value.run.accepted in (kept, max(kept - 1, 0))


def test_floating_point_warnings_are_the_users_own_and_none_of_newels() -> None:
    """Overflow in the engine's sums is a rejection; in the rate it is what NumPy makes of it."""
    run = newel.march(
        newel.Model(lambda t, y: np.array([1e308]), start=0.0, stop=1.0, state=[-1.7e308]),
        "dormand-prince-5-4",
        steps=newel.Adaptive(rel_tol=1e-3, abs_tol=1e-3, first=1.0),
    )
    assert np.isfinite(run.states).all()

    def rate(t: float, y: Any) -> Any:
        return 0 * y + 1.0 / (1.0 + np.exp(y * 0 + 1000.0))

    with pytest.warns(RuntimeWarning, match="overflow encountered"):
        march(rate=rate, rule={"step": 1.0})
    with np.errstate(over="raise"), pytest.raises(newel.MarchFailed, match="rate raised FloatingPointError"):
        march(rate=rate)
    with np.errstate(over="ignore"):
        march(rate=rate)


def test_numpys_settings_are_what_they_were_after_a_march() -> None:
    before, call = np.geterr(), np.geterrcall()
    march()
    with pytest.raises(newel.MarchFailed):
        march(rate=lambda t, y: 1 / 0)
    assert (np.geterr(), np.geterrcall()) == (before, call)
