"""The nominal voltage of a circuit, wherever it is recorded."""

from __future__ import annotations

from rules.index import Index
from rules.record import Board, Circuit, Source


def nominal_v(circuit: Circuit, index: Index) -> float | None:
    """A circuit's nominal voltage: its own, its board's, that of what feeds the board, else the site's. [V]"""
    seen: set[str] = set()
    here: Circuit | Board | Source | None = circuit
    while here is not None and here.id not in seen:
        seen.add(here.id)
        if here.nominal_voltage_v is not None:
            return here.nominal_voltage_v
        here = _above(here, index)
    return index.site.nominal_voltage_v


def _above(row: Circuit | Board | Source, index: Index) -> Circuit | Board | Source | None:
    feeds = row.fed_by if isinstance(row, Board) else (row.fed_from,)
    feed = feeds[0] if feeds else None
    if feed is None:
        return None
    return index.sources.get(feed.id) or index.boards.get(feed.id) or index.circuits.get(feed.id)
