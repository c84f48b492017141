"""
The journal: what is in force, as a pure function of the set of saves and changes.

Two laptops that copied one site file each go on writing. Bringing them together is the union of their
saves and changes; what then stands in the tables is ``current`` of that union. It depends on the set
alone, not on the order in which its parts came together, so combining is commutative, associative and
idempotent.

- The *heads* of a field are the writes to it that no other write saw. One is the rule; several come from
  laptops that wrote without knowing of each other. If they differ, the field is in conflict: the head of
  the highest rank, the greatest (stamp, id), is in force until a later write, which saw all of them.
- A removal counts only if it saw every head of the row: what another laptop wrote meanwhile keeps the
  row. And a row stays while a living row refers to it.
"""

from __future__ import annotations

import time
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from itertools import groupby
from operator import itemgetter

from db.errors import Damaged
from db.schema import SCHEMA, Values, references
from db.writes import Cell, Write, read_saw, read_values, row_of

ChangeRow = tuple[str, str, str, str | None, str]
"""A row of ``changes``: save, table, row, values, saw."""


def next_stamp(largest: int | None) -> int:
    """
    Time of the next save: the wall clock, or one more than the largest stamp of the file.

    A hybrid logical clock: a save that knew of another always has the greater stamp, however wrong the
    laptop's clock is. [ms since 1970]
    """
    now = time.time_ns() // 1_000_000
    return now if largest is None else max(now, largest + 1)


@dataclass(frozen=True, slots=True)
class RowState:
    """What the writes of one row come to."""

    heads: Mapping[str, tuple[Write, ...]]
    """The writes in force on each field, that of the highest rank first."""
    is_removed: bool
    """Whether a removal saw all heads; the row is gone unless a living row refers to it."""

    @property
    def cells(self) -> dict[str, Cell]:
        """The value in force of each field ever written."""
        return {field: in_force(field, writes) for field, writes in self.heads.items()}

    @property
    def conflicts(self) -> tuple[str, ...]:
        """Fields that laptops gave different values without knowing of each other."""
        return tuple(f for f, writes in self.heads.items() if len({written(f, w).value for w in writes}) > 1)

    @property
    def head_saves(self) -> tuple[str, ...]:
        """Every save that is in force on some field."""
        return tuple(sorted({write.save for writes in self.heads.values() for write in writes}))


def written(field: str, write: Write) -> Cell:
    """What a write that is no removal gave a field."""
    assert write.values is not None
    return write.values[field]


def in_force(field: str, writes: Iterable[Write]) -> Cell:
    """The value of a field with these heads."""
    return written(field, max(writes, key=lambda write: write.rank))


def state(writes: Iterable[Write]) -> RowState:
    """What the writes of one row come to, in whatever order they are given."""
    all_writes = sorted(writes, key=lambda write: write.rank, reverse=True)
    heads: dict[str, tuple[Write, ...]] = {}
    for field in dict.fromkeys(name for write in all_writes for name in write.values or ()):
        of_field = [write for write in all_writes if write.values is not None and field in write.values]
        seen = {save for write in of_field for save in write.seen(field)}
        heads[field] = tuple(write for write in of_field if write.save not in seen)
    is_removed = any(
        write.values is None
        and all(head.save in write.seen(field) for field, of_field in heads.items() for head in of_field)
        for write in all_writes
    )
    return RowState(heads, is_removed)


def replaced(field: str, write: Write, by_save: Mapping[str, Write]) -> tuple[Write, ...]:
    """
    The writes that were in force on a field when another was made: what it replaced.

    Parameters
    ----------
    field
        The field, written by ``write`` or by the removal that ``write`` is.
    write
        One write of a row.
    by_save
        All writes of that row by their save's id.
    """
    seen = [save for save in write.seen(field) if _wrote(field, by_save.get(save))]
    # A removal names the saves in force on any field: on this one, some may have replaced others.
    superseded: set[str] = set()
    waiting = [save for earlier in seen for save in by_save[earlier].seen(field)]
    while waiting:
        save = waiting.pop()
        if save in by_save and save not in superseded:
            superseded.add(save)
            waiting += by_save[save].seen(field)
    return tuple(by_save[save] for save in seen if save not in superseded)


def _wrote(field: str, write: Write | None) -> bool:
    return write is not None and write.values is not None and field in write.values


def current(stamps: Mapping[str, int], changes: Iterable[ChangeRow]) -> dict[str, dict[str, Values]]:
    """
    The tables that a journal comes to.

    Parameters
    ----------
    stamps
        Stamp of each save by its id.
    changes
        Rows of ``changes``, in any order.

    Returns
    -------
    dict
        For each table its living rows by id, as they stand in columns.

    Raises
    ------
    Damaged
        If a change belongs to no save, or a row of the journal was never written.
    """
    living: dict[str, dict[str, Values]] = {table: {} for table in SCHEMA}
    removed: dict[tuple[str, str], Values] = {}
    for (table, id_), of_row in groupby(sorted(changes, key=itemgetter(1, 2)), key=itemgetter(1, 2)):
        if table not in SCHEMA:
            raise Damaged(f"the journal names the table {table!r}")
        found = list(of_row)
        if len(found) == 1 and found[0][0] in stamps and found[0][3] is not None:  # almost every row: written once
            living[table][id_] = row_of(table, id_, read_values(table, found[0][3]))
            continue
        row_state = state(read_write(stamps, change) for change in found)
        if not row_state.heads:
            raise Damaged(f"the journal removes {table} {id_}, which was never written")
        row = row_of(table, id_, row_state.cells)
        if row_state.is_removed:
            removed[table, id_] = row
        else:
            living[table][id_] = row
    _keep_referred(living, removed)
    return living


def read_write(stamps: Mapping[str, int], change: ChangeRow) -> Write:
    """A row of ``changes`` as a write."""
    save, table, _, values, saw = change
    if save not in stamps:
        raise Damaged(f"a change belongs to the save {save}, which is not there")
    return Write(save, stamps[save], None if values is None else read_values(table, values), read_saw(saw))


def _keep_referred(living: dict[str, dict[str, Values]], removed: dict[tuple[str, str], Values]) -> None:
    """Move removed rows that living rows refer to, straight or through others, back to the living."""
    if not removed:
        return
    referred = {ref for table, rows in living.items() for row in rows.values() for ref in references(table, row)}
    waiting = [ref for ref in referred if ref in removed]
    while waiting:
        ref = waiting.pop()
        row = removed.pop(ref, None)
        if row is not None:
            living[ref[0]][ref[1]] = row
            waiting += references(ref[0], row)
