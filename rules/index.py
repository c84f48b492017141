"""Look-ups over one site: what belongs to what, and in which order it is walked."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Callable, Collection, Iterable, Mapping
from copy import copy
from typing import TypeVar

from rules.record import Board, Circuit, Feed, Instrument, Load, Reading, Row, Run, Site, Source

R = TypeVar("R", bound=Row)


class Index:
    """
    Everything that is asked of a site again and again, built once in time linear in its rows.

    It holds for any record, also one that does not hold together: what is asked about an id that
    names nothing is empty. Of two rows with one id, which only a damaged file has, the later counts.

    Examples
    --------
    >>> site = Site(
    ...     name="hut",
    ...     circuits=(Circuit(id="c", tag="C1"),),
    ...     runs=(
    ...         Run(id="r2", circuit_id="c", number=2, from_point="p1", to_point="p2"),
    ...         Run(id="r1", circuit_id="c", number=1, from_point="way", to_point="p1"),
    ...     ),
    ... )
    >>> index = Index(site)
    >>> index.points_of("c"), index.last_point("c")
    (('way', 'p1', 'p2'), 'p2')
    """

    site: Site
    sources: dict[str, Source]
    """Sources by id."""
    boards: dict[str, Board]
    """Boards by id."""
    circuits: dict[str, Circuit]
    """Circuits by id."""
    readings: dict[str, Reading]
    """Readings by id, replaced ones too."""
    walked_sources: tuple[Source, ...]
    """Sources in walking order."""
    walked_boards: tuple[Board, ...]
    """Boards in walking order."""
    walked_circuits: tuple[Circuit, ...]
    """
    Circuits in walking order: under the sources, then under the boards that feed them, each by
    ``order``, then by row; last those that nothing in the record feeds.
    """
    replaced: frozenset[str]
    """Ids of the readings that another one replaces; they are never judged."""

    def __init__(self, site: Site) -> None:
        self.site = site
        self.sources = {row.id: row for row in site.sources}
        self.boards = {row.id: row for row in site.boards}
        self.circuits = {row.id: row for row in site.circuits}
        self._feeding: dict[str, Mapping[str, Source | Board | Circuit]] = {
            "sources": self.sources,
            "boards": self.boards,
            "circuits": self.circuits,
        }
        self.readings = {row.id: row for row in site.readings}
        self.replaced = frozenset(row.replaces_id for row in site.readings if row.replaces_id)
        self._runs = _grouped(sorted(site.runs, key=lambda run: run.number), lambda run: run.circuit_id)
        self._loads = _grouped(site.loads, lambda load: load.circuit_id)
        self._readings = _grouped(site.readings, _place_of)
        self._ranges = _grouped(site.instruments, lambda row: row.tag)
        self._fed_by_circuit = self._what_circuits_feed()
        self._points = {circuit_id: self._walk(runs) for circuit_id, runs in self._runs.items()}
        self.walked_sources = site.sources  # the format gives sources no ``order``
        self.walked_boards = tuple(sorted(site.boards, key=_order))
        self._circuits = _grouped(
            sorted(site.circuits, key=_order), lambda row: row.fed_from.id if row.fed_from is not None else ""
        )
        self.walked_circuits = self._walked_circuits()

    def with_readings(self, site: Site, changed: Collection[str]) -> Index:
        """
        The index of a site that differs from this one's in some readings alone: as ``Index(site)``, and quick.

        Parameters
        ----------
        site : Site
            The site as it is now.
        changed : collection of str
            Ids of the readings that were added, changed or removed.
        """
        index = copy(self)
        index.site = site
        index.readings = {row.id: row for row in site.readings}
        index.replaced = frozenset(row.replaces_id for row in site.readings if row.replaces_id)
        places = {_place_of(known[id_]) for id_ in changed for known in (self.readings, index.readings) if id_ in known}
        there = _grouped((row for row in site.readings if _place_of(row) in places), _place_of)
        index._readings = {place: rows for place, rows in self._readings.items() if place not in places} | there
        return index

    def named(self, feed: Feed) -> Source | Board | Circuit | None:
        """What a reference names; ``None`` where it names nothing."""
        return self._feeding.get(feed.table, {}).get(feed.id)

    def runs_of(self, circuit_id: str) -> tuple[Run, ...]:
        """The runs of a circuit by number."""
        return self._runs.get(circuit_id, ())

    def loads_of(self, circuit_id: str) -> tuple[Load, ...]:
        """The loads of a circuit in the order of their rows."""
        return self._loads.get(circuit_id, ())

    def readings_of(self, place_id: str) -> tuple[Reading, ...]:
        """The readings on a circuit, or on the busbar of a board or source; replaced ones too."""
        return self._readings.get(place_id, ())

    def ranges_of(self, instrument: str) -> tuple[Instrument, ...]:
        """The rows of an instrument, by its tag: one for each range used."""
        return self._ranges.get(instrument, ())

    def circuits_of(self, feed_id: str) -> tuple[Circuit, ...]:
        """The circuits that a board or source feeds, by ``order``, then by row."""
        return self._circuits.get(feed_id, ())

    def fed_by_circuit(self, circuit_id: str) -> tuple[Board | Source, ...]:
        """The boards, then the converters, that a circuit feeds at any of its points."""
        return self._fed_by_circuit.get(circuit_id, ())

    def points_of(self, circuit_id: str) -> tuple[str, ...]:
        """``way``, then the end of every run by the runs' numbers, each once."""
        return self._points.get(circuit_id, ("way",))

    def last_point(self, circuit_id: str) -> str:
        """Where the highest-numbered run ends; ``way`` of a circuit without runs."""
        runs = self.runs_of(circuit_id)
        return self.end_of(runs[-1]) if runs else "way"

    def end_of(self, run: Run) -> str:
        """The point where a run ends, ``board:TAG`` where it closes a mesh on a board."""
        if not run.to_board_id:
            return run.to_point
        board = self.boards.get(run.to_board_id)
        return "board:" + (board.tag if board is not None else run.to_board_id.removeprefix("?"))

    def _walk(self, runs: Iterable[Run]) -> tuple[str, ...]:
        return tuple(dict.fromkeys(["way", *(self.end_of(run) for run in runs)]))

    def _what_circuits_feed(self) -> dict[str, tuple[Board | Source, ...]]:
        fed: dict[str, list[Board | Source]] = defaultdict(list)
        for board in self.site.boards:
            for feed in board.fed_by:
                if feed.table == "circuits":
                    fed[feed.id].append(board)
        for source in self.site.sources:
            if source.fed_from is not None:
                fed[source.fed_from.id].append(source)
        return {id_: tuple(rows) for id_, rows in fed.items()}

    def _walked_circuits(self) -> tuple[Circuit, ...]:
        feeds = [row.id for row in (*self.walked_sources, *self.walked_boards)]
        walked = [circuit for id_ in dict.fromkeys(feeds) for circuit in self.circuits_of(id_)]
        known = set(feeds)
        stray = [row for id_, rows in self._circuits.items() if id_ not in known for row in rows]
        return tuple(walked + sorted(stray, key=_order))


def _order(row: Board | Circuit) -> float:
    """Place in the walk; rows without ``order`` follow those with one. Sorting is stable: then by row."""
    return float("inf") if row.walk_order is None else row.walk_order


def _place_of(reading: Reading) -> str:
    if reading.circuit_id or reading.board is None:
        return reading.circuit_id
    return reading.board.id


def _grouped(rows: Iterable[R], key: Callable[[R], str]) -> dict[str, tuple[R, ...]]:
    groups: dict[str, list[R]] = defaultdict(list)
    for row in rows:
        groups[key(row)].append(row)
    return {name: tuple(group) for name, group in groups.items()}
