"""The command line as people and scripts meet it."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest

from audit import cli
from sample_sites.catalogue import sample_site

Captured = pytest.CaptureFixture[str]


@pytest.fixture
def plant(tmp_path: Path) -> Path:
    """A copy of the 48 V plant's folder."""
    folder = tmp_path / "plant"
    folder.mkdir()
    for name, content in sample_site("plant").files().items():
        (folder / name).write_bytes(content)
    return folder


@pytest.fixture(autouse=True)
def _here(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)


def checked(folder: Path, capsys: Captured, *options: str) -> Any:
    assert cli.run(["check", str(folder), "--json", *options]) == 0
    return json.loads(capsys.readouterr().out)


def refused(args: list[str], capsys: Captured, status: int = 2) -> list[str]:
    """The lines on standard error of a call that must fail, with nothing on standard output."""
    assert cli.run(args) == status
    shown = capsys.readouterr()
    assert shown.out == ""
    assert "Traceback" not in shown.err
    return shown.err.splitlines()


def test_json_is_one_object_on_standard_output(plant: Path, capsys: Captured) -> None:
    told = checked(plant, capsys)
    assert told["schema"] == "ohmwalk.check/1"
    assert told["summary"]["circuits"] == len(told["circuits"]) == 30


def test_one_circuit(plant: Path, capsys: Captured) -> None:
    told = checked(plant, capsys, "--circuit", "F2")
    assert [circuit["circuit"] for circuit in told["circuits"]] == ["F2"]
    assert {finding["circuit"] for finding in told["findings"]} == {"F2"}
    assert told["summary"]["circuits"] == 1


def test_an_unknown_circuit_or_visit_names_the_nearest(plant: Path, capsys: Captured) -> None:
    assert refused(["check", str(plant), "--circuit", "F22"], capsys) == [
        "--circuit: no circuit 'F22'; did you mean 'F2'?"
    ]
    (line,) = refused(["check", str(plant), "--visit", "nineteen"], capsys)
    assert line.startswith("--visit: no visit 'nineteen'")


def test_fail_on_a_severity(plant: Path, capsys: Captured) -> None:
    assert cli.run(["check", str(plant), "--fail-on", "soon"]) == 1
    assert cli.run(["check", str(plant), "--fail-on", "immediate"]) == 1
    assert cli.run(["check", str(plant), "--circuit", "A-03", "--fail-on", "immediate"]) == 0
    capsys.readouterr()


@pytest.mark.parametrize(
    ("args", "line"),
    [
        (["chekc"], "ohmwalk: no command 'chekc'; did you mean 'check'?; there are:"),
        (["check"], "ohmwalk check: Missing argument 'SITE'."),
        (["check", "x", "--loud"], "ohmwalk check: No such option '--loud'"),
        (["check", "nowhere"], "nowhere"),
        (["check", "x", "--fail-on", "later"], "ohmwalk check: Invalid value for '--fail-on'"),
        (["report", "x"], "ohmwalk report: Missing option '--to'."),
        (["demo", "castle"], "there is no sample site 'castle'"),
        (["tables", "awgs"], "no table 'awgs'"),
    ],
)
def test_wrong_use_is_one_line(args: list[str], line: str, capsys: Captured) -> None:
    (told,) = refused(args, capsys)
    assert told.startswith(line)


def test_every_problem_of_a_folder_has_its_line_and_nothing_is_written(plant: Path, capsys: Captured) -> None:
    runs = plant / "runs.csv"
    lines = runs.read_text(encoding="utf-8").splitlines()
    header = lines[0].split(",")
    cells = lines[1].split(",")
    cells[next(n for n, name in enumerate(header) if name.startswith("length ["))] = "ten m"
    runs.write_text("\n".join([lines[0], ",".join(cells), *lines[2:]]) + "\n", encoding="utf-8")
    (plant / "loads.csv").write_text("circuit,point,load\nNO-1,p1,lamp\n", encoding="utf-8")
    before = sorted(path.name for path in plant.parent.rglob("*"))
    told = refused(["report", str(plant), "--to", "audit.html"], capsys)
    assert any(line.startswith("runs.csv:2:length: 'ten m'") for line in told)
    assert any(line.startswith("loads.csv:2:circuit: ") and "NO-1" in line for line in told)
    assert sorted(path.name for path in plant.parent.rglob("*")) == before


