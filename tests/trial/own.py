#!/usr/bin/env python3
"""
Simulated surveys beyond the blind trial, whose truth is known, and what the diagnosis reaches on each.

    python tests/trial/own.py [--circuits 300] [--seeds 1 2 3] [--survey WORDS …]

The simulation is written for itself, on the conductor figures of the blind trial's own module: every leg,
termination, meter and load errs as the limits profile says that it may, and each circuit gets one truth. The priors
say how it was drawn. Common errors of whole sites with their explanations are in ``tests/trial/habits.py``.
"""

from __future__ import annotations

import argparse
import importlib.util
import math
from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from pathlib import Path
from types import ModuleType
from typing import Any

import numpy as np

from audit.intake.folder import site_of
from rules import limits
from rules.assess import prepare
from rules.assessment import Place
from rules.diagnosis.diagnose import Diagnosis
from rules.record import Site

TESTS = Path(__file__).parent.parent
LEGS = ("positive", "negative")
ENDS = ("start", "end")
FAULTS = ("bad connection", "smaller conductor", "other metal", "longer route", "series semiconductor")
DOUBTFUL = "reading or record doubtful"


def blind_trial() -> ModuleType:
    """The blind trial, for its conductor figures and its scale of doubts."""
    spec = importlib.util.spec_from_file_location("blind_trial", TESTS / "trial" / "trial.py")
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


TRIAL = blind_trial()
METERS: dict[str, list[tuple[float | None, float, int, float]]] = {
    "volts": [(0.6, 0.08, 5, 1e-5), (None, 0.05, 3, 0.001)],
    "other volts": [(None, 0.5, 2, 0.01)],
    "amps": [(None, 0.25, 2, 0.01)],
    "ohms": [(None, 0.25, 5, 1e-5)],
}
"""Range, accuracy [%], counts, resolution of each range."""


@dataclass(frozen=True)
class Survey:
    """What is read, and what may be wrong."""

    name: str
    runs: tuple[int, int] = (2, 5)
    tree: bool = False
    rounds: int = 2
    currents: str = "every run"
    """``every run``, or ``the first run`` alone."""
    legs: bool = False
    """Drops along each leg of each run, with a long lead."""
    joints: bool = False
    """Millivolts across every termination."""
    dead: bool = False
    """Resistance of each leg of each run, isolated."""
    two_meters: bool = False
    """Every other point is read by a coarser meter, and ``way`` by both."""
    wander_v: float = 0.0
    """Standard deviation of the source between readings; ``way`` is then read three times."""
    slips: float = 0.0
    """Share of circuits that are as recorded but for one mistyped reading."""
    two_bad: bool = False
    """Bad connections come in pairs, in different runs."""
    faulty: float = 0.5
    """Share of circuits with a fault."""
    bad: float = 0.6
    """Share of faults that are bad connections; the others share the rest."""
    voltages: bool = True
    bias: float = 0.0
    """One voltmeter reads the whole site, and shows so much more than there is, far outside its specification."""


SURVEYS = (
    Survey("voltages and currents of chains"),
    Survey("trees with taps", tree=True, runs=(3, 7)),
    Survey("drops along each leg", legs=True),
    Survey("millivolts across joints", joints=True, rounds=1, runs=(1, 4)),
    Survey("dead tests of each leg", dead=True, voltages=False, runs=(1, 4)),
    Survey("the first run's current alone", currents="the first run"),
    Survey("two meters", two_meters=True),
    Survey("a meter 6 % high over the whole site", bias=0.06),
    Survey("a source that wanders by 20 mV", wander_v=0.02),
    Survey("a typing slip in every fifth circuit", slips=0.2),
    Survey("two bad connections", two_bad=True, bad=1.0),
    Survey("two bad connections, legs read", two_bad=True, bad=1.0, legs=True),
)


@dataclass
class Truth:
    """What a drawn circuit truly is."""

    circuit: str
    cause: str = "as recorded"
    places: tuple[str, ...] = ()
    """``run 2 end positive``"""
    extra_ohm: tuple[float, ...] = ()


