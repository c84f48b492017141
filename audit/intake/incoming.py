"""
The rows of what is given, in the ids of the site that they are taken into.

Cells and headers are read table by table; ``rules.consistency`` judges the site that comes of it, and its
problems go back to file and line. What a problem in one place would only repeat elsewhere is left out: a
circuit is not missing where ``circuits.csv`` could not be read.
"""

from __future__ import annotations

from collections.abc import Callable, Collection, Mapping
from dataclasses import replace
from types import MappingProxyType
from typing import Any

from audit.intake.faults import Faults
from audit.intake.given import Given, Stage, no_stage
from audit.intake.grid import Grid
from audit.intake.header import read_header
from audit.intake.ids import Known
from audit.intake.rows import Taken, read_rows, read_tags
from audit.intake.settings import FILE as SETTINGS_FILE
from audit.intake.settings import place_of
from rules.consistency import Problem, problems
from rules.record import TABLES, Site, columns
from rules.references import Tags

_NAMED_IN_REFERENCES = ("sources", "boards", "circuits")


class Incoming:
    """What comes in: a row of the record for every row given, and where each stands."""

    faults: Faults
    """What is wrong so far."""
    settings: Mapping[str, Any] | None
    """Fields of ``Site`` that were given; ``None`` without a ``site.toml``."""

    def __init__(self, given: Given, into: Site | None = None, stage: Stage = no_stage) -> None:
        """
        Read all rows.

        Parameters
        ----------
        given : Given
            The texts; they are left as they are, its faults are taken over.
        into : Site, optional
            The site that they are taken into: a row that is there already keeps its id, and what the rows refer to
            may stand there.
        stage : callable
            Is told which table is being read.
        """
        self.faults = Faults(list(given.faults.found))
        self.settings = None if given.settings is None else given.settings.values
        self._given = given
        for table in given.required:
            if table not in given.grids:
                missing = Grid(table, f"{table}.csv")
                missing.fault(self.faults, "is missing; accepted: a CSV file of this name, or a sheet of a workbook")
        known = Known(into)
        grids = {table: grid for table, grid in given.grids.items() if grid.header}
        headers = {table: read_header(grid, self.faults) for table, grid in grids.items()}
        ids = {
            table: read_tags(grids[table], headers[table], known) if table in headers else known.tag_ids(table)
            for table in _NAMED_IN_REFERENCES
        }
        self._taken: dict[str, Taken] = {}
        for table in TABLES:
            if table in headers:
                stage(f"read the rows of {table}")
                self._taken[table] = read_rows(grids[table], headers[table], Tags(ids), known, self.faults)
        self._unread = {table for table, grid in given.grids.items() if not grid.whole}
        self._unread |= set(given.required).difference(given.grids)
        self._unread |= {table for table, header in headers.items() if header.absent}

    @property
    def is_whole(self) -> bool:
        """Whether all settings that were given could be read."""
        settings = self._given.settings
        return settings is None or (settings.whole and not settings.told)

    @property
    def site(self) -> Site:
        """The rows as a site of their own; what they refer to may stand in the site that they are taken into."""
        rows: dict[str, Any] = {table: tuple(taken.rows) for table, taken in self._taken.items()}
        return Site(**({"name": ""} | dict(self.settings or {}) | rows))

    def has_row(self, table: str, id_: str) -> bool:
        """Whether a row stands among what is given."""
        return table in self._taken and id_ in self._taken[table].numbers

    def given_fields(self, table: str) -> Collection[str]:
        """The fields that the table has a column for."""
        return self._taken[table].given

    def judge(
        self,
        site: Site,
        known: Callable[[], Collection[Problem]] = tuple,
        came_from: Mapping[str, str] = MappingProxyType({}),
    ) -> None:
        """
        Ask whether a site holds together that these rows went into; a problem of theirs goes to ``faults``.

        Parameters
        ----------
        site : Site
            The site as it would be.
        known : callable
            Gives what did not hold together before, which is no fault of what comes in; asked only if something does
            not now.
        came_from : dict
            Id of the row that came in, by that of a reading which was made of it.
        """
        found = problems(site)
        before = set(map(_what, known())) if found else set()
        for problem in found:
            problem = replace(problem, row=came_from.get(problem.row, problem.row))
            if _what(problem) not in before and not self._is_told(problem):
                self._add(problem, site)

    def fault(self, table: str, row: str, column: str, what: str) -> None:
        """One more problem of a row that was given, or of a setting where ``table`` is ``site``."""
        if table == "site":
            self.faults.add(SETTINGS_FILE, what, column=column, order=(0, place_of(column)))
            return
        part = self._taken[table]
        place = [known.name for _, known in columns(table)].index(column)
        part.grid.fault(self.faults, what, row=part.line(row), column=column, place=place)

    def could_read(self, table: str, row: str, column: str) -> bool:
        """Whether a cell that was given, or a setting where ``table`` is ``site``, could be read; if not, that is told."""
        settings = self._given.settings
        if table == "site":
            return settings is None or (settings.whole and column not in settings.told)
        part = self._taken[table]
        number = part.numbers[row]
        return number not in part.ragged and (number, column) not in part.told and column not in part.header.absent

    def _is_told(self, problem: Problem) -> bool:
        """Whether a problem only repeats what is told already, or follows from what could not be read."""
        if problem.table == "site":
            return not self.could_read("site", "", problem.column)
        if not self._unread.isdisjoint(problem.seen_in):
            return True
        if not self.has_row(problem.table, problem.row):
            return False
        if not self.could_read(problem.table, problem.row, problem.column):
            return True
        if "runs" not in problem.seen_in or "runs" not in self._taken:
            return False
        part = self._taken[problem.table]
        return getattr(part.rows[part.numbers[problem.row]], "circuit_id", "") in self._taken["runs"].doubtful_circuits

    def _add(self, problem: Problem, site: Site) -> None:
        """One problem of the record as a line about the file that it came from."""
        if problem.table == "site" or self.has_row(problem.table, problem.row):
            self.fault(problem.table, problem.row, problem.column, problem.text)
            return
        row = next(row for row in site.table(problem.table) if row.id == problem.row)
        tag = getattr(row, "tag", "") or getattr(row, "number", "")
        place = f"{problem.table}, {tag}" if tag else problem.table
        self.faults.add("the site file", f"{place}, {problem.column}: {problem.text}", order=(len(TABLES) + 1, 0))


def _what(problem: Problem) -> tuple[str, str, str, str]:
    """A problem without what is accepted: that may change with rows that come in."""
    return problem.table, problem.row, problem.column, problem.what
