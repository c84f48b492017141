"""A chain of runs as a site, with readings that are computed by hand: what the tests of the next reading share."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import Any

from audit.intake.folder import site_of
from rules import limits
from rules.assess import prepare
from rules.case import CircuitCase, case_of
from rules.record import Site

OHM_PER_M = 4.61e-3
"""4 mm² copper, IEC 60228:2004, class 2. [ohm/m]"""
JOINTS = 4 * 0.15e-3 * (10 / 4) ** 0.5 * 1.2715
"""Four healthy terminations on 4 mm², each the mean of its log-normal. [ohm]"""
FINE = {"instrument": "M1", "quantity": "voltage", "accuracy": "0.05", "counts": "1", "resolution": "0.001"}
CLAMP = {"instrument": "K1", "quantity": "current", "accuracy": "0.3", "counts": "1", "resolution": "0.01"}
COARSE = {"instrument": "M1", "quantity": "voltage", "accuracy": "0.5", "counts": "5", "resolution": "0.01"}


def drops(
    lengths: Sequence[float], amps: float, extra: Sequence[float] = (), factor: float = 1.0, offset: float = 0.0
) -> list[float]:
    """Voltage at ``way`` and at the end of each run of 4 mm², everything but what is given as recorded."""
    volts = [24.0]
    for number, length in enumerate(lengths):
        ohm = 2 * length * OHM_PER_M * factor + JOINTS + (extra[number] if number < len(extra) else 0.0)
        volts.append(volts[-1] - ohm * amps - (offset if number == 0 else 0.0))
    return volts


def read(points: Sequence[str], volts: Sequence[float], amps: float, round_: str = "1") -> list[dict[str, Any]]:
    """Voltages at some of the points of a chain, and the current in its first run."""
    names = ["way", *(f"p{n}" for n in range(1, len(volts)))]
    rows: list[dict[str, Any]] = [
        {"quantity": "voltage", "at": point, "value": f"{volts[names.index(point)]:.3f}", "instrument": "M1"}
        for point in points
    ]
    rows.append({"quantity": "current", "at": "run 1", "value": str(amps), "instrument": "K1"})
    return [row | {"circuit": "C1", "round": round_} for row in rows]


def chain(
    lengths: Sequence[float],
    readings: Sequence[dict[str, Any]] = (),
    amps: float = 8.0,
    own: str = "",
    tables: dict[str, list[dict[str, Any]]] | None = None,
    **circuit: str,
) -> Site:
    """Runs of 4 mm² one behind the other, the load at the far end; ``own`` adds to the limits profile."""
    ends = [f"p{n}" for n in range(1, len(lengths) + 1)]
    rows: dict[str, list[dict[str, Any]]] = {
        "sources": [{"source": "PSU", "kind": "power supply", "nominal": "24"}],
        "circuits": [{"circuit": "C1", "fed_from": "PSU", "device": "none", "allowed_drop": "50"} | circuit],
        "runs": [
            {"circuit": "C1", "run": n + 1, "from": "way" if n == 0 else ends[n - 1], "to": end, "length": lengths[n],
             "length_by": "marks", "size": "4 mm2", "temperature": 20, "temperature_by": "probe", "insulation": "PVC",
             "method": "C", "grouped": 1}
            for n, end in enumerate(ends)
        ],
        "loads": [{"circuit": "C1", "point": ends[-1], "load": "far", "current": amps}],
        "instruments": [FINE, CLAMP],
        "readings": list(readings),
    }  # fmt: skip
    as_text = {
        name: [{key: str(cell) for key, cell in row.items()} for row in table]
        for name, table in (rows | (tables or {})).items()
    }
    made = site_of(as_text, {"name": "chain", "nominal": "24 V", "ambient": "20 degC"})
    return replace(made, limits="ours.toml", own_limits=DROP_ALLOWED + own)


DROP_ALLOWED = '[drop]\nsource = "this test"\nallowed_total_percent = 50\n'


def case_from(site: Site) -> CircuitCase:
    """The case of a site's first circuit."""
    context = prepare(site, limits.of(site))
    return case_of(context, site.circuits[0])