@dataclass
class Drawn:
    """The record of a survey as rows, and its truth."""

    tables: dict[str, list[dict[str, str]]] = field(default_factory=dict)
    truth: list[Truth] = field(default_factory=list)
    gains: dict[tuple[str, float | None], float] = field(default_factory=dict)
    """Of meters that read the whole site."""

    def add(self, table: str, **cells: Any) -> None:
        row = {name: ("" if cell is None else str(cell)) for name, cell in cells.items()}
        self.tables.setdefault(table, []).append(row)

    def site(self) -> Site:
        return site_of(self.tables, {"name": "drawn", "ambient": "25 degC"})


def draw(survey: Survey, circuits: int, seed: int) -> Drawn:
    """A survey of so many circuits."""
    rng = np.random.default_rng(seed)
    drawn = Drawn()
    for number in range(circuits):
        _circuit(survey, drawn, rng, f"C{number + 1:04d}")
    return drawn


@dataclass
class _Run:
    """One run as recorded and as it is."""

    number: int
    start: str
    end: str
    length_m: float
    load_a: float
    true_load_a: float
    conductor_ohm: dict[str, float] = field(default_factory=dict)
    joint_ohm: dict[tuple[str, str], float] = field(default_factory=dict)
    current_a: float = 0.0
    recorded_current_a: float = 0.0

    def loss(self, leg: str, current_a: float) -> float:
        return (self.conductor_ohm[leg] + sum(self.joint_ohm[end, leg] for end in ENDS)) * current_a


def _circuit(survey: Survey, drawn: Drawn, rng: np.random.Generator, tag: str) -> None:
    ladder = TRIAL.LADDER_MM if rng.random() < 0.5 else TRIAL.LADDER_AWG
    step = int(rng.integers(3, len(ladder) - 2))
    size = ladder[step]
    temperature, temperature_by = round(float(rng.uniform(15, 45)), 1), str(rng.choice(["probe", "air"]))
    length_by = str(rng.choice(["marks", "tape", "tdr"]))
    nominal = float(rng.choice([24, 48]))
    truth = _truth(survey, rng, tag)
    runs = _runs(survey, rng, size, nominal, temperature)
    _resistances(runs, truth, rng, ladder, step, temperature, temperature_by, length_by, survey.two_bad)
    source = f"{tag}-S"
    drawn.add("sources", source=source, kind="power supply", nominal=nominal, lowest=0.9 * nominal)
    drawn.add("circuits", circuit=tag, fed_from=source, device="none", allowed_drop=50)
    for run in runs:
        drawn.add(
            "runs", circuit=tag, run=run.number, **{"from": run.start, "to": run.end}, length=run.length_m,
            length_by=length_by, size=size, temperature=temperature, temperature_by=temperature_by,
        )  # fmt: skip
        drawn.add("loads", circuit=tag, point=run.end, load=f"{tag}-{run.number}", current=round(run.load_a, 3))
    _read(survey, drawn, rng, tag, runs, truth, nominal)
    drawn.truth.append(truth)


def _truth(survey: Survey, rng: np.random.Generator, tag: str) -> Truth:
    if rng.random() < survey.slips:
        return Truth(tag, DOUBTFUL)
    if rng.random() >= survey.faulty:
        return Truth(tag)
    others = (1 - survey.bad) / (len(FAULTS) - 1)
    return Truth(tag, str(rng.choice(FAULTS, p=[survey.bad, *[others] * (len(FAULTS) - 1)])))


def _runs(survey: Survey, rng: np.random.Generator, size: str, nominal: float, temperature: float) -> list[_Run]:
    count = int(rng.integers(survey.runs[0], survey.runs[1] + 1))
    if survey.two_bad:
        count = max(count, 2)
    full = min(float(rng.uniform(1.0, 3.0)) * TRIAL.area_m2(size) * 1e6, 50.0)
    per_m = 2 * TRIAL.ohm_per_m(size, "copper", temperature)
    whole = np.clip(rng.uniform(0.02, 0.06) * nominal / (per_m * full), 4, 200)
    lengths = np.maximum(np.round(rng.dirichlet(np.full(count, 4.0)) * whole, 1), 0.5)
    loads = rng.dirichlet(np.full(count, 3.0)) * full
    points = ["way"]
    runs = []
    for n in range(count):
        start = points[int(rng.integers(len(points)))] if survey.tree and n else points[-1]
        points.append(f"p{n + 1}")
        true_load = loads[n] * (1 + (rng.normal(0, 0.15) if survey.currents != "every run" else 0.0))
        runs.append(_Run(n + 1, start, points[-1], float(lengths[n]), float(loads[n]), float(true_load)))
    return runs


