import pytest


@pytest.fixture(autouse=True)
def apart(tmp_path, monkeypatch):
    """Run each command in a folder of its own, with no settings of the person who runs the tests."""
    for name in ("NEWEL_TABLEAUX", "NEWEL_TRACEBACK", "NO_COLOR", "FORCE_COLOR", "COLUMNS", "TERM"):
        monkeypatch.delenv(name, raising=False)
    monkeypatch.setenv("NEWEL_CACHE", str(tmp_path / "cache"))
    monkeypatch.chdir(tmp_path)
    return tmp_path
