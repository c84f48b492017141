"""Commands on a site file: what they change, what they leave, and the one line where they cannot."""

from __future__ import annotations

import csv
import io
import json
import os
import re
import resource
import shutil
import sqlite3
import subprocess
import sys
import tempfile
from collections.abc import Iterator
from contextlib import closing, contextmanager
from pathlib import Path
from types import SimpleNamespace
from typing import Any

import pytest
from sqlite_utils import Database

from audit import cli, interface, recent, terminal
from audit.intake import into_file
from audit.intake.folder import read_folder
from audit.settings import UserSettings
from db import connection
from db.migrations import migrations
from db.save import Save
from db.store import SiteStore
from rules.record import Load, Site
from sample_sites.catalogue import SAMPLE_SITES, sample_site

Captured = pytest.CaptureFixture[str]
ROOT = Path(__file__).parents[2]

READ = {
    "check": ["check"],
    "report": ["report", "--to", "audit.json"],
    "unload": ["unload", "out"],
    "history": ["history"],
    "verify": ["verify"],
    "backup": ["backup", "--to", "copy.ohmwalk"],
}
"""Commands that only read; SITE goes in as the first argument."""


def call(name: str, site: Path | str) -> list[str]:
    command, *rest = READ[name]
    return [command, str(site), *rest]


@pytest.fixture(autouse=True)
def _here(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)


def folder_of(name: str, folder: Path) -> Path:
    """A copy of a sample site's folder."""
    folder.mkdir()
    for file_name, content in sample_site(name).files().items():
        (folder / file_name).write_bytes(content)
    return folder


@pytest.fixture
def plant(tmp_path: Path) -> Path:
    """The 48 V plant as a folder."""
    return folder_of("plant", tmp_path / "plant")


@pytest.fixture
def site(plant: Path, capsys: Captured) -> Path:
    """The 48 V plant as a site file."""
    path = plant.with_name("plant.ohmwalk")
    assert cli.run(["intake", str(path), str(plant), "--by", "Ann"]) == 0
    capsys.readouterr()
    return path


def record(path: Path) -> Site:
    with SiteStore(path, read_only=True) as store:
        return store.site()


def edit(table: Path, column: str, value: str, line: int = 2) -> None:
    """Change one cell of a CSV file."""
    with table.open(encoding="utf-8", newline="") as file:
        rows = list(csv.reader(file))
    place = next(n for n, name in enumerate(rows[0]) if name.split(" [")[0] == column)
    rows[line - 1][place] = value
    with table.open("w", encoding="utf-8", newline="") as file:
        csv.writer(file).writerows(rows)


def done(args: list[str], capsys: Captured) -> tuple[str, str]:
    """Standard output and error of a call that must succeed."""
    assert cli.run(args) == 0, capsys.readouterr().err
    shown = capsys.readouterr()
    return shown.out, shown.err


def refused(args: list[str], capsys: Captured, status: int = 2) -> list[str]:
    """The lines on standard error of a call that must fail, with nothing on standard output."""
    assert cli.run(args) == status
    shown = capsys.readouterr()
    assert shown.out == ""
    assert "Traceback" not in shown.err
    return shown.err.splitlines()


# --- there and back


@pytest.mark.parametrize("name", [sample.name for sample in SAMPLE_SITES])
def test_intake_then_unload_gives_an_equal_site(name: str, tmp_path: Path, capsys: Captured) -> None:
    folder = folder_of(name, tmp_path / "in")
    done(["intake", "a.ohmwalk", str(folder)], capsys)
    assert record(Path("a.ohmwalk")) == read_folder(folder)
    _, err = done(["unload", "a.ohmwalk", "out"], capsys)
    assert "journal, signatures and drafts stay" in err
    assert read_folder(Path("out")) == read_folder(folder)
    before = Path("a.ohmwalk").read_bytes()
    out, _ = done(["intake", "a.ohmwalk", "out"], capsys)
    assert "nothing is changed" in out
    assert Path("a.ohmwalk").read_bytes() == before
    done(["intake", "b.ohmwalk", "out"], capsys)
    assert record(Path("b.ohmwalk")) == record(Path("a.ohmwalk"))


@pytest.mark.parametrize("name", [sample.name for sample in SAMPLE_SITES])
def test_check_says_the_same_of_folder_and_file(name: str, tmp_path: Path, capsys: Captured) -> None:
    folder = folder_of(name, tmp_path / "in")
    done(["intake", "a.ohmwalk", str(folder)], capsys)
    of_folder, _ = done(["check", str(folder), "--json"], capsys)
    of_file, _ = done(["check", "a.ohmwalk", "--json"], capsys)
    assert json.loads(of_file) == json.loads(of_folder)
    assert of_file == of_folder


def test_a_site_file_is_known_by_what_it_holds_and_not_by_its_name(site: Path, capsys: Captured) -> None:
    renamed = site.rename(site.with_name("plant.bin"))
    assert json.loads(done(["check", str(renamed), "--json"], capsys)[0])["summary"]["circuits"] == 32
    done(["report", str(renamed), "--to", "audit.md"], capsys)
    assert "F1" in Path("audit.md").read_text(encoding="utf-8")


