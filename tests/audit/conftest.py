"""No test of ``audit`` touches the settings of whoever runs it."""

from __future__ import annotations

from pathlib import Path

import pytest


@pytest.fixture(autouse=True)
def home(tmp_path_factory: pytest.TempPathFactory, monkeypatch: pytest.MonkeyPatch) -> Path:
    """The settings folder of this test; it is not there yet."""
    folder = tmp_path_factory.mktemp("user") / "settings"
    monkeypatch.setenv("OHMWALK_HOME", str(folder))
    monkeypatch.delenv("OHMWALK_BY", raising=False)
    return folder
