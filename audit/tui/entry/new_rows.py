"""A new row with the least asked: where it hangs and what it is called follow from where the cursor stands."""

from __future__ import annotations

import re

from rules.index import Index
from rules.record import Board, Circuit, Feed, Instrument, Load, Run, Source

TAGGED = ("sources", "boards", "circuits", "loads", "instruments")
"""Tables whose new rows are asked for a tag."""


def next_tag(known: list[str], first: str) -> str:
    """
    The tag after the last one, counted up in its last number; ``first`` where there is none.

    >>> next_tag(["DB1-01", "DB1-02"], "DB1-01"), next_tag([], "DB1-01"), next_tag(["spare"], "DB1-01")
    ('DB1-03', 'DB1-01', 'DB1-01')
    """
    for tag in reversed(known):
        found = re.fullmatch(r"(.*?)([0-9]{1,9})", tag)
        if found:
            width = len(found[2])
            numbers = range(int(found[2]) + 1, int(found[2]) + len(known) + 2)
            return next(fresh for fresh in (f"{found[1]}{number:0{width}}" for number in numbers) if fresh not in known)
    return first if first not in known else ""


def tag_for(table: str, index: Index, feed: Feed | None, circuit_id: str) -> str:
    """A tag to begin with; it can be typed over."""
    site = index.site
    if table == "circuits" and feed is not None:
        row = index.named(feed)
        siblings = [circuit.tag for circuit in index.circuits_of(feed.id)]
        proposed = next_tag(siblings, f"{row.tag}-01" if row is not None else "")
        return proposed if proposed not in {circuit.tag for circuit in site.circuits} else ""
    if table == "loads":
        return next_tag([load.tag for load in index.loads_of(circuit_id)], "load 1")
    known = {
        "circuits": [row.tag for row in site.circuits],
        "boards": [row.tag for row in site.boards],
        "sources": [row.tag for row in site.sources],
        "instruments": [row.tag for row in site.instruments],
    }[table]
    firsts = {"circuits": "C1", "boards": "DB1", "sources": "PSU-1", "instruments": "DMM-1"}
    return next_tag(known, firsts[table])


def new_source(tag: str) -> Source:
    """A source of which nothing else is known."""
    return Source(id="", tag=tag)


def new_board(tag: str, index: Index) -> Board:
    """A board on the source, where there is one alone."""
    sources = index.site.sources
    feeds = (Feed("sources", sources[0].id),) if len(sources) == 1 else ()
    return Board(id="", tag=tag, fed_by=feeds)


def new_circuit(tag: str, feed: Feed | None) -> Circuit:
    """A circuit on a board or source."""
    return Circuit(id="", tag=tag, fed_from=feed)


def new_run(index: Index, circuit_id: str) -> Run:
    """A run from the circuit's last point to the next ``pN``."""
    runs = index.runs_of(circuit_id)
    points = index.points_of(circuit_id)
    end = next(point for point in (f"p{n}" for n in range(1, len(points) + 2)) if point not in points)
    start = index.last_point(circuit_id)
    number = runs[-1].number + 1 if runs else 1
    return Run(
        id="",
        circuit_id=circuit_id,
        number=number,
        from_point="way" if start.startswith("board:") else start,
        to_point=end,
    )


def new_load(index: Index, circuit_id: str, tag: str) -> Load:
    """A load at the first point behind ``way`` that has none, else at the last one."""
    used = {load.point for load in index.loads_of(circuit_id)}
    ends = [point for point in index.points_of(circuit_id)[1:] if not point.startswith("board:")]
    free = [point for point in ends if point not in used]
    return Load(id="", circuit_id=circuit_id, point=(free or ends or ["way"])[-1], tag=tag)


def new_instrument(index: Index, tag: str) -> Instrument:
    """A meter for volts, or for amperes where one for volts has the tag already."""
    taken = {row.quantity for row in index.ranges_of(tag)}
    return Instrument(id="", tag=tag, quantity="voltage" if "voltage" not in taken else "current")


def feed_at(index: Index, row_id: str) -> Feed | None:
    """What a new circuit hangs on: the board at the cursor, that of the circuit there, or the only one there is."""
    if row_id in index.boards:
        return Feed("boards", row_id)
    if row_id in index.sources:
        return Feed("sources", row_id)
    if row_id in index.circuits and (feed := index.circuits[row_id].fed_from) is not None:
        return feed
    site = index.site
    if len(site.boards) == 1:
        return Feed("boards", site.boards[0].id)
    return Feed("sources", site.sources[0].id) if not site.boards and len(site.sources) == 1 else None
