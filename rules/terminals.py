"""What was read at the terminals of a source, and on the busbars and circuits that hang on it without a cable between."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from rules.calc.doubt import Weighted, probability_above, total
from rules.context import Context
from rules.limits import Limits
from rules.meters import worth
from rules.record import Board, Figure, Reading, Source
from rules.rounds import Round, judged

REGULATED = ("rectifier", "power supply", "converter")
"""Kinds of source that hold their working voltage; a battery's falls while it discharges."""
HEALTHY_AT_MOST = 2.0
"""Times its typical resistance that a healthy device may have; our own default."""


@dataclass(frozen=True, slots=True)
class AtTerminals:
    """Voltage at a source's terminals in one round."""

    place: str
    """``busbar of MDB``, ``bus of A-01``."""
    visit: str
    round: str
    volts: tuple[Weighted, ...]
    amps: tuple[Weighted, ...]
    """On a busbar what it gives in all; on a circuit, that of its device alone; empty where none was read."""
    whole: bool
    """Whether ``amps`` is all that the busbar gives."""

    @property
    def voltage(self) -> Figure:
        value, u = total(self.volts)
        return Figure(value, "V", u)

    @property
    def current(self) -> Figure | None:
        if not self.amps:
            return None
        value, u = total(self.amps)
        return Figure(value, "A", u)


def at_terminals(context: Context, node: int) -> list[AtTerminals]:
    """Everything that was read at one held node on the latest visit, in the order of its boards, then circuits."""
    return _of_latest_visit(context, [*_busbars(context, node), *_circuits(context, node)])


def _of_latest_visit(context: Context, found: list[AtTerminals]) -> list[AtTerminals]:
    if not found:
        return []
    latest = max((one.visit for one in found), key=lambda visit: context.visit_ranks[visit])
    return [one for one in found if one.visit == latest]


def surely_below(read: Sequence[AtTerminals], limit_v: float, limits: Limits) -> AtTerminals | None:
    """
    The reading that lies most surely below a voltage; ``None`` where none does beyond doubt.

    A dead one is no sag, unless current flows: then the source folds back, or is short-circuited. One below zero is RD01.
    """

    def sure(one: AtTerminals) -> float:
        return probability_above(limit_v, one.voltage.value, one.voltage.u or 0.0)

    dead_v = limits["readings.no_voltage_share"] * limit_v
    living = [
        one for one in read if one.voltage.value > dead_v or (one.voltage.value > 0 and _flows(one.current, limits))
    ]
    if not living:
        return None
    worst = max(living, key=lambda one: (sure(one), -one.voltage.value))
    return worst if sure(worst) >= limits["decision.beyond_doubt"] else None


def _flows(current: Figure | None, limits: Limits) -> bool:
    if current is None:
        return False
    return probability_above(abs(current.value), 0.0, current.u or 0.0) >= limits["decision.beyond_doubt"]


def low_behind_device(context: Context, node: int) -> AtTerminals | None:
    """
    The ``way`` of a circuit that lies below the lowest of its source, beyond what a healthy device loses.

    Whether it is the source that sags or the device that loses it is open. Only where the terminals themselves were
    not read.
    """
    if context.network.gap_lowest[node] or at_terminals(context, node):
        return None
    read = _of_latest_visit(context, list(_behind_devices(context, node)))
    return surely_below(read, float(context.network.held_lowest_v[node]), context.limits)


def low_source_of(context: Context, circuit_id: str) -> AtTerminals | None:
    """Where a circuit's source was read below its lowest, at its terminals or behind a device; ``None`` where nowhere."""
    network = context.network
    if circuit_id not in network.nodes_of:
        return None
    node = list(network.way_up(network.nodes_of[circuit_id]["bus"]))[-1]
    if network.gap_lowest[node]:
        return None
    lowest = float(network.held_lowest_v[node])
    return surely_below(at_terminals(context, node), lowest, context.limits) or low_behind_device(context, node)


