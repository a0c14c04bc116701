"""The project's own shape: what ships, what the top level holds, which names are public."""

from __future__ import annotations

import importlib
import re
import subprocess
import tomllib
from importlib import resources
from pathlib import Path

import pytest

import newel

ROOT = Path(__file__).resolve().parents[2]


def project() -> dict[str, object]:
    data: dict[str, object] = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))
    return data


def test_every_package_folder_is_declared() -> None:
    """A package that the project file forgets would be missing from the wheel."""
    tool = project()["tool"]
    assert isinstance(tool, dict)
    declared = set(tool["setuptools"]["packages"])
    source = ROOT / "src"
    found = {".".join(p.parent.relative_to(source).parts) for p in source.rglob("__init__.py")}
    assert declared == found | {"newel.tableaux"}


def test_run_time_needs_exactly_four_libraries() -> None:
    """numpy, attrs, pluggy, rich, and nothing else."""
    table = project()["project"]
    assert isinstance(table, dict)
    names = {re.split(r"[<>=~! ]", text)[0] for text in table["dependencies"]}
    assert names == {"numpy", "attrs", "pluggy", "rich"}


def test_the_installed_slugs_are_the_committed_ones() -> None:
    """A folder left behind by an earlier build would ship deleted files again."""
    committed = {path.stem for path in (ROOT / "tableaux").glob("order-*/*.toml")}
    shipped = {
        file.name.removesuffix(".toml")
        for folder in resources.files("newel.tableaux").iterdir()
        if folder.name.startswith("order-")
        for file in folder.iterdir()
        if file.name.endswith(".toml")
    }
    assert shipped == committed
    proved = tomllib.loads((ROOT / "tableaux" / "proved.toml").read_text(encoding="utf-8"))
    listed = {name for name in str(proved).split("'") if name in committed}
    assert listed == committed


def test_the_top_level_holds_what_the_design_names() -> None:
    """README.md, DEVELOPERS.md, pyproject.toml, tableaux, src, tests, LICENSE, and files with a dot."""
    listing = subprocess.run(["git", "ls-files"], cwd=ROOT, capture_output=True, text=True, check=False)
    if listing.returncode:
        pytest.skip("no git checkout")
    tops = {line.split("/")[0] for line in listing.stdout.splitlines()}
    assert {top for top in tops if not top.startswith(".")} == {
        "README.md",
        "DEVELOPERS.md",
        "pyproject.toml",
        "tableaux",
        "src",
        "tests",
        "LICENSE",
    }


@pytest.mark.parametrize("name", newel.__all__)
def test_each_public_name_loads(name: str) -> None:
    """Names are loaded on first use; each of them must be there."""
    assert getattr(newel, name) is not None
    assert name in dir(newel)


def test_an_unknown_name_says_which_there_are() -> None:
    """A slip in a name is an AttributeError that lists the public names."""
    with pytest.raises(AttributeError, match=r"newel.*no attribute 'marsh'.*march"):
        importlib.import_module("newel").__getattr__("marsh")


def test_versions_agree() -> None:
    """The version in the project file is the one that the package tells."""
    table = project()["project"]
    assert isinstance(table, dict)
    assert table["version"] == newel.__version__
