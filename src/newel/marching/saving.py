"""What a march needs to go on from a place to the bit."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import attrs

from newel.errors import BadRequest
from newel.models.intake import copy_params
from newel.protocols import Array, ControllerMemory
from newel.results.run import EventRecord, Note

if TYPE_CHECKING:
    from newel.marching.loop import Loop

__all__ = ["Saved", "restore", "save"]


@attrs.frozen(eq=False)
class Saved:
    """All that a loop needs to go on from here to the bit."""

    time: Any
    state: Array
    rate: Array | None
    carry: Array | None
    next_step: float
    last_step: Any
    memory: ControllerMemory
    pace: Any
    signs: tuple[int, ...]
    break_index: int
    floor: Any
    params: Any
    counters: tuple[int, int, int]
    events: tuple[EventRecord, ...]
    notes: tuple[Note, ...]
    ended_by: str | None
    crowded: int


def save(loop: Loop) -> Saved:
    """Return all that is needed to go on from here to the bit."""
    step = loop.step
    return Saved(
        time=loop.time,
        state=step.slab[0].copy(),
        rate=step.slab[1].copy() if step.fresh else None,
        carry=step.carry.copy() if step.compensated else None,
        next_step=loop.next_step,
        last_step=loop.last_step,
        memory=loop.memory,
        pace=loop.pace.save(),
        signs=tuple(loop.crossings.signs),
        break_index=loop.break_index,
        floor=step.floor,
        params=copy_params(loop.params)[0],
        counters=(loop.accepted, loop.rejected, step.calls),
        events=tuple(loop.events),
        notes=tuple(loop.notes),
        ended_by=loop.ended_by,
        crowded=loop.switches.here,
    )


def restore(loop: Loop, saved: Saved) -> None:
    """Go back to what `save` returned; counters and events go back with it.

    Raises:
        BadRequest: for what is not a saved place of a march of this state.
    """
    step = loop.step
    fits = isinstance(saved, Saved) and (saved.state.shape, saved.state.dtype) == (
        step.slab[0].shape,
        step.dtype,
    )
    if not fits:
        raise BadRequest(
            "this is not a place that a stepper of this model saved\n"
            "  Give what save() of the same stepper, or of one with the same arguments, returned.",
            argument="saved",
        )
    step.put(saved.state, saved.rate, saved.carry)
    step.floor = saved.floor
    loop.take_params(copy_params(saved.params)[0])
    loop.time, loop.next_step, loop.last_step = saved.time, saved.next_step, saved.last_step
    loop.memory, loop.break_index = saved.memory, saved.break_index
    loop.wall = loop.break_ahead()
    loop.pace.restore(saved.pace)
    loop.crossings.signs = list(saved.signs)
    loop.accepted, loop.rejected, step.calls = saved.counters
    loop.ended_by, loop.switches.here = saved.ended_by, saved.crowded
    loop.events[:], loop.notes[:] = saved.events, saved.notes
