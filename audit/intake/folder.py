"""
A site folder to a site: all of it, or a line for everything that is wrong with it.

``read_folder`` reads files, ``site_of`` the same from plain texts. Both go one way: cells and headers are
read table by table, ``rules.consistency`` judges the site that comes of it, and its problems go back to file
and line. What a problem in one place would only repeat elsewhere is left out: a circuit is not missing
where ``circuits.csv`` could not be read.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from pathlib import Path
from typing import Any

from audit.errors import IntakeRefused
from audit.intake.csv_file import read_csv
from audit.intake.faults import Faults
from audit.intake.grid import Grid
from audit.intake.header import read_header, title
from audit.intake.rows import Taken, read_rows, read_tags
from audit.intake.settings import FILE as SETTINGS_FILE
from audit.intake.settings import Settings, place_of, read_settings, read_toml
from audit.intake.workbook import read_workbook
from rules.consistency import Problem, problems
from rules.record import TABLES, Site, columns
from rules.references import Tags
from rules.text import either, nearest

REQUIRED = ("circuits", "runs")
"""Tables that a site folder must have."""


def read_folder(path: Path) -> Site:
    """
    Read a site folder.

    Parameters
    ----------
    path : Path
        A folder with ``site.toml`` and the tables as CSV files or as sheets of XLSX workbooks.

    Raises
    ------
    IntakeRefused
        With a line for every problem; nothing is written in any case.
    """
    faults = Faults()
    if not path.is_dir():
        faults.add(str(path), "is not a folder; accepted: a site folder")
        raise IntakeRefused(faults.lines())
    settings = _settings_of(path, faults)
    grids = _grids_of(path, faults)
    return _site(settings, grids, faults, check=True, required=REQUIRED)


def site_of(
    tables: Mapping[str, Iterable[Mapping[str, str]]],
    settings: Mapping[str, object] | None = None,
    check: bool = True,
) -> Site:
    """
    Make a site of texts, as if they stood in a site folder.

    Parameters
    ----------
    tables : dict
        By table, its rows: header (``length [ft]`` counts) and text of each cell. A key that a row lacks is
        an empty cell. No table is required.
    settings : dict, optional
        As in ``site.toml``; without it the site is named ``site``.
    check : bool
        Ask ``rules.consistency`` too; without it only what cannot be read is refused.

    Raises
    ------
    IntakeRefused
        With a line for every problem, named as if the tables were CSV files.
    """
    faults = Faults()
    grids: dict[str, Grid] = {}
    for table, given in tables.items():
        if table not in TABLES:
            faults.add(f"{table}.csv", _no_table(table))
            continue
        titles = {column.name: title(column) for _, column in columns(table)}
        rows = [{titles.get(name, name): cell for name, cell in row.items()} for row in given]
        header = tuple(dict.fromkeys(name for row in rows for name in row))
        cells = tuple((line, tuple(row.get(name, "") for name in header)) for line, row in enumerate(rows, 2))
        if cells:
            grids[table] = Grid(table, f"{table}.csv", header, rows=cells)
    data = {"name": "site"} if settings is None else settings
    return _site(read_settings(data, lambda name: None, faults), grids, faults, check)


def _settings_of(folder: Path, faults: Faults) -> Settings:
    """The settings in ``site.toml``, with what lies beside it."""
    if not (folder / SETTINGS_FILE).is_file():
        faults.add(SETTINGS_FILE, "is missing; accepted: a file of this name with at least the name of the site")
        return Settings(whole=False)
    content = _bytes(folder / SETTINGS_FILE, faults)
    data = None if content is None else read_toml(SETTINGS_FILE, content, faults)
    if data is None:
        return Settings(whole=False)

    def beside(name: str) -> bytes | None:
        return _bytes(folder / name, faults) if (folder / name).is_file() else None

    return read_settings(data, beside, faults)


def _grids_of(folder: Path, faults: Faults) -> dict[str, Grid]:
    """Every table of the folder, from CSV files and workbooks."""
    grids: dict[str, Grid] = {}
    for path in sorted(folder.iterdir()):
        if path.name.startswith((".", "~$")) or not path.is_file():  # what a system or a spreadsheet leaves behind
            continue
        for grid in _grids_in(path, faults):
            if grid.table in grids:
                what = f"the table stands in {grids[grid.table].file} too; accepted: each table once"
                grid.fault(faults, what)
            else:
                grids[grid.table] = grid
    return grids


def _grids_in(path: Path, faults: Faults) -> list[Grid]:
    """The tables of one file; none where it is no kind of table."""
    kind = path.suffix.casefold()
    if kind not in (".csv", ".xlsx"):
        return []
    if kind == ".csv" and path.stem not in TABLES:
        faults.add(path.name, _no_table(path.stem))
        return []
    content = _bytes(path, faults)
    if kind == ".xlsx":
        return [] if content is None else read_workbook(path.name, content, faults)
    if content is None:
        return [Grid(path.stem, path.name, whole=False)]
    return [read_csv(path.stem, path.name, content, faults)]


def _bytes(path: Path, faults: Faults) -> bytes | None:
    try:
        return path.read_bytes()
    except OSError as error:
        faults.add(path.name, f"cannot be read: {error.strerror}; accepted: a file that you may read")
        return None


def _no_table(name: str) -> str:
    near = nearest(name, TABLES)
    hint = "" if near is None else f", did you mean {near}.csv?"
    return f"no table has this name; accepted: {either([f'{table}.csv' for table in TABLES])}{hint}"


def _site(
    settings: Settings, grids: Mapping[str, Grid], faults: Faults, check: bool, required: tuple[str, ...] = ()
) -> Site:
    """Read every table, make the site and judge it."""
    for table in required:
        if table not in grids:
            missing = Grid(table, f"{table}.csv")
            missing.fault(faults, "is missing; accepted: a CSV file of this name, or a sheet of a workbook")
    headers = {table: read_header(grid, faults) for table, grid in grids.items() if grid.header}
    ids: dict[str, dict[str, str]] = {
        t: read_tags(grids[t], headers[t]) for t in ("sources", "boards", "circuits") if t in headers
    }
    taken = {t: read_rows(grids[t], headers[t], Tags(ids), faults) for t in TABLES if t in headers}
    rows: dict[str, Any] = {table: tuple(part.rows) for table, part in taken.items()}
    site = Site(**({"name": ""} | settings.values | rows))
    if check:
        unread = {table for table, grid in grids.items() if not grid.whole} | set(required).difference(grids)
        unread |= {table for table, header in headers.items() if header.absent}
        for problem in problems(site):
            if not _is_told(problem, settings, taken, unread):
                _add(problem, taken, faults)
    if faults.found:
        raise IntakeRefused(faults.lines())
    return site


def _is_told(problem: Problem, settings: Settings, taken: Mapping[str, Taken], unread: set[str]) -> bool:
    """Whether a problem only repeats what is told already, or follows from what could not be read."""
    if problem.table == "site":
        return not settings.whole or problem.column in settings.told
    part = taken[problem.table]
    if (problem.row, problem.column) in part.told or problem.column in part.header.absent:
        return True
    if problem.row in part.ragged or not unread.isdisjoint(problem.seen_in):
        return True
    if "runs" not in problem.seen_in or "runs" not in taken:
        return False
    return part.circuits.get(problem.row, "") in taken["runs"].doubtful_circuits


def _add(problem: Problem, taken: Mapping[str, Taken], faults: Faults) -> None:
    """One problem of the record as a line about the file that it came from."""
    if problem.table == "site":
        faults.add(SETTINGS_FILE, problem.text, column=problem.column, order=(0, place_of(problem.column)))
        return
    part = taken[problem.table]
    place = [column.name for _, column in columns(problem.table)].index(problem.column)
    part.grid.fault(faults, problem.text, row=part.lines[problem.row], column=problem.column, place=place)
