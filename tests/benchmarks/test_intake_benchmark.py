"""The benchmark of intake measures what it says."""

from __future__ import annotations

import importlib.util
import sys
from pathlib import Path
from types import ModuleType

import pytest

from audit.intake.folder import read_folder


@pytest.fixture
def intake(monkeypatch: pytest.MonkeyPatch) -> ModuleType:
    """``intake.py`` beside this file, as a module."""
    spec = importlib.util.spec_from_file_location("intake_benchmark", Path(__file__).with_name("intake.py"))
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    monkeypatch.setitem(sys.modules, spec.name, module)
    spec.loader.exec_module(module)
    return module


def test_its_site_has_the_stated_rows(intake: ModuleType, tmp_path: Path) -> None:
    intake.write_folder(tmp_path / "site", 100)
    site = read_folder(tmp_path / "site")
    assert [len(rows) for rows in (site.circuits, site.runs, site.loads, site.readings)] == [100, 180, 180, 700]


def test_it_says_the_ratio_and_where_the_time_goes(intake: ModuleType, tmp_path: Path) -> None:
    lines: list[str] = []
    assert intake.benchmark(tmp_path, 20, 1, lines.append) > 1
    assert "at most 15" in lines[1]
    assert [line.split("  ")[2] for line in lines[2:-1]] == ["read files", "read the rows", "check the record", "save"]
