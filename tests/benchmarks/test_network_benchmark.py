"""The benchmark of networks measures what it says."""

from __future__ import annotations

import importlib.util
import sys
from pathlib import Path
from types import ModuleType

import numpy as np
import pytest


@pytest.fixture
def network(monkeypatch: pytest.MonkeyPatch) -> ModuleType:
    """``network.py`` beside this file, as a module."""
    spec = importlib.util.spec_from_file_location("network_benchmark", Path(__file__).with_name("network.py"))
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    monkeypatch.setitem(sys.modules, spec.name, module)
    spec.loader.exec_module(module)
    return module


@pytest.mark.parametrize("kind", ["tree", "chain"])
def test_both_solve_the_same_network(network: ModuleType, kind: str) -> None:
    """But for the loads: at the voltage found they draw a little more than at 48 V."""
    tree = network.Tree.drawn(2000, kind)
    ours, sparse = tree.ours().voltage_v[1:], tree.sparse()()
    assert ours.min() < 47
    np.testing.assert_allclose(48 - ours, 48 - sparse, rtol=0.15)
    assert np.all(ours <= sparse)


def test_the_circuits_are_solved(network: ModuleType) -> None:
    columns = network.Columns.drawn(500)
    np.testing.assert_allclose(48 - columns.solved().voltage_v[1:], columns.bare() * columns.current_a, rtol=1e-9)
    assert len(columns.rows()) == 500


def test_it_prints_every_ratio(
    network: ModuleType, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setattr(sys, "argv", ["network.py", "--points", "3000", "--circuits", "1000", "--runs", "1"])
    network.main()
    said = capsys.readouterr().out
    for words in (
        "× one sparse solution (at most 1)",
        "× the time a point",
        "chain of 3,000",
        "× bare numpy (at most 10)",
    ):
        assert words in said
