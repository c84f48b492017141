"""The command line as people and scripts meet it."""

from __future__ import annotations

import json
import os
import re
import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest

from audit import cli
from audit.opening import judge_site, on_visit
from rules import limits
from rules.record import Circuit, Feed, Reading, Site, Source
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
    assert told["summary"]["circuits"] == len(told["circuits"]) == 32


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
    settings.write_text(text.replace('limits = "telecom-48"', 'limits = "genral"'), encoding="utf-8")
    assert refused(["check", str(plant)], capsys) == [
        "site.toml:limits: there is no limits profile 'genral'; did you mean 'general'?; there are: "
        + ", ".join(limits.names())
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


PROGRAM = [sys.executable, "-c", "from audit.cli import main; main()"]


def closed(*args: str) -> tuple[int, str]:
    """Exit status and standard error of a call whose standard output is closed."""
    done = subprocess.run(
        ["sh", "-c", 'exec "$@" >&-', "sh", *PROGRAM, *args], stderr=subprocess.PIPE, text=True, timeout=120
    )
    return done.returncode, done.stderr


def test_a_closed_standard_output_is_one_line(plant: Path) -> None:
    line = "standard output is closed; accepted: a terminal, a file or a pipe\n"
    assert closed("check", str(plant)) == (2, line)
    assert closed("check", str(plant), "--json") == (2, line)


def test_a_report_needs_no_standard_output(plant: Path) -> None:
    assert closed("report", str(plant), "--to", "audit.md") == (0, "wrote audit.md\n")
    assert Path("audit.md").read_text(encoding="utf-8").startswith("#")


def test_json_is_utf_8_whatever_the_locale(plant: Path) -> None:
    settings = plant / "site.toml"
    text = settings.read_text(encoding="utf-8")
    settings.write_text(re.sub("(?m)^name = .*$", 'name = "Halle Süd Ω"', text), encoding="utf-8")
    env = os.environ | {"PYTHONIOENCODING": "utf-16", "LC_ALL": "C"}
    done = subprocess.run([*PROGRAM, "check", str(plant), "--json"], capture_output=True, env=env, check=True)
    assert json.loads(done.stdout.decode("utf-8"))["site"]["name"] == "Halle Süd Ω"


@pytest.mark.parametrize("kind", ["link", "folder", "pipe", "device"])
def test_a_table_that_is_no_file_is_a_line(kind: str, plant: Path, capsys: Captured) -> None:
    table = plant / "decisions.csv"
    table.unlink(missing_ok=True)
    if kind == "folder":
        table.mkdir()
    elif kind == "pipe":
        os.mkfifo(table)  # opened, it would wait for a writer
    else:
        table.symlink_to("nowhere" if kind == "link" else os.devnull)
    what = "is not there; accepted: a file that is" if kind == "link" else "is no file; accepted: a file of this name"
    assert refused(["check", str(plant)], capsys) == [f"decisions.csv: {what}"]


def test_a_pipe_is_no_site_and_is_not_waited_for(capsys: Captured) -> None:
    os.mkfifo("pipe.ohmwalk")
    assert refused(["check", "pipe.ohmwalk"], capsys) == ["pipe.ohmwalk is a pipe or a device; accepted: a site file"]


def test_a_circuit_is_named_once(plant: Path, capsys: Captured) -> None:
    (line,) = refused(["check", str(plant), "--circuit", "F2", "--circuit", "F3"], capsys)
    assert line == "ohmwalk check: --circuit stands there twice; accepted: one circuit"


def own_profile(plant: Path, text: str) -> None:
    """Give the plant a limits profile of its own."""
    settings = plant / "site.toml"
    old = settings.read_text(encoding="utf-8")
    settings.write_text(old.replace('limits = "telecom-48"', 'limits = "ours.toml"'), encoding="utf-8")
    (plant / "ours.toml").write_text(text, encoding="utf-8")


def test_a_rule_that_is_switched_off_is_told_for_one_circuit_too(plant: Path, capsys: Captured) -> None:
    own_profile(plant, '[rules.VD05]\noff = true\nreason = "not wanted"\n')
    told = checked(plant, capsys, "--circuit", "F2")
    assert ("VD05", None) in {(gap["rule"], gap["circuit"]) for gap in told["not_judged"]}
    assert {gap["circuit"] for gap in told["not_judged"]} <= {None, "F2"}


@pytest.mark.parametrize(
    ("text", "line"),
    [
        (f'[drop]\nsource = "x"\nallowed_percent = 1{"0" * 400}\n', "drop.allowed_percent is 1000"),
        (f'[drop]\nsource = "x"\nallowed_percent = 1{"0" * 5000}\n', "not TOML: "),
        ('[termination]\nsource = "x"\ngeometric_sd = 1\n', "termination.geometric_sd is 1; above 1"),
        ('[rules.VD99]\noff = true\nreason = "x"\n', "there is no rule 'VD99'"),
    ],
    ids=["too large", "thousands of digits", "spread", "rule"],
)
def test_a_mistake_in_a_profile_of_the_site_s_own_is_a_line(
    text: str, line: str, plant: Path, capsys: Captured
) -> None:
    own_profile(plant, text)
    (told,) = refused(["check", str(plant)], capsys)
    assert line in told
    assert told.startswith(("site.toml:limits: ours.toml: ", "ours.toml: is "))
    assert len(told) < 300


def test_a_visit_is_judged_without_what_another_visit_replaced() -> None:
    def reading(id_: str, visit: str, value: float, replaces: str = "") -> Reading:
        return Reading(
            id=id_, circuit_id="c", visit=visit, round="1", quantity="voltage", at="way", value=value, tag=id_,
            replaces_id=replaces,
        )  # fmt: skip

    site = Site(
        name="hut",
        nominal_voltage_v=48.0,
        sources=(Source(id="s", tag="BATT", kind="battery", nominal_voltage_v=48.0),),
        circuits=(Circuit(id="c", tag="C1", fed_from=Feed("sources", "s")),),
        readings=(
            reading("a", "1", 48.0),
            reading("b", "2", 47.0, "a"),
            reading("d", "1", 46.0),
            reading("e", "2", 45.0, "?gone"),
        ),
    )
    first, second = (on_visit(site, visit).readings for visit in "12")
    assert [row.id for row in first] == ["d"]
    assert [(row.id, row.replaces_id) for row in second] == [("b", ""), ("e", "?gone")]
    told = [finding.why + finding.title for finding in judge_site(site, "1").findings]
    assert not any("names no reading" in text for text in told)
