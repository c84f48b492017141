#!/usr/bin/env python3
"""
Readings of a sample site from a simulation of its true network.

    python tests/sample_sites/simulate.py station

prints ``readings.csv``; for ``plant`` and ``doors`` the readings of the circuits that were added later, at the end of
theirs. The record is the folder's own; what is true of the building but not in the record (faults, source voltages, what
was switched off) and the order of the survey stand in ``NAME.toml`` beside this file. What the record leaves open is drawn
within what it states: lengths, temperatures, terminations, devices, loads, meter gains and counts. Every quantity has a
generator of its own, so that another reading moves no other figure. Needs numpy alone and none of the project's code, so
that the two can disagree; it serves such words of the format as these sites use.
"""

from __future__ import annotations

import argparse
import csv
import io
import math
import sys
import tomllib
import zlib
from collections.abc import Iterator
from dataclasses import dataclass
from datetime import datetime, timedelta
from pathlib import Path
from typing import Any, TypeAlias

import numpy as np
from numpy.typing import NDArray

HERE = Path(__file__).parent
SITES = HERE.parent.parent / "sample_sites"

OHM_PER_KM = {
    0.5: 36.0, 0.75: 24.5, 1: 18.1, 1.5: 12.1, 2.5: 7.41, 4: 4.61, 6: 3.08, 10: 1.83, 16: 1.15, 25: 0.727, 35: 0.524,
    50: 0.387, 70: 0.268, 95: 0.193, 120: 0.153,
}  # fmt: skip
"""IEC 60228 Table 2, stranded copper at 20 °C, by mm²; tinned copper and other metals by their resistivity."""
RHO = {"copper": 1 / 58, "tinned copper": 0.017745, "copper-clad aluminium": 1 / 58 / 0.62}
"""At 20 °C. [Ω mm²/m]"""
ALPHA = {"copper": 0.00393, "tinned copper": 0.00382, "copper-clad aluminium": 0.00405}
LAY = 1.02
LENGTH_DOUBT = {"marks": 0.005, "tape": 0.01, "tdr": 0.02, "paced": 0.08, "drawing": 0.10, "guess": 0.25}
TEMPERATURE_DOUBT = {"probe": 2.0, "air": 5.0, "assumed": 8.0}
BREAKER_LOSS = {10: 3.0, 16: 3.5, 25: 4.5, 32: 6.0, 40: 7.5, 50: 9.0, 63: 13.0}
"""Largest loss of a pole at ratings up to each. From memory: IEC 60898-1. [A, W]"""
FUSE_LOSS = {32: 3.0, 50: 5.0, 100: 9.5, 160: 12.0, 250: 23.0}
"""The same of gG fuse-links. From memory: IEC 60269-2."""
BLADE_OHM = {1: 0.123, 2: 0.0535, 3: 0.0311, 4: 0.0228, 5: 0.01785, 7.5: 0.01091, 10: 0.0077}
"""Cold resistance of blade fuses. From memory: a maker's sheet."""
QUANTITIES = {"v": "voltage", "d": "drop", "j": "joint", "i": "current", "r": "residual", "t": "temperature"}
METER_ROWS = {"drop": "voltage", "joint": "voltage", "residual": "current"}
"""Whose rows of an instrument serve another quantity's readings."""
COLUMNS = (
    "circuit", "board", "visit", "round", "taken_at", "quantity", "at", "to", "leg", "value", "instrument", "loads_off",
    "by", "notes",
)  # fmt: skip

Row: TypeAlias = dict[str, str]
Node: TypeAlias = tuple[str, str, str]
"""Leg, circuit (or board, or name of a shared return), point."""


@dataclass(frozen=True)
class Branch:
    """A resistance between two nodes, with a voltage that a semiconductor in it takes away."""

    circuit: str
    name: str
    """As in the readings: ``run 2 end``, ``device``; the conductor between is ``run 2``."""
    leg: str
    start: Node
    end: Node
    ohm: float
    lost_v: float = 0.0


