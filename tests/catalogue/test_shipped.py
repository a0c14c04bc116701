"""What newel brings itself goes through the hooks, and every loader leads somewhere."""

import subprocess
import sys

import pytest

from newel.catalogue.registry import Registry
from newel.catalogue.shipped import newel_controllers, newel_sinks, tableau_files
from newel.protocols import Controller, Sink
from newel.stepping.controllers import NAMED

pytestmark = pytest.mark.core

STAND = Registry(folders=[], plugins=False, cache=None)


def test_every_named_controller_is_offered_under_its_name() -> None:
    assert set(newel_controllers()) == set(NAMED)
    for name in STAND.controllers():
        made = STAND.controller(name)
        assert isinstance(made, Controller)
        assert made.name == name


def test_every_sink_leads_to_a_class_with_the_three_methods() -> None:
    assert set(STAND.sinks()) == set(newel_sinks())
    for name in STAND.sinks():
        factory = STAND.sink(name)
        assert all(callable(getattr(factory, method)) for method in ("open", "write", "close"))
    assert isinstance(STAND.sink("memory")(), Sink)


def test_every_built_in_file_is_a_method_of_its_own_name_in_the_folder_of_its_order() -> None:
    files = tableau_files()
    assert len(files) >= 40
    assert STAND.names() == tuple(files)
    for slug in STAND.names():
        tableau = STAND.load(slug)
        assert tableau.slug == slug
        assert tableau.origin == "built-in"
        assert f"order-{tableau.order}" in str(files[slug])


def test_a_zipped_package_is_read_too(monkeypatch: pytest.MonkeyPatch, tmp_path: object) -> None:
    """Where the data is no plain folder, a file is read through its package."""
    import zipfile
    from pathlib import Path

    from newel.catalogue import shipped

    assert isinstance(tmp_path, Path)
    archive = tmp_path / "data.zip"
    with zipfile.ZipFile(archive, "w") as packed:
        packed.writestr("zipped_methods/__init__.py", "")
        packed.writestr("zipped_methods/order-4/kutta-4.toml", tableau_files()["kutta-4"].read_bytes())
    plain = STAND.find("kutta-4").digest  # before the patch: the stand gathers its names only once
    monkeypatch.syspath_prepend(str(archive))
    monkeypatch.setattr(shipped, "PACKAGE", "zipped_methods")
    stand = Registry(folders=[], plugins=False, cache=None)
    assert stand.names() == ("kutta-4",)
    assert stand.find("kutta-4").digest == plain


@pytest.mark.parametrize("asked", ["names()", "find('kutta-4')", "controller('elementary')"])
def test_nothing_is_imported_before_it_is_used(asked: str) -> None:
    """A fresh process that asks for one thing has not imported the others."""
    unwanted = {
        "names()": ["newel.methods.tableau", "newel.stepping.controllers", "newel.results.sinks.csv_file"],
        "find('kutta-4')": ["newel.stepping.controllers", "newel.results.sinks.csv_file"],
        "controller('elementary')": ["newel.methods.tableau", "newel.results.sinks.csv_file"],
    }[asked]
    script = (
        "import sys, newel.catalogue.registry as r\n"
        "assert 'pluggy' not in sys.modules and 'rich' not in sys.modules\n"
        f"r.Registry(folders=[], cache=None).{asked}\n"
        f"assert not [name for name in {unwanted!r} if name in sys.modules], sys.modules\n"
        "assert 'rich' not in sys.modules\n"
    )
    subprocess.run([sys.executable, "-c", script], check=True, timeout=60)
