"""How load, device and conductor of a run go together: whether it is overloaded, and whether its device protects it."""

from __future__ import annotations

from dataclasses import dataclass

from rules.case import CircuitCase
from rules.decision import Verdict, against_limit
from rules.loading import Bounds, current_of, read_in
from rules.record import Figure, Run
from rules.tables.ampacity import nec_largest_device_a, nec_next_device_a

ROUNDING = 1e-9
"""Relative: a current that differs from the capacity by less is the capacity."""


@dataclass(frozen=True, slots=True)
class Overload:
    """A run that carries more than it may, whatever the record leaves open."""

    current: Figure
    round: str
    """In which a clamp showed it; empty for the current with every load on."""


def overload_of(case: CircuitCase, run: Run, bounds: Bounds) -> Overload | None:
    """By the record, or where a clamp showed more beyond doubt, by that; ``None`` where neither is above capacity."""
    amps, read = current_of(run, case), read_in(run, case)
    shown = read is not None and is_past(read[1], bounds.most_a, case)
    if amps is not None and is_above(amps, bounds.most_a) and not (shown and read is not None and read[1].value > amps):
        return Overload(Figure(amps, "A"), "")
    return Overload(read[1], read[0]) if read is not None and shown else None


def is_above(amps: float, limit_a: float) -> bool:
    """Whether an exact current is above a limit, but for rounding."""
    return amps > limit_a * (1 + ROUNDING)


def is_past(read: Figure, limit_a: float, case: CircuitCase) -> bool:
    """Whether a current that was read is past a limit beyond its doubt."""
    return against_limit(read.value, limit_a, read.u or 0.0, case.limits) is Verdict.FAILS


def is_unprotected(case: CircuitCase, run: Run, bounds: Bounds) -> bool:
    """Whether the circuit's device lets more through than a run may carry, whatever the record leaves open."""
    rated = case.circuit.rated_current_a
    if rated is None or case.circuit.device == "none" or sources_give_a(case) <= bounds.least_a:
        return False
    return rated > largest_device_a(run, bounds, bounds.most_a)[0]


def largest_device_a(run: Run, bounds: Bounds, ampacity_a: float) -> tuple[float, str]:
    """The largest device for a capacity, and the words for a rule that says more than the capacity. [A]"""
    if not bounds.capacity.table.startswith("nec"):
        return ampacity_a, ""
    small, standard_a = nec_largest_device_a(run.size, run.material_or_default), nec_next_device_a(ampacity_a)
    if small is not None and small.value <= standard_a:
        return small.value, "; the small-conductor rule allows a device of {}"
    return standard_a, "; the next standard rating is {}"


def sources_give_a(case: CircuitCase) -> float:
    """The most that the sources together can give for good; infinite where one does not say. [A]"""
    network = case.context.network
    nodes = network.nodes_of.get(case.circuit.id)
    if nodes is None:
        return float("inf")
    sources = network.sources_at(list(network.way_up(nodes["bus"]))[-1])
    limits = [source.current_limit_a for source in sources]
    known = [amps for amps in limits if amps is not None]
    return sum(known) if known and len(known) == len(limits) else float("inf")