class Building:
    """What is true of a site: its record, and what ``NAME.toml`` says beside it."""

    def __init__(self, name: str) -> None:
        self.truth: dict[str, Any] = tomllib.loads((HERE / f"{name}.toml").read_text(encoding="utf-8"))
        folder = SITES / str(self.truth["folder"])
        for table in ("sources", "boards", "circuits", "runs", "loads", "instruments"):
            with (folder / f"{table}.csv").open(newline="", encoding="utf-8") as file:
                rows = [{key.split(" [")[0]: cell for key, cell in row.items()} for row in csv.DictReader(file)]
            setattr(self, table, rows)
        only = set(self.truth.get("only", [row["circuit"] for row in self.circuits]))
        for table in ("circuits", "runs", "loads"):
            setattr(self, table, [row for row in getattr(self, table) if row["circuit"] in only])

    sources: list[Row]
    boards: list[Row]
    circuits: list[Row]
    runs: list[Row]
    loads: list[Row]
    instruments: list[Row]

    def drawn(self, *name: str) -> np.random.Generator:
        """The generator of one thing's error."""
        return np.random.default_rng([self.truth["seed"], zlib.crc32("/".join(name).encode())])

    def normal(self, *name: str) -> float:
        """Standard normal, within two standard deviations."""
        return float(np.clip(self.drawn(*name).standard_normal(), -2, 2))

    def faults(self, circuit: str, visit: str) -> Iterator[dict[str, Any]]:
        """What is wrong with a circuit on a visit."""
        for fault in self.truth.get("fault", []):
            if fault["circuit"] == circuit and fault.get("visit", visit) == visit:
                yield fault

    # What the record says, as numbers

    def conductor_ohm(self, run: Row, size: str, metal: str, metres: float) -> float:
        """One conductor at its true temperature."""
        circuit = run["circuit"]
        celsius = read(run["temperature"] or str(self.truth["ambient"]))
        celsius += TEMPERATURE_DOUBT[run["temperature_by"] or "assumed"] * self.normal("temperature", circuit)
        number, unit = words(size)
        metric = unit == "mm2"
        r20 = OHM_PER_KM[float(number)] / 1e3 * 58 * RHO[metal] if metric else RHO[metal] * LAY / area_mm2(size)
        r20 *= 1 + 0.02 * self.normal("resistance", circuit)
        return metres * r20 * (1 + ALPHA[metal] * (celsius - 20))

    def joint_ohm(self, size: str, *name: str) -> float:
        """One healthy termination."""
        return 0.15e-3 * math.sqrt(10 / area_mm2(size)) * math.exp(math.log(2) * self.normal("joint", *name))

    def device_ohm(self, circuit: Row) -> float:
        """One pole of a circuit's device."""
        kind, rating = circuit["device"], float(circuit["device_rating"])
        share = 0.6 * (1 + 0.3 * self.normal("device", circuit["circuit"]))
        if kind == "electronic":
            return 0.15 / rating
        if kind == "fuse blade":
            return BLADE_OHM[rating]
        losses = FUSE_LOSS if kind == "fuse gG" else BREAKER_LOSS
        return share * next(loss for up_to, loss in losses.items() if rating <= up_to) / rating**2

    # The network of one visit

    def board_node(self, leg: str, tag: str) -> Node:
        """The busbar of a board or source: the end of the circuit that feeds it, or its own."""
        board = next((row for row in self.boards if row["board"] == tag), None)
        fed_by = board["fed_by"] if board else tag
        if any(row["circuit"] == fed_by for row in self.circuits):
            last = [run for run in self.runs if run["circuit"] == fed_by][-1]
            return (leg, fed_by, last["to"])
        return (leg, fed_by, "terminals")

    def point_node(self, leg: str, circuit: str, point: str) -> Node:
        """A point of a circuit, as the readings name it."""
        row = next(row for row in self.circuits if row["circuit"] == circuit)
        if point == "bus":
            return self.board_node(leg, row["fed_from"])
        if point == "way" and leg not in poles(row):
            return self.board_node(leg, row["fed_from"])
        arriving = next((run for run in self.runs if run["circuit"] == circuit and run["to"] == point), None)
        if arriving and leg == return_leg(row) and arriving.get("return", "").startswith("shared:"):
            return (leg, arriving["return"], point)
        return (leg, circuit, point)

    def branches(self, visit: str) -> Iterator[Branch]:
        """Every device pole, termination and conductor."""
        shared: set[str] = set()
        for circuit in self.circuits:
            tag = circuit["circuit"]
            faults = list(self.faults(tag, visit))
            for leg in poles(circuit):
                ends = (self.point_node(leg, tag, "bus"), self.point_node(leg, tag, "way"))
                worn = sum(fault.get("ohm", 0.0) for fault in faults if fault.get("at") == f"device {leg}")
                yield Branch(tag, "device", leg, *ends, self.device_ohm(circuit) + worn)
            for run in (run for run in self.runs if run["circuit"] == tag):
                for leg in ("positive", "negative"):
                    common = run.get("return", "") if leg == return_leg(circuit) else ""
                    if common in shared:
                        continue
                    if common.startswith("shared:"):
                        shared.add(common)
                    yield from self.leg_of(run, leg, faults, is_return=leg == return_leg(circuit))

    def leg_of(self, run: Row, leg: str, faults: list[dict[str, Any]], is_return: bool) -> Iterator[Branch]:
        """Start termination, conductor and end termination of one leg of a run, with what is wrong in them."""
        tag, name = run["circuit"], f"run {run['run']}"
        true = {
            key: value
            for fault in faults
            if fault.get("run", int(run["run"])) == int(run["run"])
            for key, value in fault.items()
        }
        metres = true.get("length", read(run["length"]) * true.get("times_length", 1.0))
        metres *= 1 + LENGTH_DOUBT[run["length_by"] or "drawing"] * self.normal("length", tag, name)
        size, metal = true.get("size", run["size"]), true.get("material", run["material"] or "copper")
        if is_return and run.get("return_size"):
            size = run["return_size"]
        start, end = self.point_node(leg, tag, run["from"]), self.point_node(leg, tag, run["to"])
        inner: tuple[Node, Node] = ((leg, tag, f"{name} first"), (leg, tag, f"{name} last"))
        structure = true.get("structure_ohm") if is_return else None
        conductor = self.conductor_ohm(run, size, metal, metres) if structure is None else structure
        parts = (
            ("start", start, inner[0], self.joint_ohm(size, tag, name, leg, "start")),
            ("", inner[0], inner[1], conductor),
            ("end", inner[1], end, self.joint_ohm(size, tag, name, leg, "end")),
        )
        for part, one, other, ohm in parts:
            place = f"{name} {part}".strip()
            here = [fault for fault in faults if fault.get("at") == f"{place} {leg}"]
            yield Branch(
                tag, place, leg, one, other,
                ohm + sum(fault.get("ohm", 0.0) for fault in here), sum(fault.get("volts", 0.0) for fault in here),
            )  # fmt: skip


