"""The sheets of an XLSX workbook as grids of texts, each cell as people see it."""

from __future__ import annotations

import io
import warnings
import zipfile
from dataclasses import dataclass
from datetime import date, datetime, time
from typing import Any, TypeAlias

from audit.intake.faults import Faults
from audit.intake.grid import EMPTY, Grid
from audit.intake.number_format import NotShown, shown
from rules.record import TABLES
from rules.text import either, nearest, quoted

_MOST_BYTES = 500_000_000
"""Unpacked size from which a workbook is refused: a small file can hold any amount of zeros."""
_MOST_ROWS = 1_048_576
"""Rows that a sheet of a spreadsheet program has."""
_MOST_COLUMNS = 1_000
"""Far more than any table has; a cell beyond would make each row as long."""

Rows: TypeAlias = "list[tuple[int, list[str | NoText]]]"
"""Line and cells of each row that is not empty: a sheet may have a million empty ones between two."""


@dataclass(frozen=True, slots=True)
class NoText:
    """A cell that has no value of its own."""

    why: str


class _TooLarge(Exception):
    """A sheet with cells where none can be."""

    def __init__(self, line: int, what: str) -> None:
        super().__init__(what)
        self.line = line
        self.what = what


def read_workbook(file: str, content: bytes, faults: Faults) -> list[Grid]:
    """
    Every sheet of a workbook that is named like a table.

    Parameters
    ----------
    file : str
        Name of the file, for error lines.
    content : bytes
        The file as it is.
    faults : Faults
        Takes what could not be read, and sheets that are no table.
    """
    try:
        with zipfile.ZipFile(io.BytesIO(content)) as archive:
            size = sum(entry.file_size for entry in archive.infolist())
        if size > _MOST_BYTES:
            faults.add(file, f"holds {size:,} bytes unpacked; accepted: up to {_MOST_BYTES:,}")
            return []
        sheets = _sheets(content)
    except Exception as error:  # openpyxl lets through whatever a damaged workbook makes it stumble over
        reason = type(error).__name__
        faults.add(file, f"cannot be read as an XLSX workbook ({reason}); accepted: a workbook saved as .xlsx")
        return []
    return [grid for name, rows in sheets.items() if (grid := _grid(file, name, rows, faults)) is not None]


def _sheets(content: bytes) -> dict[str, Rows | _TooLarge]:
    """Name and cells of every sheet, or why they are not read."""
    import openpyxl  # 0.4 s, and only a folder with a workbook needs it

    def load(values: bool) -> Any:
        return openpyxl.load_workbook(io.BytesIO(content), read_only=True, data_only=values, keep_links=False)

    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # about styles and extensions, which hold no value
        values, formulas = load(True), load(False)
        try:
            return {sheet.title: _cells(sheet, formulas[sheet.title]) for sheet in values.worksheets}
        finally:
            values.close()
            formulas.close()


def _cells(values: Any, formulas: Any) -> Rows | _TooLarge:
    for sheet in (values, formulas):
        sheet.reset_dimensions()  # some programs write a wrong size, which would hide cells
    filled: Rows = []
    for line, both in enumerate(zip(values.iter_rows(), formulas.iter_rows(), strict=True), 1):
        if line > _MOST_ROWS:
            return _TooLarge(line, f"a row stands beyond the last; accepted: up to {_MOST_ROWS:,} rows")
        cells = [_text(*pair) for pair in zip(*both, strict=True)]
        while cells and isinstance(end := cells[-1], str) and not end.strip():
            cells.pop()
        if len(cells) > _MOST_COLUMNS:
            return _TooLarge(line, f"the row has {len(cells):,} cells; accepted: up to {_MOST_COLUMNS:,}")
        if cells:
            filled.append((line, cells))
    return filled


def _text(cell: Any, formula: Any) -> str | NoText:
    """One cell as people see it."""
    value = cell.value
    if value is None and formula.data_type == "f":
        return NoText("the formula has no stored value; accepted: a value, or the file saved by a spreadsheet program")
    if value is None:
        return ""
    if cell.data_type == "e":
        return NoText(f"the formula gives {quoted(str(value))}; accepted: a value")
    if isinstance(value, bool):
        return str(value).upper()
    if isinstance(value, int | float):
        try:
            return shown(value, cell.number_format)
        except NotShown as error:
            return NoText(f"{error}; accepted: a format of digits, and a unit after them if any")
    if isinstance(value, datetime):
        has_time = value.time() != time() or "h" in cell.number_format.casefold()
        return value.isoformat() if has_time else value.date().isoformat()
    return value.isoformat() if isinstance(value, date | time) else str(value)


def _grid(file: str, name: str, rows: Rows | _TooLarge, faults: Faults) -> Grid | None:
    """One sheet; ``None`` where its name is no table's."""
    sheet = f"{file}[{name}]"
    if name not in TABLES:
        if rows:
            near = nearest(name, TABLES)
            hint = "" if near is None else f", did you mean {near}?"
            faults.add(sheet, f"no table has this name; accepted: a sheet named {either(tuple(TABLES))}{hint}")
        return None
    if not rows or isinstance(rows, _TooLarge):
        grid = Grid(name, sheet, whole=False)
        if isinstance(rows, _TooLarge):
            grid.fault(faults, rows.what, row=rows.line)
        else:
            grid.fault(faults, EMPTY)
        return grid
    filled = [(line, tuple("" if isinstance(cell, NoText) else cell for cell in row)) for line, row in rows]
    unreadable = {
        (line, place): cell.why for line, row in rows for place, cell in enumerate(row) if isinstance(cell, NoText)
    }
    (header_line, header), *below = filled
    header = _fit(header, 0)
    fitted = tuple((line, _fit(row, len(header))) for line, row in below)
    return Grid(name, sheet, header, header_line, fitted, unreadable)


def _fit(row: tuple[str, ...], width: int) -> tuple[str, ...]:
    """The row without empty cells beyond ``width``, filled up to it: a sheet has no ragged rows of its own."""
    end = len(row)
    while end > width and not row[end - 1].strip():
        end -= 1
    return row[:end] + ("",) * (width - end)
