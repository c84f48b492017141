"""
One save: what it is asked for is collected, then checked and written as a whole.

The record must hold together after a save, not at each step within it: a run may be added before its
circuit, and two tags may change places.
"""

from __future__ import annotations

import secrets
import sqlite3
from collections import Counter
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import replace
from itertools import count
from pathlib import Path
from typing import Any

from db.digest import SaveRow
from db.errors import InvalidValue, TakenId, UnknownRow, translated
from db.finish import Touched, write_save
from db.ids import refuse_unfit, with_ids_exchanged
from db.lookup import described, find
from db.rows import to_cell, to_columns, typed_text
from db.schema import NOUNS, SCHEMA, SITE, Values
from db.tables import no_collection
from db.writes import Cell, cells_of, row_of
from rules.record import KEY_FIELDS, TABLES, Row, Site, Typed, row_id

POSITIONS_PER_MS = 1_000_000
"""
Rows stand in the order in which they were first written: a position is the stamp of the save in
millionths, counted up. So it needs no look at the rows that are there, and two laptops interleave by time.
"""


class Save:
    """What ``with store.save(who, why) as save:`` gives: the only way to write. Nothing is written before its end."""

    def __init__(self, path: Path, connection: sqlite3.Connection, row: SaveRow) -> None:
        self._path = path
        self._connection = connection
        self._row = row
        self.is_written = False
        """Whether the save is over and changed anything."""
        self._places = Counter[str]()
        self._added: dict[str, dict[str, Values]] = {table: {} for table in SCHEMA}
        self._touched: dict[str, dict[str, Touched]] = {table: {} for table in SCHEMA}

    @property
    def id(self) -> str:
        """The save's id."""
        return self._row.id

    @property
    def touched(self) -> dict[str, frozenset[str]]:
        """Ids of the rows that were added, changed or removed, once it is written, by table; ``site`` for the settings."""
        return {
            table: frozenset((*self._added[table], *self._touched[table]))
            for table in SCHEMA
            if self._added[table] or self._touched[table]
        }

    # --- what a user of the store asks for

    def add(self, table: str, row: Row, /) -> str:
        """
        Add a row and return its id.

        An empty id asks for a new one: derived from the tag where the table has tags, else random.

        Raises
        ------
        InvalidValue
            If a field cannot hold its value.
        TakenId
            If a row of this table has or had the id.
        """
        return self.add_all(table, (row,))[0]

    def add_all(self, table: str, rows: Iterable[Row], /) -> list[str]:
        """Add rows in their order and return their ids; as ``add``, and quick for very many."""
        _known_table(table)
        rows = list(rows)
        for row in rows:
            if type(row) is not TABLES[table]:
                raise InvalidValue(f"{table} takes {TABLES[table].__name__}, not {type(row).__name__}")
        if not all(row.id for row in rows):
            rows = self._with_ids(table, rows)
        ids = [row.id for row in rows]
        self._refuse_taken(table, ids)
        found = to_columns(table, rows, self._positions(table, len(rows)))
        self._added[table].update(zip(ids, found, strict=True))
        return ids

    def put(self, site: Site, /) -> None:
        """
        Add every row of a site, and take over its settings.

        Ids that this file has used already are exchanged for new ones, references along. Which rows are
        there already under another id is for the caller to find.
        """
        site = self._with_free_ids(site)
        self._set_settings(site)
        for table in TABLES:
            self.add_all(table, site.table(table))

    def change(self, table: str, id_: str, /, *, typed: Typed = (), **fields: Any) -> None:
        """
        Set fields of a row.

        Parameters
        ----------
        table, id_
            The row.
        typed
            Field and text as typed, for fields among ``fields``; a field set without one loses its text.
        fields
            New values by field.

        Raises
        ------
        UnknownRow
            If the row or a field is not there.
        InvalidValue
            If a field cannot hold its value.
        """
        _known_table(table)
        self._change(table, id_, typed, fields)

    def settings(self, *, typed: Typed = (), **fields: Any) -> None:
        """Set settings of the site (``name``, ``limits``, ``prior`` …); as ``change``."""
        self._change(SITE, SITE, typed, fields)

    def remove(self, table: str, id_: str, /) -> None:
        """
        Remove a row. The journal keeps it, so that the removal can be undone.

        Raises
        ------
        UnknownRow
            If it is not there.
        StillReferred
            At the end of the save, if rows refer to it that are there then.
        """
        _known_table(table)
        self._existing(table, id_)
        if self._added[table].pop(id_, None) is None:
            self._touch(table, id_).after = None

    # --- what undoing asks for

    def write_back(self, table: str, id_: str, cells: Mapping[str, Cell] | None) -> None:
        """Set cells as they once stood; a row that was removed comes back with these. ``None`` removes it."""
        touched = self._touch(table, id_)
        if cells is None:
            touched.after = None
            return
        if touched.after is None:
            touched.after = row_of(table, id_, cells)
        else:
            touched.after = row_of(table, id_, {**cells_of(table, touched.after), **cells})
            touched.asked |= cells.keys()

    def finish(self) -> None:
        """Check and write what was asked for."""
        with no_collection(), translated(self._path):
            self.is_written = write_save(self._connection, self._row, self._added, self._touched)

    # --- collecting

    def _change(self, table: str, id_: str, typed: Typed, fields: Mapping[str, Any]) -> None:
        schema = SCHEMA[table]
        row = list(self._existing(table, id_))
        for name, value in fields.items():
            known = schema.field(name)
            if known is None:
                raise UnknownRow(f"{table} has no field {name!r}")
            try:
                row[schema.place(name)] = to_cell(known, value)
            except InvalidValue as error:
                with translated(self._path):
                    what = described(self._connection, table, tuple(row))
                raise InvalidValue(f"{what}: {error}") from None
        texts = {name: cell.typed for name, cell in cells_of(table, tuple(row)).items() if cell.typed is not None}
        for name, _ in typed:
            if name not in fields:
                raise InvalidValue(f"{table}: typed names {name!r}, which is not being set")
        kept = tuple((name, text) for name, text in texts.items() if name not in fields)
        row[-1] = typed_text(schema, (*kept, *typed))
        if id_ in self._added[table]:
            self._added[table][id_] = tuple(row)
        else:
            touched = self._touch(table, id_)
            touched.after = tuple(row)
            touched.asked |= fields.keys()

    def _set_settings(self, site: Site) -> None:
        (row,) = to_columns(SITE, [site], self._positions(SITE, 1))
        if self._find(SITE, SITE) is None:
            self._added[SITE][SITE] = row
        else:
            self.write_back(
                SITE, SITE, {f.name: cells_of(SITE, row).get(f.name, Cell(f.empty)) for f in SCHEMA[SITE].fields}
            )

    def _existing(self, table: str, id_: str) -> Values:
        row = self._find(table, id_)
        if row is None:
            raise UnknownRow(f"there is no {NOUNS[table]} {id_!r} (any more)")
        return row

    def _find(self, table: str, id_: str) -> Values | None:
        """A row as it stands in this save."""
        if id_ in self._added[table]:
            return self._added[table][id_]
        return self._touch(table, id_).after

    def _touch(self, table: str, id_: str) -> Touched:
        touched = self._touched[table].get(id_)
        if touched is None:
            with translated(self._path):
                row = find(self._connection, table, id_)
            touched = self._touched[table][id_] = Touched(row, row)
        return touched

    def _positions(self, table: str, number: int) -> range:
        first = self._row.stamp * POSITIONS_PER_MS + self._places[table]
        self._places[table] += number
        return range(first, first + number)

    # --- ids

    def _is_used(self, table: str, id_: str) -> bool:
        """Whether a row of the table has or had the id."""
        if id_ in self._added[table]:
            return True
        with translated(self._path):
            found = self._connection.execute(
                'SELECT 1 FROM changes WHERE "table" = ? AND row = ? LIMIT 1', (table, id_)
            ).fetchone()
        return found is not None

    def _was_ever_written(self, table: str) -> bool:
        with translated(self._path):
            found = self._connection.execute('SELECT 1 FROM changes WHERE "table" = ? LIMIT 1', (table,)).fetchone()
        return found is not None

    def _refuse_taken(self, table: str, ids: Sequence[str]) -> None:
        for id_ in ids:
            refuse_unfit(table, id_)
        known = set(ids)
        twice = len(known) < len(ids)
        if twice or self._added[table].keys() & known or self._was_ever_written(table):
            seen: set[str] = set()
            for id_ in ids:
                if id_ in seen or self._is_used(table, id_):
                    raise TakenId(f"{table}: the id {id_!r} is that of another row, there or removed")
                seen.add(id_)

    def _with_ids(self, table: str, rows: Sequence[Row]) -> list[Row]:
        out: list[Row] = []
        given = {row.id for row in rows}
        for row in rows:
            if not row.id:
                row = replace(row, id=self._new_id(table, row, given))
                given.add(row.id)
            out.append(row)
        return out

    def _new_id(self, table: str, row: Row, taken: set[str]) -> str:
        """An id that no row has or had: two laptops that add the same tag get the same one."""
        if table not in KEY_FIELDS:
            return secrets.token_hex(16)
        of_row = [getattr(row, name) for name in KEY_FIELDS[table]]
        ids = (row_id(table, *of_row, salt=salt) for salt in count())
        return next(id_ for id_ in ids if id_ not in taken and not self._is_used(table, id_))

    def _with_free_ids(self, site: Site) -> Site:
        """The site with each id that is used in this file exchanged for a new one."""
        new: dict[tuple[str, str], str] = {}
        for table in TABLES:
            if self._was_ever_written(table) or self._added[table]:
                taken = {row.id for row in site.table(table)}
                for row in site.table(table):
                    if row.id and self._is_used(table, row.id):
                        new[table, row.id] = self._new_id(table, row, taken)
                        taken.add(new[table, row.id])
        return with_ids_exchanged(site, new)


def _known_table(table: str) -> None:
    if table not in TABLES:
        raise UnknownRow(f"a site has no table {table!r}; it has {', '.join(TABLES)}")
