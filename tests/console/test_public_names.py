"""`import newel`: every public name is there, lazily, once."""

import importlib
import subprocess
import sys

import pytest

import newel

pytestmark = pytest.mark.core


def test_every_public_name_can_be_used_and_is_what_its_module_has():
    for name, module in newel._WHERE.items():
        if name == "guide":  # the folder of the guides has this name too: see test_other_commands
            continue
        assert getattr(newel, name) is getattr(importlib.import_module(module), name)
    for name, module in newel._MODULES.items():
        assert getattr(newel, name) is importlib.import_module(module)
    assert sorted(newel.__all__) == sorted({*newel._WHERE, *newel._MODULES, "__version__"})
    assert dir(newel) == newel.__all__


def test_type_checkers_see_the_same_names():
    text = importlib.resources.files("newel").joinpath("__init__.py").read_text(encoding="utf-8")
    block = text[text.index("if TYPE_CHECKING:") : text.index("__version__ =")]
    seen = {line.rsplit(" as ", 1)[1] for line in block.splitlines() if " as " in line}
    assert seen == {*newel._WHERE, *newel._MODULES}


def test_a_name_that_is_not_there_is_answered_with_those_that_are():
    with pytest.raises(AttributeError, match="its names: Adaptive, Fixed"):
        newel.nothing  # noqa: B018 - the access itself is what is tested


def test_importing_newel_loads_nothing_that_is_used_later():
    code = (
        "import sys, newel;"
        "late = ('rich', 'pluggy', 'tomllib', 'importlib.metadata', 'argparse', 'newel.catalogue');"
        "print([name for name in late if name in sys.modules])"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout == "[]\n"


def test_find_register_and_read_agree_on_one_method(tmp_path):
    registry = newel.Registry(folders=[], plugins=False, cache=None)
    own = newel.Tableau("two-thirds-2", order=2, matrix=[[], ["2/3"]], weights=["1/4", "3/4"])
    newel.write_tableau(own, tmp_path / "two-thirds-2.toml")
    read = newel.read_tableau(tmp_path / "two-thirds-2.toml", registry=registry)
    registered = newel.register(own, registry=registry)
    assert read == registered == newel.find("two-thirds-2", registry=registry)
    assert read.proof.outcome == "exact"
    assert newel.names(text="two-thirds", registry=registry) == ("two-thirds-2",)
    assert newel.plugins(registry)[-1].tableaux == ("two-thirds-2",)


def test_trust_skips_the_proof_and_shows_that_there_is_none(tmp_path):
    registry = newel.Registry(folders=[], plugins=False, cache=None)
    wrong = newel.Tableau("wrong-2", order=2, matrix=[[], ["1/3"]], weights=[0, 1])
    newel.write_tableau(wrong, tmp_path / "wrong-2.toml")
    with pytest.raises(newel.errors.NotProved):
        newel.read_tableau(tmp_path / "wrong-2.toml", registry=registry)
    with pytest.raises(newel.errors.NotProved):
        newel.register(wrong, registry=registry)
    assert newel.read_tableau(tmp_path / "wrong-2.toml", trust=True, registry=registry).proof is None
    assert newel.names(details=True, registry=registry)[-1].outcome != "unproven"
    newel.register(wrong, trust=True, registry=registry)
    assert newel.names(details=True, registry=registry)[-1].outcome == "unproven"
