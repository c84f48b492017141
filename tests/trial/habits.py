#!/usr/bin/env python3
"""
How well a site's common errors are found: invented sites with a known one, checked in this process and scored.

    python tests/trial/habits.py [--sites 10] [--circuits 60] [--scenario NAME …]

Each site has one common error at most (a voltmeter, a clamp, its zero, paced lengths, assumed temperatures, one
cable); a fifth of its circuits have a fault of their own. Printed, as means over the sites:

    reported    a common error was reported
    true habit  probability of the true habit, or of those that the survey cannot tell apart, where one was reported
    first       the most probable habit is a true one, where one was reported
    alarms      share of the healthy circuits that are flagged: judged alone, and with what the site teaches
    sound       share of the healthy circuits that are as recorded with enough probability to be settled
    found       share of the faulty circuits that are flagged; "clean" is the same site without its common error

What is drawn shares no code with the project.
"""

from __future__ import annotations

import argparse
import importlib.util
import math
from collections.abc import Callable
from dataclasses import dataclass, field, replace
from pathlib import Path
from types import ModuleType

import numpy as np

from audit.intake.folder import site_of
from rules import limits
from rules.assess import prepare
from rules.context import Context
from rules.diagnosis.common_error import CommonError
from rules.diagnosis.diagnose import Diagnosis, diagnose
from rules.diagnosis.habits import Habit
from rules.diagnosis.hypotheses import AS_RECORDED
from rules.measured import posed_by

FLAGGED = 0.9
"""Probability that something is wrong from which a circuit counts as flagged."""
FAULTS = ("bad connection", "smaller conductor", "longer route")
SIZES = ("2.5 mm2", "4 mm2", "6 mm2", "10 mm2")
VOLTMETERS = {"DV-1": (0.5, 2, 0.001), "DV-2": (0.5, 2, 0.001)}
CLAMPS = {"CL-1": (2.0, 3, 0.01), "CL-2": (2.0, 3, 0.01)}
"""Accuracy [%], counts, resolution [V, A]."""
Rows = list[dict[str, str]]


def blind_trial() -> ModuleType:
    """The blind trial's module: conductors, doubts and terminations, all its own."""
    spec = importlib.util.spec_from_file_location("blind_trial", Path(__file__).parent / "trial.py")
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


TRIAL = blind_trial()


@dataclass(frozen=True)
class Scenario:
    """A common error, and how a site is surveyed."""

    voltage: dict[str, float] = field(default_factory=dict)
    """By voltmeter: shown over true, less one."""
    current: dict[str, float] = field(default_factory=dict)
    zero_a: dict[str, float] = field(default_factory=dict)
    """By clamp: shown with nothing in its jaws."""
    length: dict[str, float] = field(default_factory=dict)
    """By how it was obtained: true over recorded, less one."""
    temperature_k: dict[str, float] = field(default_factory=dict)
    """True less recorded."""
    cable: dict[str, float] = field(default_factory=dict)
    """By size: true resistance per metre over the table's, less one."""
    truth: tuple[Habit, ...] = ()
    """What an assessment should name; several where the survey cannot tell them apart."""
    teams: tuple[tuple[str, str], ...] = (("DV-1", "CL-1"), ("DV-1", "CL-2"), ("DV-2", "CL-1"), ("DV-2", "CL-2"))
    length_by: tuple[str, ...] = ("tape", "paced", "drawing", "marks")
    temperature_by: tuple[str, ...] = ("assumed", "air", "probe")
    sizes: tuple[str, ...] = SIZES
    tied: bool = False
    """The first team alone, and it alone, paces."""


V1, C1, Z1 = Habit("voltage", "DV-1", "1"), Habit("current", "CL-1", "1"), Habit("zero", "CL-1", "1")
PACED, ASSUMED = Habit("length", "paced"), Habit("temperature", "assumed")
BATCH = Habit("cable", "2.5 mm2 copper stranded")
ONE_TEAM = (("DV-1", "CL-1"),)

