"""Step controllers as data: one digital filter, and the published coefficient sets.

With the error norm r (1 is the tolerance), k one more than the lower order of the pair, and steps h:

    h_new = safety · h_n · r_n^(−β1/k) · r_(n−1)^(−β2/k) · r_(n−2)^(−β3/k)
                  · (h_n/h_(n−1))^(−α2) · (h_(n−1)/h_(n−2))^(−α3)

Source: G. Söderlind, "Digital filters in adaptive time-stepping", ACM Transactions on Mathematical Software
29 (2003) 1–26; the proportional–integral set is that of K. Gustafsson, ACM Transactions on Mathematical
Software 17 (1991) 533–554.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable
from functools import partial

import attrs

from newel.errors import BadRequest
from newel.protocols import ControllerMemory

__all__ = [
    "NAMED",
    "FilterController",
    "elementary",
    "gustafsson_pi",
    "soderlind_h211b",
    "soderlind_h312b",
]

# What is remembered of a tiny error, so that one lucky step does not throttle the next; common practice.
_LEAST_REMEMBERED = 1e-4
# A rejected step is shortened even where its error was above 1 by a rounding and nothing is kept for safety.
_LARGEST_AFTER_REJECTION = 0.99


def _three(values: Iterable[float]) -> tuple[float, ...]:
    given = tuple(float(v) for v in values)
    return given + (0.0,) * (3 - len(given))


def _two(values: Iterable[float]) -> tuple[float, ...]:
    given = tuple(float(v) for v in values)
    return given + (0.0,) * (2 - len(given))


@attrs.frozen
class FilterController:
    """A digital filter that turns error norms into step lengths. All numbers are unitless.

    Args:
        name: the name shown in a run's settings.
        errors: β1, β2, β3, the exponents (times k) of the last, last but one and last but two error norm.
        steps: α2, α3, the exponents of the last two step ratios.
        safety: multiplies every factor.
        smallest, largest: the bounds of the factor.
        limiter: "clip" cuts the factor off at the bounds; "arctangent" bends it smoothly as
            1 + arctan(factor − 1), after G. Söderlind and L. Wang, Journal of Computational and Applied
            Mathematics 185 (2006) 225–243, and then clips.
        growth_after_rejection: the largest factor on the first accepted step after a rejection.

    Raises:
        BadRequest: where a number is out of range.

    Example:
        >>> pi = gustafsson_pi(safety=0.8)
        >>> accepted, factor, memory = pi.decide(1.0, 0.1, 5, pi.start())
        >>> accepted, factor
        (True, 0.8)
    """

    name: str
    errors: tuple[float, ...] = attrs.field(converter=_three)
    steps: tuple[float, ...] = attrs.field(default=(), converter=_two)
    safety: float = attrs.field(default=0.9, kw_only=True)
    smallest: float = attrs.field(default=0.2, kw_only=True)
    largest: float = attrs.field(default=5.0, kw_only=True)
    limiter: str = attrs.field(default="clip", kw_only=True)
    growth_after_rejection: float = attrs.field(default=1.0, kw_only=True)

    def __attrs_post_init__(self) -> None:
        """Refuse numbers with which no march could go on."""
        if len(self.errors) != 3 or len(self.steps) != 2:
            raise BadRequest("a filter has at most 3 error exponents and 2 step exponents", argument="errors")
        checks = (
            ("safety", self.safety, 0.0 < self.safety <= 1.0, "above 0 and at most 1"),
            ("smallest", self.smallest, 0.0 < self.smallest < 1.0, "between 0 and 1"),
            ("largest", self.largest, 1.0 < self.largest < math.inf, "above 1 and finite"),
            (
                "growth_after_rejection",
                self.growth_after_rejection,
                1.0 <= self.growth_after_rejection <= self.largest,
                "from 1 to `largest`",
            ),
            (
                "limiter",
                self.limiter,
                self.limiter in ("clip", "arctangent"),
                'one of "clip", "arctangent"',
            ),
        )
        for name, value, good, allowed in checks:
            if not good:
                raise BadRequest(
                    f"{name}={value!r} of controller {self.name}: must be {allowed}", argument=name
                )

    def start(self) -> ControllerMemory:
        """Return an empty memory: no errors, no steps, no rejection behind."""
        return ()

    def decide(
        self, error: float, step: float, order: int, memory: ControllerMemory
    ) -> tuple[bool, float, ControllerMemory]:
        """Judge one attempted step; see `newel.protocols.Controller`.

        A rejected step is followed by the elementary factor, its error is not remembered, and the next
        accepted step does not grow beyond `growth_after_rejection`.
        """
        if error > 1.0:
            factor = self.safety * error ** (-1.0 / order)
            factor = min(max(factor, self.smallest), _LARGEST_AFTER_REJECTION)
            if memory:
                return False, factor, (*memory[:4], 1.0)
            return False, factor, (0.0, 0.0, 0.0, 0.0, 1.0)
        remembered = error if error > _LEAST_REMEMBERED else _LEAST_REMEMBERED
        if not memory or memory[0] == 0.0:
            # The first error since the start: nothing to filter with yet.
            factor = self.safety * remembered ** (-1.0 / order)
            rejected = bool(memory)
            memory = (remembered, 1.0, step, step, 0.0)
        else:
            last, last_but_one, step_before, step_before_that, rejection = memory
            b1, b2, b3 = self.errors
            factor = self.safety * (remembered**b1 * last**b2) ** (-1.0 / order)
            if b3:
                factor *= last_but_one ** (-b3 / order)
            a2, a3 = self.steps
            if a2:
                factor *= (step / step_before) ** -a2
            if a3:
                factor *= (step_before / step_before_that) ** -a3
            rejected = rejection != 0.0
            memory = (remembered, last, step, step_before, 0.0)
        if self.limiter == "arctangent":
            factor = 1.0 + math.atan(factor - 1.0)
        ceiling = self.growth_after_rejection if rejected else self.largest
        if factor > ceiling:
            factor = ceiling
        elif factor < self.smallest:
            factor = self.smallest
        return True, factor, memory


def soderlind_h211b(b: float = 4.0, **limits: float) -> FilterController:
    """Return Söderlind's smoothing filter H211b; `b` from 2 (fast) to 8 (smooth), unitless."""
    if not 1.0 < b < math.inf:
        raise BadRequest(
            f"b={b!r} of controller soderlind-h211b: must be above 1; 2 to 8 is usual", argument="b"
        )
    return _made("soderlind-h211b", (1 / b, 1 / b), (1 / b,))(**limits)


