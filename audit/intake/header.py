"""The header of a table: which field each of its columns is, and in which unit."""

from __future__ import annotations

import re
from dataclasses import dataclass
from functools import cache

from audit.intake.cell import trimmed
from audit.intake.faults import Faults
from audit.intake.grid import Grid
from rules.columns import Column
from rules.errors import RulesError
from rules.record import UNIT_OF_QUANTITY, columns
from rules.text import clean, either, forbidden_character, nearest, quoted
from rules.units import parse

_HEADER = re.compile(r"(.*?)\s*(?:\[([^\[\]]*)\])?", re.DOTALL)
_HEADER_CELL = Column("header")
_SEPARATORS = re.compile(r"[;\t|]")
_LONGEST_NAME = 60
"""What is shown of an unknown name. [characters]"""


@dataclass(frozen=True, slots=True)
class Heading:
    """One column of a table as it stands there."""

    place: int
    """Its place in the rows, from 0."""
    order: int
    """Its place in the format, from 0, by which error lines are sorted."""
    field: str
    column: Column
    unit: str = ""
    """The header's unit where it is not the column's own."""


@dataclass(frozen=True, slots=True)
class Header:
    """What a header says."""

    headings: tuple[Heading, ...]
    nameless: tuple[int, ...]
    """Places without a name, which must be empty all the way down."""
    absent: frozenset[str]
    """Required columns that are not there."""


def read_header(grid: Grid, faults: Faults) -> Header:
    """Find the field of every column; what is unknown, double or missing goes to ``faults``."""
    known = {column.name: (order, field, column) for order, (field, column) in enumerate(columns(grid.table))}
    required = [name for name, (_, _, column) in known.items() if column.header]
    found: dict[str, Heading] = {}
    nameless: list[int] = []

    def fault(what: str, column: str, place: int) -> None:
        grid.fault(faults, what, row=grid.header_line, column=column, place=place)

    if len(grid.header) == 1 and (separator := _SEPARATORS.search(grid.header[0])):
        fault(f"cells are separated by {quoted(separator.group())}; accepted: a file separated by commas", "", 0)
        return Header((), (), frozenset(required))
    for place, text in enumerate(grid.header):
        text = trimmed(text, _HEADER_CELL)
        match = _HEADER.fullmatch(text)
        name, unit = (match[1], match[2]) if match else (text, None)
        if not text:
            nameless.append(place)
        elif name not in known:
            fault(_unknown(name, tuple(known)), "" if forbidden_character(name) else name[:_LONGEST_NAME], place)
        elif name in found:
            fault("the column stands there twice; accepted: once", name, place)
        else:
            order, field, column = known[name]
            own_unit, wrong = _unit(unit, column)
            if wrong:
                fault(wrong, name, place)
            found[name] = Heading(place, order, field, column, own_unit)
    absent = [name for name in required if name not in found]
    for place, name in enumerate(absent, len(grid.header)):
        fault(f"the column is missing; accepted: a column {title(known[name][2])}", name, place)
    return Header(tuple(found.values()), tuple(nameless), frozenset(absent))


@cache
def is_unit(header_unit: str, unit: str) -> bool:
    """Whether a header's unit is just another spelling of a column's own."""
    try:
        return parse(f"0 {header_unit}", unit) == 0 and parse(f"1 {header_unit}", unit) == 1
    except RulesError:
        return False


def title(column: Column) -> str:
    """A column's name with its unit, as a header has it."""
    return f"{column.name} [{column.unit}]" if column.unit not in ("", "*") else column.name


def _unknown(name: str, known: tuple[str, ...]) -> str:
    if forbidden_character(name) is not None:
        return f"the header {quoted(name)} holds control characters; accepted: {either(known, most=99)}"
    near = nearest(name[:_LONGEST_NAME], known)
    if near is None:
        return f"there is no column of this name; accepted: {either(known, most=99)}"
    return f"there is no column of this name; did you mean {near}?"


def _unit(unit: str | None, column: Column) -> tuple[str, str]:
    """The header's unit, empty where it is the column's own, and what is wrong with it."""
    if unit is None:
        bare = column.kind != "number" or column.unit in ("", "*", "%")  # these can be meant one way only
        return "", "" if bare else f"the header names no unit; accepted: {title(column)}, or another unit of the kind"
    unit = unit.strip()
    if column.kind != "number" or not column.unit:
        return "", f"the header names the unit {quoted(unit)}; accepted: {column.name} without a unit"
    if column.unit != "*" and is_unit(unit, column.unit):
        return "", ""
    for target in set(UNIT_OF_QUANTITY.values()) if column.unit == "*" else {column.unit}:
        try:
            parse(f"1 {unit}", target)
        except RulesError:
            continue
        return unit, ""
    example = "V" if column.unit == "*" else column.unit
    return "", f"{quoted(clean(unit))} is no unit of {column.name}; accepted: a unit such as {column.name} [{example}]"
