"""
A site as a network: which node is what, which branch is which run, and its voltages at design.

Sources, boards and circuits become one forest. What cannot be computed (an unknown length, a load
without a figure) is left out of the sums and remembered: a voltage below it is then known only to
be *at most* what is computed, and ``gap_of`` says why.
"""

from __future__ import annotations

from collections import deque
from collections.abc import Iterator
from dataclasses import dataclass, field

import numpy as np

from rules.calc.device import device_resistance_ohm
from rules.calc.radial import Integers, Radial, Solved, solve
from rules.index import Index
from rules.limits import Limits
from rules.loads import Drawn, drawn
from rules.record import Board, Circuit, Feed, Source
from rules.runs import RunFigures

GAP_SEVERAL_FEEDS = "{} is fed from several sides, which this version does not compute"
GAP_NOTHING_FEEDS = "nothing in the record feeds {}"
GAP_SOURCE = "the voltage of {} is not known"
GAP_LOWEST = "the lowest voltage of {} is not known"
GAP_MESH = "{} closes a mesh, which this version does not compute"
GAP_LOAD = "what {} draws is not known"
NESTED_CONVERTERS = 12
"""Passes over the site until the power that converters take has settled."""


@dataclass(slots=True)
class _Draft:
    """The forest while it grows."""

    parent: list[int] = field(default_factory=list)
    cold: list[float] = field(default_factory=list)
    hot: list[float] = field(default_factory=list)
    held: list[float] = field(default_factory=list)
    held_lowest: list[float] = field(default_factory=list)
    gap: list[str] = field(default_factory=list)
    gap_lowest: list[str] = field(default_factory=list)
    loads: list[tuple[int, Drawn]] = field(default_factory=list)
    unknown: dict[int, str] = field(default_factory=dict)
    run: list[str] = field(default_factory=list)
    circuit: list[str] = field(default_factory=list)

    def node(
        self, parent: int, cold: float = 0.0, hot: float = 0.0, gap: str = "", circuit: str = "", run: str = ""
    ) -> int:
        self.parent.append(parent)
        self.circuit.append(circuit)
        self.run.append(run)
        self.cold.append(cold)
        self.hot.append(hot)
        self.held.append(0.0)
        self.held_lowest.append(0.0)
        self.gap.append(gap)
        self.gap_lowest.append(gap)
        return len(self.parent) - 1

    def held_node(self, tag: str, working: float | None, lowest: float | None, gap: str = "") -> int:
        node = self.node(-1)
        self.held[node] = working if working is not None else 0.0
        self.held_lowest[node] = lowest if lowest is not None else self.held[node]
        self.gap[node] = gap or (GAP_SOURCE.format(tag) if working is None else "")
        self.gap_lowest[node] = self.gap[node] or (GAP_LOWEST.format(tag) if lowest is None else "")
        return node


class Network:
    """The solved forest of a site; build with ``network_of``."""

    def __init__(self, draft: _Draft, node_of: dict[tuple[str, str], int], nodes_of: dict[str, dict[str, int]]) -> None:
        self.node_of = node_of
        """Node by table and id, of sources and boards."""
        self.nodes_of = nodes_of
        """By circuit id: node by point, ``bus`` included; a circuit that nothing feeds is not in it."""
        self.parent: Integers = np.array(draft.parent, dtype=np.int64)
        self.cold_ohm = np.array(draft.cold)
        self.hot_ohm = np.array(draft.hot)
        self.held_v = np.array(draft.held)
        self.held_lowest_v = np.array(draft.held_lowest)
        self.gap = draft.gap
        self.gap_lowest = draft.gap_lowest
        self.unknown_load = draft.unknown
        self.run_at = draft.run
        """Id of the run that arrives at each node; empty for a device and for a held node."""
        self.circuit_at = draft.circuit
        """Id of the circuit whose branch arrives at each node."""
        self._below = self._unknown_below()
        self.design: Solved
        """The source at ``working``, the recorded temperature, healthy joints."""
        self.lowest: Solved
        """The same record with the source at ``lowest`` and hot conductors."""

    def way_up(self, node: int, until: int = -1) -> Iterator[int]:
        """Branches from a node towards its source, as far as the node ``until`` (itself left out)."""
        while node >= 0 and node != until:
            yield node
            node = int(self.parent[node])

    def gap_of(self, node: int, until: int = -1, lowest: bool = False) -> str:
        """Why the voltage between two nodes is not known exactly; empty where it is."""
        gaps = self.gap_lowest if lowest else self.gap
        for branch in self.way_up(node, until):
            if gaps[branch]:
                return gaps[branch]
            if self.parent[branch] >= 0 and self.cold_ohm[branch] > 0 and branch in self._below:
                return GAP_LOAD.format(self._below[branch])
        return ""

    def design_current_a(self, node: int) -> float | None:
        """Current in the branch to a node at design; ``None`` where a load beneath it is not known. [A]"""
        current = float(self.design.current_a[node])
        return None if node in self._below or np.isnan(current) else current

    def _unknown_below(self) -> dict[int, str]:
        """By branch: one load beneath it whose figure is not known."""
        below: dict[int, str] = {}
        for node, name in self.unknown_load.items():
            for branch in self.way_up(node):
                if branch in below:
                    break
                below[branch] = name
        return below


