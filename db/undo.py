"""
Undoing: a save that writes back what an earlier one replaced.

One's saves form the usual two stacks: a save can be undone, its undoing can be undone in turn (redone),
and a new save forgets what could be redone. Nothing is taken out of the journal.
"""

from __future__ import annotations

import sqlite3
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from db.digest import SaveRow
from db.journal import RowState, in_force, replaced, state
from db.lookup import changes_of, saves, writes_of
from db.schema import SCHEMA, SITE
from db.writes import Cell, Write

UNDO, REDO = "undo: ", "redo: "
"""How the ``why`` of an undoing and of a redoing begins."""


@dataclass(frozen=True, slots=True)
class Undoing:
    """What undoes a save."""

    save: str
    """The save that is undone."""
    why: str
    """What the undoing save will say."""
    what: str
    """What the save that is undone, or redone, was for."""
    rows: tuple[tuple[str, str, Mapping[str, Cell] | None], ...]
    """Table, id and what is written back: cells, or ``None`` where the row is removed."""


def undoing(connection: sqlite3.Connection, who: str, laptop: str, *, redo: bool = False) -> Undoing | None:
    """
    What would undo (or redo) one's last save; ``None`` where there is none.

    A save can be undone as long as it is the sole head of all that it wrote. What an undoing wrote back
    counts as written by the save from which it came, so that one can go on undoing.
    """
    own = saves(connection, "WHERE who = ? AND laptop = ?", (who, laptop))
    done, undone = stacks(own)
    stack = undone if redo else done
    if not stack:
        return None
    save = next(save for save in own if save.id == stack[-1])
    undoes = {s.id: s.undoes for s in saves(connection, "WHERE undoes IS NOT NULL") if s.undoes}
    shared = _rows_of_others_too(connection, save.id)
    rows: list[tuple[str, str, Mapping[str, Cell] | None]] = []
    for table, id_, _, _ in changes_of(connection, save.id):
        if (
            table != SITE and (table, id_) not in shared
        ):  # made by this save and never written again: an intake has very many
            rows.append((table, id_, None))
            continue
        back = _back(table, {write.save: write for write in writes_of(connection, table, id_)}, save.id, undoes)
        if back is None:
            return None
        if back.cells is None and table == SITE:
            return None  # the save that made the file
        rows.append((table, id_, back.cells))
    what = save.why.removeprefix(UNDO).removeprefix(REDO)
    return Undoing(save.id, (REDO if redo else UNDO) + what, what, tuple(rows))


def stacks(own: Sequence[SaveRow]) -> tuple[list[str], list[str]]:
    """
    The ids of one's saves that can be undone and redone, the next one last.

    >>> def save(id_, undoes=None):
    ...     return SaveRow(id_, 0, "", "", "", undoes)
    >>> stacks([save("a"), save("b"), save("c", undoes="b")])
    (['a'], ['c'])
    >>> stacks([save("a"), save("b"), save("c", undoes="b"), save("d", undoes="c")])
    (['a', 'd'], [])
    """
    done: list[str] = []
    undone: list[str] = []
    for save in own:
        if save.undoes is None:
            done.append(save.id)
            undone.clear()
        elif save.undoes in undone:
            undone.remove(save.undoes)
            done.append(save.id)
        else:
            if save.undoes in done:
                done.remove(save.undoes)
            undone.append(save.id)
    return done, undone


def _rows_of_others_too(connection: sqlite3.Connection, save: str) -> set[tuple[str, str]]:
    """The rows of a save that other saves wrote as well."""
    found = connection.execute(
        'SELECT DISTINCT c."table", c.row FROM changes c'
        ' JOIN changes o ON o."table" = c."table" AND o.row = c.row AND o.save <> c.save WHERE c.save = ?',
        (save,),
    )
    return set(found.fetchall())


@dataclass(frozen=True, slots=True)
class _Back:
    """What undoes one write: cells to write back, or ``None`` where the row is removed."""

    cells: Mapping[str, Cell] | None


def _back(table: str, by_save: Mapping[str, Write], save: str, undoes: Mapping[str, str]) -> _Back | None:
    """What undoes one write; ``None`` where it is not (any more) the sole head of all that it wrote."""
    write = by_save[save]
    row_state = state(by_save.values())
    if write.values is None:
        return _Back(row_state.cells) if row_state.is_removed else None
    if row_state.is_removed:
        return None
    if "position" in write.values:  # the save made the row, or brought it back
        for field, heads in row_state.heads.items():
            own = {None} | ({_author(field, write, by_save, undoes)} if field in write.values else set())
            if len(heads) > 1 or _author(field, heads[0], by_save, undoes) not in own:
                return None
        return _Back(None)
    if not all(_is_sole(field, write, row_state, by_save, undoes) for field in write.values):
        return None
    cells = {}
    for field in write.values:
        before = replaced(field, write, by_save)
        known = SCHEMA[table].field(field)
        cells[field] = in_force(field, before) if before else Cell(known.empty if known else None)
    return _Back(cells)


def _is_sole(
    field: str, write: Write, row_state: RowState, by_save: Mapping[str, Write], undoes: Mapping[str, str]
) -> bool:
    heads = row_state.heads[field]
    return len(heads) == 1 and _author(field, heads[0], by_save, undoes) == _author(field, write, by_save, undoes)


def _author(field: str, write: Write, by_save: Mapping[str, Write], undoes: Mapping[str, str]) -> str | None:
    """The save from which a value comes, through undoings; ``None`` for a field written back to nothing."""
    while (undone := undoes.get(write.save, "")) in by_save:
        before = replaced(field, by_save[undone], by_save)
        if not before:
            return None
        if len(before) > 1:
            break
        write = before[0]
    return write.save