def read(text: str) -> float:
    """Metres or degrees Celsius from a cell."""
    number, unit = words(text)
    return {"": 1.0, "m": 1.0, "ft": 0.3048}[unit] * float(number)


def words(text: str) -> tuple[str, str]:
    """A number and its unit, in one spelling."""
    number, _, unit = text.replace(",", ".").replace("²", "2").partition(" ")
    return number, unit


def area_mm2(size: str) -> float:
    """Of a conductor; of AWG by its diameter."""
    number, unit = words(size)
    if unit in ("mm2", "kcmil"):
        return float(number) * (1.0 if unit == "mm2" else 0.5067)
    gauge = 1 - int(number.split("/")[0]) if "/" in number else int(number)
    return math.pi / 4 * (0.127 * math.pow(92, (36 - gauge) / 39)) ** 2


def poles(circuit: Row) -> tuple[str, ...]:
    """The legs that a circuit's device lies in."""
    leg = circuit["device_leg"]
    return () if circuit["device"] == "none" else ("positive", "negative") if leg == "both" else (leg,)


def return_leg(circuit: Row) -> str:
    """The leg that a shared return or the structure stands for: the one without the device."""
    return "positive" if circuit["device_leg"] == "negative" else "negative"


class State:
    """Voltages and currents of the building in one round."""

    def __init__(self, building: Building, survey: dict[str, Any]) -> None:
        self.building, self.visit = building, str(survey["visit"])
        off = set(survey.get("off", ()))
        self.open = {tag for tag in off if "." not in tag}
        self.parts = [
            part for part in building.branches(self.visit) if not (part.name == "device" and part.circuit in self.open)
        ]
        self.fixed = self._fixed(survey["volts"])
        self.loads = [row for row in building.loads if f"{row['circuit']}.{row['load']}" not in off]
        self.share = {**building.truth.get("draws", {}), **survey.get("draws", {})}
        self.ohms: dict[str, float] = survey.get("ohms", {})
        nodes = {node for part in self.parts for node in (part.start, part.end)} | set(self.fixed)
        self.place = {node: n for n, node in enumerate(sorted(nodes))}
        self.volts: NDArray[np.float64] = np.zeros(len(self.place))
        self._solve()

    def _fixed(self, volts: dict[str, float]) -> dict[Node, float]:
        """The poles of each source, against earth."""
        fixed = {}
        for tag, value in volts.items():
            above = value * self.building.truth.get("positive_share", {}).get(tag, 1.0)
            fixed[self.building.board_node("positive", tag)] = above
            fixed[self.building.board_node("negative", tag)] = above - value
        return fixed

    def at(self, node: Node) -> float:
        return float(self.volts[self.place[node]])

    def between(self, circuit: str, point: str, leg: str = "") -> float:
        """Voltage between the legs, or of one pole to earth."""
        ends = [self.at(self._node(name, circuit, point)) for name in ("positive", "negative")]
        return ends[0] - ends[1] if not leg else ends[0] if leg == "positive" else ends[1]

    def _node(self, leg: str, circuit: str, point: str) -> Node:
        known = any(row["circuit"] == circuit for row in self.building.circuits)
        return self.building.point_node(leg, circuit, point) if known else self.building.board_node(leg, circuit)

    def current(self, part: Branch) -> float:
        """From start to end, as drawn in the branch."""
        return (self.at(part.start) - self.at(part.end) - part.lost_v * self._sense(part)) / part.ohm

    def _sense(self, part: Branch) -> float:
        return 1.0 if part.leg == "positive" else -1.0

    def _draw(self, row: Row) -> float:
        """Amperes of a load at the voltage that it has now."""
        node = [self.building.point_node(leg, row["circuit"], row["point"]) for leg in ("positive", "negative")]
        volts = max(self.at(node[0]) - self.at(node[1]), 1e-9)
        share = self.share.get(f"{row['circuit']}.{row['load']}", self.share.get(row["circuit"]))
        if share is None:
            share = 0.93 + 0.05 * float(self.building.drawn("load", row["circuit"], row["load"]).uniform(-1, 1))
        if row.get("power"):
            return share * watts(row["power"]) / volts if volts > 5 else 0.0
        if row.get("resistance"):
            ohm = self.ohms.get(row["circuit"], float(row["resistance"]))
            return volts / (ohm * (1 + 0.02 * self.building.normal("load", row["circuit"], row["load"])))
        return share * float(row["current"]) if volts > 5 else 0.0

    def _converters(self) -> Iterator[tuple[Node, Node, float]]:
        """Where each converter takes its current, and how much."""
        for row in self.building.sources:
            if not row.get("fed_from") or self.building.board_node("positive", row["source"]) not in self.fixed:
                continue
            own = self.building.board_node("positive", row["source"])
            amps = sum(self.current(part) for part in self.parts if part.start == own)
            ends = [self.building.point_node(leg, *row["fed_from"].split(":")) for leg in ("positive", "negative")]
            volts = max(self.at(ends[0]) - self.at(ends[1]), 1.0)
            yield ends[0], ends[1], self.fixed[own] * amps / (float(row["efficiency"]) / 100 * volts)

    def _solve(self) -> None:
        """Node by node; loads and converters drawn anew until nothing moves."""
        size = len(self.place)
        matrix = 1e-12 * np.eye(size)
        emf = np.zeros(size)
        for part in self.parts:
            a, b = self.place[part.start], self.place[part.end]
            matrix[np.ix_([a, b], [a, b])] += np.array([[1, -1], [-1, 1]]) / part.ohm
            lost = self._sense(part) * part.lost_v / part.ohm
            emf[a] += lost
            emf[b] -= lost
        for node in self.fixed:
            matrix[self.place[node]] = 0
            matrix[self.place[node], self.place[node]] = 1
        for node in self.place:
            self.volts[self.place[node]] = 48.0 if node[0] == "positive" else -48.0
        for _ in range(200):
            right = emf.copy()
            for row in self.loads:
                amps = self._draw(row)
                right[self.place[self.building.point_node("positive", row["circuit"], row["point"])]] -= amps
                right[self.place[self.building.point_node("negative", row["circuit"], row["point"])]] += amps
            for start, end, amps in self._converters():
                right[self.place[start]] -= amps
                right[self.place[end]] += amps
            for node, volts in self.fixed.items():
                right[self.place[node]] = volts
            before, self.volts = self.volts, np.asarray(np.linalg.solve(matrix, right), float)
            if np.abs(self.volts - before).max() < 1e-9:
                return
        raise SystemExit("the network does not settle")

    def true_value(self, quantity: str, circuit: str, at: str, to: str, leg: str) -> float:
        """What a perfect meter would show."""
        if quantity == "voltage":
            return self.between(circuit, at, leg)
        legs = ("positive", "negative") if leg in ("", "both") else (leg,)
        if quantity == "drop":
            return sum(
                (self.at(self._node(one, circuit, at)) - self.at(self._node(one, circuit, to)))
                * (1 if one == "positive" else -1)
                for one in legs
            )
        place = {"way": "run 1", "bus": "run 1"}.get(at, at)
        found = [part for part in self.parts if part.circuit == circuit and part.name == place and part.leg in legs]
        if quantity == "joint":
            return sum(abs(self.current(part)) * part.ohm + part.lost_v for part in found)
        return abs(self.current(found[0])) * (1 if self.current(found[0]) * self._sense(found[0]) >= 0 else -1)


