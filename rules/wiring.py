"""
A site's feeders, boards and circuits as the shape of a network: nodes, branches, ties and shared returns.

Every source, or set of sources in parallel, is a held node; the boards that it feeds are that node. Circuits are trees
from ``bus`` over ``way`` on. What closes a mesh lies beside the trees: a run that ends at an earlier point or on a
board that something else feeds, and a board's second feeder.
"""

from __future__ import annotations

from collections import deque
from dataclasses import dataclass, field

from rules.index import Index
from rules.loads import Drawn, drawn
from rules.nominal import nominal_v
from rules.record import Board, Circuit, Feed, Run, Source
from rules.runs import SHARED


@dataclass(slots=True)
class Wiring:
    """Nodes in the order in which they were reached, with what is known of each; lists of one length."""

    parent: list[int] = field(default_factory=list)
    circuit: list[str] = field(default_factory=list)
    """Id of the circuit whose branch leads to the node; empty for a held node."""
    run: list[str] = field(default_factory=list)
    """Id of the run that leads to it; empty for a device and for a held node."""
    ties: list[tuple[int, int]] = field(default_factory=list)
    """Pairs of nodes that are one: the far end of a closing run and where it ends, a second feeder and its board."""
    shared: dict[str, list[int]] = field(default_factory=dict)
    """By name of a shared return, the nodes to which its runs lead."""
    node_of: dict[tuple[str, str], int] = field(default_factory=dict)
    """Node by table and id, of sources and boards."""
    nodes_of: dict[str, dict[str, int]] = field(default_factory=dict)
    """By circuit id: node by point, ``bus`` included; a circuit that nothing feeds is not in it."""
    sources: dict[int, tuple[Source, ...]] = field(default_factory=dict)
    """What holds each held node."""
    loads: list[tuple[int, Drawn]] = field(default_factory=list)
    unknown: dict[int, str] = field(default_factory=dict)
    """A load at a node whose figure is not known."""
    takes: dict[str, int] = field(default_factory=dict)
    """By converter id: the node at which it takes its power."""

    def node(self, parent: int, circuit: str = "", run: str = "") -> int:
        self.parent.append(parent)
        self.circuit.append(circuit)
        self.run.append(run)
        return len(self.parent) - 1


def wiring_of(index: Index) -> Wiring:
    """Every source, board and circuit that something feeds, in time linear in the rows."""
    return _Builder(index).build()


class _Builder:
    def __init__(self, index: Index) -> None:
        self._index = index
        self._wiring = Wiring()
        self._held: dict[tuple[str, ...], int] = {}
        self._closing: list[tuple[Circuit, Run, int]] = []
        """Circuit, run and the node at the run's own end."""
        self._queue: deque[tuple[int, Board | Source]] = deque()

    def build(self) -> Wiring:
        index, wiring = self._index, self._wiring
        for source in index.site.sources:
            wiring.node_of["sources", source.id] = node = self._held_by((source,))
            self._queue.append((node, source))
        for board in index.site.boards:
            sources = tuple(
                index.sources[feed.id] for feed in board.fed_by if feed.table == "sources" and feed.id in index.sources
            )
            if sources:
                self._place(board, self._held_by(sources))
        self._walk()
        for board in index.site.boards:
            # the first of its feeders leads nowhere, another one does: the board hangs on that
            nodes = [at for feed in board.fed_by if (at := self._node_at(feed)) is not None]
            if ("boards", board.id) not in wiring.node_of and nodes:
                self._place(board, nodes[0])
                self._walk()
        self._tie()
        for source in index.site.sources:
            if source.fed_from is not None and (taken_at := self._node_at(source.fed_from)) is not None:
                wiring.takes[source.id] = taken_at
        return wiring

    def _held_by(self, sources: tuple[Source, ...]) -> int:
        key = tuple(sorted({source.id for source in sources}))
        if key not in self._held:
            self._held[key] = node = self._wiring.node(-1)
            self._wiring.sources[node] = sources
        return self._held[key]

    def _place(self, board: Board, node: int) -> None:
        self._wiring.node_of["boards", board.id] = node
        self._queue.append((node, board))

    def _walk(self) -> None:
        """Follow the feeders down from what has been placed."""
        index, wiring = self._index, self._wiring
        while self._queue:
            node, feeder = self._queue.popleft()
            for circuit in index.circuits_of(feeder.id):
                if circuit.id in wiring.nodes_of:
                    continue
                self._add(node, circuit)
                for fed in index.fed_by_circuit(circuit.id):
                    if not isinstance(fed, Board) or ("boards", fed.id) in wiring.node_of:
                        continue
                    if fed.fed_by[0].id == circuit.id and (below := self._node_at(fed.fed_by[0])) is not None:
                        self._place(fed, below)

    def _node_at(self, feed: Feed) -> int | None:
        points = self._wiring.nodes_of.get(feed.id)
        return None if points is None else points.get(feed.point or self._index.last_point(feed.id))

    def _add(self, bus: int, circuit: Circuit) -> None:
        index, wiring = self._index, self._wiring
        points = wiring.nodes_of[circuit.id] = {"bus": bus, "way": wiring.node(bus, circuit.id)}
        for run in index.runs_of(circuit.id):
            start, end = points.get(run.from_point), index.end_of(run)
            if start is None or run.from_point == end:
                continue  # does not hold together: RC02 says so
            node = wiring.node(start, circuit.id, run.id)
            if run.return_conductor.startswith(SHARED):
                wiring.shared.setdefault(run.return_conductor.removeprefix(SHARED), []).append(node)
            if end in points or (run.to_board_id and not self._feeds(circuit, end, run.to_board_id)):
                self._closing.append((circuit, run, node))
            points.setdefault(end, node)
        nominal = nominal_v(circuit, index)
        for load in index.loads_of(circuit.id):
            at = points.get(load.point)
            if at is None:
                continue
            draws = drawn(load, nominal)
            if draws is None or min(draws.current_a, draws.power_w, draws.conductance_s) < 0:
                wiring.unknown[at] = f"{load.tag} on {circuit.tag}"
            else:
                wiring.loads.append((at, draws))

    def _feeds(self, circuit: Circuit, point: str, board_id: str) -> bool:
        """Whether a board is fed by this circuit at this point: then the run leads to it, and closes nothing."""
        board = self._index.boards.get(board_id)
        if board is None or not board.fed_by:
            return False
        feed = board.fed_by[0]
        return feed.id == circuit.id and (feed.point or self._index.last_point(circuit.id)) == point

    def _tie(self) -> None:
        index, wiring = self._index, self._wiring
        for circuit, run, node in self._closing:
            at = wiring.nodes_of[circuit.id].get(run.to_point)
            if run.to_board_id:
                at = wiring.node_of.get(("boards", run.to_board_id))
            if at is not None:
                wiring.ties.append((node, at))
        for board in index.site.boards:
            at = wiring.node_of.get(("boards", board.id))
            for feed in board.fed_by if at is not None and len(board.fed_by) > 1 else ():
                second = self._node_at(feed) if feed.table == "circuits" else None
                if second is not None and at is not None and second != at:
                    wiring.ties.append((second, at))