def test_an_unknown_limits_profile_is_a_line(plant: Path, capsys: Captured) -> None:
    settings = plant / "site.toml"
    text = settings.read_text(encoding="utf-8")
    settings.write_text(text.replace('limits = "general"', 'limits = "genral"'), encoding="utf-8")
    assert refused(["check", str(plant)], capsys) == [
        "site.toml:limits: there is no limits profile 'genral'; did you mean 'general'?; there are: general"
    ]


@pytest.mark.parametrize("ending", [".html", ".md", ".csv", ".json"])
def test_a_report_is_written_once(plant: Path, ending: str, capsys: Captured) -> None:
    target = plant.parent / f"audit{ending}"
    assert cli.run(["report", str(plant), "--to", str(target)]) == 0
    first = target.read_bytes()
    assert first
    assert capsys.readouterr().out == ""
    (line,) = refused(["report", str(plant), "--to", str(target)], capsys)
    assert "--overwrite" in line
    assert target.read_bytes() == first
    assert cli.run(["report", str(plant), "--to", str(target), "--overwrite", "--for", "supervisor"]) == 0


def test_a_report_of_an_unknown_form_is_refused_before_anything_is_read(capsys: Captured) -> None:
    (line,) = refused(["report", "nowhere", "--to", "audit.docx"], capsys)
    assert ".docx" in line
    assert ".html" in line


def test_tables_name_source_and_status(capsys: Captured) -> None:
    assert cli.run(["tables"]) == 0
    listed = capsys.readouterr().out
    assert "IEC 60228" in listed
    assert "from-memory" in listed
    assert cli.run(["tables", "iec_class2_copper"]) == 0
    shown = capsys.readouterr().out
    assert "7.41" in shown
    assert "verified" in shown


def test_a_fault_of_the_program_shows_its_traceback(
    plant: Path, monkeypatch: pytest.MonkeyPatch, capsys: Captured
) -> None:
    def broken(*_: object) -> None:
        raise ZeroDivisionError("broken on purpose")

    monkeypatch.setattr("audit.opening.assess", broken)
    assert cli.run(["check", str(plant)]) == cli.PROGRAM_FAULT
    assert "broken on purpose" in capsys.readouterr().err


def test_an_interrupt_is_130(plant: Path, monkeypatch: pytest.MonkeyPatch, capsys: Captured) -> None:
    def stopped(*_: object) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr("audit.opening.assess", stopped)
    assert cli.run(["check", str(plant)]) == cli.INTERRUPTED
    assert capsys.readouterr().out == ""


def test_a_pipe_gets_plain_text_and_may_close_early(plant: Path) -> None:
    env = os.environ | {"PYTHONIOENCODING": "utf-8"}
    call = [sys.executable, "-c", "from audit.cli import main; main()", "check", str(plant)]
    whole = subprocess.run(call, capture_output=True, env=env, check=True)
    assert b"\x1b" not in whole.stdout
    assert whole.stderr == b""
    closed = subprocess.Popen(call, stdout=subprocess.PIPE, stderr=subprocess.PIPE, env=env)
    assert closed.stdout is not None
    assert closed.stderr is not None
    closed.stdout.close()
    complaint = closed.stderr.read()
    closed.stderr.close()
    assert closed.wait(60) == 0
    assert complaint == b""


def test_an_old_terminal_that_knows_ascii_alone_gets_its_text(plant: Path) -> None:
    env = {name: value for name, value in os.environ.items() if name != "PYTHONUTF8"}
    env |= {"PYTHONIOENCODING": "ascii", "LC_ALL": "C"}
    call = [sys.executable, "-c", "from audit.cli import main; main()", "check", str(plant)]
    done = subprocess.run(call, capture_output=True, env=env, check=True)
    done.stdout.decode("ascii")
    assert b"! act" in done.stdout


def test_the_audiences_of_the_command_are_those_of_the_reports() -> None:
    from audit.commands.report import AUDIENCES
    from audit.report.content import AUDIENCES as OF_REPORTS

    assert tuple(AUDIENCES) == tuple(OF_REPORTS)
