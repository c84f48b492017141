"""What a rule is given: the record, rounds, solved points and limits of one circuit, computed beforehand."""

from __future__ import annotations

import math
from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

from rules.assessment import Drop
from rules.calc.doubt import total
from rules.consistency import Problem
from rules.diagnosis.budget import Current
from rules.diagnosis.common_error import Taught
from rules.diagnosis.diagnose import Diagnosis
from rules.diagnosis.habits import Tie, ties_of
from rules.diagnosis.learning import diagnose_told
from rules.diagnosis.problem import Problem as Posed
from rules.diagnosis.rows import problem_of
from rules.doubts import drop_u
from rules.errors import MissingData
from rules.impossible import impossible
from rules.index import Index
from rules.limits import Limits
from rules.network import GAP_NOTHING_FEEDS, Network, device_ohm
from rules.nominal import nominal_v
from rules.record import Board, Circuit, Figure, Load, Reading, Run, Site, Source
from rules.rounds import Round, Tree, current_at, drop_of, judged, rounds_of, temperature_read, visit_of
from rules.routes import Shared, first_ends
from rules.runs import SHARED, Figures
from rules.worst import largest_current_a, worst_of

GAP_COLLAPSE = "the voltage collapses behind {}: the path there cannot carry what hangs on it"


@dataclass(frozen=True, slots=True)
class Context:
    """A site prepared for judging: solved, indexed, its limits resolved."""

    recorded: Site
    """As it stands in the record, whatever is wrong with it."""
    site: Site
    """What of it holds together, by which all is judged; mostly all of it."""
    limits: Limits
    index: Index
    figures: Figures
    """Of every run, by id, and of the returns that runs share."""
    network: Network
    visit_ranks: Mapping[str, tuple[float, str, int]]
    problems: tuple[Problem, ...]
    left_out: frozenset[str] = frozenset()
    """Ids of recorded readings that are no part of ``site``."""
    measured: Mapping[str, Measured] = field(default_factory=dict)
    """By circuit id: what was read on the visit that it is judged on."""
    diagnoses: Mapping[str, Diagnosis] = field(default_factory=dict)
    """By circuit id, of those whose readings say something."""
    taught: Taught = field(default_factory=Taught)
    """What meters and habits that circuits share have taught."""
    common: Mapping[str, Figure] = field(default_factory=dict)
    """By circuit id: error that a circuit shares with others, relative to its computed drops; none where none was found."""
    unused: Mapping[str, tuple[str, ...]] = field(default_factory=dict)
    """By circuit id: readings that nothing makes use of."""
    joints: Mapping[tuple[str, ...], Sequence[SimilarJoint]] = field(default_factory=dict)
    """Joints that were read across themselves, by what makes them similar."""


@dataclass(frozen=True, slots=True)
class SimilarJoint:
    """A termination or pole of some circuit, to compare others with."""

    circuit: str
    """Its tag."""
    place: str
    ohm: Figure


@dataclass(frozen=True, slots=True)
class Measured:
    """The readings of one visit on one circuit."""

    visit: str
    """Empty where nothing was read."""
    readings: tuple[Reading, ...]
    rounds: tuple[Round, ...]
    tree: Tree


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
        fed = {_fed_at(fed, self.circuit, index) for fed in index.fed_by_circuit(self.circuit.id)}
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
        return _return_leg(self.circuit, self.context.index)

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
        largest_current_a=_largest_currents(context, circuit),
        unused=unused,
        common=common,
    )


def measured_of(context: Context, circuit: Circuit, readings: Sequence[Reading] | None = None) -> Measured:
    """The rounds of the visit that a circuit is judged on, or of the readings given."""
    index = context.index
    if readings is None:
        visit = visit_of(circuit.id, index, context.visit_ranks) or ""
        readings = [r for r in judged(index.readings_of(circuit.id), index) if r.visit_or_default == visit]
    else:
        visit = readings[-1].visit_or_default if readings else ""
        readings = [row for row in readings if row.id not in context.left_out]
    tree = _tree(context, circuit, readings)
    return Measured(visit, tuple(readings), rounds_of(readings, tree, index, context.limits), tree)


def posed_by(context: Context, measured: Measured) -> Posed | None:
    """What the readings of a visit pose to the diagnosis; ``None`` where they say nothing about a run or the device."""
    if not measured.rounds:
        return None
    circuit, limits = measured.tree.circuit, context.limits
    amps = _largest_currents(context, circuit)
    hot_ohm = {point: limits["heat.limit_w"] / a**2 if a else math.inf for point, a in amps.items()}
    return_leg = _return_leg(circuit, context.index)
    return problem_of(measured.rounds, measured.tree, limits, hot_ohm, return_leg, nominal_v(circuit, context.index))


