"""
A save as data: what a screen asks the store's thread to write.

An edit is written whole or not at all. ``why`` goes into the history and is what undoing names.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any, TypeAlias

from db.save import Save
from rules.record import Row, Typed


@dataclass(frozen=True, slots=True)
class Add:
    """A new row; an empty id asks for one."""

    table: str
    row: Row

    def write(self, save: Save) -> str:
        return save.add(self.table, self.row)


@dataclass(frozen=True, slots=True)
class Change:
    """New values of some fields of a row."""

    table: str
    id: str
    fields: dict[str, Any]
    typed: Typed = ()

    def write(self, save: Save) -> str:
        save.change(self.table, self.id, typed=self.typed, **self.fields)
        return self.id


@dataclass(frozen=True, slots=True)
class ChangeSettings:
    """New values of some settings of the site."""

    fields: dict[str, Any]
    typed: Typed = ()

    def write(self, save: Save) -> str:
        save.settings(typed=self.typed, **self.fields)
        return ""


@dataclass(frozen=True, slots=True)
class Remove:
    """The end of a row."""

    table: str
    id: str

    def write(self, save: Save) -> str:
        save.remove(self.table, self.id)
        return self.id


Step: TypeAlias = Add | Change | ChangeSettings | Remove


@dataclass(frozen=True, slots=True, eq=False)
class Edit:
    """What is written in one save. Edits are told apart by identity, so that an answer finds its question."""

    why: str
    steps: tuple[Step, ...] = field(default=())