def watts(text: str) -> float:
    number, _, unit = text.partition(" ")
    return float(number) * {"": 1.0, "W": 1.0, "kW": 1e3}[unit]


class Meters:
    """What the instruments show."""

    def __init__(self, building: Building) -> None:
        self.building = building

    def shown(self, true: float, tag: str, quantity: str, visit: str, name: str) -> str:
        """The reading as it stands on the display of the smallest range that holds it."""
        kind = METER_ROWS.get(quantity, quantity)
        rows = [row for row in self.building.instruments if (row["instrument"], row["quantity"]) == (tag, kind)]
        rows.sort(key=lambda row: float(row["range"] or math.inf))
        row = next(row for row in rows if abs(true) * 1.02 <= float(row["range"] or math.inf))
        gain = float(row["accuracy"]) / 100 * self.building.drawn("gain", tag, kind, row["range"], visit).uniform(-1, 1)
        wrong = [item for item in self.building.truth.get("meter", []) if item["instrument"] == tag]
        step = float(row["resolution"])
        value = true * (1 + gain + sum(item.get("gain", 0.0) for item in wrong))
        value += float(row["zero"] or 0) + sum(item.get("zero", 0.0) for item in wrong)
        value += (
            float(row["counts"]) * step * float(self.building.drawn("counts", tag, visit, name).uniform(-1, 1)) * 0.6
        )
        places = max(0, -math.floor(math.log10(step) + 1e-9))
        return f"{round(round(value / step) * step, places) + 0.0:.{places}f}"


