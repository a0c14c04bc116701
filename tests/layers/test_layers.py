"""Arrows between packages go one way, as DEVELOPERS.md lists them."""

from __future__ import annotations

import ast
from collections.abc import Iterator
from pathlib import Path

import pytest

import newel

SOURCE = Path(newel.__path__[0])

LAYERS = (
    ("errors", "protocols"),
    ("methods",),
    ("catalogue",),
    ("models",),
    ("stepping",),
    ("results",),
    ("marching",),
    ("many",),
    ("studies",),
    ("testing", "guide", "examples"),
    ("console", "__main__"),
)
LEVEL = {name: level for level, names in enumerate(LAYERS) for name in names}

# Inside a package, lowest first; a module that is not listed may stand anywhere in a package without cycles.
ORDER = {
    "methods": (
        "number_text",
        "exact",
        "trees",
        "tableau",
        "tableau_file",
        "order_conditions",
        "analysis",
        "families",
    ),
    "catalogue": ("plugins", "shipped", "registry", "checking"),
    "models": ("model", "events", "layout", "examine", "loading", "provenance"),
    "stepping": ("controllers", "rules", "numpy_step", "continuous", "switching"),
    "results": ("run", "sinks", "progress"),
    "marching": ("first_step", "loop", "march"),
}


def files() -> list[Path]:
    return sorted(path for path in SOURCE.rglob("*.py") if path != SOURCE / "__init__.py")


def module_of(path: Path) -> tuple[str, ...]:
    parts = path.relative_to(SOURCE).with_suffix("").parts
    return parts[:-1] if parts[-1] == "__init__" else parts


def imports(tree: ast.AST) -> Iterator[str]:
    """Every module that is imported, inside functions too, but not under `if TYPE_CHECKING:`."""
    for node in ast.iter_child_nodes(tree):
        if isinstance(node, ast.If) and ast.unparse(node.test).endswith("TYPE_CHECKING"):
            yield from imports(ast.Module(node.orelse, []))
            continue
        if isinstance(node, ast.Import):
            yield from (alias.name for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, "imports are absolute"
            yield node.module or ""
            yield from (f"{node.module}.{alias.name}" for alias in node.names)
        else:
            yield from imports(node)


def own_imports(path: Path) -> set[tuple[str, ...]]:
    found = set()
    for name in imports(ast.parse(path.read_text(encoding="utf-8"))):
        parts = tuple(name.split("."))
        if parts[0] != "newel" or len(parts) == 1:
            continue
        target = SOURCE.joinpath(*parts[1:])
        if target.with_suffix(".py").is_file() or (target / "__init__.py").is_file():
            found.add(parts[1:])
    return found


def test_every_package_has_a_layer() -> None:
    """A new package needs a place in the order."""
    assert {module_of(path)[0] for path in files()} <= set(LEVEL)


@pytest.mark.parametrize("path", files(), ids=lambda path: "/".join(module_of(path)))
def test_a_module_imports_only_from_layers_below(path: Path) -> None:
    """No import points up."""
    own = module_of(path)
    for target in own_imports(path):
        assert LEVEL[target[0]] <= LEVEL[own[0]], f"{'.'.join(own)} imports {'.'.join(target)}"
        if LEVEL[target[0]] == LEVEL[own[0]] and target[0] != own[0]:
            assert LAYERS[LEVEL[own[0]]].index(target[0]) <= LAYERS[LEVEL[own[0]]].index(own[0])


@pytest.mark.parametrize("path", files(), ids=lambda path: "/".join(module_of(path)))
def test_inside_a_package_the_order_is_kept(path: Path) -> None:
    """The modules that the order names import only from those before them."""
    package, *rest = module_of(path)
    order = ORDER.get(package, ())
    if not rest or rest[0] not in order:
        return
    for target in own_imports(path):
        if target[0] == package and len(target) > 1 and target[1] in order:
            assert order.index(target[1]) <= order.index(rest[0]), f"{path}: {'.'.join(target)}"


def test_no_cycle_between_modules() -> None:
    """Modules can be put into one line in which each imports only from those before it."""
    needs = {module_of(path): own_imports(path) - {module_of(path)} for path in files()}
    # A package's own __init__ gathers its modules; what imports the package imports those.
    while needs:
        free = [module for module, targets in needs.items() if not targets & needs.keys()]
        assert free, f"a cycle among {sorted('.'.join(module) for module in needs)}"
        for module in free:
            del needs[module]


def test_nothing_beyond_the_four_libraries_is_imported_at_run_time() -> None:
    """SciPy, mpmath and the test libraries stay in tests; extras are imported where they are asked for."""
    allowed = {"numpy", "attrs", "pluggy", "rich", "newel", "hypothesis", "pytest"}
    import sys

    for path in files():
        for name in imports(ast.parse(path.read_text(encoding="utf-8"))):
            top = name.split(".")[0]
            assert top in allowed or top in sys.stdlib_module_names, f"{path} imports {name}"
            if top in ("hypothesis", "pytest"):
                assert module_of(path) == ("testing",), path
