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


def of_nominal(read: dict[str, Any], key: str) -> float:
    """A voltage in percent of nominal, to the digits that a profile has."""
    return round(100 * float(read[key]) / float(read["nominal_v"]), 6)


VERIFIED = {
    ("general", "drop", "allowed_percent"): READ["nec_recommendation"]["branch_percent"],
    ("general", "drop", "allowed_total_percent"): READ["nec_recommendation"]["total_percent"],
    ("dc-lighting", "drop", "allowed_percent"): READ["iec_annex_g"]["public_supply_lighting_percent"],
    ("emergency-lighting", "drop", "allowed_total_percent"): READ["iec_annex_g"]["private_supply_lighting_percent"],
    ("control-24", "load_window", "lowest_percent"): of_nominal(READ["iec61131_2"], "mean_lowest_v"),
    ("control-24", "load_window", "highest_percent"): of_nominal(READ["iec61131_2"], "mean_highest_v"),
    ("security-12-24", "load_window", "lowest_percent"): READ["nfpa_72"]["lowest_percent"],
    ("security-12-24", "load_window", "highest_percent"): READ["nfpa_72"]["highest_percent"],
    ("general", "joint_rise", "similar_watch_k"): READ["neta_infrared"]["over_similar_probable_from"],
    ("general", "joint_rise", "similar_soon_k"): READ["neta_infrared"]["over_similar_major_above"],
    ("general", "joint_rise", "ambient_watch_k"): READ["neta_infrared"]["over_ambient_monitor_from"],
    ("general", "joint_rise", "ambient_soon_k"): READ["neta_infrared"]["over_ambient_major_above"],
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
    assert found == {place: VERIFIED.get(place) for place in found}


def test_the_station_battery_of_125_v_may_lose_what_lies_between_end_of_discharge_and_closing() -> None:
    """60 cells at 1.75 V: 105 V; a breaker closes from 100 V on (ANSI C37.06, from memory): 5 V of 125 V."""
    cells = READ["ieee485_cells"]
    end_v = cells["cells"] * cells["end_v_of_a_cell"]
    allowed = limits.of(Site(name="x", limits="battery-125"))["drop.allowed_total_percent"]
    assert end_v == 105
    assert allowed == pytest.approx(100 * (end_v - 100) / cells["nominal_v"])


@pytest.mark.parametrize(
    ("name", "nominal_v", "lowest_v", "highest_v"),
    [("telecom-48", 48, 40.5, 57), ("control-24", 24, 20.4, 28.8), ("battery-125", 125, 100, 140)],
)
def test_the_windows_are_the_volts_that_their_sources_state(
    name: str, nominal_v: float, lowest_v: float, highest_v: float
) -> None:
    """EN 300 132-2 and C37.06 from memory, IEC 61131-2 as read."""
    window = limits.of(Site(name="x", limits=name)).values("load_window")
    assert window["lowest_percent"] / 100 * nominal_v == pytest.approx(lowest_v)
    assert window["highest_percent"] / 100 * nominal_v == pytest.approx(highest_v)


def test_the_telecom_loop_is_two_volts() -> None:
    allowed = limits.of(Site(name="x", limits="telecom-48"))["drop.allowed_total_percent"]
    assert allowed / 100 * 48 == pytest.approx(2.0, abs=0.02)


@pytest.mark.parametrize("name", ["telecom-48", "battery-110", "battery-125", "battery-220"])
def test_heavy_plants_look_for_joints_that_burn_at_hundreds_of_amperes(name: str) -> None:
    """0.5 mΩ at 300 A are 45 W; on 150 mm² the range must begin below it: 0.2 mΩ × √(10 / 150) = 0.05 mΩ."""
    low_ohm = limits.of(Site(name="x", limits=name))["bad_connection.low_ohm"]
    assert pytest.approx(45) == 0.5e-3 * 300**2
    assert low_ohm * (10 / 150) ** 0.5 < 0.5e-3 < limits.of(Site(name="x"))["bad_connection.low_ohm"]
