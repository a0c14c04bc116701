"""The region |R(z)| ≤ 1 of the complex plane: its boundary, its area, and how errors in a step grow there."""

from __future__ import annotations

from functools import lru_cache
from math import pi
from typing import Any

import attrs
import numpy as np
from numpy.typing import NDArray

from newel.methods.analysis.stability import growth_polynomial
from newel.methods.tableau import Tableau

__all__ = ["Region", "amplification", "internal_growth", "main_region", "stability_area"]

_FITTINGS = 12

_MOST_STAGES = 40
_TRUSTED = 1e7
"""The polynomial may cancel this much on the boundary before float64 is no longer trusted with it."""

_LEVELS = 4
_ANGLES = 240
_REACH = 3.2
"""Where the rule's weights are below float64: sinh(3.2) is above 53·log(2)/π."""


def amplification(tableau: Tableau, z: NDArray[Any], embedded: bool = False) -> NDArray[np.float64]:
    """Return |R(z)| for an array of z of any shape (unitless), by the stages of the method itself.

    The stages do not cancel as the powers of z do, so that it is right for long polynomials too. Source:
    J. D. Lambert, Computational Methods in Ordinary Differential Equations (1973), chapter 4.

    Args:
        tableau: the method.
        z: complex numbers h·λ.
        embedded: whether the embedded weights are meant; those of the method where it has none.

    >>> euler = Tableau("euler-1", order=1, matrix=[[]], weights=[1])
    >>> amplification(euler, np.array([-2.0 + 0j, 1j]))
    array([1.        , 1.41421356])
    """
    weights = tableau.b_embedded if embedded and tableau.b_embedded is not None else tableau.b
    stages = np.empty((tableau.stages, *z.shape), dtype=np.complex128)
    with np.errstate(over="ignore", invalid="ignore"):
        for i, row in enumerate(tableau.A):
            stages[i] = 1.0 + z * _combined(row[:i], stages)
        modulus = np.abs(1.0 + z * _combined(weights, stages))
    # Far outside, where the stages overflow, it grows; inf − inf is no reason to say otherwise.
    return np.nan_to_num(modulus, nan=np.inf, posinf=np.inf)


def _combined(factors: NDArray[np.float64], arrays: NDArray[np.complex128]) -> NDArray[np.complex128]:
    """Return Σ factor·array; most factors are zero, so that this is quicker than one large product."""
    total = np.zeros(arrays.shape[1:], dtype=np.complex128)
    for factor, array in zip(factors, arrays, strict=False):
        if factor:
            total += factor * array
    return total


@attrs.frozen(eq=False)
class Region:
    """The part of |R(z)| ≤ 1 that hangs together with the origin, on a grid of the upper half plane.

    Attributes:
        x: real parts, shape (161,), ascending; y: imaginary parts, shape (81,), from 0 up; unitless.
        inside: whether each point belongs to it, shape (81, 161).
    """

    x: NDArray[np.float64]
    y: NDArray[np.float64]
    inside: NDArray[np.bool_]

    @property
    def extent(self) -> tuple[float, float, float]:
        """The smallest and the largest real part and the largest imaginary part, to one grid point."""
        columns, rows = self.inside.any(axis=0), self.inside.any(axis=1)
        at = np.flatnonzero(columns)
        top = np.flatnonzero(rows)[-1]
        return float(self.x[at[0]]), float(self.x[at[-1]]), float(self.y[top])

    def is_near(self, z: NDArray[np.complex128]) -> NDArray[np.bool_]:
        """Return whether each z lies within two grid points of it, its mirror image included; z's shape."""
        column = np.rint((z.real - self.x[0]) / (self.x[1] - self.x[0]))
        row = np.rint(np.abs(z.imag) / self.y[1])
        wide = self.inside
        for _ in range(2):
            wide = _grown(wide)
        on_grid = (column >= 0) & (column < len(self.x)) & (row < len(self.y))
        found = wide[np.where(on_grid, row, 0).astype(int), np.where(on_grid, column, 0).astype(int)]
        return np.asarray(found & on_grid)


