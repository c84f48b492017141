"""The fields of a row as texts, and texts back to values: the same reading as intake's."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import MISSING, dataclass
from dataclasses import fields as dataclass_fields
from typing import Any

from audit.intake.cell import read_cell, trimmed
from rules.columns import Column
from rules.errors import RulesError
from rules.index import Index
from rules.problems.cells import accepted
from rules.problems.settings import SETTINGS
from rules.record import TABLES, Instrument, Row, Run, Site, Typed, columns, is_missing
from rules.references import TO_BOARD, feed_text, feeds_text, read_end, read_feed, read_feeds, tags_of
from rules.text import either, nearest, nearest_choice, quoted
from rules.units import plain

SITE = "site"
"""The table of the site's own settings."""
NEWLINE = "␤"
"""Stands for a newline in a field of one line."""
_FIXED = {"runs": ("circuit_id",), "loads": ("circuit_id",)}
"""Fields that a row keeps: a run does not change its circuit."""
_METER_UNITS = {"voltage": "V", "current": "A", "resistance": "ohm", "temperature": "degC"}


class FieldRefused(Exception):
    """A text that its field does not take, with one line that says what is accepted."""


@dataclass(frozen=True, slots=True)
class Field:
    """One field of a form."""

    table: str
    name: str
    column: Column

    @property
    def label(self) -> str:
        """The column's name as words."""
        return self.column.name.replace("_", " ")


@dataclass(frozen=True, slots=True)
class FieldValue:
    """What a text means: the fields that it sets, and the text where it was not the plain number."""

    fields: dict[str, Any]
    typed: Typed = ()


def fields_of(table: str) -> tuple[Field, ...]:
    """The fields of a table in the format's order; ``site`` has the settings."""
    if table == SITE:
        return tuple(Field(SITE, name, column) for name, column in SETTINGS.values())
    fixed = _FIXED.get(table, ())
    return tuple(Field(table, name, column) for name, column in columns(table) if name not in fixed)


def row_of(site: Site, table: str, id_: str) -> Row | Site | None:
    """A row by its id, or the site itself; ``None`` for a row that is not there (any more)."""
    if table == SITE:
        return site
    return next((row for row in site.table(table) if row.id == id_), None)


def unit_of(field: Field, row: Row | Site) -> str:
    """Unit of a number's field; of a meter's it follows what the meter measures."""
    if field.column.unit != "*":
        return field.column.unit
    return _METER_UNITS.get(row.quantity, "") if isinstance(row, Instrument) else ""


def text_of(field: Field, row: Row | Site, index: Index) -> str:
    """What a field says, as it was typed; empty for not known."""
    typed = dict(row.typed).get(field.name)
    value = getattr(row, field.name)
    kind = field.column.kind
    if typed is not None:
        text = typed
    elif isinstance(row, Run) and field.name == "to_point":
        text = index.end_of(row)
    elif value is None or value in ("", ()):
        text = ""
    elif kind in ("number", "whole"):
        text = plain(value)
    elif kind == "feeds":
        text = feeds_text(value, index)
    elif kind == "reference":
        text = feed_text(value, index)
    else:
        text = str(value)
    return text.replace("\n", NEWLINE).replace("\t", " ")


def answers_for(field: Field, row: Row | Site, index: Index) -> tuple[str, ...]:
    """What a field may say, where that can be listed: choices, tags, points."""
    column = field.column
    if column.kind == "choice":
        return column.choices
    if column.kind in ("reference", "feeds"):
        return tuple(row.tag for table in column.tables for row in index.site.table(table))  # type: ignore[attr-defined]
    if column.kind == "point" and field.table in ("runs", "loads"):
        return index.points_of(row.circuit_id) if field.name != "to_point" else ()  # type: ignore[union-attr]
    return ("own", "shared:", "structure") if column.kind == "return" else ()