def ties_by(context: Context, measured: Measured, problem: Posed) -> tuple[Tie, ...]:
    """What ties a circuit's problem to meters and habits that others share."""
    return ties_of(problem, {run.id: run for run in measured.tree.runs}, measured.readings, context.index)


def unused_readings(measured: Measured, problem: Posed | None) -> tuple[str, ...]:
    """Names of the visit's readings that enter neither a drop nor the diagnosis."""
    posed = problem.used if problem is not None else frozenset()
    return tuple(
        dict.fromkeys(
            _name(row) for row in measured.readings if row.id not in posed and not _is_used(row, measured.rounds)
        )
    )


def _largest_currents(context: Context, circuit: Circuit) -> dict[str, float]:
    nodes = context.network.nodes_of.get(circuit.id, {})
    amps = {point: largest_current_a(context.network, node) for point, node in nodes.items() if point != "bus"}
    return {point: a for point, a in amps.items() if a is not None}


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


def _return_leg(circuit: Circuit, index: Index) -> str:
    """The leg without the device: negative, unless the source is positive earthed."""
    if circuit.device_leg in ("positive", "negative"):
        return "negative" if circuit.device_leg == "positive" else "positive"
    here: Circuit | Board | Source | None = circuit
    seen: set[str] = set()
    while here is not None and not isinstance(here, Source) and here.id not in seen:
        seen.add(here.id)
        feeds = here.fed_by if isinstance(here, Board) else (here.fed_from,)
        here = index.named(feeds[0]) if feeds and feeds[0] is not None else None
    return "positive" if isinstance(here, Source) and here.earthing == "positive earthed" else "negative"


def _is_used(reading: Reading, rounds: Sequence[Round]) -> bool:
    """Whether a reading enters a voltage, a current, a drop over both legs or a temperature."""
    if reading.is_unloaded:
        return reading.quantity in ("current", "residual")  # what a clamp shows without a current
    this = next(round_ for round_ in rounds if round_.name == reading.round)
    if reading.quantity == "voltage":
        return reading.at in this.volts
    if reading.quantity == "drop":
        return (reading.at, reading.to) in this.direct
    # a temperature enters the computed drop, or HT02; a joint HT01 or HT03, which say what they miss
    return reading.quantity in ("current", "temperature", "joint")


def _name(reading: Reading) -> str:
    leg = f" {reading.leg}" if reading.leg and reading.leg != "both" else ""
    return f"{reading.quantity} at {reading.at}{f' to {reading.to}' if reading.to else ''}{leg}"


def _tree(context: Context, circuit: Circuit, readings: Sequence[Reading]) -> Tree:
    index, limits = context.index, context.limits
    runs = index.runs_of(circuit.id)
    network = context.network
    nodes = network.nodes_of.get(circuit.id, {})
    ends = first_ends(runs, index.end_of)
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
    taps |= {run.to_point for branch, run in ends.items() if branch == run.name}
    nodes = nodes | {
        branch: at for branch, run in ends.items() if (at := network.node_at_run_end.get(run.id)) is not None
    }
    return Tree(
        circuit,
        runs,
        ends,
        figures,
        device_ohm(circuit, limits),
        {point: network.design_current_a(node) for point, node in nodes.items() if point != "bus"},
        frozenset(taps),
        {run.id: shared for run in runs if (shared := _shared(context, run, readings)) is not None},
        network.meshed,
    )


def _shared(context: Context, run: Run, readings: Sequence[Reading]) -> Shared | None:
    """The return that a run shares, with what the other runs put into it on the same visit."""
    of = context.figures.returns.get(run.return_conductor.removeprefix(SHARED))
    if of is None or not run.return_conductor.startswith(SHARED):
        return None
    visit = readings[-1].visit_or_default if readings else ""
    others = [other for other in of.runs if other.id != run.id]
    return Shared(of.figures, lambda round_: tuple(_carried(context, other, visit, round_) for other in others))


def _carried(context: Context, run: Run, visit: str, round_: str) -> Current:
    """The current in a run of another circuit, in a round of the same visit and name."""
    circuit, index = context.index.circuits[run.circuit_id], context.index
    there = judged(index.readings_of(circuit.id), index)
    of_round = [row for row in there if row.visit_or_default == visit and row.round == round_]
    tree = _tree(context, circuit, of_round)
    branch = next(branch for branch, other in tree.ends.items() if other.id == run.id)
    try:
        (this,) = rounds_of(of_round, tree, index, context.limits)
        current = current_at(branch, this, tree, context.limits)
    except (ValueError, MissingData):
        raise MissingData(
            f"round {round_} has no current of {circuit.tag}, which shares the return {run.return_conductor.removeprefix(SHARED)}"
        ) from None
    # taps of two circuits may be named alike and err on their own
    return Current(current.terms, tuple((f"{circuit.tag} {tap}", u) for tap, u in current.shares))


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
