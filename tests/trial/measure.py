#!/usr/bin/env python3
"""
How well the diagnosis does on the blind trial: surveys are made, checked in this process and scored.

    python tests/trial/measure.py --seeds 1 2 3 [--circuits 600] [--claims]

Prints each figure beside that of the exact observer (``exact.toml``) and, for what common practice can flag, its
own; the last line pools all seeds. Only ``trial.py`` draws and scores, and it shares no code with the project.

With ``--claims`` it counts findings instead: circuits as recorded that get one which claims a fault, and others that do,
both with the site's ``[prior]`` and with that table removed.
"""

from __future__ import annotations

import argparse
import importlib.util
import json
import sys
import tempfile
import tomllib
from dataclasses import replace
from pathlib import Path
from types import ModuleType
from typing import Any, NamedTuple

from audit.intake.folder import read_folder
from audit.report.as_json import as_json, as_text
from rules import limits
from rules.assess import assess
from rules.record import Site

HERE = Path(__file__).parent
EXACT: dict[str, Any] = tomllib.loads((HERE / "exact.toml").read_text(encoding="utf-8"))
FIGURES = (
    "faulty flagged at 1 % false alarms",
    "faulty flagged at 5 % false alarms",
    "cause named rightly",
    "log score, nats a circuit",
    "bad connection placed in the right run",
    "calibration error",
    "95 % interval holds the extra resistance",
)
"""Figures of ``trial.score`` in the order of ``exact.toml``."""
COMMON = "the same at 1 %, by share of nominal alone"
AS_RECORDED = "as recorded"
Rows = list[dict[str, Any]]


def trial() -> ModuleType:
    """The blind trial's own module."""
    spec = importlib.util.spec_from_file_location("blind_trial", HERE / "trial.py")
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


TRIAL = trial()


def survey(seed: int, circuits: int) -> tuple[Rows, Rows]:
    """The truth of a drawn survey, and the circuits of the JSON that its check gives."""
    truth, site = drawn(seed, circuits)
    return truth, checked(site)["circuits"]


def drawn(seed: int, circuits: int) -> tuple[Rows, Site]:
    """The truth of a drawn survey, and its record as intake reads it."""
    tables = TRIAL.draw(circuits, seed)
    with tempfile.TemporaryDirectory() as folder:
        TRIAL.write(Path(folder), tables)
        return tables["truth"], read_folder(Path(folder) / "site")


def checked(site: Site) -> dict[str, Any]:
    """The JSON of a check."""
    found: dict[str, Any] = json.loads(as_text(as_json(assess(site, limits.of(site)))))
    return found


class Claims(NamedTuple):
    """Findings of severity watch or above that claim a fault, by what is true of their circuits."""

    falsely: float
    """Share of the circuits as recorded that get one."""
    rightly: float
    """Share of the others that get one."""
    alarms: tuple[str, ...]
    """The circuits as recorded that get one."""


def claims(truth: Rows, findings: Rows) -> Claims:
    """Who gets a finding whose ``cause`` is neither null nor as recorded."""
    claimed = {
        row["circuit"] for row in findings if row["severity"] != "note" and row["cause"] not in (None, AS_RECORDED)
    }
    healthy = [row["circuit"] for row in truth if row["cause"] == AS_RECORDED]
    faulty = [row["circuit"] for row in truth if row["cause"] != AS_RECORDED]
    alarms = tuple(circuit for circuit in healthy if circuit in claimed)
    return Claims(len(alarms) / len(healthy), sum(circuit in claimed for circuit in faulty) / len(faulty), alarms)


def claims_of(seed: int, circuits: int) -> dict[str, Claims]:
    """The claims on a drawn survey, with its ``[prior]`` and without."""
    truth, site = drawn(seed, circuits)
    return {
        "with [prior]": claims(truth, checked(site)["findings"]),
        "without": claims(truth, checked(replace(site, prior=()))["findings"]),
    }