SCENARIOS: dict[str, Scenario] = {
    "healthy": Scenario(),
    "healthy, one team": Scenario(teams=ONE_TEAM),
    "voltmeter 6 % high": Scenario(voltage={"DV-1": 0.06}, truth=(V1,)),
    "voltmeter 6 % high, one team": Scenario(voltage={"DV-1": 0.06}, truth=(V1, C1), teams=ONE_TEAM),
    "voltmeter 12 % high, well surveyed": Scenario(
        voltage={"DV-1": 0.12}, truth=(V1,), length_by=("tape", "marks"), temperature_by=("probe",)
    ),
    "voltmeter 5 % low": Scenario(voltage={"DV-1": -0.05}, truth=(V1,)),
    "clamp 10 % low": Scenario(current={"CL-1": -0.10}, truth=(C1,)),
    "clamp zero 0.5 A": Scenario(zero_a={"CL-1": -0.5}, truth=(Z1,)),
    "paced 15 % short": Scenario(length={"paced": 0.15}, truth=(PACED,)),
    "paced 15 % short, all paced": Scenario(length={"paced": 0.15}, truth=(PACED,), length_by=("paced",)),
    "one team paced, 15 % short": Scenario(length={"paced": 0.15}, truth=(PACED, V1, C1), tied=True),
    "ambient 15 K wrong": Scenario(temperature_k={"assumed": 15}, truth=(ASSUMED,)),
    "one cable 9 % off": Scenario(cable={"2.5 mm2": 0.09}, truth=(BATCH,)),
}


@dataclass(frozen=True)
class Drawn:
    """A site as intake takes it, and which fault each circuit has."""

    tables: dict[str, Rows]
    faults: dict[str, str]
    """By tag; empty for a healthy circuit."""


def draw(scenario: Scenario, seed: int, circuits: int, faulty: float = 0.2) -> Drawn:
    """A site with a scenario's common error; all other errors by the doubts of the general profile."""
    rng = np.random.default_rng(seed)
    gain = {tag: rng.uniform(-1, 1) * VOLTMETERS[tag][0] / 100 for tag in VOLTMETERS} | scenario.voltage
    gain |= {tag: rng.uniform(-1, 1) * CLAMPS[tag][0] / 100 for tag in CLAMPS} | scenario.current
    tables: dict[str, Rows] = {name: [] for name in ("circuits", "runs", "loads", "readings")}
    faults = {}
    for number in range(circuits):
        tag = f"C{number + 1:04d}"
        team = scenario.teams[int(rng.integers(len(scenario.teams)))]
        length_by = str(rng.choice(scenario.length_by))
        if scenario.tied:
            length_by = "paced" if team == scenario.teams[0] else "tape"
            team = scenario.teams[0] if length_by == "paced" else scenario.teams[-1]
        faults[tag] = str(rng.choice(FAULTS)) if rng.random() < faulty else ""
        _circuit(tables, scenario, rng, tag, team, length_by, faults[tag], gain)
    tables["sources"] = [{"source": "PSU", "kind": "power supply", "nominal": "48"}]
    meters = [("voltage", VOLTMETERS), ("current", CLAMPS)]
    tables["instruments"] = [
        _text(instrument=tag, quantity=quantity, accuracy=percent, counts=counts, resolution=resolution)
        for quantity, of_quantity in meters
        for tag, (percent, counts, resolution) in of_quantity.items()
    ]
    return Drawn(tables, faults)


