"""A table as it stands in a file: a header and rows of texts, whatever the file's form."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

from audit.intake.faults import Faults
from rules.record import TABLES

EMPTY = "is empty; accepted: a header row, and below it a row for each entry"
_PLACES = {table: n for n, table in enumerate(TABLES, 1)}


@dataclass(frozen=True, slots=True)
class Grid:
    """One table of one file."""

    table: str
    file: str
    """How error lines name it: ``runs.csv``, or ``survey.xlsx[runs]`` for a sheet."""
    header: tuple[str, ...] = ()
    header_line: int = 1
    rows: tuple[tuple[int, tuple[str, ...]], ...] = ()
    """Line on which the row starts, and its cells; rows of empty cells are left out."""
    unreadable: Mapping[tuple[int, int], str] = field(default_factory=dict)
    """What is wrong with cells that have no text, by line and place in the row."""
    whole: bool = True
    """Everything could be read; ``False`` where a part of the file is not in ``rows``."""

    def fault(self, faults: Faults, what: str, *, row: int = 0, column: str = "", place: int = 0) -> None:
        """One more problem of this table; ``place`` is that of the column."""
        faults.add(self.file, what, row=row, column=column, order=(_PLACES[self.table], place))


def is_empty(cells: Sequence[str]) -> bool:
    """Whether a row holds nothing but empty cells."""
    return not any(cells) or not "".join(cells).strip()
