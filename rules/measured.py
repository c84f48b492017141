"""What was read on a circuit on the visit that it is judged on, and what that poses to the diagnosis."""

from __future__ import annotations

import math
from collections import Counter
from collections.abc import Sequence

from rules.context import Context, Measured
from rules.diagnosis.budget import Current
from rules.diagnosis.habits import Tie, ties_of
from rules.diagnosis.problem import Problem as Posed
from rules.diagnosis.rows import problem_of
from rules.errors import MissingData
from rules.index import Index
from rules.network import device_ohm
from rules.nominal import nominal_v
from rules.record import Board, Circuit, Reading, Run, Source
from rules.rounds import Round, Tree, current_at, judged, rounds_of, temperature_read, visit_of
from rules.routes import Shared, first_ends
from rules.runs import SHARED
from rules.worst import largest_current_a


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
    amps = largest_currents(context, circuit)
    hot_ohm = {point: limits["heat.limit_w"] / a**2 if a else math.inf for point, a in amps.items()}
    return_leg = return_leg_of(circuit, context.index)
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


def largest_currents(context: Context, circuit: Circuit) -> dict[str, float]:
    """By the point at which a branch arrives: current at design and the voltage that makes it largest, where it is known. [A]"""
    nodes = context.network.nodes_of.get(circuit.id, {})
    amps = {point: largest_current_a(context.network, node) for point, node in nodes.items() if point != "bus"}
    return {point: a for point, a in amps.items() if a is not None}


def return_leg_of(circuit: Circuit, index: Index) -> str:
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
    # a temperature enters the computed drop, or HT02; a joint HT01 or HT03, a residual RD13, which say what they miss
    return reading.quantity in ("current", "temperature", "joint", "residual")


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
    taps |= {fed_at(fed, circuit, index) for fed in index.fed_by_circuit(circuit.id)}
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


def fed_at(fed: object, circuit: Circuit, index: Index) -> str:
    """The point of a circuit at which a board or converter takes its current."""
    feeds = getattr(fed, "fed_by", ()) or (getattr(fed, "fed_from", None),)
    point = next((feed.point for feed in feeds if feed is not None and feed.id == circuit.id), "")
    return point or index.last_point(circuit.id)
