"""A filled file of the first schema, kept since: whatever steps follow, it opens with all that it holds."""

from __future__ import annotations

import runpy
import shutil
import sqlite3
from contextlib import closing
from dataclasses import replace
from pathlib import Path

import pytest

from db.migrations import expected, schema_of
from db.store import SiteStore
from rules.record import TABLES

FILES = Path(__file__).parent / "files"
FIRST = FILES / "first.ohmwalk"
MADE = runpy.run_path(str(FILES / "make_first.py"))


@pytest.mark.parametrize("read_only", [True, False])
def test_the_first_file_opens_with_all_it_holds(path: Path, read_only: bool) -> None:
    shutil.copy(FIRST, path)
    with SiteStore(path, read_only=read_only) as store:
        assert store.site() == MADE["EXPECTED"]
        assert store.verify() == ()
        entries = store.history()
    assert tuple(entry.why for entry in entries) == MADE["WHYS"]
    assert {(entry.who, entry.laptop) for entry in entries} == {("Ann", "laptop-a"), ("Bob", "laptop-b")}


def test_one_goes_on_from_the_first_file(path: Path) -> None:
    shutil.copy(FIRST, path)
    with SiteStore(path, laptop="laptop-b") as store:
        assert store.undo("Bob") == "no caution"
        assert store.site().acknowledged == MADE["START"].acknowledged
        assert store.undo("Bob") == "a second visit"
        assert store.site().visits == MADE["START"].visits
        assert store.verify() == ()


def test_the_first_file_has_rows_in_every_table() -> None:
    assert all(MADE["START"].table(table) for table in TABLES)


def test_the_first_step_was_not_edited_since() -> None:
    with closing(sqlite3.connect(f"{FIRST.as_uri()}?mode=ro", uri=True)) as connection:
        assert connection.execute("PRAGMA user_version").fetchone() == (1,)
        assert schema_of(connection) == expected(1)


def test_the_first_file_takes_what_the_second_step_added(path: Path) -> None:
    shutil.copy(FIRST, path)
    with SiteStore(path, laptop="laptop-b") as store:
        assert [row.category for row in store.site().sources] == ["", ""]
        assert [row.category for row in store.site().boards] == ["", ""]
        with store.save("Bob", "categories, and a clamp with the loads off") as save:
            save.change("sources", "rect", category="CAT II")
            save.change("boards", "db1", category="CAT III")
            save.change("instruments", "m1", rated_voltage_v=600.0)
            save.change("readings", "x2", loads_off="yes")
    with SiteStore(path, read_only=True) as store:
        site = store.site()
        assert store.verify() == ()
    start = MADE["EXPECTED"]
    assert site == replace(
        start,
        sources=(replace(start.sources[0], category="CAT II"), start.sources[1]),
        boards=(replace(start.boards[0], category="CAT III"), start.boards[1]),
        instruments=(replace(start.instruments[0], rated_voltage_v=600.0),),
        readings=(start.readings[0], replace(start.readings[1], loads_off="yes"), start.readings[2]),
    )
