"""How tests install a package: into a folder of their own, without its dependencies."""

from __future__ import annotations

import sys
from importlib.metadata import PackageNotFoundError, version
from pathlib import Path

__all__ = ["pip_into"]

LEAST_SETUPTOOLS = 77


def pip_into(folder: Path) -> tuple[list[str], list[str]]:
    """Return a `pip` command and the options of its `install` that put a package into this folder.

    The setuptools that is at hand builds it where it is recent enough; a virtual environment of Python 3.11
    holds an older one, and pip then fetches one for the build.
    """
    options = ["--quiet", "--no-deps", "--disable-pip-version-check", "--target", str(folder)]
    try:
        at_hand = int(version("setuptools").partition(".")[0])
    except PackageNotFoundError:
        at_hand = 0
    options += ["--no-build-isolation"] if at_hand >= LEAST_SETUPTOOLS else []
    return [sys.executable, "-m", "pip"], options
