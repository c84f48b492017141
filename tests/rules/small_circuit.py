"""One small circuit of two runs and two loads, with readings that agree with its record or show a resistance more."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

from audit.intake.folder import site_of
from rules import limits
from rules.assess import assess
from rules.assessment import CircuitResult
from rules.record import Site

DROP_ALLOWED = '[drop]\nsource = "this test"\nallowed_total_percent = 20\n'
R_MM4 = 4.61e-3
"""IEC 60228:2004, class 2. [ohm/m]"""
JOINTS = 4 * 0.15e-3 * (10 / 4) ** 0.5 * 1.2715
"""Four healthy terminations on 4 mm². [ohm]"""
RUN_1 = 2 * 20 * R_MM4 + JOINTS
RUN_2 = 2 * 10 * R_MM4 + JOINTS

TABLES: dict[str, list[dict[str, str]]] = {
    "sources": [{"source": "PSU", "kind": "power supply", "nominal": "24", "lowest": "21"}],
    "circuits": [{"circuit": "C1", "fed_from": "PSU", "device": "none", "allowed_drop": "20"}],
    "runs": [
        {"circuit": "C1", "run": "1", "from": "way", "to": "p1", "length": "20", "length_by": "marks", "size": "4 mm2",
         "temperature": "20", "temperature_by": "probe"},
        {"circuit": "C1", "run": "2", "from": "p1", "to": "p2", "length": "10", "length_by": "marks", "size": "4 mm2",
         "temperature": "20", "temperature_by": "probe"},
    ],
    "loads": [
        {"circuit": "C1", "point": "p1", "load": "near", "current": "3", "lowest": "16"},
        {"circuit": "C1", "point": "p2", "load": "far", "current": "5", "lowest": "16"},
    ],
    "instruments": [
        {"instrument": "M1", "quantity": "voltage", "accuracy": "0.05", "counts": "1", "resolution": "0.001"},
        {"instrument": "K1", "quantity": "current", "accuracy": "0.3", "counts": "1", "resolution": "0.01"},
    ],
}  # fmt: skip


def read(
    extra: tuple[float, float] = (0.0, 0.0), amps: tuple[float, float] = (8.0, 5.0), round_: int = 1
) -> list[dict[str, str]]:
    """Readings of a round without errors, with resistances added in the two runs."""
    volts = [24.0]
    for ohm, more, a in zip((RUN_1, RUN_2), extra, amps, strict=True):
        volts.append(volts[-1] - (ohm + more) * a)
    rows: list[dict[str, Any]] = [
        {"quantity": "voltage", "at": at, "value": f"{v:.3f}", "instrument": "M1"}
        for at, v in zip(("way", "p1", "p2"), volts, strict=True)
    ]
    rows += [
        {"quantity": "current", "at": f"run {n}", "value": str(a), "instrument": "K1"} for n, a in enumerate(amps, 1)
    ]
    return [row | {"circuit": "C1", "round": str(round_)} for row in rows]


def site(readings: list[dict[str, str]], own: str = "", tables: dict[str, list[dict[str, str]]] | None = None) -> Site:
    """The circuit with some readings, under a profile of its own that allows its drop."""
    rows = TABLES | (tables or {}) | {"readings": readings}
    made = site_of(rows, {"name": "x", "nominal": "24 V", "ambient": "20 degC"})
    return replace(made, limits="ours.toml", own_limits=DROP_ALLOWED + own)


def result(record: Site) -> CircuitResult:
    (only,) = assess(record, limits.of(record)).circuits
    return only
