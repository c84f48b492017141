#!/usr/bin/env python3
"""
How soon the proposed reading settles a cause: invented circuits are surveyed reading by reading, three ways.

    python tests/rules/diagnosis/next_survey.py [--circuits 100] [--seed 1]

Each circuit has one true cause. It is read once by voltages at its ends and at some points between; where that leaves
something to settle, one reading after another is taken from the truth and entered: the *proposed* one, the
terminations and legs *in order* along the circuit, or those *at random*, until nothing is left to settle or 24 readings
were taken. Only the record is shared with the program; what a reading shows is computed here from the truth.
"""

from __future__ import annotations

import argparse
import math
import sys
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from audit.intake.folder import site_of
from rules import limits
from rules.assess import assess_circuit, prepare
from rules.assessment import CircuitResult, NextReading

MOST_READINGS = 24
OHM_PER_M = {
    "1.5 mm2": 12.1e-3,
    "2.5 mm2": 7.41e-3,
    "4 mm2": 4.61e-3,
    "6 mm2": 3.08e-3,
    "10 mm2": 1.83e-3,
    "16 mm2": 1.15e-3,
}
"""IEC 60228:2004, class 2, copper at 20 °C. [ohm/m]"""
ALPHA = 0.00393
LEGS = ("positive", "negative")
CORNERS = [(end, leg) for end in ("start", "end") for leg in LEGS]
METERS = {
    "hand": ("voltage", 0.5, 2, 0.001),
    "fine": ("voltage", 0.05, 5, 0.00001),
    "clamp": ("current", 1.0, 3, 0.01),
    "micro": ("resistance", 0.5, 5, 0.000001),
    "probe": ("temperature", 0.5, 5, 0.1),
}
"""Quantity, accuracy in percent, counts, resolution: they err within it."""
CAUSES = ("as recorded", "bad connection", "series semiconductor", "longer route", "smaller conductor")
MIXTURE = (0.15, 0.5, 0.1, 0.15, 0.1)
"""Of the truth; the program keeps its profile's prior."""
Rows = list[dict[str, Any]]


