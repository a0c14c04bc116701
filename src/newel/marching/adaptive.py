"""One accepted step under error control: proposed, judged, shortened until it holds."""

from __future__ import annotations

import logging
import math
from typing import TYPE_CHECKING, Any

from newel.marching.failures import CannotGoOn, not_finite, outside
from newel.stepping.rate_call import where_defined
from newel.stepping.switching.spacing import spacing

if TYPE_CHECKING:
    from newel.marching.loop import Loop

__all__ = ["FEWEST_SPACINGS", "adaptive_step"]

log = logging.getLogger("newel")

FEWEST_SPACINGS = 4.0
"""A step below so many spacings of t is no step."""

# Measured and common practice: a stage that is no number, or a state outside its limits, quarters the step.
_QUARTER, _MOST_QUARTERINGS = 0.25, 10
_STRETCH = 1.01
_INFINITY = math.inf


def adaptive_step(loop: Loop, landing: float | None) -> tuple[float, float]:
    """Attempt steps until one is accepted; return the time where it ends and its signed length.

    The march lands on the next place that it may not cross, or on `landing` where that is nearer: the last
    step is stretched by up to 1 %, and what remains is split in two where it is under two steps.

    Raises:
        CannotGoOn: where no step is small enough.
    """
    controller, step, time = loop.controller, loop.step, loop.time
    assert controller is not None
    assert loop.limits is not None
    rel_tol, ratio, norm, smallest, largest = loop.limits
    wall = loop.wall
    if landing is not None and (landing - wall) * loop.direction < 0:
        wall = landing
    remaining = (wall - time) * loop.direction
    quarterings, rejected_here, error, h = 0, 0, math.nan, 0.0
    while True:
        wanted = length = loop.next_step
        lands = wanted * _STRETCH >= remaining
        if lands:
            length = remaining
        elif 2.0 * wanted > remaining:
            length = 0.5 * remaining
        ahead = wall if lands else time + length * loop.direction
        if not lands and (wanted < smallest or wanted < FEWEST_SPACINGS * spacing(time)):
            raise _no_way(loop, error, h, quarterings) if quarterings else _underflow(loop, rejected_here)
        h = ahead - time
        step.attempt(time, h, loop.ceiling(ahead) if lands or loop.reach > 1 else None)
        error = step.error_norm(rel_tol, ratio, norm)
        if not error < _INFINITY or (loop.has_within and not loop.inside(ahead, step.new)):
            quarterings += 1
            loop.rejected += 1
            log.debug("rejected at t = %r: step %r, not finite or not within", time, length)
            if quarterings == _MOST_QUARTERINGS:
                raise _no_way(loop, error, h, quarterings)
            loop.next_step = length * _QUARTER
            continue
        accepted, factor, memory = controller.decide(error, length, loop.order, loop.memory)
        if not 0.0 < factor < (_INFINITY if accepted else 1.0):
            raise _bad_factor(loop, accepted, factor)
        if accepted:
            break
        loop.memory = memory
        loop.rejected += 1
        rejected_here += 1
        log.debug("rejected at t = %r: step %r, error norm %r", time, length, error)
        loop.next_step = length * float(factor)
    following = length * float(factor)
    cut = length < wanted and not rejected_here and not quarterings
    if cut and error ** (1.0 / loop.order) * (wanted / length) <= 1.0:
        # Cut to land, and its error allows for what was wanted: that stands, and the cut is forgotten.
        following = max(following, wanted)
    else:
        loop.memory = memory
    loop.next_step = min(following, largest)
    return ahead, h


def _bad_factor(loop: Loop, accepted: bool, factor: Any) -> CannotGoOn:
    assert loop.controller is not None
    verdict = "accepted" if accepted else "rejected"
    return CannotGoOn(
        "controller",
        f"controller {loop.controller.name!r} {verdict} the step at t = {loop.time!r} with factor {factor!r}",
        "  A factor is positive and finite, and below 1 where the step is rejected.",
    )


def _no_way(loop: Loop, error: float, h: float, quarterings: int) -> CannotGoOn:
    often = "once" if quarterings == 1 else f"{quarterings} times"
    words = f"  The step was quartered {often}.  {where_defined(loop.model.rate)}"
    if error < math.inf:
        return CannotGoOn("within", outside(loop.model, loop.step.new, loop.time + h), words)
    return CannotGoOn("not finite", not_finite(loop.step, loop.model, loop.time, h), words)


def _underflow(loop: Loop, rejected: int) -> CannotGoOn:
    smallest = 0.0 if loop.limits is None else loop.limits.smallest
    least = max(smallest, FEWEST_SPACINGS * spacing(loop.time))
    bound = "smallest" if least == smallest else "four spacings of t"
    return CannotGoOn(
        "underflow",
        f"the step at t = {loop.time!r} would have to be {loop.next_step:.3g}, below {bound} ({least:.3g}), "
        f"after {rejected} rejections there",
        "  A jump or kink of the rate that is no declared break, a singularity, or a tolerance below the "
        "model's own noise does this.",
    )
