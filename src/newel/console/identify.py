"""`newel identify`: which known method is this?"""

from __future__ import annotations

from argparse import ArgumentParser, Namespace
from typing import Any

import attrs

from newel.console.lookup import method_name, registry_of
from newel.console.screen import Screen
from newel.console.words import filled

__all__ = ["PASTE", "WHAT", "add", "run"]

WHAT = "Say which known method a tableau is, whatever its name and order of stages."
PASTE = ("newel identify kutta-4", "newel identify kutta-4 --json")


def add(parser: ArgumentParser) -> None:
    """Add the method."""
    parser.add_argument("method", metavar="METHOD", help="a file that ends in .toml, or a slug")


def run(options: Namespace, screen: Screen) -> int:
    """Identify the method; the status is 1 where no known method is the same."""
    from newel.catalogue.identify import identities

    registry = registry_of(options)
    tableau = registry.load(method_name(options.method, registry))
    found = [each for each in identities(tableau, registry) if not _is_itself(each, options.method)]
    if options.json:
        data: dict[str, Any] = {"method": options.method, "slug": tableau.slug}
        data["same_as"] = [attrs.asdict(each) for each in found]
        screen.document("newel-identify/1", data)
    elif found:
        for each in found:
            screen.draw(filled(f"{options.method}: {each.text}", screen.console.width, "", "  "))
    else:
        others = "no other known method" if not options.method.endswith(".toml") else "no known method"
        screen.draw(f"{options.method}: {others} is the same")
    return 0 if found or not options.method.endswith(".toml") else 1


def _is_itself(identity: Any, method: str) -> bool:
    return bool(identity.slug == method and identity.relation == "same")