def test_commands_that_only_read_leave_the_bytes_alone(site: Path, capsys: Captured) -> None:
    before, when = site.read_bytes(), site.stat().st_mtime_ns
    for name in READ:
        done(call(name, site), capsys)
    done(["intake", str(site), "plant", "--dry-run"], capsys)
    assert (site.read_bytes(), site.stat().st_mtime_ns) == (before, when)
    assert record(Path("copy.ohmwalk")) == record(site)


# --- intake into a file that is there


def test_a_failed_intake_leaves_the_file_as_it_was_and_names_every_problem(
    site: Path, plant: Path, capsys: Captured
) -> None:
    before = site.read_bytes()
    edit(plant / "runs.csv", "length", "ten m")
    edit(plant / "circuits.csv", "device_rating", "125")
    (plant / "loads.csv").write_text("circuit,point,load\nNO-1,p1,lamp\n", encoding="utf-8")
    told = refused(["intake", str(site), str(plant), "--replace"], capsys)
    assert [line.split(": ")[0] for line in told] == ["runs.csv:2:length", "loads.csv:2:circuit"]
    told = refused(["intake", str(site), str(plant)], capsys)
    assert told[0] == (
        "circuits.csv:2:device_rating: '100' in the site file, '125' here; accepted: equal values, or --replace"
    )
    assert len(told) == 3
    assert site.read_bytes() == before
    assert sorted(os.listdir()) == ["plant", "plant.ohmwalk"]
    assert refused(["intake", "new.ohmwalk", str(plant)], capsys)
    assert not Path("new.ohmwalk").exists()


def test_replace_takes_what_differs_and_says_so(site: Path, plant: Path, capsys: Captured) -> None:
    edit(plant / "circuits.csv", "device_rating", "125")
    edit(plant / "runs.csv", "length", "80 ft")
    args = ["intake", str(site), str(plant), "--replace", "--by", "Bob"]
    would, _ = done([*args, "--dry-run"], capsys)
    assert "would be changed" in would
    assert record(site).circuits[0].rated_current_a == 100
    out, _ = done(args, capsys)
    assert "circuits, F1: device_rating '100' → '125'" in out
    assert "runs, F1 run 1: length '24' → '80 ft'" in out
    assert out.replace("changed", "would be changed", 1) == would
    assert record(site) == read_folder(plant)
    assert "nothing is changed" in done(args, capsys)[0]
    assert "Bob  intake of plant" in done(["history", str(site), "--circuit", "F1"], capsys)[0]


def test_dry_run_writes_nothing(site: Path, plant: Path, home: Path, capsys: Captured) -> None:
    before = site.read_bytes()
    shutil.rmtree(home)
    edit(plant / "circuits.csv", "circuit", "F99")
    edit(plant / "runs.csv", "circuit", "F99")
    out, _ = done(["intake", str(site), str(plant), "--dry-run"], capsys)
    assert "circuits      1 added, 31 left as they are" in out
    (plant / "visits.csv").write_text("visit,kind\n2026-09 as left,as left\n", encoding="utf-8")
    out, _ = done(["intake", str(site), str(plant / "visits.csv"), "--dry-run"], capsys)
    assert "visits        1 added" in out
    assert site.read_bytes() == before
    out, _ = done(["intake", "new.ohmwalk", str(plant / "visits.csv"), "--dry-run"], capsys)
    assert "would be made" in out
    assert sorted(os.listdir()) == ["plant", "plant.ohmwalk"]
    assert not home.exists()


def test_single_tables_go_into_a_file_and_what_they_name_may_be_there(
    site: Path, tmp_path: Path, capsys: Captured
) -> None:
    (tmp_path / "readings.csv").write_text(
        "circuit,visit,round,quantity,at,value [mV]\nF1,2026-03 as found,9,voltage,way,53300\n", encoding="utf-8"
    )
    (tmp_path / "boards.csv").write_text("board,fed_by\nNEW,F1\n", encoding="utf-8")
    out, _ = done(["intake", str(site), "readings.csv", "boards.csv"], capsys)
    assert out.splitlines()[1:] == ["  boards        1 added", "  readings      1 added"]
    assert record(site).readings[-1].typed == (("value", "53300 mV"),)
    (tmp_path / "readings.csv").write_text(
        "circuit,round,quantity,at,value\nF1,9,voltage,nowhere,53\nF88,9,voltage,way,53\n"
    )
    (line, other) = refused(["intake", str(site), "readings.csv"], capsys)
    assert line.startswith("readings.csv:2:at: 'nowhere' is no place of circuit 'F1'")
    assert other.startswith("readings.csv:3:circuit: 'F88' names no circuit")


