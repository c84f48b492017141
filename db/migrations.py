"""
The steps that make a site file, and bring an older one up to date.

A released step is never edited; the next one corrects it, with a test that starts from the filled file
of its predecessor (``tests/db/files/``). Each step sets ``user_version`` to its own number. A step that
renames a field renames it in ``changes`` too, since the tables are what the journal comes to.

The steps are plain SQL rather than ``table.create()``: SQLite keeps the text of each statement, opening
compares it with these (``expected``), and generated columns and WITHOUT ROWID have no other way in.
"""

from __future__ import annotations

import sqlite3
from functools import cache

from sqlite_utils import Database, Migrations

APPLICATION_ID = 0x4F686D57
"""``OhmW``: what tells a site file from other SQLite files."""

migrations = Migrations("site")


@migrations()
def m001_create_site(db: Database) -> None:
    """The record as surveyed, one column a field, units in the names; and the journal it comes from."""
    db.execute(f"PRAGMA application_id = {APPLICATION_ID}")
    for statement in _M001.split(";"):
        if statement.strip():
            db.execute(statement.strip())
    db.execute("PRAGMA user_version = 1")


@migrations()
def m002_categories_and_loads_off(db: Database) -> None:
    """The category of a place, the rated voltage of a meter, and readings with the loads off."""
    for table in ("sources", "boards"):
        db.execute(f"ALTER TABLE {table} ADD COLUMN category TEXT NOT NULL DEFAULT ''")
    db.execute("ALTER TABLE instruments ADD COLUMN rated_voltage_v REAL")
    db.execute("ALTER TABLE readings ADD COLUMN loads_off TEXT NOT NULL DEFAULT ''")
    db.execute("PRAGMA user_version = 2")


