"""`one_step`: the body of a home-made loop, in one line."""

from __future__ import annotations

import math
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from newel.catalogue.registry import default_registry
from newel.errors import BadModel, BadRequest
from newel.marching.arithmetic import own_sums_are_quiet
from newel.marching.pacing import exactly
from newel.models.model import Model
from newel.protocols import Array, Rate
from newel.stepping.numpy_step import NumpyStep
from newel.stepping.rate_call import RateCall

if TYPE_CHECKING:
    from newel.catalogue.registry import Registry
    from newel.methods.tableau import Tableau

__all__ = ["one_step"]


def one_step(
    rate: Rate,
    t: float,
    y: Any,
    step: float,
    method: str | Path | Tableau,
    params: Any = None,
    registry: Registry | None = None,
) -> tuple[Array, Array | None]:
    """Make one step of length `step` from (t, y) and return the new state and the error estimate.

    Args:
        rate: `rate(t, y)`, or `rate(t, y, params)` where `params` is given.
        t: time. y: the state, of any shape; it is not changed. step: signed, in time units.
        method: a slug, a Tableau, or a path that ends in `.toml`.
        params: passed on to `rate`, exactly when it is not None.
        registry: where the method is looked up; by default the usual one.

    Returns:
        The new state, and the estimate of its local error, both in the state's shape and units; None where
        the method has no embedded weights.

    Raises:
        BadModel: for a rate or a state that is not what a step needs, or a result that is not finite.
        BadRequest: for a step that is zero or not finite.
        UnknownMethod, NotProved: for a method that is not there or does not hold what it claims.

    Example:
        >>> state, error = one_step(lambda t, y: -y, 0.0, [1.0], 0.1, "kutta-4")
        >>> f"{state[0]:.7f}", error
        ('0.9048375', None)
    """
    tableau = (default_registry() if registry is None else registry).find(method)
    if not 0.0 < abs(float(step)) < math.inf:
        raise BadRequest(f"step={step!r}: must be finite and not zero, in time units", argument="step")
    model = Model(rate, start=t, stop=t + step, state=y, params=params)
    call = RateCall(model, params)
    pair = tableau.embedded_weights is not None
    engine = NumpyStep(tableau, call, model.state, estimate=pair, compensated=False)
    exact = model.state.dtype == object
    at, length = (exactly(t), exactly(step)) if exact else (model.start, float(step))
    call.first(at, engine.state, engine.rows[1])
    engine.evaluate, engine.fresh = call.evaluate, True
    with own_sums_are_quiet():
        engine.attempt(at, length)
    if not engine.new_is_finite():
        raise BadModel(f"the step from t = {t!r} of length {step!r} gave a state that is not finite")
    error = engine.error_and_scale(0.0, np.ones(1))[0] if pair else None
    return engine.new.copy(), error