def below_its_lowest(context: Context, node: int) -> AtTerminals | None:
    """The busbar on which a source was read below the lowest that is recorded of it; ``None`` where none was."""
    if context.network.gap_lowest[node]:
        return None
    read = _of_latest_visit(context, list(_busbars(context, node)))
    return surely_below(read, float(context.network.held_lowest_v[node]), context.limits)


def lacking_v(context: Context, node: int, circuit_id: str) -> float:
    """
    What a source lacked at its terminals where it was read least, on a busbar or at the ``bus`` of one circuit. [V]

    Of its working voltage where it is regulated, or of the most that was read; of a battery, which discharges, of its lowest.
    0 where nothing was read.
    """
    network = context.network
    own = _of_circuit(context, circuit_id) if network.nodes_of[circuit_id]["bus"] == node else ()
    volts = [one.voltage.value for one in _of_latest_visit(context, [*_busbars(context, node), *own])]
    if not volts:
        return 0.0
    if any(source.kind in REGULATED for source in network.sources_at(node)):
        return float(np.nanmax([network.held_v[node], *volts])) - min(volts)
    return 0.0 if network.gap_lowest[node] else max(float(network.held_lowest_v[node]) - min(volts), 0.0)


def _busbars(context: Context, node: int) -> Iterator[AtTerminals]:
    index = context.index
    rows = list(context.network.hanging.rows_at.get(node, ()))
    sources = context.network.sources_at(node)
    if len(sources) > 1:  # what was read at one of them was read on the busbar that they hold together
        rows = [("sources", source.id) for source in sources] + rows
    for table, row_id in rows:
        row: Source | Board = index.sources[row_id] if table == "sources" else index.boards[row_id]
        rounds: dict[tuple[str, str], list[Reading]] = defaultdict(list)
        for reading in judged(index.readings_of(row.id), index):
            rounds[reading.visit_or_default, reading.round].append(reading)
        for (visit, round_), readings in rounds.items():
            volts = [one for one in readings if one.quantity == "voltage" and one.leg in ("", "both")]
            amps = [one for one in readings if one.quantity == "current"]
            if volts:
                yield AtTerminals(
                    f"busbar of {row.tag}", visit, round_, _mean(context, volts), _mean(context, amps), whole=True
                )


def _circuits(context: Context, node: int) -> Iterator[AtTerminals]:
    for circuit_id in context.network.hanging.circuits_at.get(node, ()):
        yield from _of_circuit(context, circuit_id)


def _of_circuit(context: Context, circuit_id: str) -> Iterator[AtTerminals]:
    circuit, measured = context.index.circuits[circuit_id], context.measured.get(circuit_id)
    for this in measured.rounds if measured is not None else ():
        if "bus" in this.volts and measured is not None:
            first = _first_current(this, tuple(measured.tree.ends))
            yield AtTerminals(f"bus of {circuit.tag}", measured.visit, this.name, this.volts["bus"], first, whole=False)


def _behind_devices(context: Context, node: int) -> Iterator[AtTerminals]:
    """The ``way`` of each circuit with what its device may lose added: an upper bound of the terminals."""
    for circuit_id in context.network.hanging.circuits_at.get(node, ()):
        circuit, measured = context.index.circuits[circuit_id], context.measured.get(circuit_id)
        if measured is None or measured.tree.device_ohm is None:
            continue
        most_ohm = HEALTHY_AT_MOST * measured.tree.device_ohm
        for this in measured.rounds:
            amps = _first_current(this, tuple(measured.tree.ends))
            if "way" in this.volts and amps:
                lost = (Weighted(most_ohm * term.weight, term.shown) for term in amps)
                terms = (*this.volts["way"], *lost)
                yield AtTerminals(f"way of {circuit.tag}", measured.visit, this.name, terms, amps, whole=False)


def _first_current(this: Round, ends: tuple[str, ...]) -> tuple[Weighted, ...]:
    return this.amps.get("way") or (this.amps.get(ends[0], ()) if ends else ())


def _mean(context: Context, rows: list[Reading]) -> tuple[Weighted, ...]:
    return tuple(Weighted(1 / len(rows), worth(row, context.index, context.limits).shown) for row in rows)
