"""What is to be taken in, as texts: the settings and tables of a site folder, or single tables."""

from __future__ import annotations

import stat
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path

from audit.intake.csv_file import read_csv
from audit.intake.faults import Faults
from audit.intake.grid import Grid
from audit.intake.header import title
from audit.intake.settings import FILE as SETTINGS_FILE
from audit.intake.settings import Settings, read_settings, read_toml
from audit.intake.workbook import read_workbook
from rules.record import TABLES, columns
from rules.text import either, nearest

REQUIRED = ("circuits", "runs")
"""Tables that a site folder must have."""
_ENDINGS = (".csv", ".xlsx")

Stage = Callable[[str], None]
"""Is told what begins: ``readings.csv``."""


def no_stage(name: str) -> None:
    """Nobody wants to know."""


@dataclass(slots=True)
class Given:
    """Settings and tables before their rows are read; what is wrong with them so far stands in ``faults``."""

    settings: Settings | None = None
    """``None`` where tables come without a ``site.toml``."""
    grids: dict[str, Grid] = field(default_factory=dict)
    faults: Faults = field(default_factory=Faults)
    required: tuple[str, ...] = ()
    """Tables that must be there."""

    def add(self, grid: Grid) -> None:
        """One more table."""
        if grid.table in self.grids:
            what = f"the table stands in {self.grids[grid.table].file} too; accepted: each table once"
            grid.fault(self.faults, what)
        else:
            self.grids[grid.table] = grid


def given_folder(folder: Path, stage: Stage = no_stage) -> Given:
    """A site folder: ``site.toml`` and the tables as CSV files or as sheets of XLSX workbooks."""
    given = Given(required=REQUIRED)
    if not folder.is_dir():
        given.faults.add(str(folder), "is not a folder; accepted: a site folder")
        return given
    given.settings = _settings_of(folder, given.faults)
    for path in sorted(folder.iterdir()):
        if path.name.startswith((".", "~$")):  # what a system or a spreadsheet leaves behind
            continue
        if path.suffix.casefold() in _ENDINGS:
            _add_file(path, given, stage)
    return given


def given_files(paths: Sequence[Path], stage: Stage = no_stage) -> Given:
    """Single tables, named like the tables, wherever they lie."""
    given = Given()
    for path in paths:
        if path.suffix.casefold() in _ENDINGS:
            _add_file(path, given, stage)
        else:
            given.faults.add(path.name, "is no table; accepted: a site folder, or tables as .csv or .xlsx")
    return given


def given_texts(tables: Mapping[str, Iterable[Mapping[str, str]]], settings: Mapping[str, object] | None) -> Given:
    """Rows of texts, as if they stood in CSV files."""
    given = Given()
    data = {"name": "site"} if settings is None else settings
    given.settings = read_settings(data, lambda name: None, given.faults)
    for table, rows_given in tables.items():
        if table not in TABLES:
            given.faults.add(f"{table}.csv", _no_table(table))
            continue
        titles = {column.name: title(column) for _, column in columns(table)}
        rows = [{titles.get(name, name): cell for name, cell in row.items()} for row in rows_given]
        header = tuple(dict.fromkeys(name for row in rows for name in row))
        cells = tuple((line, tuple(row.get(name, "") for name in header)) for line, row in enumerate(rows, 2))
        if cells:
            given.add(Grid(table, f"{table}.csv", header, rows=cells))
    return given


def _settings_of(folder: Path, faults: Faults) -> Settings:
    """The settings in ``site.toml``, with what lies beside it."""
    if not (folder / SETTINGS_FILE).is_file():
        faults.add(SETTINGS_FILE, "is missing; accepted: a file of this name with at least the name of the site")
        return Settings(whole=False)
    content = _bytes(folder / SETTINGS_FILE, SETTINGS_FILE, faults)
    data = None if content is None else read_toml(SETTINGS_FILE, content, faults)
    if data is None:
        return Settings(whole=False)

    def beside(name: str) -> bytes | None:
        return _bytes(folder / name, name, faults) if (folder / name).is_file() else None

    return read_settings(data, beside, faults)


def _add_file(path: Path, given: Given, stage: Stage) -> None:
    """The tables of one file; a fault where it is no table."""
    name = path.name
    is_csv = path.suffix.casefold() == ".csv"
    if is_csv and path.stem not in TABLES:
        given.faults.add(name, _no_table(path.stem))
        return
    stage(f"read {name}")
    content = _bytes(path, name, given.faults)
    if content is None:
        if is_csv:
            given.add(Grid(path.stem, name, whole=False))  # so that it is not missed as well
        return
    faults = given.faults
    for grid in [read_csv(path.stem, name, content, faults)] if is_csv else read_workbook(name, content, faults):
        given.add(grid)


def _bytes(path: Path, name: str, faults: Faults) -> bytes | None:
    """Content of a file; a pipe or a device is never opened, which might wait or go on without end."""
    try:
        if not stat.S_ISREG(path.stat().st_mode):
            faults.add(name, "is no file; accepted: a file of this name")
            return None
        return path.read_bytes()
    except FileNotFoundError:
        faults.add(name, "is not there; accepted: a file that is")
    except OSError as error:
        faults.add(name, f"cannot be read: {error.strerror}; accepted: a file that you may read")
    return None


def _no_table(name: str) -> str:
    near = nearest(name, TABLES)
    hint = "" if near is None else f", did you mean {near}.csv?"
    return f"no table has this name; accepted: {either([f'{table}.csv' for table in TABLES])}{hint}"
