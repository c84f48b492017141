"""A grid of texts to rows of the record, with the line that each row stands on; worked down the columns."""

from __future__ import annotations

from collections import defaultdict, deque
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field, fields
from functools import cached_property
from itertools import repeat
from operator import itemgetter
from typing import Any

from audit.intake.cell import trimmed
from audit.intake.column import ReadColumn, read_column
from audit.intake.faults import Faults
from audit.intake.grid import Grid
from audit.intake.header import Header
from audit.intake.ids import Known
from rules.record import TABLES, UNIT_OF_QUANTITY, Row
from rules.references import Tags


@dataclass
class Taken:
    """What was taken from one table."""

    grid: Grid
    header: Header
    rows: list[Row] = field(default_factory=list)
    told: set[tuple[int, str]] = field(default_factory=set)
    """Cells whose problem is told already, by the row's number and the column."""
    ragged: set[int] = field(default_factory=set)
    """Numbers of rows whose cells may stand in the wrong columns."""
    doubtful_circuits: set[str] = field(default_factory=set)
    """Ids of circuits of which a run lacks its number or an end."""

    @cached_property
    def numbers(self) -> Mapping[str, int]:
        """The number of each row, by its id; asked once something is wrong."""
        return {row.id: n for n, row in enumerate(self.rows)}

    @property
    def given(self) -> frozenset[str]:
        """The fields that the table has a column for."""
        names = {heading.field for heading in self.header.headings}
        return frozenset(names | {"to_board_id"} if "to_point" in names else names)

    def line(self, id_: str) -> int:
        """The line that a row stands on."""
        return self.grid.rows[self.numbers[id_]][0]


def read_tags(grid: Grid, header: Header, known: Known) -> dict[str, str]:
    """Id of each tag of a table whose key is its tag, before the rows are read: references need them."""
    heading = next((heading for heading in header.headings if heading.field == "tag"), None)
    ids = known.tag_ids(grid.table)
    if heading is not None:
        place = heading.place
        texts = dict.fromkeys(cells[place] for _, cells in grid.rows if place < len(cells))
        trimmed_texts = dict.fromkeys(trimmed(text, heading.column) for text in texts)
        new = [tag for tag in trimmed_texts if tag and tag not in ids]
        ids.update(zip(new, known.ids(grid.table, {"tag": new}, len(new)), strict=True))
    return ids


def read_rows(grid: Grid, header: Header, tags: Tags, known: Known, faults: Faults) -> Taken:
    """
    Make a row of every line of a table.

    What is wrong with a cell by itself goes to ``faults``, and the row is made without it, so that whatever
    refers to the row still finds it and all problems are told in one go.
    """
    taken = Taken(grid, header)
    count = len(grid.rows)
    _nameless_columns(grid, header, faults)
    columns = _read_columns(grid, header, tags)
    _tell(taken, columns, faults)
    values: dict[str, Sequence[Any]] = {name: column.values for name, column in columns.items()}
    if "to_point" in values:
        ends = values["to_point"]
        values["to_point"], values["to_board_id"] = [point for point, _ in ends], [board for _, board in ends]
    values["typed"] = _typed(columns, count)
    ids = known.ids(grid.table, values, count)
    if grid.table == "readings":
        values = _with_replacements(values, ids, known)
    if grid.table == "runs":
        taken.doubtful_circuits = _doubtful_circuits(columns, values.get("circuit_id", [""] * count))
    taken.rows = _made(TABLES[grid.table], {"id": ids, **values}, count)
    return taken


