"""A CSV file as a grid of texts: UTF-8 with or without byte order mark, quotes as in RFC 4180."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterator
from contextlib import contextmanager

from audit.intake.faults import Faults
from audit.intake.grid import EMPTY, Grid, is_empty
from audit.intake.utf8 import NotUtf8, decode

_NOT_CLOSED = "a quoted cell is not closed; accepted: a quote at both ends, and two for each quote within"
_AFTER_QUOTE = "text follows the closing quote of a cell; accepted: a comma there, and two quotes for each quote within"


def read_csv(table: str, file: str, content: bytes, faults: Faults) -> Grid:
    """
    Split a CSV file into cells.

    Parameters
    ----------
    table : str
        Name of the table that it holds.
    file : str
        Name of the file, for error lines.
    content : bytes
        The file as it is.
    faults : Faults
        Takes what could not be read; the grid is then not ``whole``.
    """
    grid = Grid(table, file, whole=False)
    try:
        text = decode(content)
    except NotUtf8 as error:
        grid.fault(faults, error.what, row=error.line)
        return grid
    whole = True
    lines: list[tuple[int, tuple[str, ...]]] = []
    for start, cells in _rows(text):
        if isinstance(cells, str):
            whole = False
            grid.fault(faults, cells, row=start)
            if not lines:
                return grid  # without its header nothing below can be told
        elif not is_empty(cells):
            lines.append((start, tuple(cells)))
    if not lines:
        grid.fault(faults, EMPTY)
        return grid
    (header_line, header), *rows = lines
    return Grid(table, file, header, header_line, tuple(rows), whole=whole)


def _rows(text: str) -> Iterator[tuple[int, list[str] | str]]:
    """Line on which each row starts, with its cells or what is wrong with it."""
    with _cells_of_any_length():
        reader = csv.reader(io.StringIO(text, newline=""), strict=True)
        while True:
            start = reader.line_num + 1
            try:
                cells = next(reader)
            except StopIteration:
                return
            except csv.Error as error:
                yield start, _NOT_CLOSED if "unexpected end" in str(error) else _AFTER_QUOTE
            else:
                yield start, cells


@contextmanager
def _cells_of_any_length() -> Iterator[None]:
    """A cell of a megabyte is refused with its line and column like any other, not by the reader."""
    before = csv.field_size_limit(2**31 - 1)
    try:
        yield
    finally:
        csv.field_size_limit(before)