def claims_short(found: Claims) -> list[str]:
    """What falls short of the bounds that ``exact.toml`` states."""
    bounds = EXACT["claims"]
    short = []
    if found.falsely > bounds["most_falsely"]:
        short.append(f"{found.falsely:.4f} of the circuits as recorded get a claim: {', '.join(found.alarms)}")
    if found.rightly < bounds["least_rightly"]:
        short.append(f"only {found.rightly:.4f} of the others get one")
    return short


def score(truth: Rows, circuits: Rows) -> dict[str, float]:
    """Figures of merit by the trial's own scorer."""
    figures: dict[str, float] = TRIAL.score(truth, {"circuits": circuits})
    return figures


def pooled(surveys: dict[int, tuple[Rows, Rows]]) -> dict[str, float]:
    """Figures of several surveys taken together."""

    def named(seed: int, rows: Rows) -> Rows:
        return [row | {"circuit": f"{seed}-{row['circuit']}"} for row in rows]

    truth = [row for seed, (drawn, _) in surveys.items() for row in named(seed, drawn)]
    circuits = [row for seed, (_, checked) in surveys.items() for row in named(seed, checked)]
    return score(truth, circuits)


def short_of(figures: dict[str, float], exact: list[float]) -> list[str]:
    """What falls short of the exact observer by more than is allowed."""
    reach = EXACT["reach"]
    short = []
    for name, best in zip(FIGURES[:6], exact, strict=False):
        found = figures[name]
        if name.startswith("log score"):
            fails = found > best + reach["log_score_nats"]
        elif name.startswith("calibration"):
            fails = found > reach["calibration_error"]
        else:
            fails = found < reach["share"] * best
        if fails:
            short.append(f"{name}: {found:.3f}, exact {best:.3f}")
    return short


def table(scored: dict[str, dict[str, float]]) -> list[str]:
    """The figures as lines, each seed's above the exact observer's."""
    lines = [f"{'':22s}" + "".join(f"{name:>18s}" for name in [*EXACT["columns"], "common practice"])]
    for seed, figures in scored.items():
        row = [figures[name] for name in (*FIGURES, COMMON)]
        lines.append(f"{'seed ' + seed if seed.isdigit() else seed:22s}" + "".join(f"{value:18.3f}" for value in row))
        exact = EXACT["seeds"].get(seed)
        if exact is not None:
            lines.append(f"{'  exact observer':22s}" + "".join(f"{value:18.3f}" for value in exact))
    return lines


def main() -> int:
    """Measure, print, and say what falls short; 1 where something does."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--seeds", type=int, nargs="+", default=[1, 2, 3])
    parser.add_argument("--circuits", type=int, default=600)
    parser.add_argument("--claims", action="store_true", help="count findings that claim a fault")
    args = parser.parse_args()
    if args.claims:
        return _print_claims(args.seeds, args.circuits)
    surveys = {seed: survey(seed, args.circuits) for seed in args.seeds}
    scored = {str(seed): score(*found) for seed, found in surveys.items()}
    if len(surveys) > 1:
        scored[f"{len(surveys)} seeds pooled"] = pooled(surveys)
    print("\n".join(table(scored)))
    short = [f"seed {seed}: {what}" for seed, figures in scored.items() if seed in EXACT["seeds"] and args.circuits == 600
             for what in short_of(figures, EXACT["seeds"][seed])]  # fmt: skip
    print("\n".join(short) or "nothing falls short of the exact observer by more than is allowed")
    return 1 if short else 0


def _print_claims(seeds: list[int], circuits: int) -> int:
    """Print the claims of each seed, with ``[prior]`` and without; 1 where a bound is passed."""
    short = []
    print(f"{'':8s}{'':14s}{'as recorded, claimed':>22s}{'others, claimed':>18s}")
    for seed in seeds:
        for prior, found in claims_of(seed, circuits).items():
            print(f"{f'seed {seed}':8s}{prior:14s}{found.falsely:22.4f}{found.rightly:18.4f}")
            short += [f"seed {seed}, {prior}: {what}" for what in claims_short(found)]
    bounds = EXACT["claims"]
    kept = f"at most {bounds['most_falsely']:g} of the first and at least {bounds['least_rightly']:g} of the second, everywhere"
    print("\n".join(short) or kept)
    return 1 if short else 0


if __name__ == "__main__":
    sys.exit(main())
