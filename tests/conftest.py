"""What all tests share: no test depends on chance, the clock, or the user's own cache and folders."""

from __future__ import annotations

import os
import tempfile

from hypothesis import settings

settings.register_profile("fixed", derandomize=True, deadline=None, database=None)
settings.load_profile("fixed")

_cache = tempfile.TemporaryDirectory(prefix="newel-tests-")
os.environ["NEWEL_CACHE"] = _cache.name
os.environ.pop("NEWEL_TABLEAUX", None)
