"""Opening a site file: what it must be, how SQLite is set, and how a new one comes to be whole or not at all."""

from __future__ import annotations

import os
import secrets
import sqlite3
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from pathlib import Path

from sqlite_utils import Database

from db.errors import BadFileName, NewerSiteFile, NoSuchSite, NotASiteFile, SiteExists, SiteReadOnly, one_line
from db.migrations import APPLICATION_ID, expected, migrate, newest, schema_of

SUFFIX = ".ohmwalk"
"""What a site file's name ends in."""

BUSY_TIMEOUT_S = 5.0
"""How long to wait for another program that is saving. [s]"""

SYNCHRONOUS = "EXTRA"
"""A save is on disk when it ends; EXTRA waits for the removal of its journal too, which is what ends it."""

_MAGIC = b"SQLite format 3\x00"


def open_site(path: Path, *, read_only: bool) -> Database:
    """
    Open a site file, brought up to date; an older one that is only read is brought up to date in memory.

    Raises
    ------
    FileFault
        If there is no such file, it is no site file or a newer one, or it may not be written.
    """
    _look_at(path, read_only=read_only)
    # mode=rw even to read: a save that was cut off is rolled back by whoever opens the file next.
    # SQLite itself falls back to reading where it may not write; it never makes the file.
    with _refused_by_sqlite(path):
        db = _connect(f"{path.absolute().as_uri()}?mode=rw")
    try:
        with _refused_by_sqlite(path):
            version = _recognise(path, db)
        if version < newest():
            db = _brought_up_to_date(db, read_only=read_only)
        if read_only:
            db.conn.execute("PRAGMA query_only = ON")
        else:
            # Not WAL: a plain copy of the one file, made between two saves, is complete.
            db.conn.execute("PRAGMA journal_mode = DELETE")
            db.conn.execute(f"PRAGMA synchronous = {SYNCHRONOUS}")
        # After the migrations: with it on, a table that others refer to cannot be rebuilt.
        db.conn.execute("PRAGMA foreign_keys = ON")
    except BaseException:
        db.close()
        raise
    return db


def new_site(path: Path) -> Database:
    """An empty site file at a path that no one else knows: quick, because a half-made one is thrown away."""
    db = _connect(f"{path.absolute().as_uri()}?mode=rwc")
    try:
        db.conn.execute("PRAGMA journal_mode = MEMORY")
        db.conn.execute("PRAGMA synchronous = OFF")
        migrate(db)
        db.conn.execute("PRAGMA foreign_keys = ON")
    except BaseException:
        db.close()
        raise
    return db


@contextmanager
def made_whole(target: Path, *, overwrite: bool = False) -> Iterator[Path]:
    """
    Give a path beside ``target`` to write to, which takes the target's name once it is whole and on disk.

    Raises
    ------
    FileFault
        If the name does not end in ``.ohmwalk``, something of that name is there already, or its folder is not.
    """
    if target.suffix != SUFFIX:
        raise BadFileName(target, f"the name of a site file ends in {SUFFIX}")
    if not target.absolute().parent.is_dir():
        raise NoSuchSite(target, "there is no such folder")
    if target.is_dir() or (target.exists() and not overwrite):
        raise SiteExists(target, "there is already something of that name; nothing is overwritten")
    part = target.with_name(f".{secrets.token_hex(8)}.part")
    try:
        yield part
        _sync(part, os.O_RDWR)
        if overwrite:
            os.replace(part, target)
        else:
            _rename_new(part, target)
        if os.name == "posix":
            _sync(target.parent)
    finally:
        with suppress(FileNotFoundError):
            part.unlink()


def _rename_new(part: Path, target: Path) -> None:
    """Rename without overwriting what someone else may have made meanwhile."""
    try:
        os.link(part, target)
    except FileExistsError:
        raise SiteExists(target, "there is already something of that name; nothing is overwritten") from None
    except OSError:  # no hard links here (FAT on a stick): a moment's gap is the best there is
        os.rename(part, target)


def _sync(path: Path, how: int = os.O_RDONLY) -> None:
    descriptor = os.open(path, how)
    try:
        os.fsync(descriptor)
    finally:
        os.close(descriptor)


def _look_at(path: Path, *, read_only: bool) -> None:
    """Refuse what SQLite would take for an empty database, or report in words of its own."""
    if path.is_dir():
        raise NotASiteFile(path, "not a site file (a folder)")
    if not path.exists():
        raise NoSuchSite(path, "there is no such file")
    with path.open("rb") as file:
        start = file.read(len(_MAGIC))
    if start != _MAGIC:
        raise NotASiteFile(path, "not a site file (empty)" if not start else "not a site file (no SQLite database)")
    # The journal of a save stands beside the file, so the folder must be writable too.
    if not read_only and not all(_may_write(place) for place in (path, path.absolute().parent)):
        raise SiteReadOnly(path, "this file or its folder may not be written")


def _may_write(path: Path) -> bool:
    return os.access(path, os.W_OK, effective_ids=os.access in os.supports_effective_ids)


@contextmanager
def _refused_by_sqlite(path: Path) -> Iterator[None]:
    """These statements are always the same: the generic error (a format that SQLite does not know) is the file's."""
    try:
        yield
    except sqlite3.OperationalError as error:
        if getattr(error, "sqlite_errorcode", None) != sqlite3.SQLITE_ERROR:
            raise
        raise NotASiteFile(path, f"this site file is damaged ({one_line(error)})") from error


def _connect(uri: str) -> Database:
    connection = sqlite3.connect(uri, uri=True, timeout=BUSY_TIMEOUT_S, isolation_level=None)
    try:
        connection.execute("PRAGMA trusted_schema = OFF")
        connection.execute("PRAGMA cell_size_check = ON")
        connection.execute("PRAGMA cache_size = -65536")  # KiB: an intake's indexes fit in memory
    except BaseException:
        connection.close()
        raise
    return Database(connection, recursive_triggers=False, execute_plugins=False)


def _recognise(path: Path, db: Database) -> int:
    """The file's version, once it is known to be a site file of this program or an older one."""
    application: int = db.conn.execute("PRAGMA application_id").fetchone()[0]
    if application != APPLICATION_ID:
        raise NotASiteFile(path, "not a site file (another program's database)")
    version: int = db.conn.execute("PRAGMA user_version").fetchone()[0]
    if version > newest():
        raise NewerSiteFile(path, "this site file was written by a newer version of this program")
    if version < 1:
        raise NotASiteFile(path, "this site file is damaged (it has no version)")
    wanted, found = expected(version), schema_of(db.conn)
    for name in wanted.keys() | found.keys():
        if wanted.get(name) != found.get(name):
            raise NotASiteFile(
                path, f"this site file is damaged or was altered (its {one_line(name)} is not as it was made)"
            )
    return version


def _brought_up_to_date(db: Database, *, read_only: bool) -> Database:
    if read_only:
        memory = _connect("file::memory:")
        db.conn.backup(memory.conn)
        db.close()
        db = memory
    migrate(db)
    return db
