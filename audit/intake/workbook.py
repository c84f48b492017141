"""The sheets of an XLSX workbook as grids of texts, each cell as people see it."""

from __future__ import annotations

import io
import warnings
import zipfile
from dataclasses import dataclass
from datetime import date, datetime, time
from typing import Any

from audit.intake.faults import Faults
from audit.intake.grid import EMPTY, Grid, is_empty
from rules.record import TABLES
from rules.text import either, nearest, quoted

_MOST_BYTES = 500_000_000
"""Unpacked size from which a workbook is refused: a small file can hold any amount of zeros."""
_DIGITS = 15
"""Significant digits that a spreadsheet shows of a number at most."""


@dataclass(frozen=True, slots=True)
class NoText:
    """A cell that has no value of its own."""

    why: str


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


def _sheets(content: bytes) -> dict[str, list[list[str | NoText]]]:
    """Name and cells of every sheet."""
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


def _cells(values: Any, formulas: Any) -> list[list[str | NoText]]:
    for sheet in (values, formulas):
        sheet.reset_dimensions()  # some programs write a wrong size, which would hide cells
    rows = zip(values.iter_rows(), formulas.iter_rows(), strict=True)
    return [[_text(*pair) for pair in zip(*both, strict=True)] for both in rows]


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
        percent = "%" in cell.number_format
        return f"{value * 100:.{_DIGITS}g} %" if percent else f"{value:.{_DIGITS}g}"
    if isinstance(value, datetime):
        has_time = value.time() != time() or "h" in cell.number_format.casefold()
        return value.isoformat() if has_time else value.date().isoformat()
    return value.isoformat() if isinstance(value, date | time) else str(value)


def _grid(file: str, name: str, rows: list[list[str | NoText]], faults: Faults) -> Grid | None:
    """One sheet; ``None`` where its name is no table's."""
    texts = [tuple("" if isinstance(cell, NoText) else cell for cell in row) for row in rows]
    unreadable = {
        (line, place): cell.why
        for line, row in enumerate(rows, 1)
        for place, cell in enumerate(row)
        if isinstance(cell, NoText)
    }
    with_text = {line for line, _ in unreadable}
    filled = [(line, row) for line, row in enumerate(texts, 1) if line in with_text or not is_empty(row)]
    sheet = f"{file}[{name}]"
    if name not in TABLES:
        if filled:
            near = nearest(name, TABLES)
            hint = "" if near is None else f", did you mean {near}?"
            faults.add(sheet, f"no table has this name; accepted: a sheet named {either(tuple(TABLES))}{hint}")
        return None
    if not filled:
        grid = Grid(name, sheet, whole=False)
        grid.fault(faults, EMPTY)
        return grid
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
