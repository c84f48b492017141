"""
What to read or find first, where the diagnosis has nothing to go by: nothing was read, too little, or the record lacks
a length, a size, a load or the source's voltage.
"""

from __future__ import annotations

import math
from dataclasses import replace

from rules.assessment import NextReading
from rules.calc.doubt import each_u
from rules.case import CircuitCase
from rules.checks.rc01_record_incomplete import gaps_of
from rules.diagnosis.bounds import OPERATES, Bound, largest_bound, operates_a_switch, rounded_down, rounded_up
from rules.diagnosis.candidates import JOINT, POINT, Meters, shown_by, voltmeter_of
from rules.diagnosis.named import Named
from rules.diagnosis.next_cautions import caution_words
from rules.diagnosis.next_words import DEAD_METER, bound_words
from rules.diagnosis.options import AS_IT_IS, DEAD_TEST, FINER, LENGTH, LOOK, ROUND, Way, minutes_of
from rules.diagnosis.rows import extra_scale
from rules.record import Figure, Run
from rules.units import show


def missing_record(case: CircuitCase) -> NextReading | None:
    """
    How to find what the record lacks; ``None`` where the drop can be computed.

    A length is taped; a size is read off the sheath, what a load draws by the clamp, a source by the voltmeter.
    """
    gaps = gaps_of(case)
    if not gaps:
        return None
    where, why = gaps[0]
    run = next((run for run in case.runs if run.name == where), None)
    if where == "runs" or (run is not None and run.one_way_length_m is None):
        size = " and read the size off the sheath" if run is None or not run.size else ""
        return _found(
            case, LENGTH, NextReading("length", at=run.name if run else "", why=f"{why}: tape the route{size}")
        )
    if run is not None:
        return _found(case, LOOK, NextReading("reading", at=where, why=f"{why}: read it off the sheath"))
    if where == "source":
        why += ": find the busbar that feeds it and read its voltage under load"
        return _found(case, POINT, NextReading("reading", "voltage", "bus", leg="both", why=why))
    arriving = case.tree.ends.get(where)
    at = arriving.name if arriving is not None else "way"
    why += ": read the current with everything on, or the load's plate"
    return _found(case, POINT, NextReading("reading", "current", at, why=why))


def _found(case: CircuitCase, kind: str, reading: NextReading) -> NextReading:
    """With its cautions and minutes."""
    way = Way(kind, AS_IT_IS, minutes_of(kind, AS_IT_IS, case.limits))
    return replace(reading, caution=caution_words(case, way), minutes=way.minutes)


def first_round(case: CircuitCase, meters: Meters) -> NextReading | None:
    """
    The round to read where no reading says anything yet; ``None`` where no run leads anywhere.

    Voltages at the circuit's start and at the load that loses most by the record, with the current, at a load at which
    a middling bad connection, or one that gives the profile's heat, would stand out of the meter's counts.
    """
    end = _far_end(case)
    if not end:
        return None
    limits = case.limits
    path = case.tree.path("way", end)
    last = case.tree.ends[path[-1]]
    suspected = _suspected(case, last, path[-1])
    counts_v = shown_by(case, "voltage", case.nominal_v or 0.0, voltmeter_of(case, meters)).each_u
    bound = _most_current(case, case.tree.ends[path[0]])
    most = bound.level
    needed, how = _needed(case, suspected, counts_v), AS_IT_IS
    if needed > most:
        finer_v = each_u(limits["finer_meter.voltage_counts"], limits["finer_meter.voltage_resolution"])
        needed, how = _needed(case, suspected, min(finer_v, counts_v)), FINER
    if needed > most:
        return _dead_test(case, end, suspected, needed, bound)
    way = Way(ROUND, how, minutes_of(ROUND, how, limits))
    start = "bus" if case.tree.device_ohm else "way"
    told = f"a bad connection of {show(suspected, 'ohm', digits=2)} stands out at {show(needed, 'A')}"
    why = [
        _reason(case),
        *(["with the current, in one round"] if how == FINER else []),
        told,
        *bound_words(case, most, bound.why, case.largest_current_a.get(path[0], 0.0)),
    ]
    return NextReading(
        what=FINER if how == FINER else "round",
        quantity="voltage",
        at=start,
        to=end,
        leg="both",
        current_at_least=Figure(needed, "A"),
        why="; ".join(why),
        caution=caution_words(case, way),
        current_at_most=None if math.isinf(most) else Figure(most, "A"),
        minutes=way.minutes,
    )