def test_single_tables_make_a_file_named_like_the_site(plant: Path, capsys: Captured) -> None:
    tables = [str(path) for path in sorted(plant.glob("*.csv"))]
    out, err = done(["intake", "hut.ohmwalk", *tables], capsys)
    assert out.startswith("hut.ohmwalk: made\n")
    assert "Next: ohmwalk check hut.ohmwalk" in err
    assert record(Path("hut.ohmwalk")).name == "hut"
    assert len(record(Path("hut.ohmwalk")).readings) == 161


def test_an_empty_file_takes_the_settings_of_the_folder(plant: Path, capsys: Captured) -> None:
    SiteStore.create("new.ohmwalk", None, "ann", "lap", "new").close()
    done(["intake", "new.ohmwalk", str(plant)], capsys)
    assert record(Path("new.ohmwalk")) == read_folder(plant)


def test_a_tagged_reading_is_replaced_and_both_stay(site: Path, tmp_path: Path, capsys: Captured) -> None:
    table = tmp_path / "readings.csv"
    table.write_text("circuit,round,quantity,at,value,reading\nF1,9,voltage,way,53.3,R1\n", encoding="utf-8")
    done(["intake", str(site), "readings.csv"], capsys)
    edit(table, "value", "52.3")
    assert refused(["intake", str(site), "readings.csv"], capsys) == [
        "readings.csv:2:value: '53.3' in the site file, '52.3' here; accepted: equal values, or --replace"
    ]
    out, _ = done(["intake", str(site), "readings.csv", "--replace"], capsys)
    assert "readings that replace one that stays beside it: 1" in out
    first, second = record(site).readings[-2:]
    assert (first.value, second.value, second.replaces_id) == (53.3, 52.3, first.id)
    done(["unload", str(site), "out"], capsys)
    assert read_folder(Path("out")) == record(site)


def test_a_row_that_was_removed_can_come_in_again(site: Path, tmp_path: Path, capsys: Captured) -> None:
    (tmp_path / "boards.csv").write_text("board,fed_by\nNEW,C9\n", encoding="utf-8")
    (tmp_path / "circuits.csv").write_text("circuit,fed_from\nC9,MDB\n", encoding="utf-8")
    (tmp_path / "runs.csv").write_text("circuit,run,from,to,length [m],size\nC9,1,way,x,3,2.5 mm2\n", encoding="utf-8")
    tables = ["boards.csv", "circuits.csv", "runs.csv"]
    before = record(site)
    done(["intake", str(site), *tables, "--by", "Ann"], capsys)
    with_them = record(site)
    with SiteStore(site, laptop=UserSettings().laptop) as store:
        assert store.undo("Ann") is not None
    assert record(site) == before
    done(["intake", str(site), *tables], capsys)
    assert record(site) == with_them
    done(["verify", str(site)], capsys)
    told = done(["history", str(site)], capsys)[0].splitlines()
    assert any(line.endswith(")") and "Ann  " in line and " (undoes the save of " in line for line in told)
    assert "    removed circuit C9" in told
    assert sum(line == "    added board NEW: fed_by C9" for line in told) == 2


def test_an_intake_sees_what_another_one_saved_while_it_read(
    site: Path, plant: Path, monkeypatch: pytest.MonkeyPatch, capsys: Captured
) -> None:
    edit(plant / "circuits.csv", "description", "from the folder")
    merge = into_file._merged
    calls: list[int] = []

    def slowly(*args: Any) -> Any:
        merged = merge(*args)
        if not calls:
            with SiteStore(site, laptop="other") as store, store.save("Bob", "meanwhile") as save:
                save.change("circuits", store.site().circuits[1].id, description="by Bob")
        calls.append(1)
        return merged

    monkeypatch.setattr(into_file, "_merged", slowly)
    done(["intake", str(site), str(plant), "--replace"], capsys)
    assert len(calls) == 2
    assert record(site) == read_folder(plant)


@pytest.mark.parametrize(
    ("sources", "line"),
    [
        (["plant", "plant/runs.csv"], "plant is a folder beside others; accepted: one site folder, or tables alone"),
        (["nowhere"], "nowhere: is no table; accepted: a site folder, or tables as .csv or .xlsx"),
        (["runs.csv"], "runs.csv: is not there; accepted: a file that is"),
        (["other.csv"], "other.csv: no table has this name; accepted: sources.csv, "),
        (["empty"], "site.toml: is missing; accepted: a file of this name with at least the name of the site"),
    ],
)
def test_what_cannot_be_taken_in_is_told(sources: list[str], line: str, site: Path, capsys: Captured) -> None:
    Path("empty").mkdir()
    before = site.read_bytes()
    told = refused(["intake", str(site), *sources], capsys)
    assert told[0].startswith(line)
    assert site.read_bytes() == before


def test_a_rule_that_is_not_there_is_refused_with_the_profile_that_names_it(plant: Path, capsys: Captured) -> None:
    text = (plant / "site.toml").read_text(encoding="utf-8").replace('limits = "telecom-48"', 'limits = "ours.toml"')
    (plant / "site.toml").write_text(text, encoding="utf-8")
    (plant / "ours.toml").write_text('[rules.VD91]\noff = true\nreason = "of no use here"\n', encoding="utf-8")
    line = "site.toml:limits: ours.toml: there is no rule 'VD91'; did you mean 'VD01'?"
    assert refused(["intake", "new.ohmwalk", str(plant)], capsys) == [line]
    assert refused(["check", str(plant)], capsys) == [line]