def _resistances(
    runs: list[_Run], truth: Truth, rng: np.random.Generator, ladder: list[str], step: int, temperature: float,
    temperature_by: str, length_by: str, pair: bool,
) -> None:  # fmt: skip
    """Every leg and termination as it truly is, with the fault in it."""
    size, metal, stretch = ladder[step], "copper", 1.0
    if truth.cause == "smaller conductor":
        size = ladder[step - int(rng.integers(1, 3))]
    elif truth.cause == "other metal":
        metal = "copper-clad aluminium" if rng.random() < 0.6 else "aluminium"
    elif truth.cause == "longer route":
        stretch = float(rng.choice([2.0, 1 / 0.3048, rng.uniform(1.3, 2.5)]))
    true_temperature = temperature + rng.normal(0, TRIAL.TEMPERATURE_DOUBT[temperature_by])
    metal_error = 1 + rng.normal(0, TRIAL.RESISTANCE_DOUBT)
    scale = TRIAL.joint_scale(ladder[step])
    for run in runs:
        length = run.length_m * stretch * (1 + rng.normal(0, TRIAL.LENGTH_DOUBT[length_by]))
        for leg in LEGS:
            run.conductor_ohm[leg] = TRIAL.ohm_per_m(size, metal, true_temperature) * metal_error * length
            for end in ENDS:
                run.joint_ohm[end, leg] = rng.lognormal(math.log(TRIAL.TERMINATION_MEDIAN * scale), math.log(2.0))
    if truth.cause == "series semiconductor":
        truth.extra_ohm = (float(rng.uniform(0.25, 0.9)),)
    if truth.cause == "bad connection":
        chosen = rng.choice(len(runs), size=2 if pair else 1, replace=False)
        for n in sorted(int(n) for n in chosen):
            end, leg = str(rng.choice(ENDS)), str(rng.choice(LEGS))
            extra = float(np.exp(rng.uniform(np.log(TRIAL.BAD_LOW), np.log(TRIAL.BAD_HIGH)))) * scale
            runs[n].joint_ohm[end, leg] += extra
            truth.places += (f"run {runs[n].number} {end} {leg}",)
            truth.extra_ohm += (extra,)


@dataclass
class _Meters:
    """Meters of one circuit with the gains that they truly have."""

    rng: np.random.Generator
    tag: str
    drawn: Drawn
    bias: float
    gains: dict[tuple[str, float | None], float] = field(default_factory=dict)

    def shows(self, meter: str, true: float) -> tuple[str, float]:
        """Tag of the meter and what it shows, on the smallest range that holds the value."""
        scale, accuracy, counts, resolution = next(
            row for row in METERS[meter] if row[0] is None or abs(true) < 0.99 * row[0]
        )
        key, shared = (meter, scale), bool(self.bias) and meter == "volts"
        gains, tag = (self.drawn.gains, meter) if shared else (self.gains, f"{meter} {self.tag}")
        if key not in gains:
            gains[key] = 1 + float(self.rng.uniform(-1, 1)) * accuracy / 100 + (self.bias if shared else 0.0)
            quantity = {"amps": "current", "ohms": "resistance"}.get(meter, "voltage")
            self.drawn.add(
                "instruments", instrument=tag, quantity=quantity, range=scale, accuracy=accuracy,
                counts=counts, resolution=resolution,
            )  # fmt: skip
        value = true * gains[key] + float(self.rng.uniform(-1, 1)) * counts * resolution
        return tag, round(round(value / resolution) * resolution, 6)


