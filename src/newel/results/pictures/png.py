"""Stability regions as PNG, drawn by matplotlib where that is installed."""

from __future__ import annotations

from importlib import import_module
from pathlib import Path
from typing import TYPE_CHECKING, Any

from newel.errors import BadRequest
from newel.results.pictures.svg import COLOURS, mirrored

if TYPE_CHECKING:
    from newel.results.pictures.region import RegionPicture

__all__ = ["write_png"]

_STYLES = ("-", "--", ":", "-.")


def write_png(picture: RegionPicture, path: Path) -> None:
    """Write a picture as PNG, 150 dots an inch.

    Raises:
        BadRequest: matplotlib is not installed.
    """
    figures: Any = _matplotlib("figure")
    figure = figures.Figure(figsize=(7, 6))
    axes = figure.add_subplot()
    for number, (tableau, lines) in enumerate(zip(picture.methods, picture.lines, strict=True)):
        label: str | None = tableau.slug
        for line in lines:
            for side in (line, mirrored(line)):
                x, y = zip(*side, strict=True)
                axes.plot(x, y, color=COLOURS[number], linestyle=_STYLES[number % 4], label=label)
                label = None
    left, right, top = picture.window
    axes.set(xlim=(left, right), ylim=(-top, top), xlabel="Re z", ylabel="Im z")
    if 2 * top > 0.2 * (right - left):
        axes.set_aspect("equal")
    axes.axhline(0.0, color="0.7", linewidth=0.8)
    axes.axvline(0.0, color="0.7", linewidth=0.8)
    axes.legend()
    figure.savefig(path, dpi=150, format="png")


def _matplotlib(module: str) -> Any:
    try:
        return import_module(f"matplotlib.{module}")
    except ImportError:
        raise BadRequest(
            "a PNG needs matplotlib, which is not installed\n"
            "  pip install 'newel[plots]', or write an .svg, which needs nothing.",
            argument="picture_to",
        ) from None