def test_a_profile_that_is_not_there_is_refused_before_it_stops_every_check(plant: Path, capsys: Captured) -> None:
    text = (plant / "site.toml").read_text(encoding="utf-8").replace('limits = "telecom-48"', 'limits = "genral"')
    (plant / "site.toml").write_text(text, encoding="utf-8")
    (line,) = refused(["intake", "a.ohmwalk", str(plant)], capsys)
    assert line.startswith("site.toml:limits: there is no limits profile 'genral'")


def test_a_workbook_goes_in_like_tables(site: Path, capsys: Captured) -> None:
    from openpyxl import Workbook

    book = Workbook()
    sheet = book.create_sheet("visits")
    book.remove(book.worksheets[0])
    for row in (["visit", "kind", "order"], ["2026-09", "as left", 2]):
        sheet.append(row)
    book.save("later.xlsx")
    done(["intake", str(site), "later.xlsx"], capsys)
    assert record(site).visits[-1].tag == "2026-09"
    sheet["B2"] = "as lost"
    book.save("later.xlsx")
    (line, _) = refused(["intake", str(site), "later.xlsx"], capsys)
    assert line.startswith("later.xlsx[visits]:2:kind: 'as left' in the site file, 'as lost' here")


def test_what_did_not_hold_together_before_is_no_fault_of_what_comes_in(
    site: Path, tmp_path: Path, capsys: Captured
) -> None:
    with SiteStore(site, laptop="lap") as store, store.save("Ann", "half a load") as save:
        save.add("loads", Load(id="", circuit_id=store.site().circuits[0].id, point="p99", tag="FAN"))
    (tmp_path / "runs.csv").write_text("circuit,run,from,to,length [m],size\nF1,7,way,x,3,50 mm2\n", encoding="utf-8")
    done(["intake", str(site), "runs.csv"], capsys)
    _, err = done(["unload", str(site), "out"], capsys)
    assert err.splitlines()[1] == "cells that do not hold together: 1; intake would name them, as ohmwalk check does"
    assert refused(["intake", "new.ohmwalk", "out"], capsys)
    (tmp_path / "runs.csv").write_text("circuit,run,from,to,length [m],size\nF1,1,way,p5,24,50 mm2\n", encoding="utf-8")
    told = refused(["intake", str(site), "runs.csv", "--replace"], capsys)
    assert told[0].startswith("the site file: loads, ") or told[0].startswith("the site file: readings, ")


def test_a_reading_that_is_replaced_in_the_same_table_stays_even_with_replace(
    site: Path, tmp_path: Path, capsys: Captured
) -> None:
    table = tmp_path / "readings.csv"
    rows = "circuit,round,quantity,at,value,reading,replaces\nF1,9,voltage,way,53,R1,\nF1,9,voltage,way,52,R2,R1\n"
    table.write_text(rows, encoding="utf-8")
    done(["intake", str(site), "readings.csv"], capsys)
    edit(table, "value", "51")
    assert refused(["intake", str(site), "readings.csv", "--replace"], capsys) == [
        "readings.csv:2:value: '53' in the site file, '51' here, in a reading that another one here replaces; "
        "accepted: its value as in the site file"
    ]


def test_an_intake_that_is_interrupted_leaves_the_file_as_it_was(
    site: Path, plant: Path, monkeypatch: pytest.MonkeyPatch, capsys: Captured
) -> None:
    def write(save: Save, merged: object) -> None:
        save.settings(notes="half")
        raise KeyboardInterrupt

    monkeypatch.setattr(into_file, "write", write)
    before = site.read_bytes()
    edit(plant / "circuits.csv", "device_rating", "125")
    assert cli.run(["intake", str(site), str(plant), "--replace"]) == cli.INTERRUPTED
    assert capsys.readouterr().out == ""
    assert site.read_bytes() == before
    assert sorted(os.listdir()) == ["plant", "plant.ohmwalk"]


def test_an_older_file_is_read_in_memory_and_brought_up_to_date_by_whoever_writes(
    site: Path, plant: Path, monkeypatch: pytest.MonkeyPatch, capsys: Captured
) -> None:
    monkeypatch.setattr(migrations, "_migrations", list(migrations._migrations))

    @migrations()
    def m003_index_places(db: Database) -> None:
        db.execute("CREATE INDEX boards_location ON boards (location)")
        db.execute("PRAGMA user_version = 3")

    before = site.read_bytes()
    for name in READ:
        done(call(name, site), capsys)
    done(["intake", str(site), str(plant), "--dry-run"], capsys)
    assert site.read_bytes() == before
    edit(plant / "circuits.csv", "device_rating", "125")
    done(["intake", str(site), str(plant), "--replace"], capsys)
    with closing(sqlite3.connect(site)) as opened:
        assert opened.execute("PRAGMA user_version").fetchone() == (3,)
    assert record(site) == read_folder(plant)