def _circuit(
    tables: dict[str, Rows],
    scenario: Scenario,
    rng: np.random.Generator,
    tag: str,
    team: tuple[str, str],
    length_by: str,
    fault: str,
    gain: dict[str, float],
) -> None:
    size, temperature_by = str(rng.choice(scenario.sizes)), str(rng.choice(scenario.temperature_by))
    temperature = 25.0 if temperature_by == "assumed" else round(float(rng.uniform(15, 40)), 0)
    runs = int(rng.integers(1, 4))
    nominal, area = 48.0, float(size.split()[0])
    current = float(rng.uniform(1.5, 3.0)) * area
    whole = rng.uniform(0.02, 0.06) * nominal / (2 * TRIAL.ohm_per_m(size, "copper", temperature) * current)
    lengths = np.maximum(np.round(rng.dirichlet(np.full(runs, 4.0)) * whole, 1), 1.0)
    taps = rng.dirichlet(np.full(runs, 3.0)) * current
    true_size = SIZES[max(SIZES.index(size) - 1, 0)] if fault == "smaller conductor" else size
    if fault == "smaller conductor" and true_size == size:
        true_size = "1.5 mm2"
    stretch = 1.6 if fault == "longer route" else 1.0
    bad_run = int(rng.integers(runs)) if fault == "bad connection" else -1
    extra = math.exp(rng.uniform(math.log(0.01), math.log(0.2))) * TRIAL.joint_scale(size)
    warm = temperature + scenario.temperature_k.get(temperature_by, 0.0)
    warm += rng.normal(0, TRIAL.TEMPERATURE_DOUBT[temperature_by])
    metal = (1 + scenario.cable.get(size, 0.0)) * (1 + rng.normal(0, TRIAL.RESISTANCE_DOUBT))
    ohm = []
    for k in range(runs):
        length = lengths[k] * stretch * (1 + scenario.length.get(length_by, 0.0))
        length *= 1 + rng.normal(0, TRIAL.LENGTH_DOUBT[length_by])
        median = math.log(TRIAL.TERMINATION_MEDIAN * TRIAL.joint_scale(size))
        joints = rng.lognormal(median, math.log(TRIAL.TERMINATION_GSD), 4).sum()
        conductor = 2 * TRIAL.ohm_per_m(true_size, "copper", warm) * metal * length
        ohm.append(conductor + joints + (extra if k == bad_run else 0.0))
    points = ["way", *(f"p{k + 1}" for k in range(runs))]
    tables["circuits"].append(_text(circuit=tag, fed_from="PSU", device="none"))
    for n in range(int(rng.integers(1, 3))):
        share = 1.0 if n == 0 else float(rng.uniform(0.25, 0.6))
        amps = np.cumsum((taps * share)[::-1])[::-1]
        volts = [nominal * float(rng.uniform(0.98, 1.12))]
        for k in range(runs):
            volts.append(volts[-1] - ohm[k] * amps[k])
        for point, volt in zip(points, volts, strict=True):
            value = _shown(rng, VOLTMETERS[team[0]], volt * (1 + gain[team[0]]))
            tables["readings"].append(_reading(tag, n, "voltage", point, value, team[0]))
        for k in range(runs):
            value = _shown(rng, CLAMPS[team[1]], amps[k] * (1 + gain[team[1]]) + scenario.zero_a.get(team[1], 0.0))
            tables["readings"].append(_reading(tag, n, "current", f"run {k + 1}", value, team[1]))
    for k in range(runs):
        run = _text(circuit=tag, run=k + 1, to=points[k + 1], length=lengths[k], length_by=length_by, size=size)
        run |= _text(material="copper", stranding="stranded", temperature=temperature, temperature_by=temperature_by)
        tables["runs"].append(run | {"from": points[k]})
        tables["loads"].append(
            _text(circuit=tag, point=points[k + 1], load=f"{tag}-{k + 1}", current=round(taps[k], 3))
        )


def _shown(rng: np.random.Generator, meter: tuple[float, int, float], value: float) -> float:
    _, counts, resolution = meter
    return round(round((value + rng.uniform(-1, 1) * counts * resolution) / resolution) * resolution, 6)


def _reading(tag: str, number: int, quantity: str, at: str, value: float, meter: str) -> dict[str, str]:
    return _text(circuit=tag, visit=1, round=number + 1, quantity=quantity, at=at, value=value, instrument=meter)


def _text(**cells: object) -> dict[str, str]:
    return {name: str(cell) for name, cell in cells.items()}


@dataclass(frozen=True)
class Checked:
    """One site checked."""

    context: Context
    alone: dict[str, Diagnosis]
    """By tag, as if circuits shared nothing."""
    taught: dict[str, Diagnosis]
    faults: dict[str, str]

    @property
    def errors(self) -> tuple[CommonError, ...]:
        return self.context.taught.errors

    def share(self, faulty: bool, among: dict[str, Diagnosis], flagged: bool = True) -> float:
        """Share of the healthy or faulty circuits that is flagged, or settled as recorded."""
        good = [among[tag].probability(AS_RECORDED) for tag, fault in self.faults.items() if bool(fault) == faulty]
        held = [1 - p >= FLAGGED if flagged else p >= self.context.limits["decision.sound_at"] for p in good]
        return float(np.mean(held)) if held else math.nan