def network_of(index: Index, figures: dict[str, RunFigures], limits: Limits) -> Network:
    """Build a site's forest and solve it at design and at the lowest source voltage."""
    draft = _Draft()
    node_of: dict[tuple[str, str], int] = {}
    nodes_of: dict[str, dict[str, int]] = {}
    queue: deque[tuple[int, Board | Source]] = deque()
    for source in index.site.sources:
        node = draft.held_node(source.tag, source.working_or_nominal_v, source.lowest_voltage_v)
        node_of["sources", source.id] = node
        queue.append((node, source))
    for board in index.site.boards:
        if len(board.fed_by) > 1 or (board.fed_by and board.fed_by[0].table == "sources"):
            node_of["boards", board.id] = node = _board_node(draft, board, index)
            queue.append((node, board))
    while queue:
        node, feeder = queue.popleft()
        for circuit in index.circuits_of(feeder.id):
            if circuit.id in nodes_of:
                continue
            nodes_of[circuit.id] = points = _add_circuit(draft, node, circuit, index, figures, limits)
            for fed in index.fed_by_circuit(circuit.id):
                if isinstance(fed, Board) and len(fed.fed_by) == 1 and ("boards", fed.id) not in node_of:
                    node_of["boards", fed.id] = below = points.get(_point(fed.fed_by[0], index), points["way"])
                    queue.append((below, fed))
    network = Network(draft, node_of, nodes_of)
    _solve(network, draft, index)
    return network


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


def _point(feed: Feed, index: Index) -> str:
    return feed.point or index.last_point(feed.id)


def _board_node(draft: _Draft, board: Board, index: Index) -> int:
    """A busbar held by its sources: working of the highest, lowest of the battery."""
    sources = [index.sources[feed.id] for feed in board.fed_by if feed.id in index.sources]
    if len(sources) < len(board.fed_by):
        return draft.held_node(board.tag, None, None, GAP_SEVERAL_FEEDS.format(board.tag))
    working = [volts for source in sources if (volts := source.working_or_nominal_v) is not None]
    batteries = [source for source in sources if source.kind == "battery"] or sources
    lowest = [source.lowest_voltage_v for source in batteries if source.lowest_voltage_v is not None]
    names = " + ".join(source.tag for source in sources)
    return draft.held_node(names, max(working, default=None), min(lowest, default=None))


def _add_circuit(
    draft: _Draft, bus: int, circuit: Circuit, index: Index, figures: dict[str, RunFigures], limits: Limits
) -> dict[str, int]:
    device = device_ohm(circuit, limits) or 0.0
    points = {"bus": bus, "way": draft.node(bus, device, device, circuit=circuit.id)}
    for run in index.runs_of(circuit.id):
        start = points.get(run.from_point)
        end = index.end_of(run)
        if start is None or end in points or run.to_board_id:
            # a mesh leaves every voltage of the circuit open: the current may go either way
            draft.gap[points["way"]] = draft.gap_lowest[points["way"]] = GAP_MESH.format(run.name)
            continue
        known = figures[run.id]
        points[end] = draft.node(start, known.loop_ohm, known.loop_hot_ohm, known.gap, circuit.id, run.id)
    nominal = nominal_v(circuit, index)
    for load in index.loads_of(circuit.id):
        node = points.get(load.point)
        if node is None:
            continue
        draws = drawn(load, nominal)
        if draws is None:
            draft.unknown[node] = f"{load.tag} on {circuit.tag}"
        else:
            draft.loads.append((node, draws))
    return points


def device_ohm(circuit: Circuit, limits: Limits) -> float | None:
    """Typical resistance of a circuit's device; ``None`` where it is not recorded: it has no figure of its own. [ohm]"""
    if not circuit.device:
        return None
    return device_resistance_ohm(
        circuit.device, circuit.rated_current_a, circuit.device_poles or 1, limits["device_doubt.typical_share"]
    )


def _solve(network: Network, draft: _Draft, index: Index) -> None:
    """Both states; converters take the power of what they feed, over their efficiency."""
    size = len(network.parent)
    current, power, conductance = np.zeros(size), np.zeros(size), np.zeros(size)
    for node, draws in draft.loads:
        current[node] += draws.current_a
        power[node] += draws.power_w
        conductance[node] += draws.conductance_s
    converters = [(source, _taken_at(source, index, network)) for source in index.site.sources]
    states = []
    for resistance, held in ((network.cold_ohm, network.held_v), (network.hot_ohm, network.held_lowest_v)):
        # a converter holds its own output: it does not follow the battery down
        held = held.copy()
        for source, taken_at in converters:
            if taken_at is not None:
                out = network.node_of["sources", source.id]
                held[out] = network.held_v[out]
        from_converters = np.zeros(size)
        for _ in range(NESTED_CONVERTERS):
            solved = solve(Radial(network.parent, current, power + from_converters, conductance), resistance, held)
            fresh = np.zeros(size)
            for source, taken_at in converters:
                if taken_at is None:
                    continue
                out = network.node_of["sources", source.id]
                given = held[out] * np.nan_to_num(solved.current_a[out])
                fresh[taken_at] += given / ((source.efficiency_percent or 100.0) / 100)
            if np.allclose(fresh, from_converters, rtol=1e-12, atol=1e-12):
                break
            from_converters = fresh
        states.append(solved)
    network.design, network.lowest = states


def _taken_at(source: Source, index: Index, network: Network) -> int | None:
    """The node at which a converter takes its power."""
    if source.fed_from is None or source.fed_from.id not in network.nodes_of:
        return None
    return network.nodes_of[source.fed_from.id].get(_point(source.fed_from, index))
