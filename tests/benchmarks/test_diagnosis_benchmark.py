"""The benchmark of the diagnosis measures what it says."""

from __future__ import annotations

import importlib.util
import sys
from pathlib import Path
from types import ModuleType

import pytest


@pytest.fixture
def benchmark(monkeypatch: pytest.MonkeyPatch) -> ModuleType:
    """``diagnosis.py`` beside this file, as a module."""
    spec = importlib.util.spec_from_file_location("diagnosis_benchmark", Path(__file__).with_name("diagnosis.py"))
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    monkeypatch.setitem(sys.modules, spec.name, module)
    spec.loader.exec_module(module)
    return module


def test_it_says_both_ratios(benchmark: ModuleType) -> None:
    """On few circuits; whether the ratios hold is for whoever runs it, on a quiet machine."""
    lines: list[str] = []
    one, many = benchmark.benchmark(100, 5, 1, lines.append)
    assert one > 0
    assert many > 0
    assert "5 runs, 2 rounds" in lines[0]
    assert "circuits in batches" in lines[1]
    assert "memory beside the results" in lines[3]