def _read(
    survey: Survey, drawn: Drawn, rng: np.random.Generator, tag: str, runs: list[_Run], truth: Truth, nominal: float
) -> None:
    meters = _Meters(rng, tag, drawn, survey.bias)
    readings: list[dict[str, Any]] = []

    def take(round_: int, quantity: str, at: str, meter: str, true: float, to: str = "", leg: str = "") -> None:
        instrument, value = meters.shows(meter, true)
        readings.append(
            {
                "circuit": tag,
                "round": round_,
                "quantity": quantity,
                "at": at,
                "to": to,
                "leg": leg,
                "value": value,
                "instrument": instrument,
            }
        )

    offset = truth.extra_ohm[0] if truth.cause == "series semiconductor" else 0.0
    by_end = {run.end: run for run in runs}
    for n in range(survey.rounds):
        share = 1.0 if n == 0 else float(rng.uniform(0.3, 0.6))
        for run in runs:
            run.current_a = 0.0
        for run in runs:
            on: _Run | None = run
            while on is not None:
                on.current_a += run.true_load_a * share
                on = by_end.get(on.start)
        volts = {"way": nominal * float(rng.uniform(0.98, 1.1))}
        for run in runs:
            lost = sum(run.loss(leg, run.current_a) for leg in LEGS) + (offset if run.number == 1 else 0.0)
            volts[run.end] = volts[run.start] - lost
        if survey.voltages:
            for number, (point, true) in enumerate(volts.items()):
                times = 3 if survey.wander_v and point == "way" else 1
                other = survey.two_meters and number % 2 == 1
                for _ in range(times):
                    wander = rng.normal(0, survey.wander_v) if survey.wander_v else 0.0
                    take(n + 1, "voltage", point, "other volts" if other else "volts", true + wander)
                if survey.two_meters and point == "way":
                    take(n + 1, "voltage", point, "other volts", true)
        for run in runs:
            if run.number == 1 or survey.currents == "every run":
                take(n + 1, "current", f"run {run.number}", "amps", run.current_a)
            if survey.legs:
                for leg in LEGS:
                    seen = offset if run.number == 1 and leg == "positive" else 0.0
                    take(n + 1, "drop", run.start, "volts", run.loss(leg, run.current_a) + seen, run.end, leg)
            if survey.joints:
                for end in ENDS:
                    for leg in LEGS:
                        true = run.joint_ohm[end, leg] * run.current_a
                        take(n + 1, "joint", f"run {run.number} {end}", "volts", true, leg=leg)
            if survey.dead and n == 0:
                for leg in LEGS:
                    take(n + 1, "resistance", run.start, "ohms", run.loss(leg, 1.0), run.end, leg)
    if truth.cause == DOUBTFUL:
        _slip(rng, readings)
    for reading in readings:
        drawn.add("readings", **reading)


def _slip(rng: np.random.Generator, readings: list[dict[str, Any]]) -> None:
    """One voltage or current is mistyped: a decimal place, the sign, or a wrong digit."""
    reading = readings[int(rng.integers(len(readings)))]
    kind = str(rng.choice(["ten", "tenth", "sign", "digit"]))
    factor = {"ten": 10.0, "tenth": 0.1, "sign": -1.0}.get(kind)
    if factor is not None:
        reading["value"] = round(reading["value"] * factor, 6)
    else:
        reading["value"] = round(
            reading["value"] + float(rng.choice([-1, 1])) * 10 ** round(math.log10(reading["value"])) / 5, 6
        )


