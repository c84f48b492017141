"""
The site file, as the rest of the program sees it: the record in, the record out.

Rows, SQL and the errors of ``sqlite3`` stay behind ``SiteStore``. A store belongs to the thread that
opened it.
"""

from __future__ import annotations

import sqlite3
from collections.abc import Collection, Iterator
from contextlib import closing, contextmanager, suppress
from pathlib import Path
from types import TracebackType
from typing import Any

from db.connection import made_whole, new_site, open_site
from db.errors import Damaged, NotASiteFile, SiteReadOnly, translated
from db.history import Entry, history
from db.lookup import find, select
from db.opened import Opened
from db.rows import from_columns, settings_from_columns
from db.save import Save
from db.saving import new_save, saving, writing
from db.schema import SITE
from db.tables import no_collection
from db.undo import undoing
from db.verify import problems, refuse_torn
from rules.record import TABLES, Row, Site


class SiteStore:
    """An open site file. Use it as a context manager, or ``close`` it."""

    path: Path
    """The file."""
    laptop: str
    """Id of the laptop in whose name saves are made."""
    read_only: bool
    """Whether saving is refused."""

    def __init__(self, path: Path | str, *, read_only: bool = False, laptop: str = "") -> None:
        """
        Open a site file.

        Parameters
        ----------
        path
            The file; it is not made.
        read_only
            Only read. An older file is then brought up to date in memory, its bytes are left alone, and
            what others save meanwhile is not seen.
        laptop
            Random id of this laptop; its saves bear it, and only they can be undone.

        Raises
        ------
        FileFault
            If there is no such file, it is no site file, is damaged or newer, or may not be written.
        """
        self.path = Path(path)
        self.laptop = laptop
        self.read_only = read_only
        self._own_saves = 0
        with translated(self.path):
            self._db = open_site(self.path, read_only=read_only)
            try:
                connection = self._db.conn
                with _one_state(connection):
                    refuse_torn(connection)
                    self._opened = Opened(self.path, connection)
            except BaseException:
                self._db.close()
                raise

    @classmethod
    def create(cls, path: Path | str, site: Site | None, who: str, laptop: str, why: str) -> SiteStore:
        """
        Make a site file, whole or not at all, and open it.

        Parameters
        ----------
        path
            Where nothing is yet; the name ends in ``.ohmwalk``.
        site
            What it holds from the start; ``None``: a site without rows, named like the file.
        who, laptop, why
            Of its first save.

        Raises
        ------
        FileFault
            If the name is taken or has another ending, or it cannot be written there.
        RefusedSave
            If the site does not hold together.
        """
        path = Path(path)
        with (
            translated(path),
            made_whole(path) as part,
            closing(new_site(part)) as db,
            saving(path, db, who, laptop, why) as save,
        ):
            save.put(site or Site(name=path.stem))
        return cls(path, laptop=laptop)

    def close(self) -> None:
        """Close the file; a store that is closed is of no more use."""
        self._db.close()

    def __enter__(self) -> SiteStore:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.close()

    # --- reading

    def site(self, tables: Collection[str] = tuple(TABLES)) -> Site:
        """The record, its rows in their order; whole, equal to what was saved, unless only some tables are asked for."""
        with translated(self.path), no_collection():
            with self._reading() as connection:
                # Everything is fetched first: while this reads, no one else can finish a save.
                settings = connection.execute(select(SITE)).fetchone()
                found = {table: connection.execute(select(table)).fetchall() for table in tables}
            if settings is None:
                raise Damaged("it has no settings")
            rows: dict[str, Any] = {}
            for table in tables:
                rows[table] = tuple(from_columns(table, found.pop(table)))
            return Site(**settings_from_columns(settings), **rows)

    def rows(self, table: str, ids: Collection[str]) -> tuple[Row, ...]:
        """Some rows of a table, in their order; those that are not there are left out."""
        with translated(self.path):
            with self._reading() as connection:
                found = [row for id_ in ids if (row := find(connection, table, id_)) is not None]
            return tuple(from_columns(table, found))

    @property
    def version(self) -> tuple[int, int]:
        """
        Changes whenever anyone saved; cheap enough to ask several times a second.

        Only versions that one store gave can be compared.
        """
        with translated(self.path):
            self._opened.refuse_moved(self._db.conn)
            others: int = self._db.conn.execute("PRAGMA data_version").fetchone()[0]
        return others, self._own_saves

    def history(self, circuit: str | None = None, most: int = 1_000) -> tuple[Entry, ...]:
        """
        Saves with their changes and what was there before, the earliest first.

        Parameters
        ----------
        circuit
            Tag that a circuit has or had: only what was done to it, its runs, loads and readings.
        most
            How many changes of one save are listed; its ``count`` says how many there are.
        """
        with translated(self.path), self._reading() as connection:
            return history(connection, circuit, most)

    def verify(self) -> tuple[str, ...]:
        """Everything that is wrong with the file, in words; empty where it is whole."""
        try:
            with translated(self.path), no_collection(), self._reading() as connection:
                return problems(connection)
        except NotASiteFile as error:
            return (str(error),)

    def backup(self, target: Path | str, *, overwrite: bool = False) -> None:
        """
        Copy the file, safe at any moment, whole or not at all.

        Raises
        ------
        FileFault
            If ``target`` is there already, or cannot be written.
        """
        target = Path(target)
        with (
            translated(target),
            made_whole(target, overwrite=overwrite) as part,
            closing(sqlite3.connect(part)) as copy,
        ):
            self._opened.refuse_other_content(self._db.conn)
            self._db.conn.backup(copy)

    # --- writing

    @contextmanager
    def save(self, who: str, why: str) -> Iterator[Save]:
        """
        Save, all or nothing: the only way to write.

        Nothing is written before the end of the ``with``; an error within it leaves the file as it was,
        and a save that changes nothing leaves no trace.

        Parameters
        ----------
        who
            The person who saves.
        why
            What for, in a few words for the history.

        Raises
        ------
        SiteReadOnly, SiteLocked, NoSpace, DiskFault
            If it cannot be written.
        RefusedSave
            If the record would no longer hold together.
        """
        self._refuse_read_only()
        with saving(self.path, self._db, who, self.laptop, why, self._opened) as save:
            yield save
        self._own_saves += save.is_written

    def undoable(self, who: str) -> str | None:
        """What undoing one's last save would undo (its ``why``); ``None`` where it cannot be undone."""
        return self._would(who, redo=False)

    def redoable(self, who: str) -> str | None:
        """What redoing would do again; ``None`` where nothing was undone last."""
        return self._would(who, redo=True)

    def undo(self, who: str) -> str | None:
        """
        Write back what one's last save (of this laptop) replaced.

        Returns
        -------
        str or None
            What was undone: the ``why`` of that save. ``None`` where there is nothing to undo, or where
            something that it wrote has been written again since.

        Raises
        ------
        StillReferred
            If others refer to a row that it added.
        """
        return self._undo(who, redo=False)

    def redo(self, who: str) -> str | None:
        """Undo one's last undoing; as ``undo``."""
        return self._undo(who, redo=True)

    def _would(self, who: str, *, redo: bool) -> str | None:
        with translated(self.path), self._reading() as connection:
            found = undoing(connection, who, self.laptop, redo=redo)
        return found.what if found else None

    def _undo(self, who: str, *, redo: bool) -> str | None:
        self._refuse_read_only()
        with writing(self.path, self._db, self._opened) as connection:
            with translated(self.path):
                found = undoing(connection, who, self.laptop, redo=redo)
            if found is None:
                return None
            row = new_save(self.path, connection, who, self.laptop, found.why, undoes=found.save)
            save = Save(self.path, connection, row)
            for table, id_, cells in found.rows:
                save.write_back(table, id_, cells)
            save.finish()
        self._own_saves += save.is_written
        return found.what

    def _refuse_read_only(self) -> None:
        if self.read_only:
            raise SiteReadOnly(self.path, "this file was opened for reading only")

    @contextmanager
    def _reading(self) -> Iterator[sqlite3.Connection]:
        """One state of the file, whatever others save meanwhile."""
        connection = self._db.conn
        if connection.in_transaction:  # within a save: the state that the save began with
            yield connection
            return
        self._opened.refuse_moved(connection)
        with _one_state(connection):
            self._opened.refuse_other_content(connection)
            yield connection


@contextmanager
def _one_state(connection: sqlite3.Connection) -> Iterator[None]:
    connection.execute("BEGIN")
    try:
        yield
    finally:
        with suppress(sqlite3.Error):
            connection.execute("ROLLBACK")
