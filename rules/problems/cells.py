"""Cells that cannot be, each looked at by itself: empty, too long, out of bounds, not among the choices."""

from __future__ import annotations

import math
import re
from collections.abc import Callable, Iterator
from datetime import date, datetime
from operator import attrgetter
from typing import Any, TypeAlias

from rules.columns import NEAREST_ZERO, Column, ColumnKind, within
from rules.problems.problem import Problem
from rules.record import TABLES, UNIT_OF_QUANTITY, Row, Run, Site, columns
from rules.tables.conductors import is_known, neighbours
from rules.text import MOST_CHARACTERS, either, forbidden_character, nearest_choice, quoted

Complaint: TypeAlias = tuple[str, str] | None
"""What is wrong, and what is accepted; ``None`` where nothing is wrong."""

FIRST_YEAR, LAST_YEAR = 1900, 2200
"""Of dates and times in a record."""
_DATE_PART = re.compile(r"[0-9W-]+(?:[T ]|$)")
"""Python itself takes any character between date and time."""


def cell_problems(site: Site) -> Iterator[Problem]:
    """Every cell of every table that cannot be, whatever the others hold."""
    for table in TABLES:
        rows = site.table(table)
        for name, column in columns(table):
            yield from _column_problems(table, name, column, rows)
            if column.unit == "*":
                yield from _quantity_problems(table, name, column, rows)
        yield from _typed_problems(table, rows)


def accepted(column: Column, unit: str = "") -> str:
    """
    What may stand in a column, in a few words.

    Examples
    --------
    >>> accepted(Column("length", "number", unit="m", least=0))
    'a number in m, 0 or more'
    """
    if column.kind in ("number", "whole"):
        return _accepted_number(column, unit)
    if column.kind == "choice":
        return either(column.choices)
    words: dict[ColumnKind, str] = {
        "tag": "a tag",
        "size": "a size such as 2.5 mm2, 12 AWG, 4/0 AWG or 250 kcmil",
        "date": "a date such as 2026-03-14",
        "time": "an ISO 8601 time such as 2026-03-14T09:30",
        "return": "own, structure or shared:NAME",
        "feeds": "a source, several as RECT-1 + BATT-A, a circuit, or CIRCUIT:POINT",
        "point": "the name of a point",
    }
    if column.kind == "reference":
        return "the tag of a " + either([table.removesuffix("s") for table in column.tables])
    return words.get(column.kind, f"text of up to {MOST_CHARACTERS:,} characters")


def text_complaint(text: str, *, lines: bool = False) -> Complaint:
    """What is wrong with the characters of a text; ``lines`` allows newline and tab, as in notes."""
    if len(text) > MOST_CHARACTERS:
        return f"text of {len(text):,} characters", f"up to {MOST_CHARACTERS:,} characters"
    character = forbidden_character(text, lines=lines)
    if character is None:
        return None
    allowed = "text without control characters, newline and tab apart" if lines else "text without control characters"
    return f"{quoted(text)} holds the control character U+{ord(character):04X}", allowed


def cell_complaint(value: Any, column: Column) -> Complaint:
    """What is wrong with a value by itself, in a cell that is not empty."""
    return _CHECKS[column.kind](value, column)


def _column_problems(table: str, name: str, column: Column, rows: tuple[Row, ...]) -> Iterator[Problem]:
    check, value_of = _CHECKS[column.kind], attrgetter(name)
    # Most columns hold few distinct values, and hardly any holds one that is wrong.
    if not any(_may_be_wrong(value, column, check) for value in set(map(value_of, rows))):
        return
    for row in rows:
        value = value_of(row)
        if value is None or value in ("", ()):
            if column.filled and not _ends_on_board(row, name):
                yield Problem(table, row.id, column.name, "is empty", accepted(column))
        elif (complaint := check(value, column)) is not None:
            yield Problem(table, row.id, column.name, *complaint)


def _may_be_wrong(value: Any, column: Column, check: Callable[[Any, Column], Complaint]) -> bool:
    is_empty = value is None or value in ("", ())
    return column.filled if is_empty else check(value, column) is not None


def _quantity_problems(table: str, name: str, column: Column, rows: tuple[Row, ...]) -> Iterator[Problem]:
    """Numbers in the unit of their row's quantity that are far beyond what can be."""
    quantity_of, value_of = attrgetter("quantity"), attrgetter(name)
    wrong = {
        pair: complaint
        for pair in set(zip(map(quantity_of, rows), map(value_of, rows), strict=True))
        if (complaint := _quantity_complaint(*pair, column)) is not None
    }
    if not wrong:
        return
    for row in rows:
        if (complaint := wrong.get((quantity_of(row), value_of(row)))) is not None:
            yield Problem(table, row.id, column.name, *complaint)