def checked(drawn: Drawn) -> Checked:
    """A drawn site, judged with and without what it teaches."""
    site = site_of(drawn.tables, {"name": "drawn", "nominal": "48 V", "ambient": "25 degC"})
    context = prepare(site, limits.of(site))
    posed = {row.tag: posed_by(context, context.measured[row.id]) for row in site.circuits}
    some = {tag: problem for tag, problem in posed.items() if problem is not None}
    alone = dict(zip(some, diagnose(list(some.values()), context.limits), strict=True))
    taught = {row.tag: context.diagnoses[row.id] for row in site.circuits}
    return Checked(context, alone, taught, drawn.faults)


COLUMNS = (
    ("", "reported"), ("true", "habit"), ("", "first"), ("alarms", "alone"), ("alarms", "taught"),
    ("sound", "alone"), ("sound", "taught"), ("found", "alone"), ("found", "taught"), ("found", "clean"),
)  # fmt: skip


@dataclass(frozen=True)
class Score:
    """Figures of several sites, in the order of ``COLUMNS``."""

    reported: float
    true_habit: float
    first: float
    alarms_alone: float
    alarms_taught: float
    sound_alone: float
    sound_taught: float
    found_alone: float
    found_taught: float
    found_clean: float


def scored(name: str, seeds: range, circuits: int) -> Score:
    """A scenario's figures over sites of these seeds."""
    scenario = SCENARIOS[name]
    sites = [checked(draw(scenario, seed, circuits)) for seed in seeds]
    # no error of a scenario changes what else is drawn
    clean = replace(scenario, voltage={}, current={}, zero_a={}, length={}, temperature_k={}, cable={})
    cleaned = [checked(draw(clean, seed, circuits)) for seed in seeds]
    reported = [site for site in sites if site.errors]

    def mean(of: Callable[[Checked], float], among: list[Checked] = sites) -> float:
        return float(np.mean([of(site) for site in among])) if among else math.nan

    def of_truth(site: Checked) -> float:
        said = {one.habit: one.probability for error in site.errors for one in error.explanations}
        return sum(said.get(habit, 0.0) for habit in scenario.truth)

    return Score(
        reported=len(reported) / len(sites),
        true_habit=mean(of_truth, reported),
        first=mean(lambda site: float(site.errors[0].explanations[0].habit in scenario.truth), reported),
        alarms_alone=mean(lambda site: site.share(False, site.alone)),
        alarms_taught=mean(lambda site: site.share(False, site.taught)),
        sound_alone=mean(lambda site: site.share(False, site.alone, flagged=False)),
        sound_taught=mean(lambda site: site.share(False, site.taught, flagged=False)),
        found_alone=mean(lambda site: site.share(True, site.alone)),
        found_taught=mean(lambda site: site.share(True, site.taught)),
        found_clean=mean(lambda site: site.share(True, site.taught), cleaned),
    )


def lines(scores: dict[str, Score]) -> list[str]:
    """The figures as a table."""
    out = [f"{'':36s}" + "".join(f"{pair[row]:>10s}" for pair in COLUMNS) for row in (0, 1)]
    for name, score in scores.items():
        out.append(f"{name:36s}" + "".join(f"{value:10.3f}" for value in vars(score).values()))
    return out


def main() -> None:
    """Draw, check, score, print."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--sites", type=int, default=10)
    parser.add_argument("--circuits", type=int, default=60)
    parser.add_argument("--scenario", nargs="+", choices=list(SCENARIOS), default=list(SCENARIOS))
    args = parser.parse_args()
    scores = {name: scored(name, range(args.sites), args.circuits) for name in args.scenario}
    print("\n".join(lines(scores)))


if __name__ == "__main__":
    main()
