"""The end of a save: what was collected is written, checked as a whole, and journalled."""

from __future__ import annotations

import sqlite3
from collections.abc import Mapping
from dataclasses import dataclass, field

from db.checks import refuse_dangling, refuse_duplicates, refuse_referred
from db.digest import SaveRow, digest
from db.journal import RowState, state
from db.lookup import find, referring_rows, writes_of
from db.schema import SCHEMA, Values, key, references
from db.tables import delete_row, insert_changes, insert_rows, update_row
from db.writes import EVERY_FIELD, Cell, cells_of, fields_of, first_writes, saw_text, values_text

_Change = tuple[str, str, str | None, str]
"""Table, row, values and saw of a row of ``changes``."""

Added = Mapping[str, dict[str, Values]]
"""New rows by table and id."""


@dataclass(slots=True)
class Touched:
    """A row that is, or once was, in the file."""

    before: Values | None
    """As it stands in its table; ``None`` where it was removed earlier."""
    after: Values | None
    """As it will stand; ``None`` where it is removed."""
    asked: set[str] = field(default_factory=set)
    """Fields that were set, even to what they were: that settles a conflict."""


def write_save(
    connection: sqlite3.Connection, save: SaveRow, added: Added, touched: Mapping[str, dict[str, Touched]]
) -> bool:
    """
    Write everything in the transaction that is open; whether there was anything to write.

    Raises
    ------
    RefusedSave
        If the record would no longer hold together. What is written by then is for the caller to roll back.
    """
    states: dict[tuple[str, str], RowState] = {}
    for table, rows in touched.items():
        for id_, row in list(rows.items()):
            if row.before == row.after and not row.asked:
                del rows[id_]
                continue
            states[table, id_] = row_state = state(writes_of(connection, table, id_))
            if row.before == row.after and not row.asked & set(row_state.conflicts):
                del rows[id_]
    if not any(added.values()) and not any(touched.values()):
        return False
    _write_tables(connection, added, touched)
    _check(connection, added, touched)
    changes = [
        _change(table, id_, row, states[table, id_]) for table, rows in touched.items() for id_, row in rows.items()
    ]
    changes += _let_go(connection, touched)
    for table, new in added.items():
        changes += zip([table] * len(new), new, first_writes(table, list(new.values())), ["{}"] * len(new), strict=True)
    changes.sort()  # table and row are never the same twice, so nothing after them is compared
    connection.execute(
        "INSERT INTO saves (id, stamp, who, laptop, why, undoes, digest) VALUES (?, ?, ?, ?, ?, ?, ?)",
        (*save, digest(save, changes)),
    )
    insert_changes(connection, save.id, changes)
    return True


def _change(table: str, id_: str, row: Touched, row_state: RowState) -> _Change:
    """What the journal keeps of a change to a row that was written before."""
    whole = saw_text({EVERY_FIELD: row_state.head_saves})
    if row.after is None:
        return table, id_, None, whole
    after = cells_of(table, row.after)
    if row.before is None:
        # It comes back: every field that was ever written, in words of this save, which no removal has seen.
        written = row_state.heads.keys() | after.keys()
    else:
        before = cells_of(table, row.before)
        written = row.asked & set(row_state.conflicts)
        written |= {name for name in before.keys() | after.keys() if before.get(name) != after.get(name)}
    cells = {f.name: after.get(f.name, Cell(f.empty)) for f in fields_of(table) if f.name in written}
    if row.before is None:
        return table, id_, values_text(table, cells), whole
    saw = {name: [head.save for head in row_state.heads.get(name, ())] for name in cells}
    return table, id_, values_text(table, cells), saw_text(saw)


def _write_tables(connection: sqlite3.Connection, added: Added, touched: Mapping[str, dict[str, Touched]]) -> None:
    for table, schema in SCHEMA.items():
        for id_, row in touched[table].items():
            if row.after is None:
                delete_row(connection, table, id_)
            elif row.before is None:
                insert_rows(connection, table, [row.after])
            else:
                both = zip(schema.columns, row.before, row.after, strict=True)
                if differing := [name for name, before, after in both if before != after]:
                    update_row(connection, table, row.after, differing)
        if added[table]:
            insert_rows(connection, table, list(added[table].values()))


def _check(connection: sqlite3.Connection, added: Added, touched: Mapping[str, dict[str, Touched]]) -> None:
    for table in SCHEMA:
        living = dict(added[table])
        living.update((id_, row.after) for id_, row in touched[table].items() if row.after is not None)
        refuse_dangling(connection, table, living)
        for id_, row in touched[table].items():
            if row.before is not None and row.after is not None and key(table, row.before) == key(table, row.after):
                del living[id_]
        refuse_duplicates(connection, table, living)
    for table, rows in touched.items():
        removed = {id_: row.before for id_, row in rows.items() if row.after is None and row.before is not None}
        refuse_referred(connection, table, removed)


def _let_go(connection: sqlite3.Connection, touched: Mapping[str, dict[str, Touched]]) -> list[_Change]:
    """
    Remove what another laptop had removed, and only a reference that this save drops has kept.

    After combining, a row whose removal saw everything stays while something refers to it. Once that
    refers elsewhere or is gone, the row is gone too; that is written as a removal of its own.
    """
    changes: list[_Change] = []
    waiting = {
        target
        for table, rows in touched.items()
        for row in rows.values()
        if row.before is not None
        for target in set(references(table, row.before)) - set(references(table, row.after) if row.after else ())
    }
    while waiting:
        table, id_ = waiting.pop()
        row = None if id_ in touched[table] else find(connection, table, id_)
        if row is None:
            continue
        row_state = state(writes_of(connection, table, id_))
        if row_state.is_removed and not referring_rows(connection, table, [id_]):
            delete_row(connection, table, id_)
            changes.append((table, id_, None, saw_text({EVERY_FIELD: row_state.head_saves})))
            waiting.update(references(table, row))
    return changes
