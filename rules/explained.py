"""The most that a record explains of a current that was read: every load on, at the voltage read, at its peak."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import replace

from rules.calc.doubt import total
from rules.case import CircuitCase
from rules.index import Index
from rules.loads import drawn
from rules.measured import fed_at
from rules.nominal import nominal_v
from rules.record import Board, Circuit, Load, Source
from rules.rounds import Round

SHORTEST_READ_S = 0.1
"""A recorded peak that is shorter shows on no clamp that also reads a steady current. Our own default. [s]"""


def most_explained_a(case: CircuitCase, point: str, this: Round) -> float | None:
    """
    The most that the loads behind a branch may draw by their record, as they stood in a round; ``None`` where that is open.

    All of them on (``simultaneous`` 1) and at their recorded peaks. Constant-power loads draw most at the lowest voltage
    that was read in the round, constant resistances at the highest; where none was read, at the lowest and highest by the record.
    """
    network, index = case.context.network, case.context.index
    volts = [value for terms in this.volts.values() if (value := total(terms)[0]) > 0]
    node = network.nodes_of.get(case.circuit.id, {}).get(point)
    if volts:
        low, high = min(volts), max(volts)
    elif node is not None:
        low, high = float(network.lowest.voltage_v[node]), float(network.highest.voltage_v[node])
    else:
        return None
    points = {end for end in case.tree.ends if point == "way" or end == point or case.leads_over(end, point)} | {point}
    found = math.fsum(_drawn_a(case.circuit, points, index, low, high, frozenset()))
    return found if math.isfinite(found) else None


def _drawn_a(
    circuit: Circuit, points: set[str] | None, index: Index, low: float, high: float, seen: frozenset[str]
) -> Iterator[float]:
    """Of every load at some points of a circuit (``None``: at all), and of what it feeds there; NaN where one is not known. [A]"""
    if circuit.id in seen:
        return
    seen |= {circuit.id}
    for load in index.loads_of(circuit.id):
        if points is None or load.point in points:
            yield _most_a(load, nominal_v(circuit, index), low, high)
    for fed in index.fed_by_circuit(circuit.id):
        if points is not None and fed_at(fed, circuit, index) not in points:
            continue
        if isinstance(fed, Board):
            for other in index.circuits_of(fed.id):
                yield from _drawn_a(other, None, index, low, high, seen)
        elif isinstance(fed, Source):
            yield _converted_a(fed, index, low, seen)


def _most_a(load: Load, nominal: float | None, low: float, high: float) -> float:
    draws = drawn(replace(load, simultaneous=None), nominal)
    if draws is None:
        return math.nan
    steady = draws.current_a + draws.power_w / low + draws.conductance_s * high
    lasts = load.peak_time_s is None or load.peak_time_s >= SHORTEST_READ_S
    return max(steady, load.peak_current_a or 0.0) if lasts else steady


def _converted_a(converter: Source, index: Index, low: float, seen: frozenset[str]) -> float:
    """What a converter takes with every load behind it on: their power over its efficiency. [A]"""
    behind_v, percent = converter.working_or_nominal_v, converter.efficiency_percent
    if behind_v is None or not percent:
        return math.nan
    boards = [board for board in index.site.boards if any(feed.id == converter.id for feed in board.fed_by)]
    circuits = [circuit for row in (converter, *boards) for circuit in index.circuits_of(row.id)]
    amps = math.fsum(a for other in circuits for a in _drawn_a(other, None, index, behind_v, behind_v, seen))
    return amps * behind_v / (percent / 100) / low
