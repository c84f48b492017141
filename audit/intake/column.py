"""One column of a table: every distinct text is read once, however many rows hold it."""

from __future__ import annotations

from collections.abc import Callable, Hashable, Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any, NamedTuple, TypeVar

from audit.intake.cell import read_cell, trimmed
from audit.intake.header import Heading, is_unit
from rules.errors import RulesError
from rules.problems.cells import accepted
from rules.record import missing
from rules.references import Tags, read_end, read_feed, read_feeds

C = TypeVar("C", bound=Hashable)


@dataclass(slots=True)
class ReadColumn:
    """What was read down one column."""

    values: list[Any]
    """For each row; where the cell is empty or wrong, what stands for not known."""
    wrong: dict[int, str] = field(default_factory=dict)
    """What is wrong with a cell, by the number of its row."""
    typed: dict[int, str] = field(default_factory=dict)
    """The text as typed, by the number of its row, where it is not the plain number in the column's unit."""


class _Read(NamedTuple):
    value: Any
    wrong: str | None = None
    typed: str | None = None


def read_column(
    heading: Heading, texts: Sequence[str], units: Sequence[str | None] | None, tags: Tags, default: Any
) -> ReadColumn:
    """
    Read the cells of one column.

    Parameters
    ----------
    heading : Heading
        Which field it is.
    texts : sequence of str
        The cells as they stand in the file.
    units : sequence of str or None, optional
        Unit of each row's value where it follows the row's quantity, ``None`` where that is not known; nothing is
        read there, because the quantity's own cell tells of it.
    tags : Tags
        What references may name.
    default : object
        What stands for an empty cell.
    """
    read_text = _reader(heading, tags, default)
    if units is None:
        own = heading.column.unit
        return _spread(texts, {text: read_text(text, own) for text in set(texts)})
    cells = list(zip(texts, units, strict=True))
    return _spread(cells, {cell: read_text(*cell) for cell in set(cells)})


def _spread(cells: Sequence[C], read: Mapping[C, _Read]) -> ReadColumn:
    """What was read of each distinct cell, put where the cell stands."""

    def where(texts: Mapping[C, str]) -> dict[int, str]:
        return {n: texts[cell] for n, cell in enumerate(cells) if cell in texts} if texts else {}

    return ReadColumn(
        list(map({cell: found.value for cell, found in read.items()}.__getitem__, cells)),
        where({cell: found.wrong for cell, found in read.items() if found.wrong is not None}),
        where({cell: found.typed for cell, found in read.items() if found.typed is not None}),
    )


def _reader(heading: Heading, tags: Tags, default: Any) -> Callable[[str, str | None], _Read]:
    """What reads one distinct text of the column."""
    column = heading.column
    refer = _references(heading, tags)

    def read(text: str, unit: str | None) -> _Read:
        text = trimmed(text, column)
        if not text:
            if not column.filled:
                return _Read(default)
            return _Read(default, f"is empty; accepted: {accepted(column, (unit or '') if column.unit == '*' else '')}")
        if refer is not None:
            return _Read(refer(text))
        if unit is None:
            return _Read(default)
        foreign = "" if not heading.unit or is_unit(heading.unit, unit) else heading.unit
        try:
            cell = read_cell(text, column, unit, foreign)
        except RulesError as error:
            return _Read(default, str(error))
        return _Read(cell.value, None, cell.typed)

    return read


def _references(heading: Heading, tags: Tags) -> Callable[[str], Any] | None:
    """How a text that names another row is read; ``None`` where the column names none."""
    name, column = heading.field, heading.column
    if name == "circuit_id":
        return lambda text: missing(text) if (found := tags.find(("circuits",), text)) is None else found.id
    if name == "replaces_id":
        return missing  # resolved once all readings are there
    if name == "to_point":
        return lambda text: read_end(text, tags)
    if column.kind == "feeds":
        return lambda text: read_feeds(text, column.tables, tags)
    if column.kind == "reference":
        return lambda text: read_feed(text, column.tables, tags)
    return None
