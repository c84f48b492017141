"""What must hold after a save: no tag twice, no reference to nothing, nothing removed that others need."""

from __future__ import annotations

import sqlite3
from collections.abc import Mapping, Sequence

from db.errors import DanglingReference, DuplicateTag, StillReferred
from db.lookup import REFERRED_BY_TAG, described, find, names, referring_rows
from db.schema import KEYS, NOUNS, SCHEMA, Values, key, referring_places, targets
from rules.record import is_missing

_FEW = 1_000
"""Up to so many rows, each is looked up on its own; beyond, the whole table is gone through once."""

_NAMED = 3
"""How many referring rows an error names before it counts the rest."""


def refuse_duplicates(connection: sqlite3.Connection, table: str, rows: Mapping[str, Values]) -> None:
    """
    Refuse rows, which are in their table already, that share their tag with another one.

    Only what this save gave a tag is looked at: two rows of one tag that came by combining must not stop
    the save that renames one of them.
    """
    if table not in KEYS or not rows:
        return
    columns = KEYS[table]
    tagged = " AND tag <> ''" if table == "readings" else ""  # also what lets SQLite use the partial index
    if len(rows) <= _FEW:
        same = " AND ".join(f'"{name}" IS ?' for name in columns)
        statement = f'SELECT 1 FROM "{table}" WHERE {same}{tagged} AND id <> ? LIMIT 1'
        keys = ((id_, key(table, row)) for id_, row in rows.items())
        twice = [id_ for id_, of_row in keys if of_row and connection.execute(statement, (*of_row, id_)).fetchone()]
    else:
        grouped = f"GROUP BY {names(columns)} HAVING count(*) > 1"
        several = set(
            connection.execute(f'SELECT {names(columns)} FROM "{table}" WHERE 1{tagged} {grouped}').fetchall()
        )
        twice = [id_ for id_, row in rows.items() if key(table, row) in several] if several else []
    if twice:
        what = described(connection, table, rows[twice[0]])
        raise DuplicateTag(f"{what} is there twice; each needs a {_key_name(table)} of its own")


def _key_name(table: str) -> str:
    return {"runs": "number", "instruments": "tag, quantity or range"}.get(table, "tag")


def refuse_dangling(connection: sqlite3.Connection, table: str, rows: Mapping[str, Values]) -> None:
    """Refuse rows that refer to rows which are not there after the save."""
    for place, field in referring_places(table):
        for value in {row[place] for row in rows.values()}:
            for target, id_ in targets(field, value):
                if target in field.targets and _is_there(connection, target, id_):
                    continue
                row = next(row for row in rows.values() if row[place] == value)
                what = f"{id_[1:]!r}" if is_missing(id_) else f"{NOUNS.get(target, 'row')} {id_!r}"
                accepted = " or ".join(f"a {NOUNS[name]}" for name in field.targets)
                raise DanglingReference(
                    f"{described(connection, table, row)}: {field.name} must name {accepted} of this site; there is no {what}"
                )


def _is_there(connection: sqlite3.Connection, table: str, id_: str) -> bool:
    """Whether a table of the record has a row of that id."""
    return connection.execute(f'SELECT 1 FROM "{table}" WHERE id = ?', (id_,)).fetchone() is not None


def refuse_referred(connection: sqlite3.Connection, table: str, removed: Mapping[str, Values]) -> None:
    """Refuse the removal of rows, which are out of their table already, that others still refer to."""
    if not removed:
        return
    referring = referring_rows(connection, table, removed)
    if table in REFERRED_BY_TAG:
        for id_, row in removed.items():
            if of_row := _referring_by_tag(connection, table, row):
                referring.setdefault(id_, []).extend(of_row)
    for id_, of_row in referring.items():
        raise StillReferred(
            f"{described(connection, table, removed[id_])} cannot be removed: {_list(connection, of_row)}"
            f" {'refers' if len(of_row) == 1 else 'refer'} to it"
        )


def _referring_by_tag(connection: sqlite3.Connection, table: str, row: Values) -> list[tuple[str, str]]:
    tag = row[SCHEMA[table].place("tag")]
    if connection.execute(f'SELECT 1 FROM "{table}" WHERE tag = ?', (tag,)).fetchone():
        return []  # another row of that tag: a meter has one for each range
    return [
        (name, id_)
        for name, column in REFERRED_BY_TAG[table]
        for (id_,) in connection.execute(f'SELECT id FROM "{name}" WHERE "{column}" = ?', (tag,)).fetchall()
    ]


def _list(connection: sqlite3.Connection, referring: Sequence[tuple[str, str]]) -> str:
    named = []
    for table, id_ in referring[:_NAMED]:
        row = find(connection, table, id_)
        assert row is not None
        named.append(described(connection, table, row))
    more = len(referring) - len(named)
    return ", ".join([*named, f"{more} more"] if more else named)
