"""Two poles of one breaker: each may have its own share of what the standard allows."""

from __future__ import annotations

import pytest

from audit.intake.folder import site_of
from rules import limits
from rules.assess import assess

CURRENT_A = 14.0
RUN_LEG_OHM = 10 * 7.41e-3 + 2 * 0.3e-3
"""10 m of 2.5 mm² class 2 at 20 °C, 7.41 Ω/km (IEC 60228:2004), and two healthy terminations. [ohm]"""


@pytest.mark.parametrize(("first_ohm", "second_ohm"), [(8.2e-3, 8.2e-3), (10.1e-3, 6.6e-3), (11e-3, 8e-3)])
def test_healthy_poles_that_differ_are_as_recorded(first_ohm: float, second_ohm: float) -> None:
    """The standard allows a pole of 16 A 13.7 mΩ (3.5 W, IEC 60898-1, from memory); healthy ones lie apart below that."""
    volts = {
        "joint device positive": CURRENT_A * first_ohm,
        "joint device negative": CURRENT_A * second_ohm,
        "drop bus positive": CURRENT_A * (first_ohm + RUN_LEG_OHM),
        "drop bus negative": CURRENT_A * (second_ohm + RUN_LEG_OHM),
    }
    readings = [
        {
            "circuit": "C",
            "round": "1",
            "quantity": quantity,
            "at": at,
            "leg": leg,
            "value": f"{value:.4f}",
            "instrument": "D",
        }
        | ({"to": "a"} if quantity == "drop" else {})
        for name, value in volts.items()
        for quantity, at, leg in [name.split()]
    ]
    readings.append(
        {"circuit": "C", "round": "1", "quantity": "current", "at": "way", "value": f"{CURRENT_A}", "instrument": "K"}
    )
    run = {"circuit": "C", "run": "1", "from": "way", "to": "a", "length": "10", "length_by": "tape", "size": "2.5 mm2"}
    tables = {
        "sources": [{"source": "P", "kind": "battery", "nominal": "24", "working": "25", "lowest": "21.5"}],
        "circuits": [
            {
                "circuit": "C",
                "fed_from": "P",
                "device": "breaker C",
                "device_rating": "16",
                "device_poles": "2",
                "device_leg": "both",
            }
        ],
        "runs": [run | {"temperature": "20", "temperature_by": "probe"}],
        "loads": [{"circuit": "C", "point": "a", "load": "heater", "current": f"{CURRENT_A}"}],
        "instruments": [
            {"instrument": "D", "quantity": "voltage", "accuracy": "0.1", "counts": "3", "resolution": "0.0001"},
            {"instrument": "K", "quantity": "current", "accuracy": "1.5", "counts": "5", "resolution": "0.01"},
        ],
        "readings": readings,
    }
    site = site_of(tables, {"name": "case", "nominal": "24 V"})
    (circuit,) = assess(site, limits.of(site)).circuits
    best = circuit.causes[0]
    assert best.cause == "as recorded"
    assert best.probability > 0.95
