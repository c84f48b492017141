"""Who changed what and when, with what was there before: read from the journal, which keeps each value once."""

from __future__ import annotations

import sqlite3
from collections.abc import Mapping
from dataclasses import dataclass
from datetime import UTC, datetime
from typing import Any

from db.digest import SaveRow
from db.journal import in_force, read_write, replaced
from db.lookup import saves
from db.schema import SCHEMA
from db.writes import Cell, Write, read_values

_OF_CIRCUIT = ("runs", "loads", "readings")
"""Tables whose rows belong to a circuit."""


@dataclass(frozen=True, slots=True)
class FieldChange:
    """One field before and after. Values are as in columns: a reference is an id, a feed ``table/id/point``."""

    field: str
    before: Any
    after: Any
    typed_before: str | None = None
    """The text that had been typed, where it was not the plain number in the column's unit."""
    typed_after: str | None = None


@dataclass(frozen=True, slots=True)
class RowChange:
    """What a save did to one row."""

    table: str
    row: str
    what: str
    """``added``, ``changed``, ``removed`` or ``restored``."""
    fields: tuple[FieldChange, ...]


@dataclass(frozen=True, slots=True)
class Entry:
    """One save in the history."""

    id: str
    at: datetime
    """When, by the clock of the laptop that saved; never before a save that it knew of."""
    who: str
    laptop: str
    why: str
    undoes: str | None
    """The save that this one undid."""
    count: int
    """How many rows it changed (of the circuit asked for)."""
    changes: tuple[RowChange, ...]
    """The first of them, ordered by table and row."""


def history(connection: sqlite3.Connection, circuit: str | None, most: int) -> tuple[Entry, ...]:
    """
    Saves with their changes, the earliest first.

    Parameters
    ----------
    connection
        In a transaction, so that everything is read from one state.
    circuit
        Tag that a circuit has or had: only what was done to it, its runs, loads and readings.
    most
        How many changes of a save are listed.
    """
    rows = None if circuit is None else _rows_of_circuit(connection, circuit)
    found = saves(connection)
    stamps = {save.id: save.stamp for save in found}
    entries = []
    for save in found:
        touched = connection.execute(
            'SELECT "table", row FROM changes WHERE save = ? ORDER BY "table", row', (save.id,)
        ).fetchall()
        touched = touched if rows is None else [place for place in touched if place in rows]
        if rows is None or touched:
            changes = tuple(_row_change(connection, save, stamps, *place) for place in touched[:most])
            entries.append(_entry(save, len(touched), changes))
    return tuple(entries)


def _entry(save: SaveRow, count: int, changes: tuple[RowChange, ...]) -> Entry:
    at = datetime.fromtimestamp(save.stamp / 1000, UTC)
    return Entry(save.id, at, save.who, save.laptop, save.why, save.undoes, count, changes)


def _rows_of_circuit(connection: sqlite3.Connection, tag: str) -> set[tuple[str, str]]:
    """Table and id of every row that belongs, or once belonged, to a circuit of that tag."""
    circuits = {
        id_
        for id_, values in connection.execute(
            """SELECT row, "values" FROM changes WHERE "table" = 'circuits' AND "values" IS NOT NULL"""
        ).fetchall()
        if read_values("circuits", values).get("tag", Cell(None)).value == tag
    }
    rows = {("circuits", id_) for id_ in circuits}
    for id_ in circuits:
        for table in _OF_CIRCUIT:
            # An id is found as text first: reading the JSON of every change would take ten times as long.
            mentions = connection.execute(
                'SELECT row, "values" FROM changes WHERE "table" = ? AND instr("values", ?) > 0', (table, id_)
            ).fetchall()
            rows |= {
                (table, row)
                for row, values in mentions
                if read_values(table, values).get("circuit_id", Cell(None)).value == id_
            }
    return rows


def _row_change(
    connection: sqlite3.Connection, save: SaveRow, stamps: Mapping[str, int], table: str, row: str
) -> RowChange:
    changes = connection.execute('SELECT * FROM changes WHERE "table" = ? AND row = ?', (table, row)).fetchall()
    by_save = {change[0]: read_write(stamps, change) for change in changes}
    write = by_save[save.id]
    fields = SCHEMA[table].fields
    empty = {field.name: Cell(field.empty) for field in fields}
    after = {name: write.values.get(name, empty[name]) for name in empty} if write.values else empty
    before = empty
    if write.values is None:
        what, names = "removed", list(empty)
        before = {name: _before(name, write, by_save) or empty[name] for name in names}
    elif "position" in write.values:
        what, names = ("restored" if write.saw else "added"), list(empty)
    else:
        what, names = "changed", [name for name in empty if name in write.values]
        before = {name: _before(name, write, by_save) or empty[name] for name in names}
    differing = [
        FieldChange(name, before[name].value, after[name].value, before[name].typed, after[name].typed)
        for name in names
        if what == "changed" or before[name] != after[name]
    ]
    return RowChange(table, row, what, tuple(differing))


def _before(field: str, write: Write, by_save: Mapping[str, Write]) -> Cell | None:
    earlier = replaced(field, write, by_save)
    return in_force(field, earlier) if earlier else None
