"""Rows into tables, few or very many."""

from __future__ import annotations

import gc
import sqlite3
from collections.abc import Callable, Iterable, Iterator, Sequence
from contextlib import contextmanager

from db.lookup import names
from db.schema import SCHEMA, Values

_MANY = 5_000
"""From so many rows on, indexes are made after the rows: sorted once, a third of the time."""


def insert_rows(connection: sqlite3.Connection, table: str, rows: Sequence[Values]) -> None:
    """Add rows to a table of the record."""
    columns = SCHEMA[table].columns
    statement = f'INSERT INTO "{table}" ({names(columns)}) VALUES ({", ".join("?" * len(columns))})'
    _insert(connection, table, len(rows), lambda: connection.executemany(statement, rows))


def insert_changes(
    connection: sqlite3.Connection, save: str, changes: Sequence[tuple[str, str, str | None, str]]
) -> None:
    """Add rows to the journal; sorted by table and row, each lands beside the one before."""
    statement = f"INSERT INTO changes VALUES ('{save}', ?, ?, ?, ?)"
    _insert(connection, "changes", len(changes), lambda: connection.executemany(statement, changes))


def update_row(connection: sqlite3.Connection, table: str, row: Values, columns: Iterable[str]) -> None:
    """Set some columns of the row with this row's id."""
    columns = list(columns)
    assignments = ", ".join(f'"{name}" = ?' for name in columns)
    values = [row[SCHEMA[table].place(name)] for name in columns]
    connection.execute(f'UPDATE "{table}" SET {assignments} WHERE id = ?', (*values, row[0]))


def delete_row(connection: sqlite3.Connection, table: str, id_: str) -> None:
    """Take a row out of its table."""
    connection.execute(f'DELETE FROM "{table}" WHERE id = ?', (id_,))


def _insert(connection: sqlite3.Connection, table: str, count: int, insert: Callable[[], object]) -> None:
    indexes: list[tuple[str, str]] = []
    # Where more rows are there already than come, their index entries would all be made anew.
    if count >= _MANY and connection.execute(f'SELECT count(*) FROM "{table}"').fetchone()[0] < count:
        indexes = connection.execute(
            "SELECT name, sql FROM sqlite_schema WHERE type = 'index' AND tbl_name = ? AND sql IS NOT NULL", (table,)
        ).fetchall()
    for name, _ in indexes:
        connection.execute(f'DROP INDEX "{name}"')
    insert()
    for _, statement in indexes:
        connection.execute(statement)


@contextmanager
def no_collection() -> Iterator[None]:
    """
    Hold back the garbage collector while millions of rows are made.

    It would look at all of them again and again, though none of them can be garbage.
    """
    was_enabled = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        if was_enabled:
            gc.enable()
