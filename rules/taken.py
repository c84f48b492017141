"""The readings that count of every place of a site, for rules about meters."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import dataclass

from rules.case import CircuitCase
from rules.context import Context
from rules.record import Board, Circuit, Reading, Source
from rules.rounds import judged, visit_of
from rules.rule import BoardCase

MOST_SAID = 4
"""Tags that a sentence names."""


@dataclass(frozen=True, slots=True)
class Taken:
    """What was read on one place on the visit that it is judged on; replaced readings are left out."""

    place: Circuit | Board | Source
    readings: tuple[Reading, ...]


def taken_on(case: CircuitCase | BoardCase) -> tuple[Reading, ...]:
    """What was read on a circuit or busbar."""
    return case.readings if isinstance(case, CircuitCase) else _on_busbar(case.row, case.context)


def taken(context: Context) -> Iterator[Taken]:
    """Everything that was read: on sources and boards, then on circuits, in walking order."""
    index = context.index
    busbars: tuple[Board | Source, ...] = (*index.walked_sources, *index.walked_boards)
    for place in busbars:
        if rows := _on_busbar(place, context):
            yield Taken(place, rows)
    for circuit in index.walked_circuits:
        side = context.measured.get(circuit.id)
        if side is not None and side.readings:
            yield Taken(circuit, side.readings)


def _on_busbar(place: Board | Source, context: Context) -> tuple[Reading, ...]:
    visit = visit_of(place.id, context.index, context.visit_ranks)
    rows = judged(context.index.readings_of(place.id), context.index)
    return tuple(row for row in rows if row.visit_or_default == visit)


def day_of(reading: Reading, context: Context) -> str:
    """The day on which a reading was taken, by itself or by its visit; empty where neither is recorded."""
    if reading.taken_at:
        return reading.taken_at[:10]
    return next((visit.date for visit in context.site.visits if visit.tag == reading.visit_or_default), "")


def some(tags: Iterable[str]) -> str:
    """
    A few tags, and how many more there are.

    >>> some(["A", "B", "A"]), some(["A"]), some(["A", "B", "C", "D", "E", "F"])
    ('A and B', 'A', 'A, B, C, D and 2 more')
    """
    each = list(dict.fromkeys(tags))
    if len(each) > MOST_SAID:
        return f"{', '.join(each[:MOST_SAID])} and {len(each) - MOST_SAID} more"
    return " and ".join(filter(None, (", ".join(each[:-1]), each[-1]))) if each else ""
