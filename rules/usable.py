"""
What of a record can be computed with, where the record does not hold together.

Intake lets no such record through; a damaged or foreign site file, or two laptops' records combined, may hold one.
``rules.consistency`` says what is wrong with it. Here that is taken out, and nothing is put in its place: a cell that
cannot be is not known, and a row that belongs nowhere is not there. What stays is judged as any other record.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import fields, replace
from typing import Any

from rules.columns import Column, within
from rules.consistency import problems
from rules.index import Index
from rules.problems.cells import cell_complaint
from rules.problems.feeders import feeding
from rules.problems.problem import Problem
from rules.problems.settings import SETTINGS
from rules.record import TABLES, UNIT_OF_QUANTITY, Board, Circuit, Feed, Row, Run, Site, Source, columns

BELONGS_NOWHERE: Mapping[str, tuple[str, ...]] = {
    "runs": ("circuit", "run", "from", "to"),
    "loads": ("circuit",),
    "instruments": ("quantity",),
    "readings": ("circuit", "board", "round", "quantity", "at", "to", "leg", "value", "range"),
}
"""Columns by table; a row with a problem in one of them is left out."""
CONDUCTORS = ("size", "material", "stranding", "parallel", "return", "return_size", "return_material")
"""Columns of a run; with a problem in one of them, it is not known what the run is made of."""

OF_CAPACITY = ("insulation", "grouped")
"""Columns of a run that stay as they are: empty, they would stand for something, while so its capacity is not judged."""


def usable(site: Site, found: Iterable[Problem]) -> Site:
    """
    The part of a record that holds together.

    Parameters
    ----------
    site : Site
        Any record.
    found : iterable of Problem
        What is wrong with it.

    Examples
    --------
    >>> from rules.record import Circuit
    >>> site = Site(name="hut", runs=(Run(id="r", circuit_id="?C1", number=1),))
    >>> usable(site, problems(site)).runs
    ()
    """
    found = tuple(found)
    while found:
        index, wrong = Index(site), _wrong(found)
        kept = {table: tuple(_kept(table, wrong[table], index)) for table in TABLES}
        settings = _mended_settings(site)
        if not settings and all(kept[table] == site.table(table) for table in TABLES):
            break
        site = replace(site, **settings, **kept)  # type: ignore[arg-type]
        found = problems(site)  # what hung on a row that is left out may hang on nothing now
    return site


def _wrong(found: Iterable[Problem]) -> Mapping[str, Mapping[str, set[str]]]:
    """Columns with a problem, by table and row."""
    wrong: dict[str, defaultdict[str, set[str]]] = {table: defaultdict(set) for table in (*TABLES, "site")}
    for problem in found:
        wrong[problem.table][problem.row].add(problem.column)
    return wrong


def _kept(table: str, wrong: Mapping[str, set[str]], index: Index) -> Iterator[Row]:
    """The rows of a table that belong somewhere, without what cannot stand in their cells."""
    left_out = BELONGS_NOWHERE.get(table, ())
    # of two rows with one id the later counts, as in look-ups
    for row in {row.id: row for row in index.site.table(table)}.values():
        columns_wrong = wrong.get(row.id)
        if columns_wrong is None:
            yield row
        elif not columns_wrong.intersection(left_out):
            yield _mended(row, table, columns_wrong, index)


def _mended(row: Row, table: str, wrong: set[str], index: Index) -> Row:
    values: dict[str, Any] = {}
    for name, column in columns(table):
        value = getattr(row, name)
        if column.name not in wrong or column.name in OF_CAPACITY or value is None or value in ("", ()):
            continue
        if column.kind == "feeds":
            values[name] = tuple(feed for feed in value if _leads_somewhere(feed, column, index))
        elif isinstance(value, Feed):
            stays = _leads_somewhere(value, column, index) and not _feeds_itself(row, index)
            values[name] = value if stays else None
        elif column.kind not in ("tag", "point", "reference") and _complaint(value, column, row):
            values[name] = next(f.default for f in fields(row) if f.name == name)
    if isinstance(row, Run) and wrong.intersection(CONDUCTORS):
        values["size"] = ""
    return replace(row, **values)


def _complaint(value: Any, column: Column, row: Row) -> bool:
    unit = UNIT_OF_QUANTITY.get(getattr(row, "quantity", ""))
    return cell_complaint(value, within(column, unit) if unit else column) is not None


def _leads_somewhere(feed: Feed, column: Column, index: Index) -> bool:
    if index.named(feed) is None or feed.table not in column.tables:
        return False
    return not feed.point or (feed.table == "circuits" and feed.point in index.points_of(feed.id))


def _feeds_itself(row: Row, index: Index) -> bool:
    """Whether a source is no converter, or what feeds it leads back to it."""
    if not isinstance(row, Source):
        return False
    seen: set[str] = set()
    above: list[Source | Board | Circuit] = [row]
    while above:
        for fed_by in feeding(above.pop(), index):
            if fed_by.id == row.id:
                return True
            if fed_by.id not in seen:
                seen.add(fed_by.id)
                above.append(fed_by)
    return row.kind != "converter"


def _mended_settings(site: Site) -> dict[str, None]:
    """The settings with a number that cannot be, as not known."""
    return {
        field: None
        for field, column in SETTINGS.values()
        if column.kind == "number"
        and (value := getattr(site, field)) is not None
        and cell_complaint(value, column) is not None
    }
