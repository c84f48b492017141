"""What a rule is given: the record, rounds, solved points and limits of one circuit, computed beforehand."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from rules.assessment import Drop
from rules.calc.doubt import total
from rules.compared import drop_of
from rules.context import Context
from rules.diagnosis.diagnose import Diagnosis
from rules.diagnosis.learning import diagnose_told
from rules.doubts import drop_u
from rules.errors import MissingData
from rules.impossible import impossible
from rules.limits import Limits
from rules.measured import fed_at, largest_currents, measured_of, posed_by, return_leg_of, ties_by, unused_readings
from rules.network import GAP_NOTHING_FEEDS, Network
from rules.nominal import nominal_v
from rules.record import Circuit, Figure, Load, Reading, Run
from rules.rounds import Round, Tree
from rules.worst import worst_of

GAP_COLLAPSE = "the voltage collapses behind {}: the path there cannot carry what hangs on it"


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
    readings: tuple[Reading, ...]
    """Of the visit, those with the loads off too."""
    rounds: tuple[Round, ...]
    tree: Tree
    drop: Drop | None
    drop_gap: str
    """Why there is no drop; empty where there is one."""
    diagnosis: Diagnosis | None
    """``None`` where no reading says anything about a run or the device."""
    worst: Mapping[str, Figure]
    """Voltage by point with the source at its lowest, hot conductors and what readings support. [V]"""
    largest_current_a: Mapping[str, float]
    """By the point at which a branch arrives (``way``: the device), at design and the voltage that makes it largest."""
    unused: tuple[str, ...] = ()
    """Readings of the visit that nothing here makes use of."""
    common: Figure | None = None
    """Error that its readings share with those of other circuits, relative to the computed drop; ``None`` where none was found."""

    @property
    def tag(self) -> str:
        return self.circuit.tag

    @property
    def drawn(self) -> frozenset[str]:
        """Points at which a load, a board or a converter takes current."""
        index = self.context.index
        fed = {fed_at(fed, self.circuit, index) for fed in index.fed_by_circuit(self.circuit.id)}
        return frozenset(fed | {point.load.point for point in self.loads})

    def is_vital(self, point: str) -> bool:
        """Whether a life-safety or trip-or-close load hangs on a point or behind it."""
        behind = {end for end in self.tree.ends if point in ("bus", "way") or self.leads_over(end, point)} | {point}
        return any(each.load.function_or_default != "ordinary" and each.load.point in behind for each in self.loads)

    def leads_over(self, end: str, point: str) -> bool:
        """Whether the way from the source to ``end`` leads over ``point``."""
        for _ in self.tree.ends:
            run = self.tree.ends.get(end)
            if run is None:
                return False
            end = run.from_point
            if end == point:
                return True
        return False

    @property
    def return_leg(self) -> str:
        """The leg without the device."""
        return return_leg_of(self.circuit, self.context.index)

    @property
    def limits(self) -> Limits:
        return self.context.limits


def case_of(context: Context, circuit: Circuit, readings: Sequence[Reading] | None = None) -> CircuitCase:
    """
    Gather what the rules need about one circuit.

    ``readings``, where given, stand in for the circuit's readings in the record: what is being typed.
    """
    index, limits = context.index, context.limits
    known = context.measured.get(circuit.id) if readings is None else None
    if known is None:
        measured = measured_of(context, circuit, readings)
        problem = posed_by(context, measured)
        unused = unused_readings(measured, problem)
        if problem is not None:
            problem = context.taught.told(circuit.id, problem, ties_by(context, measured, problem))
        diagnosis = diagnose_told([problem], limits)[0] if problem is not None else None
        common = problem.common.relative if problem is not None and problem.common is not None else None
    else:
        measured, diagnosis = known, context.diagnoses.get(circuit.id)
        common = context.common.get(circuit.id)
        unused = context.unused.get(circuit.id, ())
    tree, rounds, nominal = measured.tree, measured.rounds, nominal_v(circuit, index)
    drop, gap = None, "nothing was read under load" if measured.readings else "nothing was read"
    if rounds:
        against = {this.name: impossible(this, tree, nominal, limits) for this in rounds}
        possible = [this for this in rounds if not against[this.name]]
        try:
            if not possible:
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
        visit=measured.visit,
        readings=measured.readings,
        rounds=rounds,
        tree=tree,
        drop=drop,
        drop_gap=gap,
        diagnosis=diagnosis,
        worst=_worst(context, circuit, diagnosis),
        largest_current_a=largest_currents(context, circuit),
        unused=unused,
        common=common,
    )


def _worst(context: Context, circuit: Circuit, diagnosis: Diagnosis | None) -> dict[str, Figure]:
    """Voltages of the circuit's points in the worst case, its own diagnosis as it is judged now."""
    network = context.network
    return worst_of(
        network.nodes_of.get(circuit.id, {}),
        network,
        context.figures,
        lambda id_: diagnosis if id_ == circuit.id else context.diagnoses.get(id_),
        lambda node: drop_u(context, list(network.way_up(node))[:-1], "lowest"),
    )


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
    gap = network.gap_of(node, bus) or (_collapse(network, node, lowest=False) if collapsed else "")
    lowest_gap = network.gap_of(node, lowest=True)
    lowest_gap = lowest_gap or (_collapse(network, node, lowest=True) if collapsed_lowest else "")
    return LoadPoint(
        load=load,
        drop_v=float(design.voltage_v[bus] - design.voltage_v[node]),
        drop_u=drop_u(context, inside, "design"),
        gap=gap,
        total_drop_v=float(design.voltage_v[source] - design.voltage_v[node]),
        total_drop_u=drop_u(context, branches[:-1], "design"),
        total_gap=network.gap_of(node) or gap,
        design_v=float(design.voltage_v[node]),
        lowest_v=float(lowest.voltage_v[node]),
        lowest_u=drop_u(context, branches[:-1], "lowest"),
        lowest_gap=lowest_gap,
        source_lowest_v=float(network.held_lowest_v[source]),
        collapsed=collapsed,
        collapsed_lowest=collapsed_lowest,
        read=read,
    )


def _volts(this: Round, point: str) -> tuple[float, str, float]:
    value, u = total(this.volts[point])
    return value, "V", u


def _collapse(network: Network, node: int, lowest: bool) -> str:
    found = network.collapse_of(node, lowest)
    return GAP_COLLAPSE.format(network.place_of(found.node)) if found is not None else ""