def main_region(tableau: Tableau, embedded: bool = False) -> Region:
    """Return the part of the stability region that hangs together with the origin, in a window that fits it.

    Args:
        tableau: the method.
        embedded: whether the embedded weights are meant; those of the method where it has none.

    >>> region = main_region(Tableau("euler-1", order=1, matrix=[[]], weights=[1]))
    >>> [round(each, 1) + 0.0 for each in region.extent]
    [-2.0, 0.0, 1.0]
    """
    left, right, top = 2.0 * tableau.stages, 1.0, 2.0 * tableau.stages
    for _ in range(_FITTINGS):
        region = _flooded(tableau, embedded, left, right, top)
        low, high, up = region.extent
        fitted = _fitted(left, -low), _fitted(right, max(high, 0.05 * left)), _fitted(top, up)
        if fitted == (left, right, top):
            break
        left, right, top = fitted
    return region


def _fitted(window: float, reached: float) -> float:
    """Return a window that is a little larger than what was reached, and the same one where it is."""
    if reached > 0.95 * window:
        return 2.0 * window
    return window if reached > 0.6 * window else max(1.25 * reached, 0.1 * window)


def _flooded(tableau: Tableau, embedded: bool, left: float, right: float, top: float) -> Region:
    x, y = np.linspace(-left, right, 161), np.linspace(0.0, top, 81)
    stable = amplification(tableau, x[None, :] + 1j * y[:, None], embedded) <= 1.0 + 1e-9
    inside = np.zeros_like(stable)
    origin = int(np.searchsorted(x, 0.0))
    inside[0, max(origin - 1, 0)] = True
    while True:
        grown = _along_rows(_along_rows(_grown(inside) & stable, stable).T, stable.T).T
        grown[0, max(origin - 1, 0)] = True
        if np.array_equal(grown, inside):
            return Region(x, y, inside)
        inside = grown


def _along_rows(inside: NDArray[np.bool_], stable: NDArray[np.bool_]) -> NDArray[np.bool_]:
    """Return the whole of each stable run of a row in which a point is inside."""
    fenced = np.pad(stable, ((0, 0), (1, 0)))
    runs = np.cumsum(fenced[:, 1:] & ~fenced[:, :-1]).reshape(stable.shape)
    touched = np.bincount(runs[inside], minlength=int(runs[-1, -1]) + 1) > 0
    return np.asarray(stable & touched[runs])


def _grown(mask: NDArray[np.bool_]) -> NDArray[np.bool_]:
    """Return a mask with the neighbours of each point, on the axes and the diagonals."""
    rows = mask.copy()
    rows[1:] |= mask[:-1]
    rows[:-1] |= mask[1:]
    wide = rows.copy()
    wide[:, 1:] |= rows[:, :-1]
    wide[:, :-1] |= rows[:, 1:]
    return wide


def stability_area(tableau: Tableau) -> float | None:
    """Return the area of the stability region |R(z)| ≤ 1, islands included (unitless), to 4 digits or more.

    With R(z) = e^(iθ) on the boundary, Green's theorem gives the area as ½ ∫ Σ Re(z̄ e^(iθ)/R′(z)) dθ over
    all roots z at each θ, integrated by the rule of H. Takahasi and M. Mori, Publ. RIMS 9 (1974) 721-741,
    which bears the corners where the boundary touches itself on the real axis.

    Returns:
        None where the polynomial is too long or cancels too much for float64.

    >>> round(stability_area(Tableau("euler-1", order=1, matrix=[[]], weights=[1])), 9)
    3.141592654
    """
    r = _floats(tableau)
    if r is None:
        return None
    before = None
    for level in range(_LEVELS):
        t = np.linspace(-_REACH, _REACH, 1 + (52 << level))
        q = np.exp(-pi * np.sinh(np.abs(t)))
        # The angle is counted from the nearer end, so that it keeps its digits there.
        near = pi * q / (1.0 + q)
        weights = (t[1] - t[0]) * pi * pi * np.cosh(t) * q / (1.0 + q) ** 2
        angles = np.where(t < 0, near, pi - near)
        z = _boundary(r, angles)
        if z is None:
            return None
        with np.errstate(divide="ignore", invalid="ignore"):
            parts = np.real(np.conj(z) * np.exp(1j * angles)[:, None] / np.polyval(np.polyder(r), z))
        total = float(weights @ np.nansum(parts, axis=1))
        if before is not None and abs(total - before) < 1e-6 * abs(total):
            break
        before = total
    return total


