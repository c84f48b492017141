"""Site files for the interface."""

from __future__ import annotations

import shutil
from pathlib import Path

import pytest

from audit.intake.folder import read_folder
from db.store import SiteStore
from sample_sites.catalogue import sample_site
from tests.audit.tui.walker import HUT


@pytest.fixture(autouse=True)
def _colours(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.delenv("NO_COLOR", raising=False)


@pytest.fixture(scope="session")
def plant_once(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The 48 V sample plant as a site file, made once."""
    folder = tmp_path_factory.mktemp("folder")
    for name, content in sample_site("plant").files().items():
        (folder / name).write_bytes(content)
    path = tmp_path_factory.mktemp("plant") / "plant.ohmwalk"
    SiteStore.create(path, read_folder(folder), "test", "elsewhere", "taken in").close()
    return path


@pytest.fixture
def plant(plant_once: Path, tmp_path: Path) -> Path:
    """The 48 V sample plant, a site file of its own."""
    return Path(shutil.copy(plant_once, tmp_path / "plant.ohmwalk"))


@pytest.fixture
def hut(tmp_path: Path) -> Path:
    """The hut, a site file of its own."""
    path = tmp_path / "hut.ohmwalk"
    SiteStore.create(path, HUT, "test", "elsewhere", "made").close()
    return path


@pytest.fixture
def empty(tmp_path: Path) -> Path:
    """A site file in which nothing is recorded."""
    path = tmp_path / "empty.ohmwalk"
    SiteStore.create(path, None, "test", "elsewhere", "made").close()
    return path
