"""
The worst case of a circuit's points: the source at its lowest, hot conductors, and what readings support.

What the diagnosis learned of each run on the way from the source (extra resistance, another conductor, a
semiconductor) is taken off the voltages of the network's lowest solve, with the currents of that solve.
"""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Callable, Mapping
from dataclasses import dataclass

from rules.diagnosis.diagnose import Diagnosis
from rules.diagnosis.learned import Learned
from rules.network import Network
from rules.record import Figure
from rules.runs import RunFigures


@dataclass(frozen=True, slots=True)
class Taken:
    """What a branch loses more than computed, by kind; the kinds exclude each other within a circuit."""

    current_a: float
    extra_v: float
    extra_square: float
    conductor_v: float
    conductor_spread: float
    """Root of the mean square. [V]"""
    offset_v: float
    offset_square: float


def worst_of(
    points: Mapping[str, int],
    network: Network,
    figures: Mapping[str, RunFigures],
    diagnosis_of: Callable[[str], Diagnosis | None],
    computed_u: Callable[[int], float],
) -> dict[str, Figure]:
    """
    Voltage of each point in the worst case; points whose voltage is not known are left out.

    Parameters
    ----------
    points : mapping
        Node by point.
    diagnosis_of : callable
        By circuit id; ``None`` where nothing was read, so that nothing was learned.
    computed_u : callable
        Standard uncertainty of the computed drop from the source to a node. [V]

    Notes
    -----
    First order: a constant-power load that gets less draws a little more than is counted here. Of one circuit one
    cause holds at a time (two bad connections count as one), so that the mean square of its loss is the sum over
    causes; circuits are independent.
    """
    found = {}
    for point, node in points.items():
        if network.gap_of(node, lowest=True) or network.lowest.collapsed[node]:
            continue
        by_circuit: dict[str, dict[str, Taken]] = defaultdict(dict)
        for branch in network.way_up(node):
            taken = _taken(branch, network, figures, diagnosis_of)
            if taken is not None:
                by_circuit[network.circuit_at[branch]][network.run_at[branch]] = taken
        lost = variance = 0.0
        for circuit_id, parts in by_circuit.items():
            mean = sum(part.extra_v + part.conductor_v + part.offset_v for part in parts.values())
            square = sum(part.extra_square + part.offset_square for part in parts.values())
            square += sum(part.conductor_spread for part in parts.values()) ** 2
            square += _both(diagnosis_of(circuit_id), parts)
            lost += mean
            variance += max(square - mean**2, 0.0)
        u = math.sqrt(variance + computed_u(node) ** 2)
        found[point] = Figure(float(network.lowest.voltage_v[node]) - lost, "V", u)
    return found


def largest_current_a(network: Network, node: int) -> float | None:
    """
    Current in the branch to a node at the voltage that makes it largest; ``None`` where it is not known. [A]

    Constant-power loads draw most at the lowest voltage behind hot conductors, constant-resistance loads at the highest
    behind cold ones; where the source's highest or lowest is not known, its working voltage stands in for it.
    """
    design = network.design_current_a(node)
    if design is None:
        return None
    beside = (abs(float(solved.current_a[node])) for solved in (network.lowest, network.highest))
    return max([abs(design), *(amps for amps in beside if not math.isnan(amps))])


def _taken(
    branch: int,
    network: Network,
    figures: Mapping[str, RunFigures],
    diagnosis_of: Callable[[str], Diagnosis | None],
) -> Taken | None:
    """What one branch loses more than the lowest solve says; ``None`` where nothing was learned of it."""
    if network.parent[branch] < 0:
        return None
    diagnosis = diagnosis_of(network.circuit_at[branch])
    run_id = network.run_at[branch]
    learned = diagnosis.of_branch(run_id) if diagnosis is not None else None
    if learned is None:
        return None
    amps = float(network.lowest.current_a[branch])
    conductor_v = amps * (figures[run_id].conductor_hot_ohm if run_id else 0.0)
    return _of(learned, amps, conductor_v)


def _both(diagnosis: Diagnosis | None, parts: Mapping[str, Taken]) -> float:
    """Mean of twice the product of what two joints lose that are bad at the same time. [V²]"""
    together = diagnosis.together if diagnosis is not None else None
    if together is None or not all(run_id in parts for run_id in together.run_ids):
        return 0.0
    first, second = (parts[run_id].current_a for run_id in together.run_ids)
    return 2 * together.mean_product * first * second


def _of(learned: Learned, amps: float, conductor_v: float) -> Taken:
    sense = math.copysign(1.0, amps) if amps else 0.0
    return Taken(
        current_a=amps,
        extra_v=amps * learned.extra_ohm,
        extra_square=amps**2 * (learned.extra_u**2 + learned.extra_ohm**2),
        conductor_v=conductor_v * (learned.factor - 1),
        conductor_spread=conductor_v * math.hypot(learned.factor_u, learned.factor - 1),
        offset_v=sense * learned.offset_v,
        offset_square=abs(sense) * (learned.offset_u**2 + learned.offset_v**2),
    )