def completed(text: str, answers: Sequence[str]) -> str:
    """
    The answer that typed letters mean: the one that is them, or the only one that begins with them.

    >>> completed("ta", ("tape", "tdr")), completed("TDR", ("tape", "tdr")), completed("t", ("tape", "tdr"))
    ('tape', 'tdr', 't')
    """
    meant = meanings(text, answers)
    return meant[0] if len(meant) == 1 else text


def meanings(text: str, answers: Sequence[str]) -> tuple[str, ...]:
    """
    The answers that typed letters may mean: the one that is them, else all that begin with them.

    >>> meanings("t", ("marks", "tape", "tdr")), meanings("p1", ("p1", "p12")), meanings("", ("tape",))
    (('tape', 'tdr'), ('p1',), ())
    """
    folded = text.casefold()
    same = [answer for answer in answers if answer == text] or [a for a in answers if a.casefold() == folded]
    begin = [answer for answer in answers if folded and answer.casefold().startswith(folded)]
    return tuple(dict.fromkeys(same or begin))


def read_field(text: str, field: Field, row: Row | Site, index: Index) -> FieldValue:
    """
    The value that a text means in a field.

    Raises
    ------
    FieldRefused
        If it means none.
    """
    column = field.column
    text = trimmed(text.replace(NEWLINE, "\n"), column)
    if not text:
        if column.filled:
            raise FieldRefused(f"{field.label} is needed; accepted: {accepted(column, unit_of(field, row))}")
        return FieldValue(_emptied(field))
    if column.kind in ("reference", "feeds") or field.name == "to_point":
        return FieldValue(_reference(text, field, index))
    if column.kind == "choice" and text not in column.choices:
        near = nearest_choice(text, column.choices)
        hint = f", did you mean {quoted(near)}?" if near else ""
        raise FieldRefused(f"{quoted(text)} is none of {either(column.choices)}{hint}")
    unit = unit_of(field, row)
    if column.unit == "*" and not unit:
        raise FieldRefused("say first what the meter measures")
    try:
        cell = read_cell(text, column, unit)
    except RulesError as error:
        raise FieldRefused(str(error)) from None
    return FieldValue({field.name: cell.value}, ((field.name, cell.typed),) if cell.typed is not None else ())


def _emptied(field: Field) -> dict[str, Any]:
    row_type = Site if field.table == SITE else TABLES[field.table]
    default = next(f.default for f in dataclass_fields(row_type) if f.name == field.name)
    emptied = {field.name: "" if default is MISSING else default}
    return emptied | {"to_board_id": ""} if field.name == "to_point" else emptied


def _reference(text: str, field: Field, index: Index) -> dict[str, Any]:
    """The fields that a reference sets; it must name something that is there."""
    tags = tags_of(index.site)
    tables = field.column.tables
    if field.name == "to_point":
        point, board_id = read_end(text, tags)
        if is_missing(board_id):
            raise FieldRefused(_names_nothing(text, ("boards",), index))
        return {"to_point": point, "to_board_id": board_id}
    if field.column.kind == "feeds":
        feeds = read_feeds(text, tables, tags)
        if any(not feed.table for feed in feeds):
            raise FieldRefused(_names_nothing(text, tables, index))
        return {field.name: feeds}
    feed = read_feed(text, tables, tags)
    if not feed.table:
        raise FieldRefused(_names_nothing(text, tables, index))
    return {field.name: feed}


def _names_nothing(text: str, tables: Sequence[str], index: Index) -> str:
    known = [row.tag for table in tables for row in index.site.table(table)]  # type: ignore[attr-defined]
    near = nearest(text.removeprefix(TO_BOARD).strip(), known)
    hint = f", did you mean {quoted(near)}?" if near else ""
    if not known and "sources" in tables:
        hint = ": add the source first (Esc, a, source)"
    return f"{quoted(text)} names no {either([table.removesuffix('s') for table in tables])} that is there{hint}"
