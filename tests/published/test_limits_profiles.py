"""
Limits profiles against the publications that they name, data in ``data/drop_limits.toml``.

A value that a profile calls verified stands here; what is from memory, common practice or our own default says so
there and is in no table that was read.
"""

from __future__ import annotations

import tomllib
from pathlib import Path
from typing import Any

import pytest

from rules import limits
from rules.record import Site

READ: dict[str, dict[str, Any]] = tomllib.loads(
    (Path(__file__).parent / "data" / "drop_limits.toml").read_text(encoding="utf-8")
)
VERIFIED = {
    ("general", "drop", "allowed_percent"): READ["nec_recommendation"]["branch_percent"],
    ("general", "drop", "allowed_total_percent"): READ["nec_recommendation"]["total_percent"],
    ("dc-lighting", "drop", "allowed_percent"): READ["iec_annex_g"]["public_supply_lighting_percent"],
    ("emergency-lighting", "drop", "allowed_total_percent"): READ["iec_annex_g"]["private_supply_lighting_percent"],
}
"""By profile, group and key; everything that was read."""


@pytest.mark.parametrize("name", limits.names())
def test_what_is_called_verified_was_read(name: str) -> None:
    found = {
        (stated.origin, group.name, key): group.values[key]
        for group in limits.of(Site(name="x", limits=name)).groups.values()
        for key, stated in group.stated.items()
        if stated.status == "verified"
    }
    assert found == {place: VERIFIED[place] for place in found}


def test_the_station_battery_of_125_v_may_lose_what_lies_between_end_of_discharge_and_closing() -> None:
    """60 cells at 1.75 V: 105 V; a breaker closes from 100 V on (ANSI C37.06, from memory): 5 V of 125 V."""
    cells = READ["ieee485_cells"]
    end_v = cells["cells"] * cells["end_v_of_a_cell"]
    allowed = limits.of(Site(name="x", limits="battery-125"))["drop.allowed_total_percent"]
    assert end_v == 105
    assert allowed == pytest.approx(100 * (end_v - 100) / cells["nominal_v"])


def test_the_telecom_loop_is_two_volts() -> None:
    allowed = limits.of(Site(name="x", limits="telecom-48"))["drop.allowed_total_percent"]
    assert allowed / 100 * 48 == pytest.approx(2.0, abs=0.02)


@pytest.mark.parametrize("name", ["telecom-48", "battery-110", "battery-125", "battery-220"])
def test_heavy_plants_look_for_joints_that_burn_at_hundreds_of_amperes(name: str) -> None:
    """0.5 mΩ at 300 A are 45 W; on 150 mm² the range must begin below it: 0.2 mΩ × √(10 / 150) = 0.05 mΩ."""
    low_ohm = limits.of(Site(name="x", limits=name))["bad_connection.low_ohm"]
    assert pytest.approx(45) == 0.5e-3 * 300**2
    assert low_ohm * (10 / 150) ** 0.5 < 0.5e-3 < limits.of(Site(name="x"))["bad_connection.low_ohm"]
