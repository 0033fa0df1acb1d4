"""What every test stands on: no record but its own, and the same examples each time."""

from __future__ import annotations

import os

import pytest
from hypothesis import settings

from tests.browsing import browser

__all__ = ["browser"]

# A slow machine is not a failure, and a failure that comes and goes would be shrugged off.
settings.register_profile("steady", deadline=None, derandomize=True, database=None)
settings.load_profile("steady")


@pytest.fixture(autouse=True)
def _nothing_of_the_users(monkeypatch: pytest.MonkeyPatch, tmp_path_factory: pytest.TempPathFactory) -> None:
    """The variables that change an answer: a test that wants one sets it."""
    for name in [name for name in os.environ if name.startswith("ELECTROLOG_")]:
        monkeypatch.delenv(name)
    for name in ("COLUMNS", "FORCE_COLOR", "NO_COLOR", "PYTHONIOENCODING"):
        monkeypatch.delenv(name, raising=False)
    monkeypatch.setenv("ELECTROLOG_SETTINGS", os.devnull)
    monkeypatch.setenv("ELECTROLOG_CACHE", str(tmp_path_factory.getbasetemp() / "cache"))
