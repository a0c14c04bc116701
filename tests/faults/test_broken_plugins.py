"""Broken packages are left out, named with rule, signature, file and line; everything else still works.

Each package here is a folder on the import path with a `.dist-info` beside it, as an installer leaves it.
"""

import itertools
import textwrap
from collections.abc import Callable
from pathlib import Path

import pytest

from newel.catalogue.plugins import PluginReport
from newel.catalogue.registry import Registry
from newel.errors import (
    BadRequest,
    BadTableau,
    ClashWarning,
    NotProved,
    PluginWarning,
    SlugTaken,
    UnknownName,
)

pytestmark = pytest.mark.core

HEAD = 'import pluggy\nhookimpl = pluggy.HookimplMarker("newel")\n\n'
TABLEAU = 'Tableau("{slug}", order={order}, matrix=[[], ["1/2"]], weights=[{weights}])'
_count = itertools.count()

Install = Callable[..., tuple[str, Path]]


@pytest.fixture
def install(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Install:
    """Install a package whose module has this body; return its module name and file."""
    site = tmp_path / "site"
    site.mkdir()

    def put(
        body: str, *, name: str | None = None, value: str | None = None, head: str = HEAD
    ) -> tuple[str, Path]:
        module = f"newel_broken_{next(_count)}"
        name = name or module.replace("_", "-")
        (site / module).mkdir()
        file = site / module / "__init__.py"
        file.write_text(head + textwrap.dedent(body), encoding="utf-8")
        info = site / f"{name.replace('-', '_')}-1.0.dist-info"
        info.mkdir()
        (info / "METADATA").write_text(f"Metadata-Version: 2.1\nName: {name}\nVersion: 1.0\n")
        (info / "entry_points.txt").write_text(f"[newel]\nplugin = {value or module}\n")
        monkeypatch.syspath_prepend(str(site))
        return module, file

    return put


def stand(*folders: Path) -> Registry:
    return Registry(folders=folders, cache=None)


def line_of(file: Path, words: str) -> int:
    return 1 + next(i for i, line in enumerate(file.read_text().splitlines()) if words in line)


def report_of(registry: Registry, module: str) -> PluginReport:
    name = module.replace("_", "-")
    return next(report for report in registry.plugins() if report.origin.name.startswith(name))


@pytest.mark.parametrize(
    ("body", "words", "rule"),
    [
        ("import no_such_module_anywhere\n", "no_such_module", "ModuleNotFoundError"),
        ("def broken(:\n", "def broken", "SyntaxError"),
        ("raise RuntimeError('no licence')\n", "no licence", "RuntimeError: no licence"),
        ("import json\njson.loads('{')\n", "json.loads", "JSONDecodeError"),
        ("raise SystemExit(3)\n", "SystemExit", "SystemExit"),
        (
            "@hookimpl\ndef newel_tableaux(registry):\n    return {}\n",
            "@hookimpl",
            r"newel_tableaux(registry)",
        ),
        ("@hookimpl\ndef newel_tableau():\n    return {}\n", "@hookimpl", "newel_tableau() is no hook"),
        ("def newel_tableaux():\n    return {}\n", "def newel", "is not marked"),
        (
            "@hookimpl\ndef newel_sinks():\n    return 1 / 0\n",
            "1 / 0",
            "newel_sinks() raised ZeroDivisionError",
        ),
        (
            "@hookimpl\ndef newel_sinks():\n    return ['a']\n",
            "@hookimpl",
            "newel_sinks() returned list ['a']",
        ),
        ("@hookimpl\ndef newel_sinks():\n    yield 'a'\n", "@hookimpl", "newel_sinks() returned generator"),
        ("@hookimpl\ndef newel_controllers():\n    pass\n", "@hookimpl", "returned NoneType None"),
        ("@hookimpl\ndef newel_controllers():\n    return {'PI': print}\n", "@hookimpl", "'PI' is no name"),
        ("@hookimpl\ndef newel_controllers():\n    return {3: print}\n", "@hookimpl", "3 is no name"),
        (
            "@hookimpl\ndef newel_controllers():\n    return {'a': 3}\n",
            "@hookimpl",
            "'a' has the loader int 3",
        ),
        (
            "@hookimpl\ndef newel_sinks():\n    return {'a': 'os.remove'}\n",
            "@hookimpl",
            "the loader 'os.remove'",
        ),
        (
            "@hookimpl\ndef newel_sinks():\n    return {'a': 'x.toml'}\n",
            "@hookimpl",
            "a TOML file holds one tableau",
        ),
        (
            "@hookimpl\ndef newel_sinks():\n    return {'a-{n}': print}\n",
            "@hookimpl",
            "only tableaux come in families",
        ),
        ("x = 1\n", "import pluggy", "answers no hook"),
    ],
)
def test_a_broken_plugin_is_named_with_its_rule_file_and_line(
    install: Install, body: str, words: str, rule: str
) -> None:
    module, file = install(body)
    registry = stand()
    with pytest.warns(PluginWarning) as caught:
        assert registry.find("kutta-4").order == 4
    (said,) = (str(warning.message) for warning in caught)
    assert module.replace("_", "-") in said
    assert rule in said
    assert "Everything else works." in said
    assert f"{file}:{line_of(file, words)}" in said
    assert registry.controller("elementary").name == "elementary"
    assert report_of(registry, module).problems == (said,)


def test_the_warning_points_at_the_line_that_asked(install: Install) -> None:
    install("raise RuntimeError\n")
    with pytest.warns(PluginWarning) as caught:
        stand().names()
    assert caught[0].filename == __file__


def test_an_entry_point_that_leads_nowhere_is_reported(install: Install) -> None:
    for value in ("newel_not_there", "os:no_such_object", "not a reference"):
        install("", value=value)
    registry = stand()
    with pytest.warns(PluginWarning) as caught:
        registry.names()
    assert len(caught) == 3
    assert "newel_not_there" in "".join(str(warning.message) for warning in caught)


def test_unreadable_metadata_of_a_stranger_stops_nothing(install: Install, tmp_path: Path) -> None:
    install(
        "@hookimpl\ndef newel_controllers():\n    return {'mine': 'newel.stepping.controllers:elementary'}\n"
    )
    odd = tmp_path / "site" / "odd-1.0.dist-info"
    odd.mkdir()
    (odd / "entry_points.txt").write_bytes(b"\xff\xfe[newel")
    (odd / "METADATA").write_bytes(b"\xff\xfe")
    registry = stand()
    assert "mine" in registry.controllers()
    assert registry.find("kutta-4").order == 4


def test_a_hook_renamed_to_one_that_newel_lacks_is_refused_and_the_next_plugin_is_not_blamed(
    install: Install,
) -> None:
    install('@hookimpl(specname="newel_pictures")\ndef mine():\n    return {}\n', name="a-first")
    install('@hookimpl(specname="newel_sinks")\ndef mine(path):\n    return {}\n', name="b-second")
    install("@hookimpl\ndef newel_sinks():\n    return {'good': print}\n", name="c-third")
    registry = stand()
    with pytest.warns(PluginWarning) as caught:
        assert "good" in registry.sinks()
    assert [str(warning.message).split()[1] for warning in caught] == ["a-first", "b-second"]


def test_one_module_under_two_names_counts_once(install: Install) -> None:
    module, _ = install("@hookimpl\ndef newel_sinks():\n    return {'good': print}\n")
    install("", name="twice", value=module)
    registry = stand()
    with pytest.warns(PluginWarning, match="twice"):
        assert registry.sinks().count("good") == 1
    assert registry.sink("good") is print


def test_one_bad_entry_leaves_its_neighbours(install: Install) -> None:
    install(
        """
        @hookimpl
        def newel_controllers():
            return {"good": "newel.stepping.controllers:elementary", "Bad Name": print}
        """
    )
    registry = stand()
    with pytest.warns(PluginWarning, match="Bad Name"):
        assert registry.controller("good").name == "elementary"


def test_one_broken_hook_leaves_the_other_hooks_of_the_plugin(install: Install) -> None:
    install(
        """
        @hookimpl
        def newel_controllers():
            return {"good": "newel.stepping.controllers:elementary"}

        @hookimpl
        def newel_tableaux():
            raise ValueError("half done")
        """
    )
    registry = stand()
    with pytest.warns(PluginWarning, match="half done"):
        assert "good" in registry.controllers()


def test_a_wrong_signature_leaves_the_whole_plugin_out(install: Install) -> None:
    """Registration is all or nothing."""
    install(
        """
        @hookimpl
        def newel_controllers():
            return {"good": "newel.stepping.controllers:elementary"}

        @hookimpl
        def newel_tableaux(order, stages):
            return {}
        """
    )
    registry = stand()
    with pytest.warns(PluginWarning, match=r"newel_tableaux\(order, stages\) has a wrong signature"):
        assert "good" not in registry.controllers()


# what is loaded late


def late(slug: str, body: str) -> str:
    body = textwrap.indent(textwrap.dedent(body), "    ")
    return (
        f"from newel.methods.tableau import Tableau\n\ndef make():\n{body}\n"
        f'@hookimpl\ndef newel_tableaux():\n    return {{"{slug}": make}}\n'
    )


@pytest.mark.parametrize(
    ("body", "words", "rule"),
    [
        ("return {}['digits']\n", "['digits']", "raised KeyError: 'digits'"),
        ("raise SystemExit\n", "raise SystemExit", "raised SystemExit"),
        ("return 'kutta-4'\n", None, "returned str, not a newel Tableau"),
        (
            f"return {TABLEAU.format(slug='other-2', order=2, weights='0, 1')}\n",
            None,
            "another slug, 'other-2'",
        ),
        (f"return {TABLEAU.format(slug='late-2', order=2, weights='0, 1, 0')}\n", None, "raised BadTableau"),
    ],
)
def test_a_loader_that_fails_is_an_error_when_asked_for_and_a_warning_in_a_list(
    install: Install, body: str, words: str | None, rule: str
) -> None:
    module, file = install(late("late-2", body))
    registry = stand()
    assert "late-2" in registry.names()
    with pytest.raises(BadTableau) as caught:
        registry.find("late-2")
    said = str(caught.value)
    assert rule in said
    assert module.replace("_", "-") in said
    assert f"{file}:{line_of(file, words or '@hookimpl')}" in said
    with pytest.warns(PluginWarning, match="late-2"):
        assert "late-2" not in [each.slug for each in registry.summaries()]


def test_a_plugins_method_must_pass_its_proof_like_any_other(install: Install) -> None:
    install(late("late-3", f"return {TABLEAU.format(slug='late-3', order=3, weights='0, 1')}"))
    registry = stand()
    with pytest.raises(NotProved) as caught:
        registry.find("late-3")
    assert caught.value.verdict.order == 2
    assert "newel-broken" in str(caught.value)
    assert registry.find("kutta-4").order == 4


def test_a_built_in_slug_offered_by_a_plugin_is_a_clash_that_the_built_in_wins(install: Install) -> None:
    module, file = install(
        late("midpoint-2", f"return {TABLEAU.format(slug='midpoint-2', order=1, weights='1, 0')}")
    )
    registry = stand()
    with pytest.warns(ClashWarning, match="midpoint-2") as caught:
        assert registry.find("midpoint-2").order == 2
    assert f"{file}:{line_of(file, '@hookimpl')}" in str(caught[0].message)
    assert report_of(registry, module).problems == (str(caught[0].message),)


def test_plugins_looks_for_clashes_that_nobody_asked_for_yet(install: Install) -> None:
    module, _ = install(
        late("midpoint-2", f"return {TABLEAU.format(slug='midpoint-2', order=1, weights='1, 0')}")
    )
    registry = stand()
    with pytest.warns(ClashWarning):
        problems = report_of(registry, module).problems
    assert "midpoint-2" in problems[0]
    assert report_of(registry, module).problems == problems


def test_two_plugins_with_one_slug_clash_when_it_is_asked_for(install: Install) -> None:
    first, _ = install(late("late-2", f"return {TABLEAU.format(slug='late-2', order=2, weights='0, 1')}"))
    second, _ = install(late("late-2", f"return {TABLEAU.format(slug='late-2', order=1, weights='1, 0')}"))
    registry = stand()
    assert registry.find("kutta-4").order == 4
    with pytest.raises(SlugTaken) as caught:
        registry.find("late-2")
    for module in (first, second):
        assert module.replace("_", "-") in str(caught.value)


def test_a_family_speaks_for_itself_about_its_sizes(install: Install) -> None:
    install(
        """
        from newel.errors import BadRequest
        from newel.methods.tableau import Tableau

        def make(first, second):
            if first > 3:
                raise BadRequest(f"first is {first}; at most 3")
            return Tableau(f"odd-{first}-by-{second}", order=1, matrix=[[]], weights=[1])

        @hookimpl
        def newel_tableaux():
            return {"odd-{first}-by-{second}": make}
        """
    )
    registry = stand()
    assert registry.find("odd-2-by-7").slug == "odd-2-by-7"
    with pytest.raises(BadRequest, match="first is 4; at most 3"):
        registry.find("odd-4-by-7")
    with pytest.raises(BadRequest, match="150 digits"):
        registry.find("odd-2-by-" + "9" * 150)
    with pytest.raises(BadRequest, match="write first as 2"):
        registry.find("odd-02-by-7")


# controllers and sinks


@pytest.mark.parametrize(
    ("loader", "said"),
    [
        ("'no_such_module_anywhere:thing'", "ModuleNotFoundError"),
        ("'newel.stepping.controllers:no_such_thing'", "AttributeError"),
        ("'newel.catalogue.plugins:GROUP'", "cannot be called"),
    ],
)
def test_a_loader_that_leads_nowhere_is_named_when_the_thing_is_asked_for(
    install: Install, loader: str, said: str
) -> None:
    module, file = install(
        f"""
        @hookimpl
        def newel_controllers():
            return {{"lost": {loader}}}

        @hookimpl
        def newel_sinks():
            return {{"lost": {loader}}}
        """
    )
    registry = stand()
    for ask in (registry.controller, registry.sink):
        with pytest.raises(UnknownName, match=said) as caught:
            ask("lost")
        assert module.replace("_", "-") in str(caught.value)
        assert str(file) in str(caught.value)
    with pytest.warns(PluginWarning, match="lost"):
        assert registry.sink_for("a.csv") is registry.sink("csv")


def test_a_controller_of_a_plugin_that_is_none_is_refused(install: Install) -> None:
    install("@hookimpl\ndef newel_controllers():\n    return {'dictionary': dict}\n")
    with pytest.raises(BadRequest, match="controller 'dictionary': a dict lacks"):
        stand().controller("dictionary")


def test_clashing_names_of_controllers_and_sinks_leave_the_built_in_in_force(install: Install) -> None:
    install(
        """
        class Mine:
            endings = (".csv", ".mine")

        @hookimpl
        def newel_controllers():
            return {"elementary": Mine}

        @hookimpl
        def newel_sinks():
            return {"csv": Mine, "mine": Mine}
        """
    )
    registry = stand()
    with pytest.warns(ClashWarning, match="controller 'elementary'"):
        assert registry.controller("elementary").name == "elementary"
    with pytest.warns(ClashWarning, match="sink 'csv'"):
        assert registry.sink("csv").__module__.startswith("newel.")
    assert registry.sink_for("a.csv") is registry.sink("csv")
    assert registry.sink_for("a.mine").__name__ == "Mine"
    problems = [problem for report in registry.plugins() for problem in report.problems]
    assert len(problems) == 2


def test_the_longest_ending_chooses(install: Install) -> None:
    install(
        """
        class Packed:
            endings = (".gz",)

        class PackedTable:
            endings = (".csv.gz",)

        @hookimpl
        def newel_sinks():
            return {"packed": Packed, "packed-table": PackedTable}
        """
    )
    registry = stand()
    assert registry.sink_for("a.csv.gz").__name__ == "PackedTable"
    assert registry.sink_for("a.tar.gz").__name__ == "Packed"
    assert registry.sink_for("a.csv") is registry.sink("csv")


def test_two_plugins_for_one_ending_or_name_must_be_told_apart(install: Install) -> None:
    body = """
        class Mine:
            endings = (".mine",)

        @hookimpl
        def newel_sinks():
            return {{"mine": Mine, "{own}": Mine}}
        """
    install(body.format(own="first"))
    install(body.format(own="second"))
    registry = stand()
    with pytest.raises(SlugTaken, match="sink 'mine'"):
        registry.sink("mine")
    with pytest.warns(PluginWarning), pytest.raises(BadRequest, match=r"\.mine are written by two sinks"):
        registry.sink_for("a.mine")
    assert registry.sink("first") is not registry.sink("second")


def test_endings_that_are_no_tuple_of_endings_are_reported(install: Install) -> None:
    install(
        "class Mine:\n    endings = '.mine'\n\n@hookimpl\ndef newel_sinks():\n    return {'mine': Mine}\n"
    )
    registry = stand()
    with pytest.warns(PluginWarning, match="endings are '.mine'"), pytest.raises(UnknownName):
        registry.sink_for("a.mine")


def test_a_registry_without_plugins_asks_no_package(install: Install) -> None:
    """Warnings are errors here, so silence is the proof."""
    install("raise RuntimeError\n")
    assert Registry(folders=[], plugins=False, cache=None).find("kutta-4").order == 4
