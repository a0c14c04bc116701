"""An example plugin: each hook returns names with loaders, and imports nothing that might not be used."""

from collections.abc import Mapping
from pathlib import Path

import pluggy

hookimpl = pluggy.HookimplMarker("newel")


@hookimpl
def newel_tableaux() -> Mapping[str, Path | str]:
    """Return two methods and a family; newel proves each when it is first asked for."""
    return {
        "landing-2": Path(__file__).parent / "tableaux" / "landing-2.toml",
        "winding-3": "newel_example_stairs.three_stages:winding",
        "even-stairs-2-stages-{stages}": "newel_example_stairs.even_stairs:even_stairs",
    }


@hookimpl
def newel_controllers() -> Mapping[str, str]:
    """Return one controller; its arguments are those of the class."""
    return {"halving": "newel_example_stairs.halving:Halving"}


@hookimpl
def newel_sinks() -> Mapping[str, str]:
    """Return one sink; its class says for which file endings it stands."""
    return {"ledger": "newel_example_stairs.ledger:Ledger"}