def test_limits_that_are_not_there_are_told_of_the_file(site: Path, capsys: Captured) -> None:
    with SiteStore(site, laptop="lap") as store, store.save("Ann", "limits") as save:
        save.settings(limits="genral")
    (line,) = refused(["check", str(site)], capsys)
    assert line.startswith(f"{site}:limits: there is no limits profile 'genral'")


def test_progress_is_for_large_input_in_a_terminal(
    site: Path, plant: Path, monkeypatch: pytest.MonkeyPatch, capsys: Captured
) -> None:
    args = ["intake", str(site), str(plant)]
    monkeypatch.setattr("audit.terminal._LARGE", 1)
    assert done(args, capsys)[1] == ""
    monkeypatch.setattr("sys.stderr.isatty", lambda: True)
    out, err = done(args, capsys)
    assert "read readings.csv …" in err
    assert err.endswith("\r\x1b[K")
    assert "\x1b" not in out
    monkeypatch.setattr("audit.terminal._LARGE", 10**9)
    assert done(args, capsys)[1] == ""


# --- files that cannot be used


@pytest.mark.parametrize("name", [*READ, "intake", "survey"])
@pytest.mark.parametrize(
    ("what", "status"), [("no database", 3), ("another program's", 3), ("newer", 3), ("absent", 2), ("locked", 2)]
)
def test_a_file_that_cannot_be_used_is_one_line(
    name: str, what: str, status: int, site: Path, monkeypatch: pytest.MonkeyPatch, capsys: Captured
) -> None:
    monkeypatch.setattr(interface, "is_terminal", lambda: True)
    monkeypatch.setattr(connection, "BUSY_TIMEOUT_S", 0.05)
    with spoiled(site, what):
        before = site.read_bytes() if site.exists() else None
        args = {"intake": ["intake", str(site), "plant"], "survey": ["survey", str(site)]}.get(name)
        if name == "intake" and what == "absent":
            return  # it is made
        (line,) = refused(args or call(name, site), capsys, status)
        assert line.startswith(f"{site}: ")
        assert (site.read_bytes() if site.exists() else None) == before
    assert not set(os.listdir()) & {"audit.json", "out", "copy.ohmwalk"}


@contextmanager
def spoiled(site: Path, what: str) -> Iterator[None]:
    if what in ("newer", "locked"):
        with closing(sqlite3.connect(site, isolation_level=None)) as other:
            other.execute("PRAGMA user_version = 99" if what == "newer" else "BEGIN EXCLUSIVE")
            yield
        return
    site.unlink()
    if what == "no database":
        site.write_bytes(b"%PDF-1.7\n")
    elif what == "another program's":
        with closing(sqlite3.connect(site)) as other:
            other.execute("CREATE TABLE circuits (id TEXT)")
    yield


def test_a_lock_is_waited_for_five_seconds() -> None:
    assert connection.BUSY_TIMEOUT_S == 5.0


def test_a_folder_is_no_site_file(plant: Path, capsys: Captured) -> None:
    for args in (["history", "plant"], ["unload", "plant", "out"], ["intake", "plant", "plant"], ["verify", "plant"]):
        (line,) = refused(args, capsys)
        assert line == "plant is a folder; accepted: a site file, which intake makes of a site folder"
    (plant / "site.toml").unlink()
    (line,) = refused(["check", "plant"], capsys)
    assert line.startswith("site.toml: is missing")


def test_another_ending_makes_no_site_file(plant: Path, monkeypatch: pytest.MonkeyPatch, capsys: Captured) -> None:
    monkeypatch.setattr(interface, "is_terminal", lambda: True)
    for args in (
        ["intake", "a.db", str(plant)],
        ["intake", "a.db", str(plant), "--dry-run"],
        ["survey", "a.db", "--new"],
        ["demo", "--to", "a.db"],
    ):
        assert refused(args, capsys) == ["a.db: the name of a site file ends in .ohmwalk"]
    (line,) = refused(["intake", "no/a.ohmwalk", str(plant)], capsys)
    assert line == "no/a.ohmwalk: there is no such folder"
    assert os.listdir() == ["plant"]


def test_a_damaged_file_is_named_by_verify(site: Path, capsys: Captured) -> None:
    assert done(["verify", str(site)], capsys)[0] == f"{site}: whole; 32 circuits, 161 readings\n"
    with closing(sqlite3.connect(site)) as other:
        other.execute("UPDATE readings SET value = value + 1 WHERE at = 'lugs'")
        other.commit()
    told = refused(["verify", str(site)], capsys, 3)
    assert told
    assert all(line.startswith(f"{site}: ") for line in told)
    site.write_bytes(site.read_bytes()[:30_000])
    assert refused(["check", str(site)], capsys, 3)


