"""
The errors of ``db``; the text of each is one line, fit for a user.

SiteError                  base; ``exit_status`` is what a command ends with
├── FileFault              the file, not the record; the text begins with its path
│   ├── NotASiteFile       no SQLite file, another program's, or damaged
│   ├── NewerSiteFile      written by a newer program
│   ├── NoSuchSite         there is no file of that name (any more)
│   ├── AnotherFile        no longer the file that was opened
│   ├── SiteExists         something of that name is there already
│   ├── BadFileName        does not end in ``.ohmwalk``
│   ├── SiteReadOnly       may be read but not written
│   ├── SiteLocked         another program was saving for five seconds on end
│   ├── NoSpace            the disk is full, or a limit on file sizes is reached
│   └── DiskFault          the disk refuses to read or write
└── RefusedSave            the record would no longer hold together; nothing was saved
    ├── InvalidValue       a value that a field cannot hold (not finite, of another type, no text)
    ├── UnknownRow         a change to a row, table or field that is not there
    ├── TakenId            an id that a row of this file has or had
    ├── DuplicateTag       two rows of one tag
    ├── DanglingReference  a reference to a row that is not there
    └── StillReferred      the removal of a row that other rows refer to
"""

from __future__ import annotations

import os
import sqlite3
from collections.abc import Iterator
from contextlib import contextmanager
from json import JSONDecodeError
from pathlib import Path


class SiteError(Exception):
    """Base of all errors that ``db`` raises on purpose."""

    exit_status = 2


class FileFault(SiteError):
    """Something is wrong with the file: ``path: what``."""

    def __init__(self, path: Path, what: str) -> None:
        super().__init__(f"{shown(path)}: {what}")
        self.path = path


class NotASiteFile(FileFault):
    """No SQLite file, another program's, or damaged."""

    exit_status = 3


class NewerSiteFile(FileFault):
    """Written by a newer program."""

    exit_status = 3


class NoSuchSite(FileFault):
    """There is no file of that name."""


class AnotherFile(FileFault):
    """Another file, or another site, stands where the one was that was opened; nothing was saved in it."""


class SiteExists(FileFault):
    """Something of that name is there already, and nothing is overwritten unasked."""


class BadFileName(FileFault):
    """The name does not end in ``.ohmwalk``."""


class SiteReadOnly(FileFault):
    """The file may be read but not written."""


class SiteLocked(FileFault):
    """Another program was saving for five seconds on end."""


class NoSpace(FileFault):
    """The disk is full, or a limit on file sizes is reached; nothing was saved."""


class DiskFault(FileFault):
    """The disk refuses to read or write."""


class RefusedSave(SiteError):
    """The record would no longer hold together; nothing was saved."""


class InvalidValue(RefusedSave):
    """A value that a field cannot hold."""


class UnknownRow(RefusedSave):
    """A change to a row, table or field that is not there."""


class TakenId(RefusedSave):
    """An id that a row of this file has, or had before it was removed."""


class DuplicateTag(RefusedSave):
    """Two rows of one tag."""


class DanglingReference(RefusedSave):
    """A reference to a row that is not there."""


class StillReferred(RefusedSave):
    """The removal of a row that other rows refer to."""


class Damaged(Exception):
    """What was read cannot have been written by this program; leaves ``db`` as ``NotASiteFile``."""


def shown(path: Path) -> str:
    """A path for one line of text: control codes and undecodable bytes are escaped."""
    text = str(path)
    return text if text.isprintable() else repr(text)[1:-1]


def one_line(text: object) -> str:
    """Text that SQLite or a damaged file gave, fit for one line: a schema in it may run over many."""
    line = " ".join(str(text).split())
    line = "".join(letter if letter.isprintable() else "\N{REPLACEMENT CHARACTER}" for letter in line)
    return line if len(line) <= _LONGEST else line[:_LONGEST] + "…"


_LONGEST = 200
"""Letters of a text from outside that an error quotes."""

_LOCKED = {sqlite3.SQLITE_BUSY, sqlite3.SQLITE_LOCKED}
_READ_ONLY = {sqlite3.SQLITE_READONLY, sqlite3.SQLITE_PERM, sqlite3.SQLITE_CANTOPEN, sqlite3.SQLITE_AUTH}
_NO_SPACE = {sqlite3.SQLITE_FULL, sqlite3.SQLITE_IOERR_WRITE, sqlite3.SQLITE_IOERR_TRUNCATE}
# SQLITE_IOERR_WRITE is what a limit on file sizes gives (EFBIG); a full disk gives SQLITE_FULL.


@contextmanager
def translated(path: Path) -> Iterator[None]:
    """Let errors of SQLite and of the disk leave as errors of ``db`` about the file at ``path``."""
    try:
        yield
    except sqlite3.ProgrammingError:
        raise  # a fault of the program, such as a store used in another thread
    except sqlite3.Error as error:
        raise _fault(path, error) from error
    except (Damaged, JSONDecodeError, UnicodeDecodeError) as error:
        raise NotASiteFile(path, f"this site file is damaged ({one_line(error)})") from error
    except OSError as error:
        kind = SiteReadOnly if isinstance(error, PermissionError) else DiskFault
        raise kind(path, os.strerror(error.errno) if error.errno else str(error)) from error


def _fault(path: Path, error: sqlite3.Error) -> Exception:
    """The error of ``db`` for one of SQLite; one that is a fault of this program stays as it is."""
    # The module's own errors (text that is not UTF-8) carry no code.
    code: int = getattr(error, "sqlite_errorcode", sqlite3.SQLITE_CORRUPT)
    codes = {code, code & 0xFF}  # the extended code and the primary one
    if codes & _LOCKED:
        return SiteLocked(path, "another program has been saving in this file for five seconds; try again")
    if codes & _NO_SPACE:
        return NoSpace(path, "no space left to save in (the disk is full, or files may not grow so large)")
    if code == sqlite3.SQLITE_READONLY_DBMOVED:
        return AnotherFile(path, "this file was moved or replaced while it was open; open it again")
    if codes & _READ_ONLY:
        return SiteReadOnly(path, f"this file or its folder may not be written ({one_line(error)})")
    if sqlite3.SQLITE_IOERR in codes:
        return DiskFault(path, f"the disk refuses to read or write ({one_line(error)})")
    if sqlite3.SQLITE_NOTADB in codes:
        return NotASiteFile(path, f"not a site file ({one_line(error)})")
    if sqlite3.SQLITE_CORRUPT in codes:
        return NotASiteFile(path, f"this site file is damaged ({one_line(error)})")
    return error