@dataclass
class Circuit:
    """One circuit's truth, and its record while readings are entered."""

    rng: np.random.Generator
    cause: str
    size: str
    lengths: list[float]
    """Recorded. [m]"""
    true_lengths: list[float]
    """[m]"""
    length_by: list[str]
    amps: list[float]
    """In each run at full load. [A]"""
    conductor: list[float]
    """True resistance of each leg of each run. [ohm]"""
    joints: list[dict[tuple[str, str], float]]
    """True resistance of each termination of each run. [ohm]"""
    place: str = ""
    """True place of a bad connection, ``run 2 end positive``."""
    offset: float = 0.0
    offset_leg: str = ""
    stretch: float = 1.0
    true_size: str = ""
    true_c: float = 25.0
    read: list[str] = field(default_factory=list)
    """Points read in the first round."""
    readings: Rows = field(default_factory=list)
    rounds: int = 0
    gain: dict[str, float] = field(default_factory=dict)

    @property
    def runs(self) -> int:
        return len(self.lengths)

    @property
    def points(self) -> list[str]:
        return ["way", *(f"p{k + 1}" for k in range(self.runs))]

    def leg_ohm(self, run: int, leg: str) -> float:
        """One leg of a run with its terminations."""
        return self.conductor[run] + sum(ohm for (_, of), ohm in self.joints[run].items() if of == leg)

    def drop(self, start: str, end: str, legs: tuple[str, ...], share: float) -> float:
        """True drop between two points along some legs. [V]"""
        first, last = self.points.index(start), self.points.index(end)
        volts = sum(self.leg_ohm(k, leg) * self.amps[k] * share for k in range(first, last) for leg in legs)
        return volts + (self.offset if first == 0 < last and self.offset_leg in legs else 0.0)

    def shown(self, meter: str, truth: float) -> float:
        """What a meter shows."""
        _, percent, counts, resolution = METERS[meter]
        gain = self.gain.setdefault(meter, float(self.rng.uniform(-1, 1)) * percent / 100)
        value = truth * (1 + gain) + float(self.rng.uniform(-1, 1)) * counts * resolution
        return round(round(value / resolution) * resolution, 9)

    def enter(self, quantity: str, at: str, value: float, meter: str, to: str = "", leg: str = "") -> None:
        """One more reading of the round."""
        row = {"circuit": "C", "round": self.rounds, "quantity": quantity, "at": at, "to": to, "leg": leg}
        self.readings.append(row | {"value": self.shown(meter, value), "instrument": meter})

    def start_round(self, share: float) -> None:
        """A round of its own, with the currents of all runs."""
        self.rounds += 1
        for k, ampere in enumerate(self.amps):
            self.enter("current", f"run {k + 1}", ampere * share, "clamp")

    def read_voltages(self, points: list[str], share: float) -> None:
        """Voltages at some points in the round."""
        for point in points:
            self.enter("voltage", point, 48.0 - self.drop("way", point, LEGS, share), "hand")

    def result(self) -> CircuitResult:
        """What the program says of the record as it is now."""
        tables: dict[str, list[dict[str, Any]]] = {
            "sources": [{"source": "S", "kind": "power supply", "nominal": "48", "working": "48"}],
            "circuits": [{"circuit": "C", "fed_from": "S", "device": "none", "allowed_drop": "100"}],
            "runs": [
                {
                    "circuit": "C", "run": k + 1, "from": self.points[k], "to": self.points[k + 1],
                    "length": length, "length_by": self.length_by[k], "size": self.size, "method": "C", "grouped": 1,
                    "temperature": 25, "temperature_by": "air",
                }
                for k, length in enumerate(self.lengths)
            ],
            "loads": [
                {"circuit": "C", "point": f"p{k + 1}", "load": f"L{k + 1}", "current": round(ampere - after, 4)}
                for k, (ampere, after) in enumerate(zip(self.amps, [*self.amps[1:], 0.0], strict=True))
            ],
            "instruments": [
                {"instrument": tag, "quantity": q, "accuracy": a, "counts": c, "resolution": r}
                for tag, (q, a, c, r) in METERS.items()
            ],
            "readings": self.readings,
        }  # fmt: skip
        as_text = {
            name: [{key: str(cell) for key, cell in row.items()} for row in rows] for name, rows in tables.items()
        }
        site = site_of(as_text, {"name": "simulated", "ambient": "25 degC"})
        context = prepare(site, limits.of(site))
        return assess_circuit(context, site.circuits[0])


def draw(rng: np.random.Generator) -> Circuit:
    """A circuit with one cause, read by one round of voltages."""
    cause = str(rng.choice(CAUSES, p=MIXTURE))
    sizes = list(OHM_PER_M)
    size = sizes[int(rng.integers(2, len(sizes)))]
    area = float(size.split()[0])
    runs = int(rng.integers(1, 5))
    length_by = str(rng.choice(["marks", "tape", "paced", "drawing"]))
    length_u = {"marks": 0.005, "tape": 0.01, "paced": 0.08, "drawing": 0.1}[length_by]
    lengths = [round(float(rng.uniform(3, 25)), 1) for _ in range(runs)]
    taps = rng.dirichlet(np.full(runs, 3.0)) * float(rng.uniform(0.5, 2.0)) * area
    amps = [float(ampere) for ampere in np.cumsum(taps[::-1])[::-1]]
    true_size = sizes[sizes.index(size) - 1] if cause == "smaller conductor" else size
    stretch = float(rng.choice([2.0, 1 / 0.3048, rng.uniform(1.3, 2.5)])) if cause == "longer route" else 1.0
    true_c = 25 + float(rng.normal(0, 5))
    warm = 1 + ALPHA * (true_c - 20)
    metal = 1 + float(rng.normal(0, 0.02))
    scale = math.sqrt(10 / area)
    true_lengths = [length * stretch * (1 + float(rng.normal(0, length_u))) for length in lengths]
    conductor = [OHM_PER_M[true_size] * warm * metal * length for length in true_lengths]
    joints = [
        {corner: float(rng.lognormal(math.log(0.15e-3 * scale), math.log(2))) for corner in CORNERS} for _ in lengths
    ]
    circuit = Circuit(
        rng, cause, size, lengths, true_lengths, [length_by] * runs, amps, conductor, joints,
        stretch=stretch, true_size=true_size, true_c=true_c,
    )  # fmt: skip
    if cause == "bad connection":
        run, corner = int(rng.integers(runs)), CORNERS[int(rng.integers(4))]
        joints[run][corner] += float(np.exp(rng.uniform(math.log(3e-3), math.log(0.3)))) * scale
        circuit.place = f"run {run + 1} {' '.join(corner)}"
    elif cause == "series semiconductor":
        circuit.offset, circuit.offset_leg = float(rng.uniform(0.25, 0.9)), str(rng.choice(LEGS))
    between = [point for point in circuit.points[1:-1] if rng.random() < 0.4]
    circuit.read = ["way", *between, circuit.points[-1]]
    circuit.start_round(1.0)
    circuit.read_voltages(circuit.read, 1.0)
    return circuit