@contextmanager
def write_protected(folder: Path) -> Iterator[None]:
    """A folder and all in it write-protected; the superuser, who may do everything, becomes nobody meanwhile."""
    places = [folder, *folder.iterdir()]
    for place in places:
        place.chmod(0o555 if place.is_dir() else 0o444)
    is_root = os.geteuid() == 0
    if is_root:
        os.seteuid(65534)
    try:
        yield
    finally:
        if is_root:
            os.seteuid(0)
        for place in places:
            place.chmod(0o755 if place.is_dir() else 0o644)


def test_a_file_that_may_not_be_written_is_read_but_not_changed(site: Path, plant: Path, capsys: Captured) -> None:
    (plant / "visits.csv").write_text("visit,kind\nlater,as left\n", encoding="utf-8")
    visits = str(plant / "visits.csv")
    table = (plant / "visits.csv").read_bytes()
    # whatever is needed is imported by now: nobody may not be allowed to read where the program lies
    done(["intake", str(site), visits, "--dry-run"], capsys)
    done(["check", str(site)], capsys)
    done(["unload", str(site), str(plant.parent / "warm")], capsys)
    done(["backup", str(site), "--to", str(plant.parent / "warm.ohmwalk")], capsys)
    done(["demo", "--no-open", "--to", str(plant.parent / "warm-demo.ohmwalk")], capsys)
    with tempfile.TemporaryDirectory() as name:
        shared = Path(name)
        (shared / "visits.csv").write_bytes(table)
        shutil.copy(site, shared / "a.ohmwalk")
        before = (shared / "a.ohmwalk").read_bytes()
        with write_protected(shared):
            (line,) = refused(["intake", f"{name}/a.ohmwalk", f"{name}/visits.csv"], capsys)
            assert line == f"{name}/a.ohmwalk: this file or its folder may not be written"
            assert (
                "would be changed"
                in done(["intake", f"{name}/a.ohmwalk", f"{name}/visits.csv", "--dry-run"], capsys)[0]
            )
            done(["check", f"{name}/a.ohmwalk"], capsys)
            for args in (
                ["intake", f"{name}/b.ohmwalk", f"{name}/visits.csv"],
                ["unload", f"{name}/a.ohmwalk", f"{name}/out"],
                ["backup", f"{name}/a.ohmwalk"],
                ["demo", "--to", f"{name}/demo.ohmwalk"],
            ):
                (line,) = [line for line in refused(args, capsys) if "settings" not in line]
                assert name in line
        assert (shared / "a.ohmwalk").read_bytes() == before
        assert sorted(os.listdir(shared)) == ["a.ohmwalk", "visits.csv"]


def limited(size: int, args: list[str], home: Path) -> subprocess.CompletedProcess[str]:
    """Run a command in a process whose files may not grow beyond a size."""

    def limit() -> None:
        resource.setrlimit(resource.RLIMIT_FSIZE, (size, size))

    code = "from audit.cli import main; main()"
    env = os.environ | {"OHMWALK_HOME": str(home), "PYTHONPATH": str(ROOT), "PYTHONDONTWRITEBYTECODE": "1"}
    return subprocess.run(
        [sys.executable, "-c", code, *args], preexec_fn=limit, capture_output=True, text=True, env=env, check=False
    )


@pytest.mark.parametrize(
    "args",
    [
        ["intake", "a.ohmwalk", "readings.csv"],
        ["intake", "new.ohmwalk", "plant"],
        ["backup", "a.ohmwalk"],
        ["demo", "--no-open"],
        ["unload", "a.ohmwalk", "out"],
    ],
    ids=lambda args: args[0] + " " + args[1],
)
def test_a_full_disk_is_one_line_and_nothing_is_lost(args: list[str], site: Path, plant: Path, home: Path) -> None:
    site.rename("a.ohmwalk")
    lines = (plant / "readings.csv").read_text(encoding="utf-8").splitlines()
    more = [line.replace("2026-03 as found,1,", f"2026-03 as found,{n},") for n in range(2, 30) for line in lines[1:]]
    Path("readings.csv").write_text("\n".join([lines[0], *more]) + "\n", encoding="utf-8")
    before = Path("a.ohmwalk").read_bytes()
    there = sorted(os.listdir())
    size = (
        4_000
        if args[0] == "unload"
        else len(before) + 8_192
        if args[1] == "a.ohmwalk" and args[0] == "intake"
        else 50_000
    )
    failed = limited(size, args, home)
    assert (failed.returncode, failed.stdout) == (2, ""), failed.stderr
    (line,) = failed.stderr.splitlines()
    assert "space" in line or "File too large" in line
    assert Path("a.ohmwalk").read_bytes() == before
    assert sorted(os.listdir()) == there
    with SiteStore("a.ohmwalk") as store:
        assert store.verify() == ()


# --- history and backup


