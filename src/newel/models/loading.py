"""A model from a text such as `plant.py:build`, as a command line gives it."""

from __future__ import annotations

import contextlib
import difflib
import hashlib
import importlib
import inspect
import os
import pkgutil
import re
import sys
import traceback
from collections.abc import Iterator, Mapping
from importlib.machinery import ModuleSpec, SourceFileLoader
from importlib.util import module_from_spec
from pathlib import Path
from types import ModuleType
from typing import Any

from newel.errors import BadModel, NewelError
from newel.models.checks import bad, nearest
from newel.models.model import Model

__all__ = ["example_names", "load_model"]

FORMS = "A model is file.py, file.py:name, package.module:name or example:name."
DOTTED = re.compile(r"[^\W\d]\w*(\.[^\W\d]\w*)*")


def load_model(text: str | os.PathLike[str], **settings: Any) -> Model:
    """Return the model that a text names.

    Args:
        text: `file.py` (its `model`), `file.py:name`, `package.module:name` or `example:name`. The thing
            named is a `Model`, or a function of keyword arguments that returns one.
        settings: keyword arguments for such a function.

    Raises:
        BadModel: there is no such file, module or name; it does not run (the text says where); it is no
            model; or the function does not take these settings.

    Example:
        >>> load_model("example:lock", paddle=0.6).labels
        ('upper level', 'chamber level', 'volume')
    """
    text = os.fspath(text)
    place, name = _parted(text)
    if place == "example":
        module = _example(name)
        thing, named = getattr(module, "model", None), text
        folder = None
    else:
        folder = str(Path(place).resolve().parent) if place.endswith(".py") else os.getcwd()
        with _importing_from(folder):
            module = _run_file(Path(place)) if place.endswith(".py") else _import(place)
        name = name or "model"
        thing, named = _named(module, name, place), f"{place}:{name}"
    with _importing_from(folder):
        return _model_from(thing, named, settings)


def example_names() -> tuple[str, ...]:
    """Return the names of the models that come with newel: `lock` is loaded as `example:lock`."""
    package = importlib.import_module("newel.examples")
    return tuple(sorted(found.name for found in pkgutil.iter_modules(package.__path__)))


def _parted(text: str) -> tuple[str, str]:
    """Return what stands before and after the colon, or raise for what cannot name a model."""
    if text.endswith(".toml"):
        raise bad("model", f"{text} is a tableau, not a model.", f"For a tableau: newel check {text}")
    if text and Path(text).is_dir():
        raise bad("model", f"{text} is a folder, not a model.", FORMS)
    place, colon, name = text.rpartition(":")
    if text.endswith(".py") or not colon:
        place, name = text, ""
    if name and not name.isidentifier():
        raise bad("model", f"{text!r}: {name!r} is no name of a thing in Python.", FORMS)
    if place.endswith(".py") or (name and DOTTED.fullmatch(place)):
        return place, name
    if text and Path(text).exists():
        raise bad("model", f"{text} is no Python file: its name does not end in .py.", FORMS)
    raise bad("model", f"{text!r} names no model.", FORMS)


def _example(name: str) -> ModuleType:
    names = example_names()
    if name not in names:
        raise bad("model", f"no example {name!r}{nearest(name, names)}", f"There are: {', '.join(names)}.")
    return importlib.import_module(f"newel.examples.{name}")


@contextlib.contextmanager
def _importing_from(folder: str | None) -> Iterator[None]:
    """Let imports find the neighbours of the user's file, as they do when Python runs it as a script."""
    if folder is None:
        yield
        return
    sys.path.insert(0, folder)
    try:
        yield
    finally:
        with contextlib.suppress(ValueError):
            sys.path.remove(folder)


def _run_file(path: Path) -> ModuleType:
    if path.is_dir():
        raise bad("model", f"{path} is a folder, not a model.", FORMS)
    try:
        source = path.read_bytes()
    except FileNotFoundError:
        near = difflib.get_close_matches(path.name, [p.name for p in path.parent.glob("*.py")], n=3)
        hint = f"Near it: {', '.join(near)}." if near else FORMS
        raise bad("model", f"there is no file {path}", hint) from None
    except OSError as error:
        raise bad("model", f"{path} cannot be read: {error.strerror}", FORMS) from None
    # The name differs for each path, so that two files called model.py do not replace each other.
    mark = hashlib.sha256(str(path.resolve()).encode()).hexdigest()[:12]
    module_name = f"{re.sub(r'[^0-9A-Za-z_]', '_', path.stem)}_{mark}"
    loader = SourceFileLoader(module_name, str(path))
    module = module_from_spec(ModuleSpec(module_name, loader, origin=str(path)))
    module.__file__ = str(path.resolve())
    sys.modules[module_name] = module  # data classes and pickle look their module up
    try:
        # Compiled from what was read, never from a cache: an edit within the clock's grain must be seen.
        exec(loader.source_to_code(source, str(path)), module.__dict__)
    except (Exception, SystemExit) as error:
        del sys.modules[module_name]
        raise _does_not_run(error, str(path), str(path)) from error
    return module


