"""What the tests of the diagnosis share: modules beside them, loaded by their path, and surveys of the blind trial."""

from __future__ import annotations

import importlib.util
import sys
from collections.abc import Callable
from functools import cache
from pathlib import Path
from types import ModuleType
from typing import Any

import pytest

from audit.intake.folder import site_of
from rules import limits
from rules.assess import prepare
from rules.case import CircuitCase, case_of
from rules.diagnosis.problem import Problem
from rules.diagnosis.rows import problem_of

TESTS = Path(__file__).parent.parent.parent


@cache
def module(path: str) -> ModuleType:
    """A module of the tests by its path below ``tests``: there are no packages there to import from."""
    found = sys.modules.get(path)
    if found is None:
        spec = importlib.util.spec_from_file_location(path, TESTS / path)
        assert spec is not None
        assert spec.loader is not None
        found = sys.modules[path] = importlib.util.module_from_spec(spec)
        spec.loader.exec_module(found)
    return found


@pytest.fixture(scope="session")
def plain() -> ModuleType:
    """The diagnosis as a plain loop."""
    return module("rules/diagnosis/plain.py")


@pytest.fixture(scope="session")
def plain_slips() -> ModuleType:
    """Its part about slips."""
    return module("rules/diagnosis/plain_slips.py")


@pytest.fixture(scope="session")
def chains() -> ModuleType:
    """Chains of runs as sites."""
    return module("rules/diagnosis/chains.py")


@pytest.fixture(scope="session")
def trial() -> ModuleType:
    """The blind trial."""
    return module("trial/trial.py")


@cache
def drawn_cases(seed: int, circuits: int) -> tuple[CircuitCase, ...]:
    """The cases of a drawn survey."""
    rows = module("trial/trial.py").draw(circuits, seed)
    tables = {name: [_cells(row) for row in rows[name]] for name in ("circuits", "runs", "loads", "readings")}
    tables["sources"] = [
        {"source": row["fed_from"], "kind": "power supply", "nominal": row["nominal"]} for row in tables["circuits"]
    ]
    meters = module("trial/trial.py").INSTRUMENTS
    tables["instruments"] = [
        _cells(dict(zip(("quantity", "accuracy", "counts", "resolution"), meters[tag.split()[0]], strict=True)))
        | {"instrument": tag}
        for tag in sorted({str(row["instrument"]) for row in rows["readings"]})
    ]
    site = site_of(tables, {"name": "drawn", "ambient": "25 degC"})
    context = prepare(site, limits.of(site))
    return tuple(case_of(context, circuit) for circuit in site.circuits)


def _cells(row: dict[str, Any]) -> dict[str, str]:
    """A drawn row as intake takes it: names without units, cells as text."""
    return {name.partition(" [")[0]: str(cell) for name, cell in row.items()}


@pytest.fixture(scope="session")
def draw() -> Callable[[int, int], tuple[CircuitCase, ...]]:
    """Cases of a survey of the blind trial: seed, number of circuits."""
    return drawn_cases


@pytest.fixture(scope="session")
def problem_from() -> Callable[[CircuitCase], Problem]:
    """The problem of a case, without design currents."""

    def made(case: CircuitCase) -> Problem:
        problem = problem_of(case.rounds, case.tree, case.limits, {}, nominal_v=case.nominal_v)
        assert problem is not None
        return problem

    return made