def test_history_tells_who_changed_what(site: Path, capsys: Captured) -> None:
    with SiteStore(site, laptop="lap") as store:
        run = store.site().runs[0]
        with store.save("Bob", "paced out again") as save:
            save.change("runs", run.id, typed=(("one_way_length_m", "80 ft"),), one_way_length_m=24.384)
        with store.save("Bob", "gone") as save:
            save.remove("visits", save.add("visits", store.site().visits[0].__class__(id="", tag="later")))
            save.settings(extent="one\ntwo")
    out, _ = done(["history", str(site)], capsys)
    lines = out.splitlines()
    assert re.fullmatch(r"\d{4}-\d\d-\d\d \d\d:\d\d:\d\d  Ann  intake of plant", lines[0])
    assert any(re.fullmatch(r"    and [\d,]+ more rows", line) for line in lines)
    assert "    changed F1 run 1: length 24 m → 80 ft" in lines
    assert any(re.fullmatch("    changed settings: extent .* → one two", line) for line in lines)
    with SiteStore(site, laptop="lap") as store, store.save("Bob", "a correction names what it replaces") as save:
        save.change("readings", store.site().readings[0].id, tag="r-1")
    (tagged,) = [line for line in done(["history", str(site)], capsys)[0].splitlines() if "r-1" in line]
    assert tagged.endswith(" reading r-1: added reading r-1")
    of_circuit = done(["history", str(site), "--circuit", "F1"], capsys)[0].splitlines()
    assert [line for line in of_circuit if not line.startswith(" ")][1].endswith("Bob  paced out again")
    assert any(line.startswith("    added circuit F1: fed_from MDB, ") for line in of_circuit)
    assert not any("settings" in line for line in of_circuit)
    (line,) = refused(["history", str(site), "--circuit", "F11"], capsys)
    assert line == "--circuit: no circuit has or had the tag 'F11'; did you mean 'F1'?"


def test_a_backup_has_the_history_and_a_name_of_its_own(site: Path, capsys: Captured) -> None:
    _, err = done(["backup", str(site)], capsys)
    copy = Path(err.removeprefix("wrote ").strip())
    assert copy.parent == site.parent
    assert re.fullmatch(r"plant-\d{8}-\d{6}\.ohmwalk", copy.name)
    assert done(["history", str(copy)], capsys) == done(["history", str(site)], capsys)
    (line,) = refused(["backup", str(site), "--to", str(copy)], capsys)
    assert line.startswith(f"{copy}: there is already something of that name")
    done(["backup", str(site), "--to", str(copy), "--overwrite"], capsys)


def test_unload_overwrites_only_when_asked(site: Path, capsys: Captured) -> None:
    done(["unload", str(site), "out"], capsys)
    (line,) = refused(["unload", str(site), "out"], capsys)
    assert "--overwrite" in line
    done(["unload", str(site), "out", "--overwrite"], capsys)


# --- the interface is opened, or not


@pytest.fixture
def opened(monkeypatch: pytest.MonkeyPatch) -> list[tuple[Path, UserSettings]]:
    """What the terminal interface was opened on, in what takes itself for a terminal."""
    calls: list[tuple[Path, UserSettings]] = []

    def run_survey(path: Path, settings: UserSettings) -> int:
        calls.append((path, settings))
        return 70 if settings.who == "Crash" else 0

    toolkit = SimpleNamespace(run_survey=run_survey)
    monkeypatch.setitem(sys.modules, "audit.tui.run", toolkit)
    for module in (interface, recent, terminal):
        monkeypatch.setattr(module, "is_terminal", lambda: True)
    return calls


Opened = list[tuple[Path, UserSettings]]


def test_survey_opens_a_site_file(site: Path, opened: Opened, capsys: Captured) -> None:
    before = site.read_bytes()
    done(["survey", str(site), "--by", "Ann"], capsys)
    ((path, settings),) = opened
    assert (path, settings.who) == (site, "Ann")
    assert [listed.path for listed in UserSettings().recent()] == [site]
    assert cli.run(["survey", str(site), "--by", "Crash"]) == 70
    assert site.read_bytes() == before


def test_survey_makes_a_new_file_only_when_asked(opened: Opened, capsys: Captured) -> None:
    (line,) = refused(["survey", "hut.ohmwalk"], capsys)
    assert line == "hut.ohmwalk: there is no such file; accepted: a site file, or --new, which makes it"
    done(["survey", "hut.ohmwalk", "--new", "--by", "Ann"], capsys)
    assert record(Path("hut.ohmwalk")) == Site(name="hut")
    assert len(opened) == 1
    with SiteStore("hut.ohmwalk") as store:
        (entry,) = store.history()
    assert (entry.who, entry.laptop, entry.why) == ("Ann", UserSettings().laptop, "new site file")
    (line,) = refused(["survey", "hut.ohmwalk", "--new"], capsys)
    assert "already something of that name" in line


def test_without_a_terminal_nothing_is_opened(site: Path, capsys: Captured) -> None:
    assert refused(["survey", str(site)], capsys) == [
        f"the terminal interface needs a terminal; accepted: a terminal, or ohmwalk check {site}"
    ]
    assert refused(["survey", "new.ohmwalk", "--new"], capsys)
    assert not Path("new.ohmwalk").exists()