def internal_growth(tableau: Tableau) -> float | None:
    """Return how much an error made in one stage may grow within the step, at most, in the stability region.

    The largest modulus of an entry of z·bᵀ(I − zA)⁻¹ over the part of |R(z)| ≤ 1 that hangs together with
    the origin, met on its boundary; unitless. Far above 1, rounding errors of the stages show in the result.
    Source: D. I. Ketcheson, L. Lóczi and M. Parsani, SIAM J. Numer. Anal. 52 (2014) 2227-2249.

    Returns:
        A number right to about 2 digits, from 240 angles; None where `stability_area` is.

    >>> internal_growth(Tableau("euler-1", order=1, matrix=[[]], weights=[1]))
    2.0
    """
    r = _floats(tableau)
    if r is None:
        return None
    # By symmetry the upper half is enough; both ends are taken, as the extremes often lie on the axes.
    z = _boundary(r, np.linspace(0.0, pi, _ANGLES // 2 + 1))
    if z is None:
        return None
    z = z[main_region(tableau).is_near(z)]
    growth = np.zeros((tableau.stages, *z.shape), dtype=np.complex128)
    for j in range(tableau.stages - 1, -1, -1):
        growth[j] = z * (tableau.b[j] + _combined(tableau.A[j + 1 :, j], growth[j + 1 :]))
    return float(f"{np.abs(growth).max():.6g}")


def _boundary(r: NDArray[np.float64], angles: NDArray[np.float64]) -> NDArray[np.complex128] | None:
    """Return every z with R(z) = e^(iθ), shape (angles, degree); None where float64 cannot tell."""
    p = np.repeat(r[None, :].astype(np.complex128), len(angles), axis=0)
    p[:, -1] -= np.exp(1j * angles)
    degree = len(r) - 1
    companion = np.zeros((len(angles), degree, degree), dtype=np.complex128)
    companion[:, np.arange(1, degree), np.arange(degree - 1)] = 1.0
    companion[:, 0, :] = -p[:, 1:] / r[0]
    z = np.linalg.eigvals(companion)
    value, slope = np.zeros_like(z), np.polyval(np.polyder(r), z)
    for k in range(degree + 1):
        value = value * z + p[:, k, None]
    with np.errstate(divide="ignore", invalid="ignore"):
        step = value / slope
        size = np.polyval(np.abs(r), np.abs(z))
        doubt = size * 1e-16 / (np.abs(slope) * (1.0 + np.abs(z)))
    if np.any((size > _TRUSTED) & ~(doubt < 1e-8)):
        return None
    better = np.isfinite(step) & (np.abs(step) < 1e-3 * (1.0 + np.abs(z)))
    z[better] -= step[better]
    return np.asarray(z, dtype=np.complex128)


@lru_cache(maxsize=4)
def _polynomial(tableau: Tableau) -> tuple[float, ...] | None:
    r = growth_polynomial(tableau) if tableau.stages <= _MOST_STAGES else None
    return None if r is None or len(r) < 2 else tuple(float(x) for x in reversed(r))


def _floats(tableau: Tableau) -> NDArray[np.float64] | None:
    """Return the coefficients of the polynomial, the highest power first."""
    found = _polynomial(tableau)
    return None if found is None else np.array(found)
