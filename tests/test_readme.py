"""What README.md says stays true: its example runs, its commands and columns are those of the program."""

from __future__ import annotations

import os
import re
import subprocess
import sys
from pathlib import Path

import pytest

from audit.cli import COMMANDS
from rules.record import TABLES, columns

README = (Path(__file__).parent.parent / "README.md").read_text(encoding="utf-8")


def example() -> str:
    """The shell block that makes a site from nothing."""
    (block,) = re.findall(r"```sh\n(mkdir .*?)```", README, re.DOTALL)
    return str(block)


def test_the_site_from_nothing_is_judged_and_taken_in(tmp_path: Path) -> None:
    environment = os.environ | {
        "PATH": f"{Path(sys.executable).parent}{os.pathsep}{os.environ['PATH']}",
        "OHMWALK_HOME": str(tmp_path / "home"),
    }
    ran = subprocess.run(
        ["sh", "-e", "-c", example()], cwd=tmp_path, env=environment, capture_output=True, text=True, check=False
    )
    assert ran.returncode == 0, ran.stderr
    assert "C1, lamp: Computed drop above the allowed drop" in ran.stdout
    assert (tmp_path / "mill.ohmwalk").is_file()


@pytest.mark.parametrize("command", sorted(COMMANDS))
def test_every_command_has_its_line(command: str) -> None:
    assert f"`ohmwalk {command}" in README


@pytest.mark.parametrize("table", sorted(TABLES))
def test_every_column_stands_in_the_table_of_files(table: str) -> None:
    row = next(line for line in README.splitlines() if line.startswith(f"| `{table}.csv` |"))
    for _, column in columns(table):
        assert re.search(rf"\b{re.escape(column.name)}\b", row), column.name
