"""A field of a million cells in single precision, in place, on a machine that cannot keep every step.

Diffusion on a ring. The discrete equation has an exact solution: a wave of n periods decays with the rate
4 D sin²(π n / N), with D in cells² per unit of time (from the eigenvalues of the second difference).
"""

import math

import numpy as np
import pytest

import newel

pytestmark = pytest.mark.core

CELLS, PERIODS, DIFFUSIVITY = 1_000_000, 100_000, 0.9
STEP, STOP = 0.125, 1.0


def diffuse(t, y, out):
    np.multiply(y, np.float32(-2.0), out=out)
    out[1:] += y[:-1]
    out[:-1] += y[1:]
    out[0] += y[-1]
    out[-1] += y[0]
    out *= np.float32(DIFFUSIVITY)


@pytest.fixture(scope="module")
def field():
    place = 2.0 * math.pi * PERIODS / CELLS * np.arange(CELLS)
    start = (1.0 + 0.5 * np.sin(place)).astype(np.float32)
    return newel.Model(diffuse, start=0.0, stop=STOP, state=start, in_place=True)


def test_the_field_is_marched_and_watched_without_being_kept(field):
    seen = []

    def look(t, y):
        seen.append((t, y.dtype, float(y.mean(dtype=float))))

    watch = newel.sinks.Call(look, every_steps=4)
    run = newel.march(field, "kutta-4", step=STEP, sinks=watch)
    assert [t for t, _, _ in seen] == [0.0, 0.5, 1.0]
    assert {dtype for _, dtype, _ in seen} == {np.dtype(np.float32)}
    assert run.last_state.dtype == np.float32

    # What is in the ring stays in it, to the rounding of single precision.
    assert [mean for _, _, mean in seen] == pytest.approx([1.0] * 3, abs=1e-7)

    # The wave has decayed as it must.
    decay = math.exp(-4.0 * DIFFUSIVITY * math.sin(math.pi * PERIODS / CELLS) ** 2 * STOP)
    exact = 1.0 + decay * (field.state.astype(float) - 1.0)
    assert np.abs(run.last_state - exact).max() < 5e-7

    with pytest.raises(newel.errors.NotKept, match="kept no states"):
        _ = run.states


def test_a_march_that_would_not_fit_is_refused_before_it_costs_anything(field):
    calls = []

    def counted(t, y, out):
        calls.append(t)
        diffuse(t, y, out)

    model = newel.Model(counted, start=0.0, stop=STOP, state=field.state, in_place=True)
    with pytest.raises(newel.errors.BadRequest, match="9 rows of 1,000,000 float32 need 34 MiB"):
        newel.march(model, "kutta-4", step=STEP, sinks=newel.sinks.Memory(limit=20e6))
    assert calls == []


def test_rows_that_are_thinned_do_fit(field):
    memory = newel.sinks.Memory(limit=20e6, every_steps=4)
    run = newel.march(field, "kutta-4", step=STEP, sinks=memory)
    assert run.times.tolist() == [0.0, 0.5, 1.0]
    assert run.states.shape == (3, CELLS)
    assert run.states.dtype == np.float32