def _dead_test(case: CircuitCase, end: str, suspected: float, needed: float, bound: Bound) -> NextReading:
    """One leg by its resistance, where no current that may flow is enough."""
    way = Way(JOINT, DEAD_TEST, minutes_of(JOINT, DEAD_TEST, case.limits))
    live = f"live, a bad connection of {show(suspected, 'ohm', digits=2)} stands out at {show(needed, 'A')}"
    return NextReading(
        what=DEAD_TEST,
        quantity="resistance",
        at="way",
        to=end,
        leg="positive",
        why=f"{_reason(case)}; {live}, and more than {show(bound.level, 'A')} {bound.why}: {DEAD_METER}",
        caution=caution_words(case, way),
        minutes=way.minutes,
    )


def named_reading(case: CircuitCase, meters: Meters, named: Named) -> NextReading:
    """Millivolts across a place that a finding names, where no reading poses a problem to the diagnosis."""
    run = next((run for run in case.runs if named.at.startswith(f"{run.name} ")), case.runs[0])
    end = next(point for point, arriving in case.tree.ends.items() if arriving.id == run.id)
    suspected, design_a = _suspected(case, run, end), case.largest_current_a.get(end, 0.0)
    bound = _most_current(case, run)
    counts_v = shown_by(case, "joint", suspected * design_a, voltmeter_of(case, meters)).each_u
    needed = min(rounded_up(case.limits["next_reading.apart"] * counts_v / suspected), bound.level)
    way = Way(JOINT, AS_IT_IS, minutes_of(JOINT, AS_IT_IS, case.limits))
    return NextReading(
        what="reading",
        quantity="joint",
        at=named.at,
        leg=named.legs[0],
        current_at_least=Figure(needed, "A") if needed else None,
        why="; ".join([named.why, *bound_words(case, bound.level, bound.why, design_a)]),
        caution=f"{caution_words(case, way)} {named.caution}",
        current_at_most=Figure(bound.level, "A") if bound.level and math.isfinite(bound.level) else None,
        minutes=way.minutes,
    )


def _suspected(case: CircuitCase, run: Run, point: str) -> float:
    """A middling bad connection in a run, or one that gives the profile's heat. [ohm]"""
    limits, design_a = case.limits, case.largest_current_a.get(point, 0.0)
    middling = math.sqrt(limits["bad_connection.low_ohm"] * limits["bad_connection.high_ohm"]) * extra_scale(run.size)
    return min(middling, limits["heat.limit_w"] / design_a**2) if design_a else middling


def _reason(case: CircuitCase) -> str:
    """Why there is nothing to go by."""
    if case.visit:
        return case.drop_gap
    if case.circuit.not_tested:
        return f"ask the duty holder first, for it was not tested: {case.circuit.not_tested}"
    return "nothing was read"


def _far_end(case: CircuitCase) -> str:
    """The load's point that loses most by the record, else the last end of a run; empty for none."""
    reached = [point for point in case.loads if point.load.point in case.tree.ends and not math.isnan(point.drop_v)]
    if reached:
        return max(reached, key=lambda point: point.drop_v).load.point
    return list(case.tree.ends)[-1] if case.tree.ends else ""


def _needed(case: CircuitCase, ohm: float, counts_v: float) -> float:
    """The current at which an extra resistance stands out of the counts of two voltages. [A]"""
    return rounded_up(case.limits["next_reading.apart"] * math.sqrt(2) * counts_v / ohm)


def _most_current(case: CircuitCase, first: Run) -> Bound:
    """The most current that may flow in a circuit's first run, all others in proportion to their design currents. [A]"""
    design = {run.name: case.tree.design_current_a.get(point) for point, run in case.tree.ends.items()}
    known = {name: ampere for name, ampere in design.items() if ampere}
    if first.name not in known and operates_a_switch(case):
        return Bound(0.0, OPERATES)
    if first.name not in known:  # as if one ampere ran through the first run alone
        known = {first.name: 1.0}
    bound = largest_bound(case, known)
    return Bound(rounded_down(bound.level * abs(known[first.name])), bound.why)
