"""
What one save wrote into one row, and how the journal keeps it.

``changes.values`` is a JSON object from field to value as it stands in its column, lists as JSON. A
value that a person typed otherwise than as the plain number comes with the text, as
``{"value": 13.716, "typed": "45 ft"}``: text and value are one write, so that two laptops that change two
fields of a row at once leave each text with its own value. In a row's first write, fields of which
nothing is known are left out. ``values`` is NULL where the save removed the row.

``changes.saw`` maps a field to the ids of the saves in force when it was written; a field without any is
left out, and ``*`` stands for every field where the whole row was written (its removal or return).
"""

from __future__ import annotations

import json
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from functools import cache
from itertools import repeat
from json.encoder import encode_basestring as quoted
from typing import Any, NamedTuple

from db.errors import Damaged
from db.rows import to_json
from db.schema import SCHEMA, Field, Values

EVERY_FIELD = "*"
"""In ``saw``: each field that is not named."""

POSITION = Field("position", "whole", nullable=False)
"""Where a row stands in its table is journalled like a field."""


class Cell(NamedTuple):
    """The value of one field as its column holds it, with the text that was typed for it."""

    value: Any
    typed: str | None = None


@dataclass(frozen=True, slots=True)
class Write:
    """What one save wrote into one row."""

    save: str
    stamp: int
    """The save's time. [ms since 1970, hybrid logical clock]"""
    values: Mapping[str, Cell] | None
    """New value of each field written; ``None``: the row was removed."""
    saw: Mapping[str, tuple[str, ...]]

    @property
    def rank(self) -> tuple[int, str]:
        """Of two writes in force at once, the one of higher rank counts."""
        return self.stamp, self.save

    def seen(self, field: str) -> tuple[str, ...]:
        """The saves in force on a field when this was written."""
        found = self.saw.get(field)
        return self.saw.get(EVERY_FIELD, ()) if found is None else found


def fields_of(table: str) -> tuple[Field, ...]:
    """What the journal keeps of a row: its position and its fields, in the order of the columns."""
    return _fields_of(table)


@cache
def _fields_of(table: str) -> tuple[Field, ...]:
    return (POSITION, *SCHEMA[table].fields)


def cells_of(table: str, row: Values) -> dict[str, Cell]:
    """A row of a table as cells, those of which nothing is known left out."""
    typed = dict(json.loads(row[-1])) if row[-1] != "[]" else {}
    return {
        field.name: Cell(value, typed.get(field.name))
        for field, value in zip(fields_of(table), row[1:-1], strict=True)
        if value != field.empty or field.name in typed
    }


def row_of(table: str, id_: str, cells: Mapping[str, Cell]) -> Values:
    """The row of a table that cells make; a field without a cell is empty."""
    schema = SCHEMA[table]
    row = list(schema.empty)
    row[0] = id_
    for name, cell in cells.items():
        row[schema.place(name)] = cell.value
    typed = sorted((name, cell.typed) for name, cell in cells.items() if cell.typed is not None)
    row[-1] = to_json(typed) if typed else "[]"
    return tuple(row)


# --- the JSON of changes.values and changes.saw


def first_writes(table: str, rows: Sequence[Values]) -> list[str]:
    """``changes.values`` of new rows; worked down the columns, as in ``db.rows``."""
    if not rows:
        return []
    columns = list(zip(*rows, strict=True))
    pieces = [_pieces(field, values) for field, values in zip(fields_of(table), columns[1:-1], strict=True)]
    for n, typed in enumerate(columns[-1]):
        if typed != "[]":
            for name, text in json.loads(typed):
                place = SCHEMA[table].place(name)
                field = fields_of(table)[place - 1]
                pieces[place - 1][n] = f',"{name}":{_cell_json(field, Cell(columns[place][n], text))}'
    written = [column for column in pieces if any(column)]
    # The position comes first and is always there: its comma becomes the opening brace.
    return ["{" + text[1:] for text in map("".join, zip(*written, repeat("}"), strict=False))]


def _pieces(field: Field, values: tuple[Any, ...]) -> list[str]:
    known = {value: f',"{field.name}":{_json(field, value)}' for value in set(values)}
    if field.empty in known:
        known[field.empty] = ""
    return list(map(known.__getitem__, values))


def values_text(table: str, cells: Mapping[str, Cell]) -> str:
    """``changes.values`` of a row that was there before."""
    pieces = (f'"{f.name}":{_cell_json(f, cells[f.name])}' for f in fields_of(table) if f.name in cells)
    return "{" + ",".join(pieces) + "}"


def saw_text(saw: Mapping[str, Iterable[str]]) -> str:
    """``changes.saw``; a field on which nothing was in force is left out."""
    return to_json({field: sorted(ids) for field, ids in saw.items() if ids})


def _cell_json(field: Field, cell: Cell) -> str:
    plain = _json(field, cell.value)
    return plain if cell.typed is None else f'{{"value":{plain},"typed":{quoted(cell.typed)}}}'


def _json(field: Field, value: Any) -> str:
    if value is None:
        return "null"
    if field.kind in ("number", "whole"):
        return repr(value)
    text: str = value if field.is_json else quoted(value)
    return text


def read_values(table: str, text: str) -> dict[str, Cell]:
    """
    What ``first_writes`` and ``values_text`` wrote.

    Raises
    ------
    Damaged
        If it is no such JSON, or names a field that the table has not.
    """
    schema = SCHEMA[table]
    try:
        cells = {name: _cell(value) for name, value in json.loads(text).items()}
    except (ValueError, AttributeError, KeyError) as error:
        raise Damaged(f"the journal of {table} cannot be read: {error}") from error
    for name in cells:
        if name != "position" and schema.field(name) is None:
            raise Damaged(f"the journal names {table}.{name}, which is no field")
    return cells


def _cell(value: Any) -> Cell:
    return Cell(_plain(value["value"]), value["typed"]) if isinstance(value, dict) else Cell(_plain(value))


def _plain(value: Any) -> Any:
    return to_json(value) if isinstance(value, list) else value


def read_saw(text: str) -> dict[str, tuple[str, ...]]:
    """What ``saw_text`` wrote; ``Damaged`` as ``read_values``."""
    try:
        return {field: tuple(ids) for field, ids in json.loads(text).items()} if text != "{}" else {}
    except (ValueError, AttributeError, TypeError) as error:
        raise Damaged(f"the journal cannot be read: {error}") from error
