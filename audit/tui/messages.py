"""What the store's thread and the judge's thread tell the program, in the past tense."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

from textual.message import Message

from audit.tui.edits import Edit
from rules.assessment import Assessment, CircuitResult
from rules.index import Index
from rules.record import Site

if TYPE_CHECKING:  # it brings numpy, and the first screen does not wait for that
    from rules.context import Context


@dataclass
class Outlined(Message):
    """What the walk shows was read, without runs, loads and readings: these follow with ``Loaded``."""

    site: Site
    index: Index
    read_only: bool


@dataclass
class Loaded(Message):
    """The record was read from the file: at the start, after a save, and when someone else saved."""

    site: Site
    index: Index
    read: Mapping[str, frozenset[str]]
    """By visit: ids of the circuits on which something was read."""
    read_only: bool


@dataclass
class Saved(Message):
    """An edit is in the file."""

    edit: Edit
    ids: tuple[str, ...]
    """Of the rows written, in the order of the edit's steps."""


@dataclass
class Refused(Message):
    """An edit was not saved; the file is as it was."""

    edit: Edit
    line: str


@dataclass
class Undone(Message):
    """One's last save was written back, or done again."""

    what: str | None
    """What that save was for; ``None`` where there was nothing to undo."""
    again: bool
    """It was done again."""


@dataclass
class Troubled(Message):
    """Something outside the program went wrong that no edit asked for."""

    line: str


@dataclass
class Judged(Message):
    """Some circuits of a record were judged."""

    site: Site
    context: Context
    results: Mapping[str, CircuitResult]


@dataclass
class Assessed(Message):
    """All of a record was judged."""

    site: Site
    context: Context
    assessment: Assessment


@dataclass
class Unjudged(Message):
    """A record cannot be judged: its limits profile is not known, or is wrong."""

    site: Site
    line: str


@dataclass
class Crashed(Message):
    """A thread met a fault of the program."""

    error: BaseException
