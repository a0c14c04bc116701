"""One step of any explicit method, on NumPy.

The slab is one array of s+1 rows: row 0 the state, rows 1..s the stage rates. Once per attempt the
coefficients are multiplied by h into a work matrix whose first column stays 1, so that each stage state is
one product of a row with a prefix of the slab, written in place. Rows, prefixes and buffers are views made
once; a stage never reads a row that this attempt has not yet written. What follows the products (error norm,
compensation) goes over wide states in pieces that stay in the processor's cache.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from fractions import Fraction
from typing import TYPE_CHECKING, Any

import numpy as np

from newel.errors import BadModel, BadRequest
from newel.protocols import Array, Norm

if TYPE_CHECKING:
    from newel.methods.exact import Exact
    from newel.methods.tableau import Tableau
    from newel.stepping.rate_call import RateCall

__all__ = ["NumpyStep", "coefficient_array"]

# Bytes of one vector that are worked on at a time: several of them fit into a second-level cache.
_PIECE = 65_536

_abs, _add, _divide, _maximum = np.abs, np.add, np.divide, np.maximum


def _read_only(array: Array, shape: tuple[int, ...]) -> Array:
    view = array.reshape(shape).view()
    view.flags.writeable = False
    return view


def coefficient_array(rows: list[list[Exact]], dtype: np.dtype[Any]) -> Array:
    """Return exact coefficients as an array (unitless) of the dtype that states of `dtype` are combined with.

    Raises:
        BadRequest: for object states where a coefficient is no fraction.
    """
    if dtype == np.dtype(object):
        if any(entry.surd for row in rows for entry in row):
            raise BadRequest(
                "this method has coefficients with square roots, which object states cannot take\n"
                "  Choose a method with rational coefficients, or a state of dtype longdouble.",
                argument="method",
            )
        return np.array([[Fraction(entry.rational) for entry in row] for row in rows], dtype=object)
    if dtype == np.dtype(np.longdouble):
        ld = np.longdouble
        table = [
            [
                ld(str(e.rational.numerator)) / ld(str(e.rational.denominator))
                + ld(str(e.surd.numerator)) / ld(str(e.surd.denominator)) * np.sqrt(ld(e.radicand))
                for e in row
            ]
            for row in rows
        ]
        return np.array(table, dtype=ld)
    return np.array([[float(entry) for entry in row] for row in rows], dtype=dtype)


_Nodes = tuple[Any, ...]
_TABLES: dict[tuple[str, str, bool], tuple[Array, _Nodes]] = {}
_MOST_TABLES = 64


def _table(tableau: Tableau, dtype: np.dtype[Any], estimate: bool) -> tuple[Array, _Nodes]:
    """Return rows of matrix, weights and, where wanted, weights less embedded weights, and the nodes.

    The last few are remembered by digest: turning exact numbers into floats takes longer than a step.
    """
    key = tableau.digest, dtype.char, estimate
    found = _TABLES.get(key)
    if found is not None:
        return found
    rows = [list(row) for row in tableau.matrix] + [list(tableau.weights)]
    if estimate:
        embedded = tableau.embedded_weights
        assert embedded is not None, "the march asks for an estimate only of a pair"
        rows.append([w - e for w, e in zip(tableau.weights, embedded, strict=True)])
    # Columns first, so that all but the first column of the work matrix is one run of memory.
    base = np.asfortranarray(coefficient_array(rows, dtype))
    kind: Any = (lambda c: Fraction(c.rational)) if dtype == np.dtype(object) else float
    if len(_TABLES) >= _MOST_TABLES:
        _TABLES.clear()
    _TABLES[key] = base, tuple(kind(c) for c in tableau.nodes)
    return _TABLES[key]


class NumpyStep:
    """Makes steps of one tableau for one state.

    Args:
        tableau: the method; its nodes, matrix, weights and, for `estimate`, embedded weights are used.
        rate: the bound rate; its shape and dtype are the state's.
        state: the state to start from, shape and dtype of the model; copied.
        estimate: whether an error estimate is wanted.
        compensated: whether the state is summed with Kahan's compensation (W. Kahan, Communications of the
            ACM 8 (1965) 40), which keeps what is lost below the last place of the state from step to step.
        after_stage: `after_stage(t, y)` sees each stage state and the new state; an array replaces it.

    Attributes:
        state, new: read-only views of the state before and after the step, in the state's shape.
        has_estimate: whether an error estimate is made. fresh: whether row 1 holds the rate at `state`.
        calls: how often the rate was called. floor: just beyond a break, where the step starts on one: no
        stage is evaluated before it; gone once the step is accepted.
    """

    def __init__(
        self,
        tableau: Tableau,
        rate: RateCall,
        state: Array,
        *,
        estimate: bool,
        compensated: bool,
        after_stage: Callable[[Any, Array], Any] | None = None,
    ) -> None:
        shape, dtype, size = state.shape, state.dtype, state.size
        s = self.stages = tableau.stages
        self.rate, self.shape, self.dtype, self.after_stage = rate, shape, dtype, after_stage
        self.evaluate = rate.evaluate
        self.first_same_as_last = bool(tableau.first_same_as_last)
        self.calls, self.fresh, self.has_estimate, self.count = 0, False, estimate, size
        self.compensated = compensated and dtype != np.dtype(object)
        self.sizes_known = self.sizes_made = False
        self.floor: Any = None
        self.base, self.nodes = _table(tableau, dtype, estimate)
        self.work = np.ones((len(self.base), s + 1), dtype=dtype, order="F")
        self.scaled = self.work[:, 1:]
        self.step_of_work: Any = None

        self.slab = np.zeros((s + 1, size), dtype=dtype)
        self.stage, self.new_flat = np.zeros(size, dtype=dtype), np.zeros(size, dtype=dtype)
        self.slab_first, self.rate_first, self.rate_last = self.slab[0], self.slab[1], self.slab[s]
        self.state = _read_only(self.slab[0], shape)
        self.new = _read_only(self.new_flat, shape)
        self.rows = [self.slab[i].reshape(shape) for i in range(s + 1)]
        self._views(size, dtype)
        self.load(state)

    def _views(self, size: int, dtype: np.dtype[Any]) -> None:
        """Make every view and buffer that the step loop uses."""
        s, slab = self.stages, self.slab
        stage_view = _read_only(self.stage, self.shape)
        self.plan = []
        for i in range(1, s):
            last = self.first_same_as_last and i == s - 1
            out, view = (self.new_flat, self.new) if last else (self.stage, stage_view)
            dot = self.work[i, : i + 1].dot
            self.plan.append((dot, slab[: i + 1], out, self.nodes[i], view, self.rows[i + 1]))
        # The last stage of a first-same-as-last method is not yet there when the new state is formed.
        known = s - 1 if self.first_same_as_last else s
        self.final_dot, self.final_prefix = self.work[s, : known + 1].dot, slab[: known + 1]
        self.increment_dot, self.increment_rates = self.work[s, 1 : known + 1].dot, slab[1 : known + 1]
        self.plain = self.after_stage is None and not (self.compensated and self.first_same_as_last)
        length = max(1, min(size, _PIECE // dtype.itemsize))
        self.cuts = [slice(a, min(a + length, size)) for a in range(0, size, length)]
        self.zeros = np.zeros(length, dtype=dtype)
        if self.compensated:
            self.carry, self.next_carry = np.zeros(size, dtype=dtype), np.zeros(size, dtype=dtype)
        if self.has_estimate:
            self._error_views(size, length, dtype)

    def _error_views(self, size: int, length: int, dtype: np.dtype[Any]) -> None:
        real = np.zeros(0, dtype=dtype).real.dtype
        self.quotient = np.zeros(length, dtype=np.float64 if real == np.dtype(np.float32) else real)
        self.scale, self.real_zeros = np.zeros(length, dtype=real), np.zeros(length, dtype=real)
        # The stage's buffer is free once the stages are done: the error estimate goes there.
        self.error_dot, self.error_rates = self.work[self.stages + 1, 1:].dot, self.slab[1:]
        self.size_before, self.size_after = np.zeros(size, dtype=real), np.zeros(size, dtype=real)
        self.one_piece = len(self.cuts) == 1 and dtype.kind != "c"
        self.square, self.finiteness = self.quotient.dot, self.scale.dot

    def load(self, state: Array) -> None:
        """Start anew from this state, shape and dtype as at first; the rate at it is not known yet."""
        self.put(state, None, None)

    def put(self, state: Array, rate: Array | None, carry: Array | None) -> None:
        """Take a state with the rate at it and what the compensated sum carries, where they are known."""
        self.slab[0] = state.reshape(-1)
        self.fresh, self.sizes_known = rate is not None, False
        if rate is not None:
            self.slab[1] = rate
        if self.compensated:
            self.carry[:] = 0 if carry is None else carry

    def begin(self, t: Any) -> None:
        """Evaluate the rate at the state, unless it is there already."""
        if not self.fresh:
            self.evaluate(t if self.floor is None else self.floor, self.state, self.rows[1])
            self.calls += 1
            self.fresh = True

    def attempt(self, t: Any, h: Any, ceiling: Any = None) -> None:
        """Fill the slab and `new` with a step of length h (signed) from t; the state stays as it is.

        `ceiling`: no stage is evaluated beyond it, in the direction of h: the last time before a break.
        """
        if h != self.step_of_work:
            np.multiply(self.base, h, self.scaled)
            self.step_of_work = h
        if not self.fresh:
            self.begin(t)
        self.sizes_made = False
        if self.plain and ceiling is None and self.floor is None:
            self._plain_stages(t, h)
        else:
            self._careful_stages(t, h, ceiling)
        self.calls += self.stages - 1
        if not self.first_same_as_last:
            self._combine_final()
            if self.after_stage is not None:
                self._replace(self.new_flat, self.after_stage(t + h, self.new))

    def _plain_stages(self, t: Any, h: Any) -> None:
        # The rate is called and judged right here: a function between costs as much as the product.
        call, fit, shape, dtype, ndarray = self.rate.call, self.rate.fit, self.shape, self.dtype, np.ndarray
        if self.rate.in_place:
            for dot, prefix, out, node, view, row in self.plan:
                dot(prefix, out)
                call(t + node * h, view, row)
            return
        for dot, prefix, out, node, view, row in self.plan:
            dot(prefix, out)
            result = call(t + node * h, view)
            if result.__class__ is ndarray and result.dtype is dtype and result.shape == shape:
                row[...] = result
            else:
                row[...] = fit(result)

    def _careful_stages(self, t: Any, h: Any, ceiling: Any) -> None:
        """The stages with all that can be asked for: pieces, compensation, a ceiling, a look at each."""
        evaluate, after_stage, floor = self.evaluate, self.after_stage, self.floor
        for dot, prefix, out, node, view, row in self.plan:
            if out is self.new_flat:
                self._combine_final()
            else:
                dot(prefix, out)
            time = t + node * h
            if ceiling is not None and (time - ceiling) * h > 0:
                time = ceiling
            elif floor is not None and (time - floor) * h < 0:
                time = floor
            if after_stage is not None:
                self._replace(out, after_stage(time, view))
            evaluate(time, view, row)

    def _combine_final(self) -> None:
        """Form the new state, with what the last sums lost where they are compensated."""
        if not self.compensated:
            self.final_dot(self.final_prefix, self.new_flat)
            return
        increments = self.stage
        self.increment_dot(self.increment_rates, increments)
        for cut in self.cuts:
            state, new, lost = self.slab[0, cut], self.new_flat[cut], self.next_carry[cut]
            increment = increments[cut]
            np.subtract(increment, self.carry[cut], increment)
            np.add(state, increment, new)
            np.subtract(new, state, lost)
            np.subtract(lost, increment, lost)

    def _replace(self, target: Array, given: Any) -> None:
        if given is None:
            return
        array = np.asarray(given)
        if array.shape != self.shape:
            raise BadModel(
                f"after_stage returned shape {array.shape}, and the state has shape {self.shape}\n"
                "  Return an array of the state's shape, or None to leave it.",
                argument="after_stage",
            )
        if not np.can_cast(array.dtype, self.dtype, casting="same_kind"):
            raise BadModel(
                f"after_stage returned dtype {array.dtype}, and the state has dtype {self.dtype}\n"
                f"  Return {self.dtype}, or give the model a state of dtype {array.dtype}.",
                argument="after_stage",
            )
        target[:] = array.reshape(-1)

    def error_norm(self, rel_tol: float, ratio: Array, norm: Norm | None) -> float:
        """Return the norm of the last attempt's error estimate (unitless; 1 is the tolerance; may be NaN).

        `ratio` is abs_tol/rel_tol, an array of the state's size, flat, or of size 1. The default norm is the
        weighted root mean square over all entries with scale abs_tol + rel_tol·max(|y_n|, |y_n+1|).
        """
        if norm is not None:
            # The user's norm may pass over what is no number; a march may not.
            if not self.new_is_finite():
                return math.nan
            return float(norm(*self.error_and_scale(rel_tol, ratio * rel_tol)))
        if not self.sizes_known:
            _abs(self.slab[0], self.size_before)
            self.sizes_known = True
        self.sizes_made = True
        self.error_dot(self.error_rates, self.stage)
        if not self.one_piece:
            return math.sqrt(self._square_in_pieces(ratio) / self.count) / rel_tol
        after, scale, quotient = self.size_after, self.scale, self.quotient
        _abs(self.new_flat, after)
        _maximum(self.size_before, after, out=scale)
        _add(scale, ratio, scale)
        _divide(self.stage, scale, quotient)
        if self.finiteness(self.real_zeros) != 0.0:
            # An infinite scale would make any error small.
            return math.nan
        return math.sqrt(self.square(quotient) / self.count) / rel_tol

    def _square_in_pieces(self, ratio: Array) -> float:
        """The sum of squares of error over scale, piece by piece, by moduli where they are complex."""
        total, zeros, all_alike = 0.0, self.real_zeros, ratio.size == 1
        for cut in self.cuts:
            length = cut.stop - cut.start
            error, scale, quotient = self.stage[cut], self.scale[:length], self.quotient[:length]
            after = self.size_after[cut]
            _abs(self.new_flat[cut], after)
            _maximum(self.size_before[cut], after, out=scale)
            _add(scale, ratio if all_alike else ratio[cut], scale)
            if scale.dot(zeros[:length]) != 0.0:
                return math.nan
            _divide(_abs(error) if error.dtype.kind == "c" else error, scale, quotient)
            total += float(quotient.dot(quotient))
        return total

    def error_and_scale(self, rel_tol: float, abs_tol: Array) -> tuple[Array, Array]:
        """Return the last attempt's error estimate and its scale, new arrays in the state's shape."""
        error = self.work[self.stages + 1, 1:].dot(self.slab[1:])
        with np.errstate(all="ignore"):
            scale = abs_tol + rel_tol * np.maximum(np.abs(self.slab[0]), np.abs(self.new_flat))
        return error.reshape(self.shape), scale.reshape(self.shape)

    def new_is_finite(self) -> bool:
        """Whether every entry of the new state is a number; a zero times it is then zero."""
        if self.dtype == np.dtype(object):
            return True
        zeros, new = self.zeros, self.new_flat
        if len(self.cuts) == 1:
            return bool(zeros.dot(new) == 0)
        return all(zeros[: c.stop - c.start].dot(new[c]) == 0 for c in self.cuts)

    def accept(self) -> None:
        """Make the new state the state; keep the rate at it where the last stage is the next first."""
        self.slab_first[...] = self.new_flat
        self.floor = None
        if self.has_estimate:
            # The sizes of the new state are known where its error was asked for.
            self.sizes_known = self.sizes_made
            self.size_before, self.size_after = self.size_after, self.size_before
        if self.compensated:
            self.carry, self.next_carry = self.next_carry, self.carry
        if self.first_same_as_last:
            self.rate_first[...] = self.rate_last
        else:
            self.fresh = False
