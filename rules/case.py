"""What a rule is given: the record, rounds, solved points and limits of one circuit, computed beforehand."""

from __future__ import annotations

import math
import re
from collections import Counter, defaultdict
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from rules.assessment import Drop
from rules.calc.doubt import total
from rules.consistency import Problem
from rules.errors import MissingData
from rules.impossible import impossible
from rules.index import Index
from rules.limits import Limits
from rules.network import GAP_NOTHING_FEEDS, Network, device_ohm, nominal_v
from rules.record import Circuit, Figure, Load, Reading, Run, Site
from rules.rounds import Round, Tree, drop_of, judged, rounds_of, temperature_read, visit_of
from rules.runs import Carrying, RunFigures, record_variance

RUN = re.compile(r"run \d+")

GAP_COLLAPSE = "the loads behind this source cannot be supplied: the voltage collapses"


@dataclass(frozen=True, slots=True)
class Context:
    """A site prepared for judging: solved, indexed, its limits resolved."""

    site: Site
    limits: Limits
    index: Index
    figures: Mapping[str, RunFigures]
    """Of every run, by id."""
    network: Network
    visit_ranks: Mapping[str, tuple[float, str, int]]
    problems: tuple[Problem, ...]


@dataclass(frozen=True, slots=True)
class LoadPoint:
    """A load's voltages at design and at the lowest source voltage, both as recorded."""

    load: Load
    drop_v: float
    """From the board that feeds the circuit, at design; at least this where ``gap`` says why. [V]"""
    drop_u: float
    gap: str
    total_drop_v: float
    """From the source's terminals. [V]"""
    total_drop_u: float
    total_gap: str
    design_v: float
    lowest_v: float
    """With the source at its lowest and hot conductors; at most this where ``lowest_gap`` says why. [V]"""
    lowest_u: float
    lowest_gap: str
    source_lowest_v: float
    collapsed: bool
    collapsed_lowest: bool
    read: tuple[tuple[str, Figure], ...]
    """Voltage read at its point, by round."""


@dataclass(frozen=True, slots=True)
class CircuitCase:
    """One circuit for the rules ``about="circuit"``."""

    context: Context
    circuit: Circuit
    nominal_v: float | None
    allowed_drop_percent: float
    runs: tuple[Run, ...]
    loads: tuple[LoadPoint, ...]
    visit: str
    rounds: tuple[Round, ...]
    tree: Tree
    drop: Drop | None
    drop_gap: str
    """Why there is no drop; empty where there is one."""
    unused: tuple[str, ...] = ()
    """Readings of the visit that nothing here makes use of."""

    @property
    def tag(self) -> str:
        return self.circuit.tag

    @property
    def limits(self) -> Limits:
        return self.context.limits


def case_of(context: Context, circuit: Circuit, readings: Sequence[Reading] | None = None) -> CircuitCase:
    """
    Gather what the rules need about one circuit.

    ``readings``, where given, stand in for the circuit's readings in the record: what is being typed.
    """
    index, limits = context.index, context.limits
    if readings is None:
        visit = visit_of(circuit.id, index, context.visit_ranks) or ""
        of_visit = [r for r in judged(index.readings_of(circuit.id), index) if r.visit_or_default == visit]
    else:
        of_visit = list(readings)
        visit = of_visit[-1].visit_or_default if of_visit else ""
    tree = _tree(context, circuit, of_visit)
    nominal = nominal_v(circuit, index)
    rounds = rounds_of(of_visit, tree, index, limits)
    drop, gap = None, "nothing was read" if not of_visit else ""
    if of_visit:
        against = {this.name: impossible(this, tree, nominal, limits) for this in rounds}
        possible = [this for this in rounds if not against[this.name]]
        try:
            if rounds and not possible:
                raise MissingData(against[rounds[0].name])
            drop = drop_of(possible, tree, limits)
        except MissingData as error:
            gap = str(error)
    allowed = circuit.allowed_drop_percent
    return CircuitCase(
        context=context,
        circuit=circuit,
        nominal_v=nominal,
        allowed_drop_percent=limits["drop.allowed_percent"] if allowed is None else allowed,
        runs=index.runs_of(circuit.id),
        loads=tuple(_load_point(context, circuit, load, rounds) for load in index.loads_of(circuit.id)),
        visit=visit,
        rounds=rounds,
        tree=tree,
        drop=drop,
        drop_gap=gap,
        unused=tuple(dict.fromkeys(_name(row) for row in of_visit if not _is_used(row, rounds))),
    )


def _is_used(reading: Reading, rounds: Sequence[Round]) -> bool:
    """Whether a reading enters a voltage, a current, a drop over both legs or a conductor's temperature."""
    this = next(round_ for round_ in rounds if round_.name == reading.round)
    if reading.quantity == "voltage":
        return reading.at in this.volts
    if reading.quantity == "drop":
        return (reading.at, reading.to) in this.direct
    if reading.quantity == "temperature":
        return bool(RUN.fullmatch(reading.at))
    return reading.quantity == "current"


