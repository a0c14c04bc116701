"""What newel itself brings, through the same hooks that a package uses: names with loaders.

No loader is followed here, so that asking for the names imports no engine and reads no file. The built-in
tableaux are found by looking into the data package; a new file there is a new method, with no list to keep.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from functools import partial
from importlib.resources import files
from importlib.resources.abc import Traversable
from pathlib import Path
from typing import TYPE_CHECKING

import pluggy

if TYPE_CHECKING:
    from newel.methods.tableau import Tableau

__all__ = ["FAMILY_SAMPLES", "newel_controllers", "newel_sinks", "newel_tableaux", "tableau_files"]

PACKAGE = "newel.tableaux"

_RULES = "newel.methods.families"
_FAMILIES = {
    "doubled-{method}": f"{_RULES}.step_doubling:doubled",
    "extrapolated-euler-{order}": f"{_RULES}.extrapolation:extrapolated_euler",
    "extrapolated-euler-romberg-{order}": f"{_RULES}.extrapolation:extrapolated_euler_romberg",
    "extrapolated-euler-bulirsch-{order}": f"{_RULES}.extrapolation:extrapolated_euler_bulirsch",
    "extrapolated-midpoint-{order}": f"{_RULES}.extrapolation:extrapolated_midpoint",
    "extrapolated-midpoint-romberg-{order}": f"{_RULES}.extrapolation:extrapolated_midpoint_romberg",
    "extrapolated-midpoint-bulirsch-{order}": f"{_RULES}.extrapolation:extrapolated_midpoint_bulirsch",
    "extrapolated-midpoint-smoothed-{order}": f"{_RULES}.extrapolation:extrapolated_midpoint_smoothed",
    "richardson-{levels}-{method}": f"{_RULES}.composition:richardson",
    "repeated-{times}-{method}": f"{_RULES}.composition:repeated",
    "picard-gauss-{order}": f"{_RULES}.collocation:picard_gauss",
    "picard-radau-{order}": f"{_RULES}.collocation:picard_radau",
    "picard-lobatto-{order}": f"{_RULES}.collocation:picard_lobatto",
    "picard-equidistant-{order}": f"{_RULES}.collocation:picard_equidistant",
    "deferred-correction-lobatto-{order}": f"{_RULES}.collocation:deferred_correction_lobatto",
    "deferred-correction-equidistant-{order}": f"{_RULES}.collocation:deferred_correction_equidistant",
    "chebyshev-1-stages-{stages}": f"{_RULES}.recursions:chebyshev_1",
    "chebyshev-2-stages-{stages}": f"{_RULES}.recursions:chebyshev_2",
    "legendre-1-stages-{stages}": f"{_RULES}.recursions:legendre_1",
    "legendre-2-stages-{stages}": f"{_RULES}.recursions:legendre_2",
    "ssp-2-stages-{stages}": f"{_RULES}.shocks:ssp_2",
    "ssp-3-stages-{stages}": f"{_RULES}.shocks:ssp_3",
}

FAMILY_SAMPLES = (
    *("doubled-kutta-4", "doubled-carpenter-kennedy-4"),
    *("extrapolated-euler-3", "extrapolated-euler-6", "extrapolated-euler-romberg-5"),
    *("extrapolated-euler-bulirsch-6", "extrapolated-midpoint-4", "extrapolated-midpoint-8"),
    *("extrapolated-midpoint-12", "extrapolated-midpoint-romberg-6", "extrapolated-midpoint-bulirsch-8"),
    *("extrapolated-midpoint-smoothed-4", "extrapolated-midpoint-smoothed-8"),
    *("richardson-3-kutta-4", "richardson-2-ssp-3-stages-5", "repeated-2-bogacki-shampine-3-2"),
    *("repeated-3-kutta-4", "picard-gauss-4", "picard-gauss-6", "picard-gauss-8"),
    *("picard-radau-3", "picard-radau-5", "picard-radau-7", "picard-lobatto-4", "picard-lobatto-7"),
    *("picard-equidistant-3", "picard-equidistant-6"),
    *("deferred-correction-lobatto-4", "deferred-correction-lobatto-7"),
    *("deferred-correction-equidistant-3", "deferred-correction-equidistant-6"),
    *("chebyshev-1-stages-5", "chebyshev-1-stages-20", "chebyshev-2-stages-5", "chebyshev-2-stages-20"),
    *("legendre-1-stages-5", "legendre-1-stages-20", "legendre-2-stages-5", "legendre-2-stages-20"),
    *("ssp-2-stages-5", "ssp-2-stages-20", "ssp-3-stages-16", "ssp-3-stages-25"),
)
"""Members of the families at several sizes each, which `newel check --all` proves with all single methods."""

_CONTROLLERS = (
    "elementary",
    "gustafsson-pi",
    "soderlind-pi-3-3",
    "soderlind-pi-4-2",
    "soderlind-h211-pi",
    "soderlind-h211b",
    "soderlind-h0211",
    "soderlind-h0220",
    "soderlind-h0330",
    "soderlind-h0312",
    "soderlind-h0321",
    "soderlind-h312-pid",
    "soderlind-h312b",
    "soderlind-h321",
)

hookimpl = pluggy.HookimplMarker("newel")


def tableau_files() -> dict[str, Traversable]:
    """Return the built-in tableau files by slug, in the order of their folders `order-1`, `order-2`, …"""
    folders = [each for each in files(PACKAGE).iterdir() if each.name.startswith("order-") and each.is_dir()]
    folders.sort(key=lambda folder: (len(folder.name), folder.name))
    found: dict[str, Traversable] = {}
    for folder in folders:
        inside = {file.name: file for file in folder.iterdir() if file.name.endswith(".toml")}
        found |= {name.removesuffix(".toml"): inside[name] for name in sorted(inside)}
    return found


@hookimpl
def newel_tableaux() -> Mapping[str, Path | Callable[[], Tableau] | str]:
    """Return the built-in methods and the families of the core."""
    single = {
        slug: file if isinstance(file, Path) else partial(_read, file)
        for slug, file in tableau_files().items()
    }
    return {**single, **_FAMILIES}


def _read(file: Traversable) -> Tableau:
    """Read a tableau that is no plain file, as in a zipped package."""
    from newel.methods.tableau_file import parse_tableau

    return parse_tableau(file.read_text(encoding="utf-8"), file=file.name)


@hookimpl
def newel_controllers() -> Mapping[str, str]:
    """Return the built-in step-size controllers."""
    return {name: f"newel.stepping.controllers:{name.replace('-', '_')}" for name in _CONTROLLERS}


@hookimpl
def newel_sinks() -> Mapping[str, str]:
    """Return the built-in sinks."""
    module = "newel.results.sinks"
    return {
        "memory": f"{module}.memory:Memory",
        "csv": f"{module}.csv_file:Csv",
        "json-lines": f"{module}.json_lines:JsonLines",
        "call": f"{module}.call:Call",
    }
