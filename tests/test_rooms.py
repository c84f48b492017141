"""Which way imports point, and what a command must not load."""

from __future__ import annotations

import ast
import subprocess
import sys
from pathlib import Path

import pytest

from audit.cli import COMMANDS

ROOT = Path(__file__).parent.parent
OURS = {"rules", "db", "audit", "sample_sites"}
MAY = {
    "rules": ("rules",),
    "db": ("db", "rules.record", "rules.columns", "rules.units"),
    "audit": ("audit", "db", "rules", "sample_sites"),
    "sample_sites": ("sample_sites",),
}
HEAVY = ("numpy", "scipy", "pint", "textual", "sqlite_utils", "rich", "openpyxl", "jinja2")


def imported(path: Path) -> list[str]:
    names: list[str] = []
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            names += [alias.name for alias in node.names]
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"{path}: relative import"
            names += [f"{node.module}.{alias.name}" for alias in node.names]
    return names


@pytest.mark.parametrize("room", sorted(MAY))
def test_imports_point_one_way(room: str) -> None:
    seen = 0
    for path in sorted((ROOT / room).rglob("*.py")):
        for name in imported(path):
            if name.split(".")[0] in OURS:
                seen += 1
                allowed = any(name == may or name.startswith(may + ".") for may in MAY[room])
                assert allowed, f"{path.relative_to(ROOT)} imports {name}"
    assert seen or room not in ("rules", "audit")


def test_only_units_imports_pint() -> None:
    users = {
        str(path.relative_to(ROOT))
        for room in MAY
        for path in (ROOT / room).rglob("*.py")
        if any(name.split(".")[0] == "pint" for name in imported(path))
    }
    assert users == {"rules/units.py"}


def test_the_packages_own_init_files_are_empty() -> None:
    assert [(ROOT / room / "__init__.py").read_text(encoding="utf-8") for room in sorted(MAY)] == ["", "", "", ""]


def loaded_by(code: str) -> set[str]:
    """Names of the modules in a fresh interpreter after running ``code``."""
    script = f"{code}\nimport sys; print('\\n'.join(sys.modules), file=sys.stderr)"
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=True, cwd=ROOT)
    return set(done.stderr.split())


@pytest.mark.parametrize(
    "args", [["--help"], ["--version"], *([command, "--help"] for command in sorted(COMMANDS)), []]
)
def test_help_loads_nothing_heavy(args: list[str]) -> None:
    loaded = loaded_by(f"from audit.cli import run; assert run({args!r}) == 0")
    assert "click" in loaded
    assert not loaded & set(HEAVY)


@pytest.mark.parametrize("module", ["rules.assess", "audit.report.write", "audit.cli", "audit.intake.folder"])
def test_what_serves_the_command_line_does_not_load_the_terminal_toolkit(module: str) -> None:
    assert not loaded_by(f"import {module}") & {"textual", "pint", "scipy"}


def test_the_blind_trial_shares_no_code_with_the_project() -> None:
    assert not {name.split(".")[0] for name in imported(ROOT / "tests/trial/trial.py")} & OURS
