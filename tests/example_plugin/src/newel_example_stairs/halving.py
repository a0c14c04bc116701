"""A controller whose step lengths stay the first one times a power of two."""

import attrs

from newel.protocols import ControllerMemory


@attrs.frozen
class Halving:
    """Halve a step that failed; double one whose double would still pass with room to spare.

    Args:
        room: the share of the tolerance that a doubled step may be expected to use, from 0 to 1 (unitless).

    Example:
        >>> Halving().decide(error=2.0, step=0.1, order=3, memory=())
        (False, 0.5, ())
    """

    room: float = 0.5

    @property
    def name(self) -> str:
        """The name under which newel knows it."""
        return "halving"

    def start(self) -> ControllerMemory:
        """Nothing is remembered from step to step."""
        return ()

    def decide(
        self, error: float, step: float, order: int, memory: ControllerMemory
    ) -> tuple[bool, float, ControllerMemory]:
        """Judge one step: its error grows like step**order."""
        if error > 1.0:
            return False, 0.5, memory
        return True, (2.0 if error * 2.0**order <= self.room else 1.0), memory
