"""Where a result comes from: digests of a model's files, and facts of the machine."""

from __future__ import annotations

import functools
import hashlib
import importlib
import inspect
import os
import platform
from pathlib import Path
from typing import Any

import numpy as np

from newel.models.checks import bad
from newel.models.model import Model

__all__ = ["file_digest", "machine", "model_origin", "source_file"]

THREAD_VARIABLES = ("OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS", "OMP_NUM_THREADS")


def file_digest(path: Path) -> str:
    """Return the SHA-256 of a file's bytes, in hexadecimal; raises OSError."""
    with path.open("rb") as stream:
        return hashlib.file_digest(stream, "sha256").hexdigest()


def source_file(function: Any) -> Path | None:
    """Return the file in which a function is written, or None (compiled, or typed at a prompt).

    Partial functions, bound methods, decorated functions and callable objects lead to what they wrap.
    """
    while isinstance(function, functools.partial):
        function = function.func
    function = inspect.unwrap(getattr(function, "__func__", function))
    own_call = vars(type(function)).get("__call__")
    code = getattr(function, "__code__", None) or getattr(own_call, "__code__", None)
    path = None if code is None else Path(code.co_filename)
    return path if path is not None and path.is_file() else None


def model_origin(model: Model) -> dict[str, Any]:
    """Return the file that holds the model's rate, its digest, and those of the files it names; fit for JSON.

    Raises:
        BadModel: a file that the model names cannot be read.
    """
    source = source_file(model.rate)
    named = {}
    for path in model.files:
        try:
            named[str(path)] = file_digest(path)
        except OSError as error:
            what = f"files: {path} cannot be read: {error.strerror}"
            raise bad("files", what, "Name files as they are found from here.") from None
    return {
        "source": None if source is None else source.name,
        "digest": None if source is None else file_digest(source),
        "files": named,
    }


def machine() -> dict[str, str]:
    """Return what the bits of a result depend on: versions, platform and the threads of linear algebra.

    Example:
        >>> sorted(machine())
        ['blas', 'blas_threads', 'machine', 'newel', 'numpy', 'platform', 'python']
    """
    return {**_versions(), "blas_threads": _blas_threads()}


@functools.cache
def _versions() -> dict[str, str]:
    return {
        "newel": str(importlib.import_module("newel").__version__),
        "python": platform.python_version(),
        "numpy": np.__version__,
        "blas": _blas(),
        "platform": platform.system(),
        "machine": platform.machine(),
    }


def _blas() -> str:
    try:
        facts: Any = np.show_config(mode="dicts")  # type: ignore[call-arg,unused-ignore]  # its stubs vary
        found = facts["Build Dependencies"]["blas"]
        return f"{found['name']} {found['version']}"
    except (KeyError, TypeError):
        return "unknown"


def _blas_threads() -> str:
    """Return the number asked for by the environment, else the number of processors that we may use."""
    for name in THREAD_VARIABLES:
        if os.environ.get(name):
            return os.environ[name]
    if hasattr(os, "sched_getaffinity"):
        return str(len(os.sched_getaffinity(0)))
    return str(os.cpu_count() or 1)
