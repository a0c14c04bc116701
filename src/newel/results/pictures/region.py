"""The picture of stability regions: one method, or several in one window."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

import attrs
import numpy as np

from newel.catalogue.access import find
from newel.errors import BadRequest, OutputExists, OutputFailed
from newel.methods.analysis.stability_region import amplification, main_region
from newel.methods.analysis.structure import computed_stages
from newel.results.pictures.outlines import Line, outlines
from newel.results.pictures.svg import as_svg
from newel.results.pictures.text import as_text

if TYPE_CHECKING:
    from newel.catalogue.registry import Registry
    from newel.methods.tableau import Tableau

__all__ = ["MOST", "RegionPicture", "stability_region"]

MOST = 9
"""So many methods fit into one picture: each is drawn with a digit of its own."""

_MARGIN = 0.08
_COLUMNS, _ROWS = 241, 121


@attrs.frozen(eq=False, repr=False)
class RegionPicture:
    """Where |R(z)| ≤ 1 for one method or several, z = hλ; see `stability_region`.

    Attributes:
        methods: the tableaux.
        scales: what z was divided by, for each: 1, or the rate calls of a step.
        window: (left, right, top) of the upper half plane that is shown; the lower half is its mirror image.
        lines: for each method, the outlines in the upper half as polylines of points (x, y).
    """

    methods: tuple[Tableau, ...]
    scales: tuple[float, ...]
    window: tuple[float, float, float]
    lines: tuple[tuple[Line, ...], ...]

    def text(self, width: int = 80) -> str:
        """Return the picture in characters, in lines of at most a width (40 at least), without any colour."""
        return as_text(self, width)

    def svg(self) -> str:
        """Return the picture as an SVG document; each method has a dash pattern of its own."""
        return as_svg(self)

    def to_data(self) -> dict[str, Any]:
        """Return dicts, lists, texts and numbers, fit for JSON."""
        left, right, top = self.window
        methods = [
            {
                "slug": t.slug,
                "z_divided_by": scale,
                "upper_outlines": [[list(p) for p in line] for line in drawn],
            }
            for t, scale, drawn in zip(self.methods, self.scales, self.lines, strict=True)
        ]
        return {"left": left, "right": right, "bottom": -top, "top": top, "methods": methods}

    def write(self, path: str | Path, overwrite: bool = False) -> None:
        """Write the picture to a file; the ending `.svg` or `.png` chooses the form.

        Args:
            path: the file. PNG needs matplotlib, which the extra `plots` installs.
            overwrite: whether a file that is there is replaced.

        Raises:
            BadRequest: another ending, or PNG without matplotlib.
            OutputExists: the file is there.
            OutputFailed: it cannot be written.
        """
        target = Path(path)
        ending = target.suffix.lower()
        if ending not in (".svg", ".png"):
            raise BadRequest(
                f"{path}: a picture is written to a file that ends in .svg or .png", argument="picture_to"
            )
        if target.exists() and not overwrite:
            raise OutputExists(str(path))
        try:
            if ending == ".svg":
                target.write_text(self.svg(), encoding="utf-8")
            else:
                from newel.results.pictures.png import write_png

                write_png(self, target)
        except OSError as error:
            raise OutputFailed(str(path), error.strerror or str(error)) from None

    def __repr__(self) -> str:
        return self.text()

    def _repr_svg_(self) -> str:
        return self.svg()


def stability_region(
    *methods: str | Path | Tableau, per_call: bool = False, registry: Registry | None = None
) -> RegionPicture:
    """Return the picture of the stability regions of one to nine methods in one window.

    The region is where |R(z)| ≤ 1, z = hλ for y' = λy. Source: J. D. Lambert, Computational Methods in
    Ordinary Differential Equations (1973), chapter 4.

    Args:
        methods: slugs, paths that end in `.toml`, or Tableaux.
        per_call: divide z by the rate calls of a step, so that methods are shown at equal cost.
        registry: where slugs are looked up; by default the usual registry.

    Raises:
        BadRequest: no method, or more than nine.
        UnknownMethod, BadTableau, NotProved: as in `newel.find`.

    Example:
        >>> print(stability_region("kutta-4").text().splitlines()[-1])
        kutta-4: |R(z)| ≤ 1, z = hλ
    """
    if not 1 <= len(methods) <= MOST:
        raise BadRequest(
            f"a picture shows 1 to {MOST} methods, not {len(methods)}\n  Draw several pictures.",
            argument="methods",
        )
    tableaux = tuple(find(method, registry) for method in methods)
    scales = tuple(float(computed_stages(t)) if per_call else 1.0 for t in tableaux)
    left, right, top = 0.0, 0.0, 0.0
    for tableau, scale in zip(tableaux, scales, strict=True):
        low, high, up = main_region(tableau).extent
        left, right, top = min(left, low / scale), max(right, high / scale), max(top, up / scale)
    room = _MARGIN * (right - left)
    window = (left - room, max(right, 0.0) + room, (1 + 2 * _MARGIN) * top)
    lines = tuple(_lines(t, scale, window) for t, scale in zip(tableaux, scales, strict=True))
    return RegionPicture(tableaux, scales, window, lines)


def _lines(tableau: Tableau, scale: float, window: tuple[float, float, float]) -> tuple[Line, ...]:
    left, right, top = window
    x, y = np.linspace(left, right, _COLUMNS), np.linspace(0.0, top, _ROWS)
    modulus = amplification(tableau, scale * (x[None, :] + 1j * y[:, None]))
    # The logarithm is nearly linear where the modulus is not; far outside any large number will do.
    with np.errstate(divide="ignore"):
        field = np.clip(np.log(modulus), -50.0, 50.0)
    return outlines(x, y, field)
