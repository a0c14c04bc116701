"""The example plugin, really installed by pip, brings one of each kind."""

import json
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

from tests.installing import pip_into

EXAMPLE = Path(__file__).parents[1] / "example_plugin"

SCRIPT = """
import json, sys, pathlib
from newel.catalogue.registry import Registry
registry = Registry(folders=[], cache=None)
report = next(each for each in registry.plugins() if each.origin.kind == "package")
early = [name for name in sys.modules if name.startswith("newel_example_stairs.")]
methods = [registry.find(slug) for slug in (*report.tableaux, "even-stairs-2-stages-9", "doubled-landing-2")]
try:
    registry.find("even-stairs-2-stages-1000")
    limit = "none"
except Exception as error:
    limit = f"{type(error).__name__}: {error}"
controller = registry.controller("halving", room=0.25)
print(json.dumps({
    "origin": str(report.origin), "early": early, "problems": report.problems,
    "offers": [report.tableaux, report.families, report.controllers, report.sinks],
    "methods": [[m.slug, m.origin, m.proof.outcome, m.proof.order, m.proof.embedded_order] for m in methods],
    "limit": limit, "decides": controller.decide(2.0, 0.1, 3, controller.start()),
    "sink": registry.sink_for("a.ledger").__name__,
}))
"""


@pytest.fixture(scope="module")
def site(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder that holds the installed package and nothing else."""
    folder = tmp_path_factory.mktemp("example")
    source = shutil.copytree(
        EXAMPLE, folder / "source", ignore=shutil.ignore_patterns("__pycache__", "build")
    )
    target = folder / "site"
    pip, options = pip_into(target)
    done = subprocess.run(
        [*pip, "install", *options, str(source)],
        capture_output=True,
        text=True,
        timeout=120,
    )
    assert done.returncode == 0, done.stderr
    return target


@pytest.fixture(scope="module")
def seen(site: Path) -> dict[str, object]:
    """What a fresh process sees with the package on its path."""
    script = f"import sys; sys.path.insert(0, {str(site)!r})\n{SCRIPT}"
    done = subprocess.run(
        [sys.executable, "-W", "error", "-c", script], capture_output=True, text=True, timeout=60, cwd=site
    )
    assert done.returncode == 0, done.stderr
    return dict(json.loads(done.stdout))


def test_the_package_is_seen_with_all_that_it_offers(seen: dict[str, object]) -> None:
    assert seen["origin"] == "package newel-example-stairs 1.0"
    assert seen["problems"] == []
    families = ["even-stairs-2-stages-{stages}"]
    assert seen["offers"] == [["landing-2", "winding-3"], families, ["halving"], ["ledger"]]


def test_nothing_of_the_package_is_imported_before_it_is_used(seen: dict[str, object]) -> None:
    assert seen["early"] == []


def test_its_methods_are_proved_whether_from_a_file_from_python_or_from_a_family(
    seen: dict[str, object],
) -> None:
    origin = "package newel-example-stairs 1.0"
    assert seen["methods"] == [
        ["landing-2", origin, "exact", 2, None],
        ["winding-3", origin, "exact", 3, 2],
        ["even-stairs-2-stages-9", origin, "exact", 2, None],
        ["doubled-landing-2", "built-in", "exact", 3, 2],
    ]


def test_its_family_tells_its_own_limits(seen: dict[str, object]) -> None:
    assert seen["limit"] == "BadRequest: even-stairs-2-stages-1000: stages must be from 2 to 40"


def test_its_controller_and_its_sink_work_by_name_and_ending(seen: dict[str, object]) -> None:
    assert seen["decides"] == [False, 0.5, []]
    assert seen["sink"] == "Ledger"