def figures(truth: list[Truth], results: list[Diagnosis]) -> dict[str, float]:
    """
    What a diagnosis reaches.

    The flag is 1 − P(as recorded) − P(doubtful), at 1 and at 5 % false alarms; a place is right where its row, more probable
    than not, names all the places of the truth, wholly or as far as its run; an interval is asked of those alone.
    """
    faulty = np.array([t.cause in FAULTS for t in truth])
    sums = [{c: sum(p.probability for p in r.causes if p.cause == c) for c in CAUSES} for r in results]
    fault = np.array([sum(s[c] for c in FAULTS) for s in sums])
    edges = [np.quantile(fault[~faulty], share) for share in (0.99, 0.95)]
    stated = np.array([s[c] for s in sums for c in CAUSES])
    held = np.array([t.cause == c for t in truth for c in CAUSES])
    bins = np.clip((stated * 10).astype(int), 0, 9)
    apart = [
        abs(stated[bins == b].mean() - held[bins == b].mean()) * (bins == b).mean()
        for b in range(10)
        if (bins == b).any()
    ]
    bad = [(t, _bad_row(r)) for t, r in zip(truth, results, strict=True) if t.cause == "bad connection"]
    in_runs = [_runs_of(row) == {place.rsplit(" ", 2)[0] for place in t.places} for t, row in bad]
    exact = [{joint.where for joint in _joints(row)} == set(t.places) for t, row in bad]
    inside = [
        joint.low_ohm <= ohm <= joint.high_ohm
        for (t, row), right in zip(bad, in_runs, strict=True)
        if right and row is not None and row.probability > 0.5
        for joint, ohm in zip(_joints(row), t.extra_ohm, strict=True)
        if joint.low_ohm is not None and joint.high_ohm is not None
    ]
    return {
        "flagged at 1 %": float((fault[faulty] > edges[0]).mean()),
        "at 5 %": float((fault[faulty] > edges[1]).mean()),
        "named rightly": float(np.mean([_top(s) == t.cause for s, t in zip(sums, truth, strict=True)])),
        "log score": float(np.mean([-math.log(max(s[t.cause], 1e-12)) for s, t in zip(sums, truth, strict=True)])),
        "calibration error": float(sum(apart)),
        "right run": float(np.mean(in_runs)) if bad else math.nan,
        "right joint": float(np.mean(exact)) if bad else math.nan,
        "interval holds": float(np.mean(inside)) if inside else math.nan,
    }


CAUSES = ("as recorded", *FAULTS, DOUBTFUL)


def _top(sums: dict[str, float]) -> str:
    return max(sums, key=sums.__getitem__)


def _bad_row(result: Diagnosis) -> Place | None:
    rows = [row for row in result.causes if row.cause == "bad connection"]
    return max(rows, key=lambda row: row.probability, default=None)


def _joints(row: Place | None) -> tuple[Place, ...]:
    """The single places of a row, in the order of their runs."""
    return () if row is None else row.joints or (row,)


def _runs_of(row: Place | None) -> set[str]:
    return {" ".join(joint.where.split()[:2]) for joint in _joints(row)}


def judged(survey: Survey, circuits: int, seed: int) -> tuple[list[Truth], list[Diagnosis]]:
    """A survey drawn, and judged under priors that say how it was drawn."""
    drawn = draw(survey, circuits, seed)
    shares = {
        "as_recorded": (1 - survey.slips) * (1 - survey.faulty),
        "reading_or_record_doubtful": max(survey.slips, 0.005),
    }
    faults = (1 - survey.slips) * survey.faulty
    others = faults * (1 - survey.bad) / (len(FAULTS) - 1)
    shares |= {cause.replace(" ", "_"): others for cause in FAULTS} | {"bad_connection": faults * survey.bad}
    site = replace(drawn.site(), prior=tuple((name.replace("_", " "), share) for name, share in shares.items()))
    context = prepare(site, limits.of(site))
    return drawn.truth, [context.diagnoses[circuit.id] for circuit in site.circuits]


def measured(survey: Survey, circuits: int, seeds: Sequence[int]) -> dict[str, float]:
    """A survey's figures over sites of these seeds, taken together."""
    truth: list[Truth] = []
    found: list[Diagnosis] = []
    for seed in seeds:
        of_site = judged(survey, circuits, seed)
        truth += of_site[0]
        found += of_site[1]
    return figures(truth, found)


def main() -> None:
    """Print what each survey reaches."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--circuits", type=int, default=300)
    parser.add_argument("--seeds", type=int, nargs="+", default=[1])
    parser.add_argument("--survey", nargs="+", help="only those whose name holds one of these words")
    args = parser.parse_args()
    chosen = [one for one in SURVEYS if args.survey is None or any(word in one.name for word in args.survey)]
    for number, survey in enumerate(chosen):
        found = measured(survey, args.circuits, args.seeds)
        if not number:
            print(f"{'':38s}" + "".join(f"{name:>18s}" for name in found))
        print(f"{survey.name:38s}" + "".join(f"{value:18.3f}" for value in found.values()), flush=True)


if __name__ == "__main__":
    main()
