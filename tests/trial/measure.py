#!/usr/bin/env python3
"""
How well the diagnosis does on the blind trial: surveys are made, checked in this process and scored.

    python tests/trial/measure.py --seeds 1 2 3 [--circuits 600]

Prints each figure beside that of the exact observer (``exact.toml``) and, for what common practice can flag, its
own; the last line pools all seeds. Only ``trial.py`` draws and scores, and it shares no code with the project.
"""

from __future__ import annotations

import argparse
import importlib.util
import json
import sys
import tempfile
import tomllib
from pathlib import Path
from types import ModuleType
from typing import Any

from audit.intake.folder import read_folder
from audit.report.as_json import as_json, as_text
from rules import limits
from rules.assess import assess

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
    drawn = TRIAL.draw(circuits, seed)
    with tempfile.TemporaryDirectory() as folder:
        TRIAL.write(Path(folder), drawn)
        site = read_folder(Path(folder) / "site")
    checked = json.loads(as_text(as_json(assess(site, limits.of(site)))))
    return drawn["truth"], checked["circuits"]


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
    args = parser.parse_args()
    surveys = {seed: survey(seed, args.circuits) for seed in args.seeds}
    scored = {str(seed): score(*found) for seed, found in surveys.items()}
    if len(surveys) > 1:
        scored[f"{len(surveys)} seeds pooled"] = pooled(surveys)
    print("\n".join(table(scored)))
    short = [f"seed {seed}: {what}" for seed, figures in scored.items() if seed in EXACT["seeds"] and args.circuits == 600
             for what in short_of(figures, EXACT["seeds"][seed])]  # fmt: skip
    print("\n".join(short) or "nothing falls short of the exact observer by more than is allowed")
    return 1 if short else 0


if __name__ == "__main__":
    sys.exit(main())