def readings(building: Building) -> Iterator[Row]:
    """Every reading of every survey, in the order in which it was taken."""
    meters = Meters(building)
    for survey in building.truth["survey"]:
        state = State(building, survey)
        clock = datetime.fromisoformat(survey["at"])
        for line in str(survey["take"]).strip().splitlines():
            place, _, steps = line.partition(":")
            clock += timedelta(minutes=4)
            for step in steps.split(","):
                yield one_reading(building, state, meters, survey, clock, place.strip(), step.strip())
                clock += timedelta(minutes=1)


def one_reading(
    building: Building, state: State, meters: Meters, survey: dict[str, Any], clock: datetime, place: str, step: str
) -> Row:
    """
    One step of a survey: ``v panel``, ``v bus positive``, ``d way>panel negative``, ``j run 1 end positive``, ``i way
    positive``; then ``@METER``, ``=VALUE`` (what is true where the network does not say), ``+MINUTES``, ``off``, ``#note``.
    """
    step, _, note = step.partition("#")
    words = step.split()
    quantity = QUANTITIES[words.pop(0)]
    marks = {word[0]: word[1:] for word in words if word[0] in "@=+"}
    loads_off = "off" in words
    words = [word for word in words if word[0] not in "@=+" and word != "off"]
    leg = words.pop() if words[-1] in ("positive", "negative", "both") else ""
    at, _, to = " ".join(words).partition(">")
    survey_meter = survey["meters"][METER_ROWS.get(quantity, quantity)]
    meter = marks.get("@", survey_meter)
    when = clock + timedelta(minutes=int(marks.get("+", 0)))
    is_circuit = any(row["circuit"] == place for row in building.circuits)
    true = float(marks["="]) if "=" in marks else state.true_value(quantity, place, at, to, leg)
    name = f"{survey['visit']} {survey['round']} {place} {quantity} {at} {to} {leg} {clock.isoformat()}"
    return {
        "circuit": place if is_circuit else "",
        "board": "" if is_circuit else place,
        "visit": survey["visit"],
        "round": str(survey["round"]),
        "taken_at": when.isoformat(timespec="minutes"),
        "quantity": quantity,
        "at": at,
        "to": to,
        "leg": leg,
        "value": meters.shown(true, meter, quantity, str(survey["visit"]), name),
        "instrument": meter,
        "loads_off": "yes" if loads_off else "",
        "by": survey["by"],
        "notes": note.strip(),
    }


def as_csv(rows: list[Row]) -> str:
    """The rows as ``readings.csv``; a column that nobody fills is left out."""
    used = [name for name in COLUMNS if any(row[name] for row in rows)]
    text = io.StringIO(newline="")
    writer = csv.DictWriter(text, used, extrasaction="ignore", lineterminator="\n")
    writer.writeheader()
    writer.writerows(rows)
    return text.getvalue()


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("site", choices=sorted(path.stem for path in HERE.glob("*.toml")))
    sys.stdout.write(as_csv(list(readings(Building(parser.parse_args().site)))))


if __name__ == "__main__":
    main()
