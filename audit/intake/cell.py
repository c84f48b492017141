"""One cell of a table, or one setting, to its value."""

from __future__ import annotations

import re
from dataclasses import dataclass

from rules.columns import Column
from rules.errors import UnreadableText
from rules.problems.cells import accepted
from rules.text import quoted
from rules.units import is_plain, parse, parse_size

_SPACES = " \t\r\n\u00a0"
"""What is dropped at both ends of a cell; notes alone keep theirs."""
_WITHOUT_UNIT = re.compile(r"[+\-−]?[0-9.,]+([eE][+-]?[0-9]+)?")
_LARGEST_WHOLE = 2**53
"""Beyond it a float skips whole numbers, and what was typed might not be what is stored."""


@dataclass(frozen=True, slots=True)
class Cell:
    """What was read from a cell."""

    value: float | int | str
    typed: str | None = None
    """The text, where it was not the plain number in the column's own unit."""


def trimmed(text: str, column: Column) -> str:
    """The text of a cell without spaces at its ends; notes as they are, each line ended by a newline."""
    if column.kind == "notes":
        return text.replace("\r\n", "\n").replace("\r", "\n")
    return text.strip(_SPACES)


def read_cell(text: str, column: Column, unit: str, header_unit: str = "") -> Cell:
    """
    Read a cell that is not empty.

    Parameters
    ----------
    text : str
        The cell, trimmed.
    column : Column
        What it is. Texts, tags and choices are returned as they are: ``rules.consistency`` judges them.
    unit : str
        Unit of the value; the column's own, or that of the row's quantity.
    header_unit : str
        The header's unit where it is another one: a cell without a unit is read as if typed with it.

    Raises
    ------
    UnreadableText, InvalidQuantity
        If the text is no number or size, with one line that says what is accepted.

    Examples
    --------
    >>> length = Column("length", "number", unit="m")
    >>> read_cell("12.5", length, "m"), read_cell("45", length, "m", "ft")
    (Cell(value=12.5, typed=None), Cell(value=13.716, typed='45 ft'))
    """
    if column.kind == "number":
        if header_unit and _WITHOUT_UNIT.fullmatch(text):
            text = f"{text} {header_unit}"
        return Cell(parse(text, unit), None if is_plain(text) else text)
    if column.kind == "whole":
        return Cell(_whole(text, column))
    return Cell(parse_size(text) if column.kind == "size" else text)


def _whole(text: str, column: Column) -> int:
    if is_plain(text) and (number := parse(text, "")).is_integer():
        if abs(number) <= _LARGEST_WHOLE:
            return int(number)
        raise UnreadableText(f"{quoted(text)} is too large a number; accepted: {accepted(column)}")
    raise UnreadableText(f"{quoted(text)} is not a whole number; accepted: {accepted(column)}")
