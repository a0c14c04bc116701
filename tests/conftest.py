"""What all tests share: no test depends on chance, the clock, or the user's own cache and folders."""

from __future__ import annotations

import os
import sys
import tempfile

import pytest
from hypothesis import settings

settings.register_profile("fixed", derandomize=True, deadline=None, database=None)
settings.load_profile("fixed")

_cache = tempfile.TemporaryDirectory(prefix="newel-tests-")
os.environ["NEWEL_CACHE"] = _cache.name
os.environ.pop("NEWEL_TABLEAUX", None)


@pytest.fixture(autouse=True)
def pythons_own_limit_of_digits() -> None:
    """mpmath lifts it for the whole process, so that what a test sees would depend on those before it."""
    sys.set_int_max_str_digits(sys.int_info.default_max_str_digits)
