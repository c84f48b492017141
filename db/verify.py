"""Whether a site file is whole: SQLite's own checks, the digests, and tables that are what the journal comes to."""

from __future__ import annotations

import os
import sqlite3
from collections.abc import Mapping

from db.digest import SaveRow, digest
from db.errors import Damaged, one_line
from db.journal import current, state
from db.lookup import SAVE_COLUMNS, changes_of, find, saves, select, writes_of
from db.schema import NOUNS, SCHEMA, Values, references
from db.writes import row_of

_CHECKED_ON_OPENING = 1_000
"""Up to so many changes of the last save are looked at whenever a file is opened."""


def problems(connection: sqlite3.Connection) -> tuple[str, ...]:
    """Everything that is wrong with a site file, in words; reads all of it."""
    found = [f"SQLite: {row[0]}" for row in connection.execute("PRAGMA integrity_check") if row[0] != "ok"]
    if found:
        return tuple(map(one_line, found))  # what a broken tree holds would only repeat it
    for table, _, parent, _ in connection.execute("PRAGMA foreign_key_check").fetchall():
        found.append(f"{table}: a row refers to a row of {parent} that is not there")
    found += [f"the save {id_} is not as it was written" for id_ in _with_wrong_digest(connection)]
    try:
        found += _unlike_journal(connection)
    except (Damaged, ValueError, TypeError) as error:
        found.append(f"the journal cannot be read: {error}")
    return tuple(map(one_line, found))


def refuse_torn(connection: sqlite3.Connection) -> None:
    """
    Look at the last save: quick, and it is the one that a copy made at a bad moment has torn.

    Raises
    ------
    Damaged
        If the file was cut short, or the last save's digest or one of its rows is not what was written.
    """
    (size,) = connection.execute("SELECT page_count * page_size FROM pragma_page_count, pragma_page_size").fetchone()
    file = connection.execute("SELECT file FROM pragma_database_list WHERE name = 'main'").fetchone()[0]
    # SQLite reads a last page that is cut short as if zeros followed.
    if file and os.stat(file).st_size < size:
        raise Damaged("it was cut short")
    last = connection.execute(f"SELECT {SAVE_COLUMNS}, digest FROM saves ORDER BY rowid DESC LIMIT 1").fetchone()
    if last is None:
        raise Damaged("it has no save")
    save, expected = SaveRow(*last[:-1]), last[-1]
    changes = connection.execute(
        'SELECT "table", row, "values", saw FROM changes WHERE save = ? ORDER BY "table", row LIMIT ?',
        (save.id, _CHECKED_ON_OPENING + 1),
    ).fetchall()
    if len(changes) > _CHECKED_ON_OPENING:
        return
    if digest(save, changes) != expected:
        raise Damaged("its last save is not as it was written")
    for table, row, _, _ in changes:
        row_state = state(writes_of(connection, table, row))
        stored = find(connection, table, row)
        # A removed row may be kept by what refers to it; only the whole journal tells.
        if stored is None and row_state.is_removed:
            continue
        if stored != row_of(table, row, row_state.cells):
            raise Damaged(f"a {NOUNS[table]} is not as the last save wrote it")


def _with_wrong_digest(connection: sqlite3.Connection) -> list[str]:
    written = dict(connection.execute("SELECT id, digest FROM saves").fetchall())
    return [save.id for save in saves(connection) if digest(save, changes_of(connection, save.id)) != written[save.id]]


def _unlike_journal(connection: sqlite3.Connection) -> list[str]:
    stamps = {save.id: save.stamp for save in saves(connection)}
    wanted = current(stamps, connection.execute("SELECT * FROM changes").fetchall())
    found = []
    for table in SCHEMA:
        stored = {row[0]: row for row in connection.execute(select(table)).fetchall()}
        if stored == wanted[table]:
            continue
        differing = {id_ for id_ in stored.keys() | wanted[table].keys() if stored.get(id_) != wanted[table].get(id_)}
        found += [f"{table}: the row {id_} is not what the journal comes to" for id_ in sorted(differing)]
    return found + _dangling(wanted)


def _dangling(tables: Mapping[str, Mapping[str, Values]]) -> list[str]:
    """References that have no foreign key too: lists of feeds."""
    return [
        f"{table}: the row {id_} refers to a row of {target} that is not there"
        for table, rows in tables.items()
        for id_, row in rows.items()
        for target, other in references(table, row)
        if other not in tables.get(target, ())
    ]
