"""A grid of texts to rows of the record, with the line that each row stands on."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping
from dataclasses import dataclass, field, fields, replace
from functools import cache
from typing import Any

from audit.intake.cell import read_cell, trimmed
from audit.intake.faults import Faults
from audit.intake.grid import Grid
from audit.intake.header import Header, Heading, is_unit
from rules.columns import Column
from rules.errors import RulesError
from rules.problems.cells import accepted
from rules.record import KEY_FIELDS, TABLES, UNIT_OF_QUANTITY, Reading, Row, missing, row_id
from rules.references import Tags, read_end, read_feed, read_feeds


@dataclass(slots=True)
class Taken:
    """What was taken from one table."""

    grid: Grid
    header: Header
    rows: list[Row] = field(default_factory=list)
    lines: dict[str, int] = field(default_factory=dict)
    """Line of each row, by id."""
    circuits: dict[str, str] = field(default_factory=dict)
    """Id of the circuit of each row that belongs to one, by the row's id."""
    told: set[tuple[str, str]] = field(default_factory=set)
    """Cells whose problem is told already, by row id and column."""
    ragged: set[str] = field(default_factory=set)
    """Ids of rows whose cells may stand in the wrong columns."""
    doubtful_circuits: set[str] = field(default_factory=set)
    """Ids of circuits of which a run lacks its number or an end."""


def read_tags(grid: Grid, header: Header) -> dict[str, str]:
    """Id of each tag of a table whose key is its tag, before the rows are read: references need them."""
    place = next((heading.place for heading in header.headings if heading.field == "tag"), None)
    if place is None:
        return {}
    column = next(heading.column for heading in header.headings if heading.field == "tag")
    tags = (trimmed(cells[place], column) for _, cells in grid.rows if place < len(cells))
    return {tag: row_id(grid.table, tag) for tag in tags if tag}


def read_rows(grid: Grid, header: Header, tags: Tags, faults: Faults) -> Taken:
    """
    Make a row of every line of a table.

    What is wrong with a cell by itself goes to ``faults``, and the row is made without it, so that whatever
    refers to the row still finds it and all problems are told in one go.
    """
    taken = Taken(grid, header)
    alike: Counter[str] = Counter()
    _nameless_columns(grid, header, faults)
    for line, cells in grid.rows:
        values, wrong = _values(grid, header, line, cells, tags)
        is_ragged = len(cells) != len(grid.header)
        row = _row(grid.table, values, alike)
        taken.rows.append(row)
        taken.lines[row.id] = line
        if "circuit_id" in values:
            taken.circuits[row.id] = values["circuit_id"]
        if is_ragged:
            taken.ragged.add(row.id)
            what = f"the row has {len(cells)} cells, the header {len(grid.header)}; accepted: as many as the header"
            grid.fault(faults, what, row=line)
        for heading, what in wrong:
            taken.told.add((row.id, heading.column.name))
            if not is_ragged:
                grid.fault(faults, what, row=line, column=heading.column.name, place=heading.order)
        if grid.table == "runs" and not values.keys() >= {"number", "from_point", "to_point"}:
            taken.doubtful_circuits.add(values.get("circuit_id", ""))
    if grid.table == "readings":
        _resolve_replacements(taken)
    return taken


def _nameless_columns(grid: Grid, header: Header, faults: Faults) -> None:
    for place in header.nameless:
        if any(cells[place].strip() for _, cells in grid.rows if place < len(cells)):
            what = f"column {place + 1} holds cells but has no name; accepted: a name, or an empty column"
            grid.fault(faults, what, row=grid.header_line)


def _values(
    grid: Grid, header: Header, line: int, cells: tuple[str, ...], tags: Tags
) -> tuple[dict[str, Any], list[tuple[Heading, str]]]:
    """Values of the fields of one row, ``typed`` among them, and what is wrong with which cells."""
    texts = {h.field: trimmed(cells[h.place], h.column) for h in header.headings if h.place < len(cells)}
    row_unit = UNIT_OF_QUANTITY.get(texts.get("quantity", ""))
    values: dict[str, Any] = {}
    typed: list[tuple[str, str]] = []
    wrong: list[tuple[Heading, str]] = []
    for heading in header.headings:
        column, name = heading.column, heading.field
        text = texts.get(name, "")
        if (line, heading.place) in grid.unreadable:
            wrong.append((heading, grid.unreadable[line, heading.place]))
        elif not text:
            if column.filled:
                wrong.append((heading, f"is empty; accepted: {accepted(column, row_unit or '')}"))
        elif column.kind in ("reference", "feeds") or name == "to_point":
            values |= _references(name, text, column, tags)
        else:
            unit = row_unit if column.unit == "*" else column.unit
            if unit is None:
                continue  # no unit without a known quantity, which is told in its own cell
            foreign = "" if not heading.unit or is_unit(heading.unit, unit) else heading.unit
            try:
                cell = read_cell(text, column, unit, foreign)
            except RulesError as error:
                wrong.append((heading, str(error)))
                continue
            values[name] = cell.value
            if cell.typed is not None:
                typed.append((name, cell.typed))
    values["typed"] = tuple(sorted(typed))
    return values, wrong


def _references(name: str, text: str, column: Column, tags: Tags) -> dict[str, Any]:
    """The fields that a reference fills."""
    if name == "circuit_id":
        found = tags.find(("circuits",), text)
        return {name: missing(text) if found is None else found.id}
    if name == "replaces_id":
        return {name: missing(text)}  # resolved once all readings are there
    if name == "to_point":
        point, board_id = read_end(text, tags)
        return {"to_point": point, "to_board_id": board_id}
    if column.kind == "feeds":
        return {name: read_feeds(text, column.tables, tags)}
    return {name: read_feed(text, column.tables, tags)}


def _row(table: str, values: Mapping[str, Any], alike: Counter[str]) -> Row:
    """
    One row with its id, derived from what makes its tag, or from the whole row where it has none.

    The n-th row alike has the n-th id, so that the same folder read twice gives the same ids; ``alike``
    counts them.
    """
    key = [values.get(name, default) for name, default in _key_defaults(table)]
    first = row_id(table, *key)
    salt = alike[first]
    alike[first] += 1
    return TABLES[table](id=row_id(table, *key, salt=salt) if salt else first, **values)


@cache
def _key_defaults(table: str) -> tuple[tuple[str, Any], ...]:
    """The fields that a row's id is derived from, with what they are in an empty cell."""
    names = KEY_FIELDS.get(table)
    return tuple(
        (f.name, f.default) for f in fields(TABLES[table]) if f.name != "id" and (names is None or f.name in names)
    )


def _resolve_replacements(taken: Taken) -> None:
    ids: dict[str, str] = {}
    for row in taken.rows:
        assert isinstance(row, Reading)
        if row.tag:
            ids.setdefault(row.tag, row.id)
    for n, row in enumerate(taken.rows):
        assert isinstance(row, Reading)
        if row.replaces_id:
            tag = row.replaces_id.removeprefix("?")
            taken.rows[n] = replace(row, replaces_id=ids.get(tag, row.replaces_id))
