"""Visits, rounds, currents and the drop that they give: stories on one small circuit."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import pytest

from audit.intake.folder import site_of
from rules import limits
from rules.assess import assess, assess_circuit, prepare
from rules.assessment import CircuitResult, Drop, Status
from rules.case import case_of
from rules.record import Site

CHAIN: dict[str, list[dict[str, str]]] = {
    "sources": [{"source": "PSU", "kind": "power supply", "nominal": "24", "lowest": "21"}],
    "circuits": [
        {
            "circuit": "C1",
            "fed_from": "PSU",
            "device": "breaker C",
            "device_rating": "16",
            "device_poles": "1",
            "allowed_drop": "20",
        }
    ],
    "runs": [
        {"circuit": "C1", "run": "1", "from": "way", "to": "p1", "length": "20", "length_by": "tape", "size": "4 mm2"},
        {"circuit": "C1", "run": "2", "from": "p1", "to": "p2", "length": "10", "length_by": "tape", "size": "4 mm2"},
    ],
    "loads": [
        {"circuit": "C1", "point": "p1", "load": "near", "current": "3"},
        {"circuit": "C1", "point": "p2", "load": "far", "current": "1"},
    ],
    "instruments": [
        {"instrument": "M1", "quantity": "voltage", "accuracy": "0.5", "counts": "2", "resolution": "0.01"},
        {"instrument": "K1", "quantity": "current", "accuracy": "1", "counts": "2", "resolution": "0.01"},
    ],
}
R_MM4 = 4.61e-3
"""IEC 60228:2004, class 2. [ohm/m]"""
JOINTS = 4 * 0.15e-3 * (10 / 4) ** 0.5 * 1.2715
"""Four healthy terminations on 4 mm². [ohm]"""


def reading(**fields: Any) -> dict[str, str]:
    whole = {"circuit": "C1", "round": "1", "instrument": "K1" if fields["quantity"] == "current" else "M1"} | fields
    return {name: str(cell) for name, cell in whole.items()}


def volts(at: str, value: float, **more: Any) -> dict[str, str]:
    return reading(quantity="voltage", at=at, value=value, **more)


def amps(at: str, value: float, **more: Any) -> dict[str, str]:
    return reading(quantity="current", at=at, value=value, **more)


def site(*readings: dict[str, str], **tables: list[dict[str, str]]) -> Site:
    return site_of(
        CHAIN | tables | {"readings": list(readings)}, {"name": "x", "nominal": "24 V", "ambient": "20 degC"}
    )


def result(record: Site) -> CircuitResult:
    (only,) = assess(record, limits.of(record)).circuits
    return only


def drop(record: Site) -> Drop:
    found = result(record).drop
    assert found is not None
    return found


def gap(record: Site) -> str:
    """Why there is no drop."""
    context = prepare(record, limits.of(record))
    case = case_of(context, record.circuits[0])
    assert case.drop is None
    assert result(record).status is Status.MEASURE
    return case.drop_gap


def test_a_reading_with_the_loads_off_is_in_no_round() -> None:
    """2 × 30 m × 4.61 mΩ/m carry 4 A and 1 A; what the clamp shows with nothing flowing is not a third current."""
    loaded = [volts("way", 24.0), volts("p2", 23.2), amps("run 1", 4.0)]
    off = [amps("run 1", 0.3, loads_off="yes"), volts("way", 24.6, loads_off="yes")]
    found = result(site(*loaded, *off))
    assert found.drop == drop(site(*loaded))
    assert found.causes == result(site(*loaded)).causes
    unused = [gap.why for gap in found.not_judged if gap.where == "readings"]
    assert unused == ["read, but of no use here: voltage at way"]


def test_with_the_loads_off_alone_nothing_was_read_under_load() -> None:
    found = result(site(amps("run 1", 0.3, loads_off="yes"), amps("run 1", 0.02, loads_off="yes")))
    assert (found.status, found.why, found.drop) == (Status.MEASURE, "nothing was read under load", None)


def test_the_far_point_is_the_one_with_the_largest_computed_drop() -> None:
    found = drop(site(volts("way", 24), volts("p1", 23), volts("p2", 22.9), amps("run 1", 4), amps("run 2", 1)))
    assert (found.start, found.end) == ("way", "p2")
    assert found.measured.value == pytest.approx(1.1)
    assert found.computed.value == pytest.approx(
        4 * (2 * 20 * R_MM4 + JOINTS) + 1 * (2 * 10 * R_MM4 + JOINTS), rel=1e-4
    )
    assert found.excess.value == pytest.approx(found.measured.value - found.computed.value)


def test_the_bus_comes_before_the_way_where_the_device_has_a_figure() -> None:
    """A C16 breaker: 0.6 × 3.5 W / 16² A² = 8.2 mΩ, at 4 A 0.033 V."""
    readings = (volts("bus", 24), volts("way", 23.9), volts("p1", 23), amps("way", 4))
    found = drop(site(*readings))
    assert (found.start, found.end) == ("bus", "p1")
    assert found.computed.value == pytest.approx(4 * (0.6 * 3.5 / 16**2 + 2 * 20 * R_MM4 + JOINTS), rel=1e-4)
    unknown = [{"circuit": "C1", "fed_from": "PSU", "allowed_drop": "20"}]
    assert drop(site(*readings, circuits=unknown)).start == "way"
    assert "way was not read" in gap(site(volts("bus", 24), volts("p1", 23), amps("way", 4), circuits=unknown))
    none = [{"circuit": "C1", "fed_from": "PSU", "device": "none"}]
    found = drop(site(*readings, circuits=none))
    assert found.start == "bus"
    assert found.computed.value == pytest.approx(4 * (2 * 20 * R_MM4 + JOINTS), rel=1e-4)


def test_a_current_that_was_not_read_follows_the_loads_share_with_more_doubt() -> None:
    """Design: 4 A in run 1, 1 A in run 2; 2 A read in run 1 make 0.5 A in run 2, doubt 15 % of the 1.5 A between."""
    both = drop(site(volts("way", 24), volts("p2", 23), amps("run 1", 2), amps("run 2", 0.5)))
    share = drop(site(volts("way", 24), volts("p2", 23), amps("run 1", 2)))
    assert share.computed.value == pytest.approx(both.computed.value)
    extra = 0.15 * 1.5 * (2 * 10 * R_MM4 + JOINTS)
    assert share.computed.u == pytest.approx(((both.computed.u or 0) ** 2 + extra**2) ** 0.5, rel=0.01)


def test_a_current_read_behind_serves_the_runs_before_it() -> None:
    found = drop(site(volts("way", 24), volts("p1", 23), amps("run 2", 0.5)))
    assert found.current.value == pytest.approx(2.0)


def test_between_points_without_taps_the_current_is_the_same() -> None:
    chain = [{"circuit": "C1", "point": "p2", "load": "far", "current": ""}]
    found = drop(site(volts("way", 24), volts("p2", 23), amps("run 1", 2), loads=chain))
    assert found.computed.value == pytest.approx(2 * (2 * 30 * R_MM4 + 2 * JOINTS), rel=1e-4)


def test_a_share_of_unknown_loads_is_not_guessed() -> None:
    loads = [
        {"circuit": "C1", "point": "p1", "load": "near", "current": ""},
        {"circuit": "C1", "point": "p2", "load": "far", "current": "1"},
    ]
    record = site(volts("way", 24), volts("p2", 23), amps("run 1", 2), loads=loads)
    assert result(record).drop is None
    (said,) = [g for g in result(record).not_judged if g.rule == "VD02"]
    assert said.why == "the current to p2 was not read, and its share of the loads is not known"


def test_a_current_in_another_branch_says_nothing() -> None:
    fork = [
        *CHAIN["runs"],
        {"circuit": "C1", "run": "3", "from": "way", "to": "p3", "length": "5", "size": "4 mm2"},
    ]
    record = site(volts("way", 24), volts("p2", 23), amps("run 3", 2), runs=fork)
    assert gap(record) == "round 1 has no current on the way to p1 or behind it"


def test_the_round_with_the_highest_current_counts() -> None:
    record = site(
        volts("way", 24), volts("p2", 23), amps("run 1", 1), amps("run 2", 0.25),
        volts("way", 24, round="2"), volts("p2", 22), amps("run 1", 4, round="2"), volts("p2", 22, round="2"),
    )  # fmt: skip
    assert drop(record).round == "2"


def test_repeated_readings_of_one_point_show_how_the_source_wanders() -> None:
    """23.96 V and 24.04 V at way: s = 0.0566 V, for each reading anew."""
    steady = drop(site(volts("way", 24), volts("p1", 23), amps("run 1", 2)))
    found = drop(site(volts("way", 23.96), volts("p1", 23), volts("way", 24.04), amps("run 1", 2)))
    assert found.measured.value == pytest.approx(1.0)
    s = 0.08 / 2**0.5
    one = 0.01 * (4 / 3 + 1 / 12) ** 0.5
    assert found.measured.u == pytest.approx(((0.5e-2 / 3**0.5) ** 2 + 1.5 * (s**2 + one**2)) ** 0.5, rel=1e-6)
    assert (steady.measured.u or 0) < (found.measured.u or 0)


def test_two_poles_to_earth_make_a_voltage_between_the_legs() -> None:
    poles = (volts("way", 13, leg="positive"), volts("way", -11, leg="negative"))
    assert drop(site(*poles, volts("p1", 23), amps("run 1", 2))).measured.value == pytest.approx(1.0)


def test_direct_drops_are_chained_over_the_path() -> None:
    def direct(at: str, to: str, leg: str, value: float) -> dict[str, str]:
        return reading(quantity="drop", at=at, to=to, leg=leg, value=value)

    record = site(
        direct("way", "p1", "positive", 0.4), direct("way", "p1", "negative", 0.35), direct("p1", "p2", "both", 0.1),
        amps("run 1", 4), amps("run 2", 1),
    )  # fmt: skip
    found = drop(record)
    assert (found.start, found.end, found.by) == ("way", "p2", "direct drops")
    assert found.measured.value == pytest.approx(0.85)


def test_one_leg_alone_is_no_drop() -> None:
    leg = reading(quantity="drop", at="way", to="p1", leg="positive", value=0.4)
    assert gap(site(leg, amps("run 1", 4))) == "round 1 has no voltages at two points, nor a drop over both legs"


def test_a_joint_reading_alone_is_no_drop() -> None:
    joint = reading(quantity="joint", at="run 1 end", leg="positive", value="4 mV")
    assert "no voltages at two points" in gap(site(joint, amps("run 1", 4)))


def test_a_drop_between_points_without_the_other_voltage_is_none() -> None:
    far = reading(quantity="drop", at="p1", to="p2", leg="both", value=0.1)
    record = site(volts("way", 24), far, amps("run 1", 4))
    assert gap(record) == "round 1 has no voltages at way and p2"


def test_a_probe_on_the_conductor_overrides_the_recorded_temperature() -> None:
    probe = reading(quantity="temperature", at="run 1", value=60, instrument="")
    cold = drop(site(volts("way", 24), volts("p1", 23), amps("run 1", 4)))
    hot = drop(site(volts("way", 24), volts("p1", 23), amps("run 1", 4), probe))
    gain = 4 * 2 * 20 * R_MM4 * 0.00393 * 40  # IEC 60028:1925
    assert hot.computed.value - cold.computed.value == pytest.approx(gain, rel=1e-6)


def test_the_zero_of_a_meter_is_taken_off() -> None:
    clamp = [
        CHAIN["instruments"][0],
        {
            "instrument": "K1",
            "quantity": "current",
            "accuracy": "1",
            "counts": "2",
            "resolution": "0.01",
            "zero": "0.5",
        },
    ]
    found = drop(site(volts("way", 24), volts("p1", 23), amps("run 1", 4.5), instruments=clamp))
    assert found.current.value == pytest.approx(4.0)


def test_the_smallest_range_that_holds_a_reading_counts() -> None:
    ranges = [
        {
            "instrument": "M1",
            "quantity": "voltage",
            "range": "60",
            "accuracy": "0",
            "counts": "1",
            "resolution": "0.01",
        },
        {
            "instrument": "M1",
            "quantity": "voltage",
            "range": "6",
            "accuracy": "0",
            "counts": "1",
            "resolution": "0.001",
        },
        CHAIN["instruments"][1],
    ]
    one = (1 / 3 + 1 / 12) ** 0.5
    low = reading(quantity="drop", at="way", to="p1", leg="both", value=1.0)
    assert drop(site(low, amps("run 1", 4), instruments=ranges)).measured.u == pytest.approx(0.001 * one)
    high = low | {"range": "60"}
    assert drop(site(high, amps("run 1", 4), instruments=ranges)).measured.u == pytest.approx(0.01 * one)


def test_a_reading_without_an_instrument_counts_with_a_poor_meter_and_says_so() -> None:
    poor = volts("p1", 20, instrument="")
    record = site(volts("way", 24), poor, amps("run 1", 4))
    (finding,) = [f for f in result(record).findings if f.rule == "VD02"]
    assert "voltage at p1: instrument not recorded, counted as a poor meter" in finding.why


def test_each_circuit_is_judged_on_its_latest_visit() -> None:
    def at_visit(visit: str, value: float, **more: Any) -> list[dict[str, str]]:
        rows = (volts("way", 24), volts("p1", value), amps("run 1", 4))
        return [row | {"visit": visit} | more for row in rows]

    listed = [{"visit": "spring"}, {"visit": "autumn"}]
    rows = [*at_visit("autumn", 23), *at_visit("spring", 22)]
    assert result(site(*rows, visits=listed)).visit == "autumn"
    assert result(site(*rows)).visit == "spring"  # first appearance
    dated = [
        *at_visit("autumn", 23, taken_at="2026-10-01T10:00:00"),
        *at_visit("spring", 22, taken_at="2026-04-01T10:00:00"),
    ]
    assert result(site(*dated)).visit == "autumn"


def test_replaced_readings_are_never_judged() -> None:
    wrong = volts("p1", 2.3, reading="r1")
    right = volts("p1", 23.0, replaces="r1", reason="decimal point")
    assert drop(site(volts("way", 24), wrong, right, amps("run 1", 4))).measured.value == pytest.approx(1.0)


def test_what_is_being_typed_stands_in_for_the_record() -> None:
    record = site(volts("way", 24), volts("p1", 23), amps("run 1", 4))
    context = prepare(record, limits.of(record))
    typed = [replace(row, value=22.0) if row.at == "p1" else row for row in record.readings]
    judged = assess_circuit(context, record.circuits[0], readings=typed)
    assert judged.drop is not None
    assert judged.drop.measured.value == pytest.approx(2.0)
    assert assess_circuit(context, record.circuits[0], readings=[]).drop is None


def test_times_with_an_offset_are_ordered_as_moments() -> None:
    rows = [
        volts("p1", 23, visit="early") | {"taken_at": "2026-06-01T10:00+05:00"},
        volts("p1", 22, visit="late") | {"taken_at": "2026-06-01T06:00"},
    ]
    assert result(site(*rows)).visit == "late"


def test_a_visit_that_is_not_listed_stands_where_its_time_puts_it() -> None:
    rows = [
        volts("p1", 23, visit="as left") | {"taken_at": "2026-02-01T10:00"},
        volts("p1", 22, visit="as found") | {"taken_at": "2026-01-01T10:00"},
    ]
    assert result(site(*rows, visits=[{"visit": "as left"}])).visit == "as left"


def test_a_point_read_twice_before_any_run_is_recorded_stops_nothing() -> None:
    record = site(volts("way", 24), volts("way", 24.1), runs=[], loads=[])
    assert result(record).status is Status.INCOMPLETE


def test_the_cautions_go_by_what_was_read_too() -> None:
    record = site(volts("way", 220, instrument=""))
    assert any("60 V" in caution for caution in assess(record, limits.of(record)).cautions)