def test_a_wrong_name_is_refused_before_anything_is_written(plant: Path, opened: Opened, capsys: Captured) -> None:
    for args in (["intake", "a.ohmwalk", str(plant)], ["demo"], ["survey", "a.ohmwalk", "--new"]):
        (line,) = refused([*args, "--by", "a\x1b[2J"], capsys)
        assert line.startswith("--by: ")
    assert os.listdir() == ["plant"]
    assert opened == []


def test_the_demo_is_made_once_and_then_opened_as_it_is(opened: Opened, capsys: Captured) -> None:
    done(["demo"], capsys)
    assert [path for path, _ in opened] == [Path("demo.ohmwalk")]
    assert len(record(Path("demo.ohmwalk")).circuits) == 32
    with SiteStore("demo.ohmwalk", laptop="lap") as store, store.save("Ann", "mine") as save:
        save.settings(notes="mine")
    before = Path("demo.ohmwalk").read_bytes()
    done(["demo"], capsys)
    done(["demo", "plant"], capsys)
    assert Path("demo.ohmwalk").read_bytes() == before
    assert len(opened) == 3
    for args in (["demo", "doors"], ["demo", "--to", "demo.ohmwalk"]):
        assert refused(args, capsys) == ["demo.ohmwalk exists already; accepted: another name, or --overwrite"]
    done(["demo", "doors", "--overwrite"], capsys)
    assert record(Path("demo.ohmwalk")).name != "mine"
    assert len(record(Path("demo.ohmwalk")).circuits) == 32
    done(["demo"], capsys)
    assert os.listdir() == ["demo.ohmwalk"]


def test_the_demo_can_be_made_without_opening_it(opened: Opened, capsys: Captured) -> None:
    _, err = done(["demo", "doors", "--to", "doors.ohmwalk", "--no-open"], capsys)
    assert "Next: ohmwalk survey doors.ohmwalk" in err
    assert opened == []
    assert "the earlier" not in err
    done(["demo", "--no-open"], capsys)
    assert "the earlier demo" in done(["demo", "--no-open"], capsys)[1]


def test_a_file_of_one_s_own_is_not_taken_for_the_demo(site: Path, capsys: Captured) -> None:
    site.rename("demo.ohmwalk")
    before = Path("demo.ohmwalk").read_bytes()
    assert refused(["demo"], capsys) == ["demo.ohmwalk exists already; accepted: another name, or --overwrite"]
    assert Path("demo.ohmwalk").read_bytes() == before
    Path("demo.ohmwalk").write_text("mine")
    (line,) = refused(["demo"], capsys, 3)
    assert "not a site file" in line
    assert Path("demo.ohmwalk").read_text() == "mine"


def test_alone_it_lists_the_recent_files_in_a_pipe(site: Path, capsys: Captured) -> None:
    done(["demo", "--no-open"], capsys)
    site.unlink()
    assert done([], capsys)[0].splitlines() == [
        f"  1  {site.with_name('demo.ohmwalk')}",
        f"  2  {site}  (not there now)",
    ]


def test_alone_it_says_how_to_begin(capsys: Captured) -> None:
    assert done([], capsys)[0].startswith("No site file was opened yet. Next: ohmwalk demo")


def test_alone_in_a_terminal_it_opens_the_one_chosen(
    site: Path, opened: Opened, monkeypatch: pytest.MonkeyPatch, capsys: Captured
) -> None:
    done(["demo", "--no-open"], capsys)
    answers = iter(["2", "", "0", "3", "-1", "\u0663", "x" * 99])
    monkeypatch.setattr("click.prompt", lambda *_, **__: next(answers))
    done([], capsys)
    assert [path for path, _ in opened] == [site]
    done([], capsys)
    assert len(opened) == 1
    for _ in range(5):
        assert cli.run([]) == 2
        (line,) = capsys.readouterr().err.splitlines()
        assert line.endswith("is none of them; accepted: a number from 1 to 2")


def test_alone_in_a_terminal_enter_opens_the_only_one(
    site: Path, opened: Opened, monkeypatch: pytest.MonkeyPatch, capsys: Captured
) -> None:
    for typed, is_opened in (("\n", True), ("1\n", True), ("0\n", False)):
        opened.clear()
        monkeypatch.setattr("sys.stdin", io.StringIO(typed))
        out, _ = done([], capsys)
        assert "Enter to open it, or 0 for none" in out
        assert [path for path, _ in opened] == ([site] if is_opened else [])
    monkeypatch.setattr("sys.stdin", io.StringIO("2\n"))
    assert cli.run([]) == 2
    (line,) = capsys.readouterr().err.splitlines()
    assert line == "'2' is none of them; accepted: a number from 1 to 1"


def test_damaged_settings_are_a_line_and_the_site_is_made(plant: Path, home: Path, capsys: Captured) -> None:
    home.mkdir()
    (home / "settings.json").write_text("{")
    _, err = done(["intake", "a.ohmwalk", str(plant)], capsys)
    assert f"{home / 'settings.json'}: is damaged; it is passed over\n" in err
    assert len(record(Path("a.ohmwalk")).circuits) == 32