def take(circuit: Circuit, asked: NextReading) -> None:
    """Take what is asked for from the truth and enter it."""
    if asked.what == "length":
        # one length that is wrong gives the others away: all are taped
        wrong = circuit.stretch != 1
        number = int(asked.at.split()[1]) - 1
        for k, true in enumerate(circuit.true_lengths):
            if wrong or k == number:
                circuit.lengths[k] = round(true * (1 + float(circuit.rng.normal(0, 0.01))), 2)
                circuit.length_by[k] = "tape"
        circuit.stretch = 1.0
        return
    if not asked.quantity:  # a look at the conductor
        circuit.size = circuit.true_size
        return
    share = share_for(circuit, asked)
    if asked.what == "round":
        circuit.start_round(share)
        circuit.read_voltages(circuit.read, share)
        return
    meter = {"finer meter": "fine", "dead test": "micro"}.get(asked.what, "hand")
    circuit.start_round(share)
    if asked.quantity == "voltage":
        place = circuit.points.index(asked.at)
        before = [point for point in circuit.read if circuit.points.index(point) < place]
        circuit.read_voltages(circuit.read if asked.at in circuit.read else [before[-1], asked.at], share)
    elif asked.quantity == "drop":
        legs = (asked.leg,) if asked.leg in LEGS else LEGS
        circuit.enter("drop", asked.at, circuit.drop(asked.at, asked.to, legs, share), meter, asked.to, asked.leg)
    elif asked.quantity in ("joint", "resistance"):
        _, of_run, end = asked.at.split()
        ohm = circuit.joints[int(of_run) - 1][end, asked.leg]
        volts = ohm * (circuit.amps[int(number) - 1] * share if asked.quantity == "joint" else 1.0)
        circuit.enter(asked.quantity, asked.at, volts, meter, leg=asked.leg)
    elif asked.quantity == "temperature":
        circuit.enter("temperature", asked.at, circuit.true_c, "probe")


def share_for(circuit: Circuit, asked: NextReading) -> float:
    """The load of the day, or what is asked for where that is more or less; all of it for a second round."""
    least, most = asked.current_at_least, asked.current_at_most
    if least is None:
        return 1.0
    # a reading's current is that of the first run that it is taken across
    first = int(asked.at.split()[1]) - 1 if asked.at.startswith("run") else circuit.points.index(asked.at)
    if asked.quantity == "voltage" and asked.what != "round":
        first = max(first - 1, 0)  # that of the run that arrives at the point
    ampere = circuit.amps[min(first, circuit.runs - 1)]
    if asked.what == "round":
        return least.value / ampere
    share = max(1.0, least.value / ampere)
    return share if most is None else min(share, most.value / ampere)


@dataclass(frozen=True)
class Outcome:
    """How one circuit went under one way of choosing."""

    cause: str
    readings: int
    settled: bool
    right: bool