_M001 = """
CREATE TABLE saves (
    id TEXT PRIMARY KEY NOT NULL,
    stamp INTEGER NOT NULL,
    who TEXT NOT NULL,
    laptop TEXT NOT NULL,
    why TEXT NOT NULL,
    undoes TEXT REFERENCES saves (id),
    digest TEXT NOT NULL
) STRICT;
CREATE INDEX saves_stamp ON saves (stamp);

CREATE TABLE changes (
    save TEXT NOT NULL REFERENCES saves (id),
    "table" TEXT NOT NULL,
    row TEXT NOT NULL,
    "values" TEXT,
    saw TEXT NOT NULL,
    PRIMARY KEY ("table", row, save)
) STRICT, WITHOUT ROWID;
CREATE INDEX changes_save ON changes (save);

CREATE TABLE site (
    id TEXT PRIMARY KEY NOT NULL,
    position INTEGER NOT NULL,
    name TEXT NOT NULL,
    address TEXT NOT NULL,
    limits TEXT NOT NULL,
    nominal_voltage_v REAL,
    ambient_temperature_c REAL,
    surveyed_by TEXT NOT NULL,
    extent TEXT NOT NULL,
    limitations TEXT NOT NULL,
    notes TEXT NOT NULL,
    prior TEXT NOT NULL,
    own_limits TEXT,
    typed TEXT NOT NULL
) STRICT;

CREATE TABLE sources (
    id TEXT PRIMARY KEY NOT NULL,
    position INTEGER NOT NULL,
    tag TEXT NOT NULL,
    kind TEXT NOT NULL,
    nominal_voltage_v REAL,
    working_voltage_v REAL,
    lowest_voltage_v REAL,
    highest_voltage_v REAL,
    resistance_ohm REAL,
    rated_current_a REAL,
    current_limit_a REAL,
    earthing TEXT NOT NULL,
    cells INTEGER,
    fed_from TEXT,
    efficiency_percent REAL,
    notes TEXT NOT NULL,
    typed TEXT NOT NULL,
    fed_from_circuit TEXT GENERATED ALWAYS AS (
        iif(substr(fed_from, 1, 9) = 'circuits/', substr(fed_from, 10, instr(substr(fed_from, 10), '/') - 1), NULL)
    ) VIRTUAL REFERENCES circuits (id)
) STRICT;
CREATE INDEX sources_fed_from_circuit ON sources (fed_from_circuit) WHERE fed_from_circuit IS NOT NULL;

CREATE TABLE boards (
    id TEXT PRIMARY KEY NOT NULL,
    position INTEGER NOT NULL,
    tag TEXT NOT NULL,
    fed_by TEXT NOT NULL,
    nominal_voltage_v REAL,
    location TEXT NOT NULL,
    walk_order REAL,
    notes TEXT NOT NULL,
    typed TEXT NOT NULL
) STRICT;
CREATE INDEX boards_tag ON boards (tag);

CREATE TABLE circuits (
    id TEXT PRIMARY KEY NOT NULL,
    position INTEGER NOT NULL,
    tag TEXT NOT NULL,
    fed_from TEXT,
    description TEXT NOT NULL,
    location TEXT NOT NULL,
    nominal_voltage_v REAL,
    device TEXT NOT NULL,
    rated_current_a REAL,
    device_poles INTEGER,
    device_leg TEXT NOT NULL,
    device_voltage_v REAL,
    breaking_capacity_a REAL,
    trip_current_a REAL,
    allowed_drop_percent REAL,
    not_tested TEXT NOT NULL,
    walk_order REAL,
    notes TEXT NOT NULL,
    typed TEXT NOT NULL,
    fed_from_board TEXT GENERATED ALWAYS AS (
        iif(substr(fed_from, 1, 7) = 'boards/', substr(fed_from, 8, instr(substr(fed_from, 8), '/') - 1), NULL)
    ) VIRTUAL REFERENCES boards (id),
    fed_from_source TEXT GENERATED ALWAYS AS (
        iif(substr(fed_from, 1, 8) = 'sources/', substr(fed_from, 9, instr(substr(fed_from, 9), '/') - 1), NULL)
    ) VIRTUAL REFERENCES sources (id)
) STRICT;
CREATE INDEX circuits_tag ON circuits (tag);
CREATE INDEX circuits_fed_from_board ON circuits (fed_from_board) WHERE fed_from_board IS NOT NULL;
CREATE INDEX circuits_fed_from_source ON circuits (fed_from_source) WHERE fed_from_source IS NOT NULL;

CREATE TABLE runs (
    id TEXT PRIMARY KEY NOT NULL,
    position INTEGER NOT NULL,
    circuit_id TEXT NOT NULL REFERENCES circuits (id),
    number INTEGER NOT NULL,
    from_point TEXT NOT NULL,
    to_point TEXT NOT NULL,
    to_board_id TEXT REFERENCES boards (id),
    one_way_length_m REAL,
    length_by TEXT NOT NULL,
    size TEXT NOT NULL,
    material TEXT NOT NULL,
    stranding TEXT NOT NULL,
    parallel INTEGER,
    insulation TEXT NOT NULL,
    method TEXT NOT NULL,
    grouped INTEGER,
    conductor_temperature_c REAL,
    temperature_by TEXT NOT NULL,
    return_conductor TEXT NOT NULL,
    return_size TEXT NOT NULL,
    return_material TEXT NOT NULL,
    notes TEXT NOT NULL,
    typed TEXT NOT NULL
) STRICT;
CREATE INDEX runs_circuit_id_number ON runs (circuit_id, number);
CREATE INDEX runs_to_board_id ON runs (to_board_id) WHERE to_board_id IS NOT NULL;

CREATE TABLE loads (
    id TEXT PRIMARY KEY NOT NULL,
    position INTEGER NOT NULL,
    circuit_id TEXT NOT NULL REFERENCES circuits (id),
    point TEXT NOT NULL,
    tag TEXT NOT NULL,
    kind TEXT NOT NULL,
    current_a REAL,
    power_w REAL,
    resistance_ohm REAL,
    lowest_voltage_v REAL,
    highest_voltage_v REAL,
    peak_current_a REAL,
    peak_time_s REAL,
    simultaneous REAL,
    function TEXT NOT NULL,
    notes TEXT NOT NULL,
    typed TEXT NOT NULL
) STRICT;
CREATE INDEX loads_circuit_id_tag ON loads (circuit_id, tag);

CREATE TABLE instruments (
    id TEXT PRIMARY KEY NOT NULL,
    position INTEGER NOT NULL,
    tag TEXT NOT NULL,
    quantity TEXT NOT NULL,
    full_scale REAL,
    accuracy_percent REAL,
    counts REAL,
    resolution REAL,
    zero REAL,
    input_resistance_ohm REAL,
    category TEXT NOT NULL,
    calibrated_until TEXT NOT NULL,
    notes TEXT NOT NULL,
    typed TEXT NOT NULL
) STRICT;

CREATE TABLE visits (
    id TEXT PRIMARY KEY NOT NULL,
    position INTEGER NOT NULL,
    tag TEXT NOT NULL,
    kind TEXT NOT NULL,
    date TEXT NOT NULL,
    by TEXT NOT NULL,
    walk_order REAL,
    notes TEXT NOT NULL,
    typed TEXT NOT NULL
) STRICT;

CREATE TABLE readings (
    id TEXT PRIMARY KEY NOT NULL,
    position INTEGER NOT NULL,
    circuit_id TEXT REFERENCES circuits (id),
    board TEXT,
    visit TEXT NOT NULL,
    round TEXT NOT NULL,
    taken_at TEXT NOT NULL,
    quantity TEXT NOT NULL,
    at TEXT NOT NULL,
    "to" TEXT NOT NULL,
    leg TEXT NOT NULL,
    value REAL NOT NULL,
    instrument TEXT NOT NULL,
    full_scale REAL,
    test_resistor_ohm REAL,
    test_resistor_leg TEXT NOT NULL,
    by TEXT NOT NULL,
    tag TEXT NOT NULL,
    replaces_id TEXT REFERENCES readings (id),
    reason TEXT NOT NULL,
    notes TEXT NOT NULL,
    typed TEXT NOT NULL,
    board_board TEXT GENERATED ALWAYS AS (
        iif(substr(board, 1, 7) = 'boards/', substr(board, 8, instr(substr(board, 8), '/') - 1), NULL)
    ) VIRTUAL REFERENCES boards (id),
    board_source TEXT GENERATED ALWAYS AS (
        iif(substr(board, 1, 8) = 'sources/', substr(board, 9, instr(substr(board, 9), '/') - 1), NULL)
    ) VIRTUAL REFERENCES sources (id)
) STRICT;
CREATE INDEX readings_circuit_id ON readings (circuit_id);
CREATE INDEX readings_tag ON readings (tag) WHERE tag <> '';
CREATE INDEX readings_replaces_id ON readings (replaces_id) WHERE replaces_id IS NOT NULL;
CREATE INDEX readings_board_board ON readings (board_board) WHERE board_board IS NOT NULL;
CREATE INDEX readings_board_source ON readings (board_source) WHERE board_source IS NOT NULL;

CREATE TABLE decisions (
    id TEXT PRIMARY KEY NOT NULL,
    position INTEGER NOT NULL,
    finding TEXT NOT NULL,
    visit TEXT NOT NULL,
    decision TEXT NOT NULL,
    by TEXT NOT NULL,
    at TEXT NOT NULL,
    reason TEXT NOT NULL,
    notes TEXT NOT NULL,
    typed TEXT NOT NULL
) STRICT;

CREATE TABLE acknowledged (
    id TEXT PRIMARY KEY NOT NULL,
    position INTEGER NOT NULL,
    caution TEXT NOT NULL,
    visit TEXT NOT NULL,
    by TEXT NOT NULL,
    at TEXT NOT NULL,
    typed TEXT NOT NULL
) STRICT;
"""