def soderlind_h312b(b: float = 8.0, **limits: float) -> FilterController:
    """Return Söderlind's second-order smoothing filter H312b; `b` from 4 to 16, unitless."""
    if not 1.0 < b < math.inf:
        raise BadRequest(f"b={b!r} of controller soderlind-h312b: must be above 1; 8 is usual", argument="b")
    return _made("soderlind-h312b", (1 / b, 2 / b, 1 / b), (3 / b, 1 / b))(**limits)


def _made(
    name: str, errors: tuple[float, ...], steps: tuple[float, ...] = (), safety: float = 0.9
) -> Callable[..., FilterController]:
    return partial(FilterController, name, errors, steps, safety=safety)


elementary = _made("elementary", (1.0,))
gustafsson_pi = _made("gustafsson-pi", (0.7, -0.4))
soderlind_pi_3_3 = _made("soderlind-pi-3-3", (2 / 3, -1 / 3))
soderlind_pi_4_2 = _made("soderlind-pi-4-2", (0.6, -0.2))
soderlind_h211_pi = _made("soderlind-h211-pi", (1 / 6, 1 / 6))
soderlind_h0211 = _made("soderlind-h0211", (0.5, 0.5), (0.5,))
soderlind_h0220 = _made("soderlind-h0220", (2.0, -1.0), (-1.0,))
soderlind_h0330 = _made("soderlind-h0330", (3.0, -3.0, 1.0), (-2.0, 1.0))
soderlind_h0312 = _made("soderlind-h0312", (0.25, 0.5, 0.25), (0.75, 0.25))
soderlind_h312_pid = _made("soderlind-h312-pid", (1 / 18, 1 / 9, 1 / 18))
soderlind_h0321 = _made("soderlind-h0321", (1.25, 0.5, -0.75), (-0.25, -0.75))
# The exponents of this set sum to 1/9: with 0.9 for safety it would settle at an error of 0.9**(9·k).
soderlind_h321 = _made("soderlind-h321", (1 / 3, 1 / 18, -5 / 18), (-5 / 6, -1 / 6), safety=0.9 ** (1 / 9))

NAMED: dict[str, Callable[..., FilterController]] = {
    made().name: made
    for made in (
        elementary,
        gustafsson_pi,
        soderlind_pi_3_3,
        soderlind_pi_4_2,
        soderlind_h211_pi,
        soderlind_h211b,
        soderlind_h0211,
        soderlind_h0220,
        soderlind_h0330,
        soderlind_h0312,
        soderlind_h312b,
        soderlind_h312_pid,
        soderlind_h0321,
        soderlind_h321,
    )
}
"""Every shipped controller by name; a value is called with limits by keyword and gives the controller."""