def _name(reading: Reading) -> str:
    leg = f" {reading.leg}" if reading.leg and reading.leg != "both" else ""
    return f"{reading.quantity} at {reading.at}{f' to {reading.to}' if reading.to else ''}{leg}"


def _tree(context: Context, circuit: Circuit, readings: Sequence[Reading]) -> Tree:
    index, limits = context.index, context.limits
    runs = index.runs_of(circuit.id)
    nodes = context.network.nodes_of.get(circuit.id, {})
    ends: dict[str, Run] = {}
    for run in runs:
        if not run.to_board_id and run.to_point not in (*ends, "way"):
            ends[run.to_point] = run
    figures = {}
    for run in runs:
        known = context.figures[run.id]
        probed = temperature_read(readings, run.number)
        probe_u = limits["temperature_doubt.probe"]
        figures[run.id] = known if probed is None or known.gap else known.at(probed, probe_u)
    starts = Counter(run.from_point for run in runs)
    taps = {point for point, count in starts.items() if count > 1}
    taps |= {load.point for load in index.loads_of(circuit.id)}
    taps |= {_fed_at(fed, circuit, index) for fed in index.fed_by_circuit(circuit.id)}
    currents = {point: context.network.design_current_a(node) for point, node in nodes.items() if point != "bus"}
    return Tree(circuit, runs, ends, figures, device_ohm(circuit, limits), currents, frozenset(taps))


def _fed_at(fed: object, circuit: Circuit, index: Index) -> str:
    """The point of a circuit at which a board or converter takes its current."""
    feeds = getattr(fed, "fed_by", ()) or (getattr(fed, "fed_from", None),)
    point = next((feed.point for feed in feeds if feed is not None and feed.id == circuit.id), "")
    return point or index.last_point(circuit.id)


def _load_point(context: Context, circuit: Circuit, load: Load, rounds: Sequence[Round]) -> LoadPoint:
    network = context.network
    read = tuple((this.name, Figure(*_volts(this, load.point))) for this in rounds if load.point in this.volts)
    nodes = network.nodes_of.get(circuit.id)
    if nodes is None or load.point not in nodes:
        gap = GAP_NOTHING_FEEDS.format(circuit.tag) if nodes is None else f"{load.point} is not reached"
        nan = math.nan
        return LoadPoint(load, nan, 0.0, gap, nan, 0.0, gap, nan, nan, 0.0, gap, nan, False, False, read)
    node, bus = nodes[load.point], nodes["bus"]
    branches = list(network.way_up(node))
    source = branches[-1]
    inside = branches[: branches.index(bus)]
    design, lowest = network.design, network.lowest
    collapsed, collapsed_lowest = bool(design.collapsed[node]), bool(lowest.collapsed[node])
    gap = network.gap_of(node, bus) or (GAP_COLLAPSE if collapsed else "")
    lowest_gap = network.gap_of(node, lowest=True) or (GAP_COLLAPSE if collapsed_lowest else "")
    return LoadPoint(
        load=load,
        drop_v=float(design.voltage_v[bus] - design.voltage_v[node]),
        drop_u=_computed_u(context, inside, design.current_a),
        gap=gap,
        total_drop_v=float(design.voltage_v[source] - design.voltage_v[node]),
        total_drop_u=_computed_u(context, branches[:-1], design.current_a),
        total_gap=network.gap_of(node) or gap,
        design_v=float(design.voltage_v[node]),
        lowest_v=float(lowest.voltage_v[node]),
        lowest_u=_computed_u(context, branches[:-1], lowest.current_a),
        lowest_gap=lowest_gap,
        source_lowest_v=float(network.held_lowest_v[source]),
        collapsed=collapsed,
        collapsed_lowest=collapsed_lowest,
        read=read,
    )


def _volts(this: Round, point: str) -> tuple[float, str, float]:
    value, u = total(this.volts[point])
    return value, "V", u


def _computed_u(
    context: Context, branches: Sequence[int], current_a: np.ndarray[tuple[int], np.dtype[np.float64]]
) -> float:
    """Standard uncertainty of the computed drop over branches, at currents that are exact. [V]"""
    network, limits = context.network, context.limits
    parts: dict[str, list[Carrying]] = defaultdict(list)
    variance = 0.0
    for branch in branches:
        amps = float(current_a[branch])
        if math.isnan(amps):  # a tree that cannot be supplied
            return math.nan
        run_id = network.run_at[branch]
        if run_id:
            parts[network.circuit_at[branch]].append(Carrying(context.figures[run_id], amps))
        else:
            variance += (limits["device_doubt.relative"] * float(network.cold_ohm[branch]) * amps) ** 2
    return math.sqrt(variance + sum(record_variance(path, limits) for path in parts.values()))
