"""Voltages that the record makes of a round: the first one read, less the computed drop."""

from __future__ import annotations

from dataclasses import replace

import pytest

from rules.assess import prepare
from rules.case import case_of
from rules.expected import expected_voltages
from rules.limits import of
from rules.record import Circuit, Feed, Figure, Load, Reading, Run, Site, Source

SITE = Site(
    name="hut",
    sources=(Source(id="s", tag="PSU", kind="power supply", nominal_voltage_v=24.0),),
    circuits=(Circuit(id="c", tag="C1", fed_from=Feed("sources", "s"), device="none"),),
    runs=(
        Run(id="r1", circuit_id="c", number=1, from_point="way", to_point="p1", one_way_length_m=29.0, size="4 mm2",
            conductor_temperature_c=20.0),
        Run(id="r2", circuit_id="c", number=2, from_point="p1", to_point="p2", one_way_length_m=10.0, size="4 mm2",
            conductor_temperature_c=20.0),
    ),
    loads=(Load(id="l", circuit_id="c", point="p2", tag="lamp", current_a=8.0),),
)  # fmt: skip


def reading(quantity: str, at: str, value: float, round_name: str = "1") -> Reading:
    return Reading(id=f"{quantity} {at}", circuit_id="c", round=round_name, quantity=quantity, at=at, value=value)


def expected(site: Site, *readings: Reading, round_name: str = "1") -> dict[str, Figure]:
    context = prepare(site, of(site))
    return expected_voltages(case_of(context, context.index.circuits["c"], readings), round_name)


def test_each_point_has_the_first_voltage_less_the_drop_to_it() -> None:
    """
    By hand: 4.61 mΩ/m at 20 °C (IEC 60228, class 2, 4 mm²); 2 × 29 m × 8 A × 4.61 mΩ/m = 2.139 V; 2 × 10 m: 0.738 V.

    Four terminations a run add 8 A × 4 × 1.27 × 0.15 mΩ × sqrt(10 / 4) = 9.6 mV each.
    """
    found = expected(SITE, reading("current", "run 1", 8.0), reading("voltage", "way", 24.2))
    assert list(found) == ["way", "p1", "p2"]
    assert (found["way"].value, found["way"].u) == (24.2, None)
    assert found["p1"].value == pytest.approx(24.2 - 2.139 - 0.010, abs=2e-3)
    assert found["p2"].value == pytest.approx(24.2 - 2.139 - 0.738 - 0.019, abs=3e-3)
    assert found["p1"].u is not None
    assert found["p2"].u is not None
    assert 0 < found["p1"].u < found["p2"].u


def test_what_was_read_behind_the_first_point_changes_nothing() -> None:
    first = (reading("current", "run 1", 8.0), reading("voltage", "way", 24.2))
    assert expected(SITE, *first, reading("voltage", "p2", 15.0)) == expected(SITE, *first)


def test_without_a_current_only_the_first_point_is_known() -> None:
    assert list(expected(SITE, reading("voltage", "way", 24.2))) == ["way"]


def test_without_a_voltage_or_a_round_nothing_is_known() -> None:
    current = reading("current", "run 1", 8.0)
    assert expected(SITE, current) == {}
    assert expected(SITE, current, reading("voltage", "way", 24.2), round_name="2") == {}


def test_a_point_behind_an_unknown_length_is_left_out() -> None:
    unknown = replace(SITE, runs=(SITE.runs[0], replace(SITE.runs[1], one_way_length_m=None)))
    found = expected(unknown, reading("current", "run 1", 8.0), reading("voltage", "way", 24.2))
    assert list(found) == ["way", "p1"]


def test_a_device_that_is_not_recorded_hides_what_lies_behind_the_busbar() -> None:
    """What it loses is not known: a reading on the busbar says nothing of ``way``."""
    unknown = replace(SITE, circuits=(replace(SITE.circuits[0], device=""),))
    current = reading("current", "run 1", 8.0)
    assert expected(unknown, current, reading("voltage", "bus", 24.2)) == {}
    known = replace(SITE, circuits=(replace(SITE.circuits[0], device="breaker C", rated_current_a=10.0),))
    found = expected(known, current, reading("voltage", "bus", 24.2))
    assert list(found) == ["bus", "way", "p1", "p2"]
    assert found["way"].value < 24.2
