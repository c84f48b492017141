"""
Whether a row would hold together with a new value: asked before it is saved, of the row's neighbourhood alone.

The rules of ``rules.consistency`` look at a whole site; a site of 100,000 circuits takes seconds. What can be
wrong with one field can be seen from the row itself, its circuit with its runs and loads, and what feeds what.
"""

from __future__ import annotations

from dataclasses import replace
from typing import Any

from audit.tui.entry.fields import SITE, Field
from rules.consistency import problems
from rules.errors import RulesError
from rules.index import Index
from rules.record import Board, Circuit, Feed, Load, Row, Run, Site, Source


def complaint_about(field: Field, row: Row | Site, new: dict[str, Any], index: Index) -> str:
    """
    What would be wrong with a field, in one line; empty where nothing is.

    Parameters
    ----------
    field : Field
        The field that is set.
    row : Row or Site
        The row as it is.
    new : dict
        The new values by field.
    """
    changed = replace(row, **new)
    return next(iter(_problems(field, changed, index)), "") or _of_limits(field, changed)


def _of_limits(field: Field, row: Row | Site) -> str:
    """Why a site cannot be judged by the profile that it would name; empty where it can."""
    if field.name != "limits" or not isinstance(row, Site):
        return ""
    from rules import limits  # who judges has it loaded; the first screen does not wait for it

    try:
        limits.of(row)
    except RulesError as error:
        return str(error).replace("\n", "; ")
    return ""


def _problems(field: Field, row: Row | Site, index: Index) -> list[str]:
    site = row if isinstance(row, Site) else _neighbourhood(field.table, row, index)
    if isinstance(row, Site):
        site = Site(**{name: getattr(row, name) for name in _SETTING_FIELDS})
    id_ = "" if field.table == SITE else row.id  # type: ignore[union-attr]
    return [
        problem.text
        for problem in problems(site)
        if (problem.table, problem.row, problem.column) == (field.table, id_, field.column.name)
    ]


_SETTING_FIELDS = (
    "name",
    "address",
    "limits",
    "nominal_voltage_v",
    "ambient_temperature_c",
    "surveyed_by",
    "extent",
    "limitations",
    "notes",
    "prior",
    "own_limits",
    "typed",
)


def _neighbourhood(table: str, row: Row, index: Index) -> Site:
    """A small site that holds a row as it would be, and everything that it could contradict."""
    site = index.site
    feeds = [feed for board in site.boards for feed in board.fed_by]
    feeds += [source.fed_from for source in site.sources if source.fed_from is not None]
    wanted = {feed.id for feed in [*feeds, *_feeds_of(row)] if feed.table == "circuits"}
    wanted |= {row.circuit_id} if isinstance(row, Run | Load) else {row.id}
    circuits = [index.circuits[id_] for id_ in wanted if id_ in index.circuits]
    small = Site(
        name=site.name,
        sources=site.sources,
        boards=site.boards,
        circuits=tuple(circuits),
        runs=tuple(run for circuit in circuits for run in index.runs_of(circuit.id)),
        loads=tuple(load for circuit in circuits for load in index.loads_of(circuit.id)),
        instruments=site.instruments,
        visits=site.visits,
    )
    others = [other if other.id != row.id else row for other in small.table(table)]
    return small.with_rows(table, tuple(others if row in others else [*others, row]))


def _feeds_of(row: Row) -> tuple[Feed, ...]:
    if isinstance(row, Board):
        return row.fed_by
    fed_from = row.fed_from if isinstance(row, Circuit | Source) else None
    return () if fed_from is None else (fed_from,)