def _quantity_complaint(quantity: str, value: float | None, column: Column) -> Complaint:
    unit = UNIT_OF_QUANTITY.get(quantity)
    if unit is None or value is None or number_complaint(value, column) is not None:
        return None
    return number_complaint(value, within(column, unit))


def _ends_on_board(row: Row, name: str) -> bool:
    return isinstance(row, Run) and name == "to_point" and bool(row.to_board_id)


def _typed_problems(table: str, rows: tuple[Row, ...]) -> Iterator[Problem]:
    """Text as typed is shown and written out, so that it is held to the same rules as any other."""
    names = {name: column.name for name, column in columns(table)}
    for row in rows:
        for name, text in row.typed:
            if (complaint := text_complaint(text)) is not None:
                yield Problem(table, row.id, names.get(name, name), *complaint)


def _accepted_number(column: Column, unit: str) -> str:
    unit = unit or ("" if column.unit == "*" else column.unit)
    words = "a whole number" if column.kind == "whole" else "a number"
    if unit:
        words += f" in {unit}"
    if column.least is not None and column.most is not None:
        return f"{words} from {column.least:.12g} to {column.most:.12g}"
    if column.least is not None:
        words += f", {column.least:.12g} or more"
    if column.above is not None:
        words += f" above {column.above:.12g}"
    return words if column.most is None else f"{words} and at most {column.most:.12g}"


def number_complaint(value: float, column: Column) -> Complaint:
    """What is wrong with a number: not finite, outside the column's bounds, or too near to 0."""
    fits = (
        math.isfinite(value)
        and (column.least is None or value >= column.least)
        and (column.above is None or value > column.above)
        and (column.most is None or value <= column.most)
    )
    if not fits:
        return f"{value:.12g} is not possible", accepted(column)
    if 0 < abs(value) < NEAREST_ZERO and column.unit != "*":  # there the bounds of the row's unit tell
        return f"{value:.12g} is too near to 0", f"0, or a number of at least {NEAREST_ZERO:g} in size"
    return None


def _text(value: str, column: Column) -> Complaint:
    complaint = text_complaint(value)
    if complaint is None and value != value.strip():
        return f"{quoted(value)} begins or ends with a space", "the same text without"
    return complaint


def _notes(value: str, column: Column) -> Complaint:
    return text_complaint(value, lines=True)


def _choice(value: str, column: Column) -> Complaint:
    if value in column.choices:
        return None
    near = nearest_choice(value[:100], column.choices)
    hint = "" if near is None else f", did you mean {quoted(near)}?"
    return f"{quoted(value)} is no {column.name}", accepted(column) + hint


def _size(value: str, column: Column) -> Complaint:
    if is_known(value):
        return None
    complaint = text_complaint(value)
    if complaint is not None:
        return complaint
    near = neighbours(value)
    hint = f", next to it {' and '.join(near)}" if near else ""
    return f"{quoted(value)} is in no table of sizes", f"a size of IEC 60228, AWG or kcmil{hint}"


def _time(value: str, column: Column) -> Complaint:
    return (f"{quoted(value)} is not a time", accepted(column)) if not is_time(value) else _year(value)


def _date(value: str, column: Column) -> Complaint:
    return (f"{quoted(value)} is not a date", accepted(column)) if not is_date(value) else _year(value)


def _year(value: str) -> Complaint:
    """Other years are a slip of the hand, and near the ends of the calendar a time zone leaves it."""
    year = int(value[:4])
    if FIRST_YEAR <= year <= LAST_YEAR:
        return None
    return f"{quoted(value)} is of the year {year}", f"a year from {FIRST_YEAR} to {LAST_YEAR}"


def _anything(value: Any, column: Column) -> Complaint:
    """References are looked at where what they name is known."""
    return None


def is_time(text: str) -> bool:
    """
    Whether a text is a time by ISO 8601, the date alone included.

    Examples
    --------
    >>> is_time("2026-03-14T09:30+01:00"), is_time("14.3.2026 9:30")
    (True, False)
    """
    try:
        datetime.fromisoformat(text)
    except ValueError:
        return False
    return _DATE_PART.match(text) is not None


def is_date(text: str) -> bool:
    """
    Whether a text is a date by ISO 8601.

    Examples
    --------
    >>> is_date("2026-03-14"), is_date("March 2026")
    (True, False)
    """
    try:
        date.fromisoformat(text)
    except ValueError:
        return False
    return True


_CHECKS: dict[ColumnKind, Callable[[Any, Column], Complaint]] = {
    "text": _text,
    "notes": _notes,
    "tag": _text,
    "point": _text,
    "return": _text,
    "number": number_complaint,
    "whole": number_complaint,
    "size": _size,
    "choice": _choice,
    "time": _time,
    "date": _date,
    "reference": _anything,
    "feeds": _anything,
}