def _read_columns(grid: Grid, header: Header, tags: Tags) -> dict[str, ReadColumn]:
    """Every column that the table has, by field."""
    width = max((heading.place for heading in header.headings), default=-1) + 1
    rows = [cells if len(cells) >= width else cells + ("",) * (width - len(cells)) for _, cells in grid.rows]
    defaults = {f.name: f.default for f in fields(TABLES[grid.table])} | {"to_point": ("", "")}
    numbers = {line: n for n, (line, _) in enumerate(grid.rows)} if grid.unreadable else {}
    units: list[str | None] | None = None
    columns: dict[str, ReadColumn] = {}
    # the quantity comes first: the units of other columns follow it
    for heading in sorted(header.headings, key=lambda heading: heading.field != "quantity"):
        follows = units if heading.column.unit == "*" else None
        if heading.column.unit == "*" and units is None:
            follows = [None] * len(rows)
        column = read_column(
            heading, list(map(itemgetter(heading.place), rows)), follows, tags, defaults[heading.field]
        )
        for (line, place), what in grid.unreadable.items():
            if place == heading.place and line in numbers:
                column.wrong[numbers[line]] = what
        if heading.field == "quantity":
            units = [UNIT_OF_QUANTITY.get(quantity) for quantity in column.values]
        columns[heading.field] = column
    return {heading.field: columns[heading.field] for heading in header.headings}


def _tell(taken: Taken, columns: Mapping[str, ReadColumn], faults: Faults) -> None:
    """Say what is wrong with single cells and with rows of another length than the header."""
    grid, width = taken.grid, len(taken.grid.header)
    for n, (line, cells) in enumerate(grid.rows):
        if len(cells) != width:
            taken.ragged.add(n)
            what = f"the row has {len(cells)} cells, the header {width}; accepted: as many as the header"
            grid.fault(faults, what, row=line)
    for heading in taken.header.headings:
        for n, what in columns[heading.field].wrong.items():
            taken.told.add((n, heading.column.name))
            if n not in taken.ragged:
                line = grid.rows[n][0]
                grid.fault(faults, what, row=line, column=heading.column.name, place=heading.order)


def _nameless_columns(grid: Grid, header: Header, faults: Faults) -> None:
    for place in header.nameless:
        if any(cells[place].strip() for _, cells in grid.rows if place < len(cells)):
            what = f"column {place + 1} holds cells but has no name; accepted: a name, or an empty column"
            grid.fault(faults, what, row=grid.header_line)


def _typed(columns: Mapping[str, ReadColumn], count: int) -> Sequence[tuple[tuple[str, str], ...]]:
    """The texts as typed of each row, sorted by field."""
    found: defaultdict[int, list[tuple[str, str]]] = defaultdict(list)
    for name in sorted(columns):
        for n, text in columns[name].typed.items():
            found[n].append((name, text))
    return [tuple(found[n]) if n in found else () for n in range(count)] if found else [()] * count


def _doubtful_circuits(columns: Mapping[str, ReadColumn], circuits: Sequence[str]) -> set[str]:
    """Circuits of which a run has no number or no end that could be read: of their tree nothing can be said."""
    needed = ("number", "from_point", "to_point")
    if not columns.keys() >= set(needed):
        return set(circuits)
    return {circuits[n] for name in needed for n in columns[name].wrong}


def _with_replacements(
    values: Mapping[str, Sequence[Any]], ids: Sequence[str], known: Known
) -> dict[str, Sequence[Any]]:
    """The values with each reading that is replaced named by its id."""
    if not any(values.get("replaces_id", ())):
        return dict(values)
    by_tag: dict[str, str] = {}
    for tag, id_ in zip(values.get("tag", repeat("")), ids, strict=False):
        by_tag.setdefault(tag, id_)
    by_tag = known.tag_ids("readings") | {tag: id_ for tag, id_ in by_tag.items() if tag}
    named = [by_tag.get(id_.removeprefix("?"), id_) for id_ in values["replaces_id"]]
    return {**values, "replaces_id": named}


def _made(row_type: type[Row], columns: Mapping[str, Iterable[Any]], count: int) -> list[Row]:
    """
    Rows of a frozen type from their columns; a field without a column is empty.

    The slot's own descriptor sets a field of all rows: ``__init__`` of a frozen row goes through
    ``object.__setattr__`` for each of twenty fields, three times as slow.
    """
    rows: list[Any] = list(map(object.__new__, repeat(row_type, count)))
    for f in fields(row_type):
        values = columns[f.name] if f.name in columns else repeat(f.default, count)
        deque(map(getattr(row_type, f.name).__set__, rows, values), maxlen=0)
    return rows
