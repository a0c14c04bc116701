"""Stability regions in characters, readable without colour."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from newel.methods.analysis.stability_region import amplification

if TYPE_CHECKING:
    from newel.results.pictures.region import RegionPicture

__all__ = ["as_text"]

_NARROWEST = 40
_ROWS = (9, 25)
_EDGE, _WITHIN, _SHARED = "#", "·", "*"


def as_text(picture: RegionPicture, width: int) -> str:
    """Return the picture in lines of at most a width; see `RegionPicture.text`.

    A single method is filled, its edge marked by #; of several only the edges are drawn, each by its digit,
    and * where they share a place.
    """
    left, right, top = picture.window
    labels = [f"{value:.3g}" for value in (top, 0.0, -top)]
    margin = max(map(len, labels))
    columns = max(width, _NARROWEST) - margin - 4
    # A character is about twice as high as it is wide.
    rows = int(np.clip(round(columns * 2 * top / (right - left) / 2), *_ROWS)) // 2 * 2 + 1
    x = left + (np.arange(columns) + 0.5) * (right - left) / columns
    y = top * (1.0 - (np.arange(rows) + 0.5) * 2.0 / rows)
    canvas = np.full((rows, columns), " ")
    canvas[rows // 2, :] = "─"
    if left < 0.0 < right:
        zero = int(-left / (right - left) * columns)
        canvas[:, zero] = "│"
        canvas[rows // 2, zero] = "┼"
    for number, (tableau, scale) in enumerate(zip(picture.methods, picture.scales, strict=True), 1):
        inside = amplification(tableau, scale * (x[None, :] + 1j * y[:, None])) <= 1.0 + 1e-9
        edge = inside & ~_surrounded(inside)
        if len(picture.methods) == 1:
            canvas[inside] = _WITHIN
            canvas[edge] = _EDGE
        else:
            taken = np.isin(canvas, [*"123456789", _SHARED])
            canvas[edge] = np.where(taken[edge], _SHARED, str(number))
    return "\n".join(_framed(canvas, labels, margin, _ends(picture, columns)) + _legend(picture, width))


def _surrounded(inside: NDArray[np.bool_]) -> NDArray[np.bool_]:
    """Return where all four neighbours are inside too; what is beyond the window counts as inside."""
    wide = np.pad(inside, 1, constant_values=True)
    return np.asarray(wide[:-2, 1:-1] & wide[2:, 1:-1] & wide[1:-1, :-2] & wide[1:-1, 2:])


def _framed(canvas: NDArray[np.str_], labels: list[str], margin: int, ends: str) -> list[str]:
    rows = len(canvas)
    at = {0: labels[0], rows // 2: labels[1], rows - 1: labels[2]}
    rule = "─" * canvas.shape[1]
    body = [f"{at.get(i, ''):>{margin}} │{''.join(row)}│" for i, row in enumerate(canvas)]
    blank = " " * (margin + 1)
    return [f"{blank}┌{rule}┐", *body, f"{blank}└{rule}┘", f"{blank} {ends}"]


def _ends(picture: RegionPicture, columns: int) -> str:
    """Return the line of real parts below the picture."""
    left, right, _ = picture.window
    first, last = f"{left:.3g}", f"{right:.3g}"
    line = list(first + last.rjust(columns - len(first)))
    zero = int(-left / (right - left) * columns)
    if len(first) < zero < columns - len(last) - 1:
        line[zero] = "0"
    return "".join(line)


def _legend(picture: RegionPicture, width: int) -> list[str]:
    scaled = any(scale != 1.0 for scale in picture.scales)
    z = "z = hλ divided by the rate calls of a step" if scaled else "z = hλ"
    if len(picture.methods) == 1:
        return [f"{picture.methods[0].slug}: |R(z)| ≤ 1, {z}"]
    names = [f"{number} {tableau.slug}" for number, tableau in enumerate(picture.methods, 1)]
    return [*names, f"the edges of |R(z)| ≤ 1, {z}; * shared"]
