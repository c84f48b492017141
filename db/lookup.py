"""What is asked of a site file by more than one module: single rows, a row's writes, who refers to it."""

from __future__ import annotations

import json
import sqlite3
from collections.abc import Iterable
from functools import cache

from db.digest import SaveRow
from db.journal import read_write
from db.schema import KEYS, NOUNS, SCHEMA, Field, TableSchema, Values, read_feed, referring
from db.writes import Write

REFERRED_BY_TAG = {
    "instruments": (("readings", "instrument"),),
    "visits": (("readings", "visit"), ("decisions", "visit"), ("acknowledged", "visit")),
}
"""Fields that hold another row's tag rather than its id: no foreign key, but asked before a removal."""

SAVE_COLUMNS = "id, stamp, who, laptop, why, undoes"
"""Columns of ``saves`` in the order of ``SaveRow``."""


def names(columns: Iterable[str]) -> str:
    """Column names for a statement."""
    return ", ".join(f'"{name}"' for name in columns)


@cache
def select(table: str) -> str:
    """The statement that reads a table's rows as ``Values``."""
    return f'SELECT {names(SCHEMA[table].columns)} FROM "{table}"'


def find(connection: sqlite3.Connection, table: str, id_: str) -> Values | None:
    """A row of a table, or ``None``."""
    row: Values | None = connection.execute(f"{select(table)} WHERE id = ?", (id_,)).fetchone()
    return row


def writes_of(connection: sqlite3.Connection, table: str, id_: str) -> list[Write]:
    """Every write of a row, removed or not."""
    found = connection.execute(
        'SELECT c.save, c."table", c.row, c."values", c.saw, s.stamp FROM changes c JOIN saves s ON s.id = c.save'
        ' WHERE c."table" = ? AND c.row = ?',
        (table, id_),
    ).fetchall()
    return [read_write({change[0]: change[5]}, change[:5]) for change in found]


def saves(connection: sqlite3.Connection, where: str = "", values: tuple[object, ...] = ()) -> list[SaveRow]:
    """Saves, the earliest first."""
    found = connection.execute(f"SELECT {SAVE_COLUMNS} FROM saves {where} ORDER BY stamp, id", values)
    return [SaveRow(*row) for row in found.fetchall()]


def changes_of(connection: sqlite3.Connection, save: str) -> list[tuple[str, str, str | None, str]]:
    """Table, row, values and saw of a save's changes, in the order in which they are digested."""
    return connection.execute(
        'SELECT "table", row, "values", saw FROM changes WHERE save = ? ORDER BY "table", row', (save,)
    ).fetchall()


def foreign_key_column(field: Field, table: str) -> str:
    """The column on which a field's foreign key to a table stands."""
    return field.name if field.kind == "reference" else f"{field.name}_{NOUNS[table]}"


def referring_rows(connection: sqlite3.Connection, table: str, ids: Iterable[str]) -> dict[str, list[tuple[str, str]]]:
    """Table and id of every row that refers to one of some rows by its id, for those of them that have any."""
    found: dict[str, list[tuple[str, str]]] = {id_: [] for id_ in ids}
    for name, field in referring(table):
        if field.kind == "feeds":
            # A list has no index: it is read once for all; boards are few.
            for other, text in connection.execute(f'SELECT id, "{field.name}" FROM "{name}"').fetchall():
                for feed in map(read_feed, json.loads(text)):
                    if feed.table == table and feed.id in found:
                        found[feed.id].append((name, other))
        else:
            statement = f'SELECT id FROM "{name}" WHERE "{foreign_key_column(field, table)}" = ?'
            for id_, of_row in found.items():
                of_row += [(name, other) for (other,) in connection.execute(statement, (id_,)).fetchall()]
    return {id_: of_row for id_, of_row in found.items() if of_row}


def described(connection: sqlite3.Connection, table: str, row: Values) -> str:
    """A row as people call it: ``run 2 of circuit 'B1-07'``."""
    schema: TableSchema = SCHEMA[table]
    value = {name: row[schema.place(name)] for name in schema.columns}
    if table == "runs":
        text = f"run {value['number']}"
    elif table == "readings":
        text = f"reading {value['tag']!r}" if value["tag"] else f"a {value['quantity']} reading at {value['at']!r}"
    else:
        text = f"{NOUNS[table]} {value['tag']!r}" if "tag" in KEYS.get(table, ()) else f"a {NOUNS[table]}"
    circuit = value.get("circuit_id")
    if circuit:
        found = connection.execute("SELECT tag FROM circuits WHERE id = ?", (circuit,)).fetchone()
        text += f" of circuit {found[0]!r}" if found else ""
    return text
