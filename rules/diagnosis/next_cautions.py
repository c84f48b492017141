"""Cautions that go with a next reading, by how it is taken, the system's voltage and what the circuit serves."""

from __future__ import annotations

from rules.assessment import Citation
from rules.case import CircuitCase
from rules.cautions import ARC, ARC_VOLTAGE_V, LIVE_READINGS, METER, SHOCK, SHOCK_LIMIT_V, Caution
from rules.diagnosis.options import DEAD_TEST, LENGTH, LOOK, Way

LIVE = Caution(
    "next live",
    "Live work: only by people who may, with the duty holder's permission; one probe clipped, one hand, nothing tightened.",
    LIVE_READINGS.source,
)
MILLIVOLTS = Caution(
    "next millivolts",
    "Start on auto volts: a millivolt reading becomes the full voltage if a joint opens.",
    METER.source,
)
ABOVE_60_V = Caution("next shock", "Above 60 V d.c. between conductors the shock can kill.", SHOCK.source)
ABOVE_100_V = Caution("next arc", "From about 100 V d.c. an arc holds and burns at a distance.", ARC.source)
DEAD = Caution(
    "next dead",
    "Isolate on both sides, secure, and prove dead before the ohmmeter is connected; a battery cannot be switched off.",
    Citation("FIST 3-6", "1998", "battery safety", "verified"),
)
TAPE = Caution(
    "next tape",
    "Tape the route from outside; open nothing that holds live parts.",
    Citation("ohmwalk", status="our own rule"),
)
LOOK_ONLY = Caution(
    "next look",
    "Opening an enclosure to look at a cable exposes live parts: cover or isolate, and prove dead before touching.",
    Citation("ohmwalk", status="our own rule"),
)
GAP = Caution(
    "next gap",
    "No voltage on a meter does not prove a circuit dead: across an open joint or fuse stands the full system voltage, and whoever "
    "switched it off may switch it on.",
    METER.source,
)
PERMISSION = Caution(
    "next permission",
    "The circuit serves life safety, or trips or closes a switch: no load test without the duty holder's permission.",
    Citation("ohmwalk", status="our own rule"),
)
SPECIAL = ("life safety", "trip or close")
"""Functions of loads that nobody tests without permission."""


def caution_words(case: CircuitCase, way: Way) -> str:
    """The cautions of one reading."""
    said = []
    if way.kind == LENGTH:
        said.append(TAPE.text)
    elif way.kind == LOOK:
        said.append(LOOK_ONLY.text)
    elif way.how == DEAD_TEST:
        said.append(DEAD.text)
    else:
        said += [LIVE.text, MILLIVOLTS.text]
    if way.kind != LENGTH:
        volts = case.nominal_v or 0.0
        said += [ABOVE_60_V.text] * (volts > SHOCK_LIMIT_V) + [ABOVE_100_V.text] * (volts >= ARC_VOLTAGE_V)
    if way.kind not in (LENGTH, LOOK) and _serves_special(case):
        said.append(PERMISSION.text)
    return " ".join(said)


def _serves_special(case: CircuitCase) -> bool:
    """Whether a load of the circuit, or of a circuit that it feeds, is one that nobody tests without permission."""
    index, waiting, seen = case.context.index, [case.circuit.id], set[str]()
    while waiting:
        here = waiting.pop()
        if here in seen:
            continue
        seen.add(here)
        if any(load.function_or_default in SPECIAL for load in index.loads_of(here)):
            return True
        waiting += [below.id for fed in index.fed_by_circuit(here) for below in index.circuits_of(fed.id)]
    return False
