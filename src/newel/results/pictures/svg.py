"""Stability regions as SVG, written by hand: paths, two axes, ticks and a legend."""

from __future__ import annotations

from collections.abc import Iterator
from html import escape
from math import ceil, floor, log10
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from newel.results.pictures.outlines import Line
    from newel.results.pictures.region import RegionPicture

__all__ = ["COLOURS", "DASHES", "as_svg", "ticks"]

COLOURS = ("#0072b2", "#d55e00", "#009e73", "#cc79a7", "#56b4e9", "#e69f00", "#000000", "#7f3c8d", "#666666")
"""The first six tell apart for the common kinds of colour blindness (M. Okabe and K. Ito, 2008)."""

DASHES = ("none", "9 4", "2 3", "12 3 2 3", "5 2", "1 2", "14 5", "7 2 2 2 2 2", "3 6")

_LONG, _LEAST, _PAD, _LINE = 560.0, 160.0, 44.0, 20.0


def as_svg(picture: RegionPicture) -> str:
    """Return the SVG document of a picture, at one scale on both axes unless it would be too thin to read."""
    left, right, top = picture.window
    scale_x = _LONG / max(right - left, 2 * top)
    scale_y = scale_x
    width, height = (right - left) * scale_x, 2 * top * scale_y
    if min(width, height) < _LEAST:
        width, height = max(width, _LEAST), max(height, _LEAST)
        scale_x, scale_y = width / (right - left), height / (2 * top)

    def place(x: float, y: float) -> tuple[float, float]:
        return _PAD + (x - left) * scale_x, _PAD + (top - y) * scale_y

    whole_height = height + 2 * _PAD + _LINE * len(picture.methods)
    body = [
        f'<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 {width + 2 * _PAD:.0f} {whole_height:.0f}" '
        f'font-family="sans-serif" font-size="12">',
        f"<title>Stability regions: {escape(', '.join(t.slug for t in picture.methods))}</title>",
        '<rect width="100%" height="100%" fill="white"/>',
    ]
    x0, y0 = place(0.0, 0.0)
    body += [
        f'<path d="M{_PAD:.1f} {y0:.1f}H{_PAD + width:.1f}M{x0:.1f} {_PAD:.1f}V{_PAD + height:.1f}" '
        f'stroke="#999" fill="none"/>'
    ]
    for x in ticks(left, right):
        at = place(x, 0.0)[0]
        body.append(f'<text x="{at:.1f}" y="{_PAD + height + 16:.1f}" text-anchor="middle">{x:g}</text>')
        body.append(f'<path d="M{at:.1f} {y0 - 3:.1f}v6" stroke="#999"/>')
    for y in ticks(-top, top):
        at = place(0.0, y)[1]
        body.append(f'<text x="{_PAD - 6:.1f}" y="{at + 4:.1f}" text-anchor="end">{y:g}</text>')
        body.append(f'<path d="M{x0 - 3:.1f} {at:.1f}h6" stroke="#999"/>')
    for number, (tableau, lines) in enumerate(zip(picture.methods, picture.lines, strict=True)):
        style = f'fill="none" stroke="{COLOURS[number]}" stroke-width="1.8"'
        if DASHES[number] != "none":
            style += f' stroke-dasharray="{DASHES[number]}"'
        path = "".join(
            "M" + "L".join("{:.2f} {:.2f}".format(*place(x, sign * y)) for x, y in line)
            for line in lines
            for sign in (1, -1)
        )
        row = height + 2 * _PAD + _LINE * number
        body.append(f'<path d="{path}" {style}/>')
        body.append(f'<path d="M{_PAD:.0f} {row:.1f}h36" {style}/>')
        body.append(
            f'<text x="{_PAD + 44:.0f}" y="{row + 4:.1f}">{_said(tableau.slug, picture, number)}</text>'
        )
    return "\n".join([*body, "</svg>"]) + "\n"


def _said(slug: str, picture: RegionPicture, number: int) -> str:
    scale = picture.scales[number]
    return escape(slug if scale == 1.0 else f"{slug}, z divided by {scale:g} rate calls")


def ticks(low: float, high: float) -> Iterator[float]:
    """Yield four to nine round numbers between two.

    >>> list(ticks(-3.3, 0.6))
    [-3.0, -2.5, -2.0, -1.5, -1.0, -0.5, 0.0, 0.5]
    """
    rough = (high - low) / 5
    power = 10.0 ** floor(log10(rough))
    step = next(power * factor for factor in (1, 2, 5, 10) if power * factor * 1.6 >= rough)
    for k in range(ceil(low / step), floor(high / step) + 1):
        yield k * step


def mirrored(line: Line) -> Line:
    """Return the mirror image of a line at the real axis."""
    return tuple((x, -y) for x, y in line)