def _import(place: str) -> ModuleType:
    try:
        return importlib.import_module(place)
    except ModuleNotFoundError as error:
        if error.name and (place == error.name or place.startswith(error.name + ".")):
            here = f"{place.replace('.', '/')}.py"
            hint = f"If it is a file, write {here}." if Path(here).exists() else FORMS
            raise bad("model", f"there is no module {error.name}", hint) from None
        raise _does_not_run(error, place, "") from error
    except (Exception, SystemExit) as error:
        raise _does_not_run(error, place, "") from error


def _does_not_run(error: BaseException, named: str, file: str) -> BadModel:
    """Return one line for what the user's code raised: its file, the line there, and the exception."""
    if isinstance(error, SyntaxError) and error.filename:
        line = (error.text or "").strip()
        where = f"{error.filename}:{error.lineno}"
        return bad("model", f"{where}: {error.msg}" + (f": {line}" if line else ""), f"{named} does not run.")
    frames = traceback.extract_tb(error.__traceback__)
    own = [frame for frame in frames if frame.filename == file] or [
        frame for frame in frames if "importlib" not in frame.filename and frame.filename != __file__
    ]
    where = f"{own[-1].filename}:{own[-1].lineno}" if own else named
    if isinstance(error, NewelError):
        return BadModel(f"{where}: {error}", argument="model")
    return bad("model", f"{where}: {type(error).__name__}: {error}", f"{named} does not run.")


def _named(module: ModuleType, name: str, place: str) -> Any:
    if hasattr(module, name):
        return getattr(module, name)
    found = {key: value for key, value in vars(module).items() if not key.startswith("_")}
    models = [key for key, value in found.items() if isinstance(value, Model)]
    functions = [key for key, value in found.items() if getattr(value, "__module__", None) == module.__name__]
    functions = [key for key in functions if inspect.isfunction(found[key])]
    has = [f"{key} (a Model)" for key in models] + [f"{key} (a function)" for key in functions]
    remedy = f"It has: {', '.join(has)}." if has else "It has no Model and no function."
    choice = (models or functions or ["name"])[0]
    what = f"{place} has no {name!r}{nearest(name, [*models, *functions])}"
    raise bad("model", what, f"{remedy}  Write {place}:{choice}, or name the model `model`.")


def _model_from(thing: Any, named: str, settings: Mapping[str, Any]) -> Model:
    if isinstance(thing, Model):
        if settings:
            what = f"{named} is a Model and takes no settings, such as {next(iter(settings))!r}"
            remedy = "To take them, make it a function of keyword arguments that returns a Model."
            raise bad("settings", what, remedy)
        return thing
    if not callable(thing):
        what = f"{named} is a {type(thing).__name__}, not a model"
        raise bad("model", what, "It must be a newel.Model, or a function that returns one.")
    _check_settings(thing, named, settings)
    try:
        built = thing(**settings)
    except (Exception, SystemExit) as error:
        code = getattr(inspect.unwrap(thing), "__code__", None)
        raise _does_not_run(error, named, code.co_filename if code else "") from error
    if not isinstance(built, Model):
        what = f"{named} returned a {type(built).__name__}, not a model"
        raise bad("model", what, "It must return a newel.Model.")
    return built


def _check_settings(function: Any, named: str, settings: Mapping[str, Any]) -> None:
    try:
        parameters = inspect.signature(function).parameters.values()
    except (ValueError, TypeError):
        return
    allowed = [p.name for p in parameters if p.kind in (p.POSITIONAL_OR_KEYWORD, p.KEYWORD_ONLY)]
    takes = f"It takes: {', '.join(allowed)}." if allowed else "It takes none."
    if not any(p.kind is p.VAR_KEYWORD for p in parameters):
        for name in settings:
            if name not in allowed:
                raise bad("settings", f"{named} has no setting {name!r}{nearest(name, allowed)}", takes)
    bare = (inspect.Parameter.VAR_POSITIONAL, inspect.Parameter.VAR_KEYWORD)
    needed = [p.name for p in parameters if p.default is p.empty and p.kind not in bare]
    missing = [name for name in needed if name not in settings]
    if missing:
        what = f"{named} needs {', '.join(missing)}"
        remedy = f"Give {missing[0]}=… (--set {missing[0]}=…), or let the function have defaults."
        raise bad("settings", what, f"{takes}  {remedy}")
