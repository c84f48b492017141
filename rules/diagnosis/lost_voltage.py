"""What to read where there is no voltage at a point: the voltage is followed from the source to where it stops."""

from __future__ import annotations

from dataclasses import replace

from rules.assessment import NextReading
from rules.case import CircuitCase
from rules.diagnosis.candidates import POINT
from rules.diagnosis.next_cautions import GAP, caution_words
from rules.diagnosis.options import AS_IT_IS, LOOK, Way, minutes_of
from rules.diagnosis.rows import DEVICE
from rules.impossible import dead_points


def follow_voltage(case: CircuitCase) -> NextReading | None:
    """
    The first point without a voltage of its own between the last that has one and the first that has none; where
    none is left, a look at what lies between: the device, or the run.

    Returns
    -------
    NextReading or None
        ``None`` where every point that was read has a voltage.
    """
    if case.nominal_v is None:
        return None
    for this in reversed(case.rounds):
        dead = {point for point, _ in dead_points(this, case.tree, case.nominal_v, case.limits)}
        first = next((point for point in ("bus", "way", *case.tree.ends) if point in dead), None)
        if first is not None:
            return _between(case, first, this.volts.keys() - dead, this.name)
    return None


def _between(case: CircuitCase, dead: str, live: set[str], name: str) -> NextReading:
    """What to read above the first point without a voltage in a round."""
    above, unread = dead, list[str]()
    for _ in range(len(case.tree.ends) + 2):  # no longer than the tree: a record may close a ring
        run = case.tree.ends.get(above)
        if run is None and (above != "way" or case.circuit.device == "none"):
            break
        above = run.from_point if run is not None else "bus"
        if above in live:
            break
        unread.insert(0, above)
    why = f"no voltage at {dead} in round {name}"
    if unread:
        why += ": it is followed from the source, to tell whether the circuit is switched off or open"
        return _found(case, POINT, NextReading("reading", "voltage", unread[0], leg="both", why=why))
    arriving = case.tree.ends.get(dead)
    if arriving is not None:
        place, look = arriving.name, f"where does {arriving.name} stand open?"
    elif dead == "way" and above == "bus":
        place, look = DEVICE, "is the device switched off, has it tripped, or is it open?"
    else:
        why += f", from which {case.tag} is fed: is that switched off?"
        return _found(case, POINT, NextReading("reading", "voltage", "bus", leg="both", why=why))
    return _found(case, LOOK, NextReading("reading", at=place, why=f"{why}, but at {above}: {look}"))


def _found(case: CircuitCase, kind: str, reading: NextReading) -> NextReading:
    """With its cautions and minutes."""
    way = Way(kind, AS_IT_IS, minutes_of(kind, AS_IT_IS, case.limits))
    return replace(reading, caution=f"{caution_words(case, way)} {GAP.text}", minutes=way.minutes)
