"""The transaction of a save: the only place that opens one to write."""

from __future__ import annotations

import secrets
import sqlite3
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from pathlib import Path

from sqlite_utils import Database

from db.digest import SaveRow
from db.errors import InvalidValue, translated
from db.journal import next_stamp
from db.opened import Opened
from db.rows import is_text
from db.save import Save


@contextmanager
def saving(path: Path, db: Database, who: str, laptop: str, why: str, opened: Opened | None = None) -> Iterator[Save]:
    """Collect a save, then write it, all or nothing; ``opened`` is the file that it must still be, unless it is new."""
    with writing(path, db, opened) as connection:
        save = Save(path, connection, new_save(path, connection, who, laptop, why))
        yield save
        save.finish()


@contextmanager
def writing(path: Path, db: Database, opened: Opened | None) -> Iterator[sqlite3.Connection]:
    """
    Hold the write lock from the first look to the last write.

    ``atomic()`` alone begins as a reader: of two programs that read and then write, one would fail at once,
    whatever the busy timeout.
    """
    with translated(path):
        if opened is not None:
            opened.refuse_moved(db.conn)
        db.conn.execute("BEGIN IMMEDIATE")
    try:
        if opened is not None:
            with translated(path):
                opened.refuse_other_content(db.conn)
        with db.atomic():
            # Rows may come in any order; what holds is asked at the end.
            db.conn.execute("PRAGMA defer_foreign_keys = ON")
            yield db.conn
        with translated(path):
            db.conn.execute("COMMIT")
        if opened is not None:
            opened.saved()
    except BaseException:
        with suppress(sqlite3.Error):  # a full disk has rolled back already
            db.rollback()
        raise


def new_save(
    path: Path, connection: sqlite3.Connection, who: str, laptop: str, why: str, undoes: str | None = None
) -> SaveRow:
    """The row of a save that begins now."""
    for name, text in (("who", who), ("laptop", laptop), ("why", why)):
        if not is_text(text):
            raise InvalidValue(f"{name} takes text that can be written as UTF-8, not {text!r:.80}")
    with translated(path):
        largest = connection.execute("SELECT max(stamp) FROM saves").fetchone()[0]
    return SaveRow(secrets.token_hex(16), next_stamp(largest), who, laptop, why, undoes)