Chooser = Callable[[Circuit, CircuitResult], NextReading | None]


def proposed(circuit: Circuit) -> Chooser:
    """What the program asks for."""
    return lambda _, result: result.next_reading


def in_order(circuit: Circuit) -> Chooser:
    """Terminations along the circuit one after another, then legs, then the lengths, then a look."""
    return _listed(list(_everything(circuit)))


def at_random(circuit: Circuit) -> Chooser:
    """The same, shuffled."""
    asked = list(_everything(circuit))
    return _listed([asked[n] for n in circuit.rng.permutation(len(asked))])


def _everything(circuit: Circuit) -> Iterator[NextReading]:
    for k in range(circuit.runs):
        for end, leg in CORNERS:
            yield NextReading("reading", "joint", f"run {k + 1} {end}", leg=leg)
    for leg in LEGS:
        yield NextReading("reading", "drop", "way", circuit.points[-1], leg)
    yield NextReading("length", at="run 1")
    yield NextReading("reading", at="run 1")


def _listed(asked: list[NextReading]) -> Chooser:
    waiting = iter(asked)
    return lambda _, result: next(waiting, None) if result.next_reading is not None else None


def survey(circuit: Circuit, chooser: Chooser) -> Outcome:
    """Read until nothing is left to settle."""
    result, looks = circuit.result(), 0
    taken = 0
    while taken < MOST_READINGS and (asked := chooser(circuit, result)) is not None:
        looks += not asked.quantity and asked.what == "reading"
        if looks > 1:  # the record has no column for a size that was looked at
            break
        take(circuit, asked)
        taken += 1
        result = circuit.result()
    return Outcome(circuit.cause, taken, result.next_reading is None, is_right(circuit, result))


def is_right(circuit: Circuit, result: CircuitResult) -> bool:
    """The most probable cause and place are the true ones, or the record was put right."""
    best = result.causes[0]
    if circuit.cause == "bad connection":
        return best.where == circuit.place
    mended = best.cause == "as recorded" and circuit.stretch == 1 and circuit.size == circuit.true_size
    return best.cause == circuit.cause or (circuit.cause in ("longer route", "smaller conductor") and mended)


WAYS: dict[str, Callable[[Circuit], Chooser]] = {"proposed": proposed, "in order": in_order, "at random": at_random}


def compare(circuits: int, seed: int) -> dict[str, list[Outcome]]:
    """The same circuits, surveyed each way: so many that their first round leaves open."""
    found: dict[str, list[Outcome]] = {name: [] for name in WAYS}
    number = 0
    while len(found["proposed"]) < circuits:
        number += 1
        if draw(np.random.default_rng([seed, number])).result().next_reading is None:
            continue
        for name, way in WAYS.items():
            circuit = draw(np.random.default_rng([seed, number]))
            found[name].append(survey(circuit, way(circuit)))
    return found


def table(found: dict[str, list[Outcome]]) -> list[str]:
    """Readings until settled by cause, and the shares settled and right."""
    lines = [f"{'':24s}" + "".join(f"{name:>34s}" for name in found)]
    lines.append(f"{'':24s}" + f"{'readings':>14s}{'settled':>10s}{'right':>10s}" * len(found))
    for cause in (*CAUSES, "all"):
        line = f"{cause:24s}"
        for outcomes in found.values():
            some = [one for one in outcomes if cause in (one.cause, "all")]
            figures = [np.mean([getattr(one, name) for one in some]) if some else math.nan for name in FIGURES]
            line += f"{figures[0]:14.2f}{figures[1]:10.2f}{figures[2]:10.2f}"
        lines.append(line)
    return lines


FIGURES = ("readings", "settled", "right")


def main() -> int:
    """Survey and print."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--circuits", type=int, default=100)
    parser.add_argument("--seed", type=int, default=1)
    args = parser.parse_args()
    print("\n".join(table(compare(args.circuits, args.seed))))
    return 0


if __name__ == "__main__":
    sys.exit(main())