def newest() -> int:
    """The ``user_version`` that this program writes."""
    return len(_names())


def migrate(db: Database) -> None:
    """
    Bring a file up to date; all steps or none.

    ``apply`` begins each step as a reader and only then writes, so that two programs opening an older
    file at once would lock each other out: the write lock is taken first.
    """
    db.conn.execute("BEGIN IMMEDIATE")
    try:
        migrations.apply(db)
    except BaseException:
        db.rollback()
        raise
    db.commit()


def expected(version: int) -> dict[str, str]:
    """Name and SQL of every table and index of a file of that ``user_version``."""
    return _expected(version, len(_names()))


@cache
def _expected(version: int, newest_version: int) -> dict[str, str]:
    db = Database(memory=True, execute_plugins=False)
    later = {} if version >= newest_version else {"stop_before": _names()[version]}
    migrations.apply(db, **later)
    found = schema_of(db.conn)
    db.close()
    return found


def schema_of(connection: sqlite3.Connection) -> dict[str, str]:
    """Name and SQL of every table, index, view and trigger, but those of SQLite and of ``Migrations``."""
    rows = connection.execute(
        "SELECT name, sql FROM sqlite_schema WHERE tbl_name NOT LIKE 'sqlite@_%' ESCAPE '@' AND tbl_name <> ?"
        " AND sql IS NOT NULL",
        (migrations.migrations_table,),
    )
    return dict(rows.fetchall())


def _names() -> list[str]:
    """Every step's name, in order: what is pending on a database that has had none."""
    db = Database(memory=True, execute_plugins=False)
    names = [step.name for step in migrations.pending(db)]
    db.close()
    return names
