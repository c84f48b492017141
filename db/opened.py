"""Whether a file is still the one that was opened: others may remove, empty or replace it meanwhile."""

from __future__ import annotations

import os
import sqlite3
from contextlib import suppress
from pathlib import Path

from db.errors import AnotherFile, NoSuchSite, NotASiteFile, SiteError


class Opened:
    """A file as it was opened; an older one that was brought up to date in memory has no more to do with the disk."""

    def __init__(self, path: Path, connection: sqlite3.Connection) -> None:
        self._path = path
        (self._first_save,) = connection.execute("SELECT id FROM saves ORDER BY stamp, id LIMIT 1").fetchone()
        """It stays, whatever is saved or brought in."""
        (file,) = connection.execute("SELECT file FROM pragma_database_list WHERE name = 'main'").fetchone()
        self._is_on_disk = bool(file)
        found = os.stat(path)
        self._file = found.st_dev, found.st_ino
        self._seen = found.st_mtime_ns, found.st_size

    def refuse_moved(self, connection: sqlite3.Connection) -> None:
        """
        Look at the name alone, before a transaction.

        Raises
        ------
        NoSuchSite, AnotherFile
            If the file no longer has its name.
        """
        if not self._is_on_disk:
            return
        found = self._look()
        if found != self._seen:
            # SQLite tells what others wrote by a counter in the file; another site may have counted as far
            connection.execute("PRAGMA shrink_memory")
            self._seen = found

    def saved(self) -> None:
        """A save of one's own is no change that another made."""
        with suppress(SiteError):
            self._seen = self._look()

    def refuse_other_content(self, connection: sqlite3.Connection) -> None:
        """
        Look at what the file holds, in the transaction that is about to read or write it.

        Raises
        ------
        NotASiteFile, AnotherFile
            If it was emptied, or another site was written over it.
        """
        try:
            found = connection.execute("SELECT 1 FROM saves WHERE id = ?", (self._first_save,)).fetchone()
        except sqlite3.OperationalError as error:
            if getattr(error, "sqlite_errorcode", None) != sqlite3.SQLITE_ERROR:
                raise
            raise NotASiteFile(self._path, "this site file was emptied while it was open") from error
        if found is None:
            raise AnotherFile(self._path, "another site was written over this file; open it again")

    def _look(self) -> tuple[int, int]:
        """When the file of this name was written last, and how large it is."""
        try:
            found = os.stat(self._path)
        except (FileNotFoundError, NotADirectoryError):
            raise NoSuchSite(self._path, "this file was removed or moved away while it was open") from None
        if (found.st_dev, found.st_ino) != self._file:
            raise AnotherFile(self._path, "another file has taken this name since it was opened; open it again")
        return found.st_mtime_ns, found.st_size
