"""How much current is asked for, and what comes first, on small circuits whose answer is known."""

from __future__ import annotations

import math
from dataclasses import replace
from types import ModuleType

import pytest

from audit.report.phrases import next_reading_words
from rules import limits
from rules.assess import assess
from rules.assessment import NextReading
from rules.record import Figure, Site

SWITCH = "at the supervision current only; more can operate the switch"


def asked_of(site: Site) -> NextReading:
    """What is asked for on a site's first circuit."""
    found = assess(site, limits.of(site)).circuits[0].next_reading
    assert found is not None
    return found


def loads(function: str, amps: float) -> dict[str, list[dict[str, object]]]:
    """A load of some function at the first point; a coil of 5 A where it trips."""
    peak = {"peak": 5, "peak_time": 0.1} if function == "trip or close" else {}
    return {"loads": [{"circuit": "C1", "point": "p1", "load": "far", "current": amps, "function": function, **peak}]}


@pytest.mark.parametrize("read", [False, True])
def test_a_coil_is_read_at_its_supervision_current(chains: ModuleType, read: bool) -> None:
    """5 A trips the switch; 0.5 A supervises it: with or without readings no more is asked for, whatever the ratings."""
    volts = chains.drops([60.0], 0.5, extra=[0.4])
    readings = chains.read(["way", "p1"], volts, 0.5) if read else []
    site = chains.chain([60.0], readings, tables=loads("trip or close", 0.5), device="breaker C", device_rating="10")
    asked = asked_of(site)
    assert asked.current_at_least is not None
    assert asked.current_at_most is not None
    assert asked.current_at_least.value <= asked.current_at_most.value <= 0.5
    assert SWITCH in asked.why
    ordinary = asked_of(replace(site, loads=tuple(replace(load, function="") for load in site.loads)))
    assert ordinary.current_at_most is not None
    assert ordinary.current_at_most.value > 0.5
    assert SWITCH not in ordinary.why


def test_a_coil_that_nothing_supervises_is_tested_dead(chains: ModuleType) -> None:
    """At rest it draws nothing: no current may be asked for, and none that is read is enough."""
    site = chains.chain([60.0], tables=loads("trip or close", 0.0), device="breaker C", device_rating="10")
    asked = asked_of(site)
    assert (asked.what, asked.quantity, asked.at, asked.to) == ("dead test", "resistance", "way", "p1")
    assert asked.leg == "positive"
    assert asked.current_at_least is None
    assert "and more than 0 A can operate the switch: with a four-wire micro-ohmmeter" in asked.why
    assert "prove dead" in asked.caution


def test_a_resistance_that_was_read_bounds_the_current(chains: ModuleType) -> None:
    """8.2 V too much at 2 A, 4.1 ohm, beyond every prior: 5 W is reached at √(5 / 4.1) = 1.10 A, not at the 2 A of the day."""
    volts = chains.drops([20.0], 2.0, extra=[4.1])
    site = chains.chain(
        [20.0], chains.read(["way", "p1"], volts, 2.0), amps=2.0, device="breaker C", device_rating="10"
    )
    asked = asked_of(site)
    assert asked.current_at_least is not None
    assert asked.current_at_most is not None
    assert asked.current_at_least.value <= asked.current_at_most.value <= math.sqrt(5 / 4.1)
    assert asked.current_at_most.value >= 1.0
    assert "more than 1.1 A turns more than 5 W into heat in a joint of 4.1 Ω; with load taken off" in asked.why


def test_in_a_tree_the_current_is_that_of_the_branch_that_is_read(chains: ModuleType) -> None:
    """Run 2 carries 1 A beside the 4 A of run 1, and loses 8 ohm: √(5 / 8) = 0.79 A in run 2."""
    branches = {
        "runs": [
            {"circuit": "C1", "run": n, "from": "way", "to": to, "length": length, "length_by": "tape", "size": "2.5 mm2",
             "insulation": "PVC", "method": "C"} for n, to, length in ((1, "a", 8), (2, "b", 3))
        ],
        "loads": [{"circuit": "C1", "point": "a", "load": "x", "current": 4}, {"circuit": "C1", "point": "b", "load": "y", "current": 1}],
    }  # fmt: skip
    cells = [("voltage", "way", 24.9), ("voltage", "a", 24.411), ("voltage", "b", 16.9)]
    readings = [
        {"circuit": "C1", "round": 1, "quantity": q, "at": at, "value": v, "instrument": "M1"} for q, at, v in cells
    ]
    readings += [
        {"circuit": "C1", "round": 1, "quantity": "current", "at": at, "value": v, "instrument": "K1"}
        for at, v in (("run 1", 4), ("run 2", 1))
    ]
    site = chains.chain([8.0], readings, tables=branches, device="breaker C", device_rating="10")
    asked = asked_of(site)
    assert asked.current_at_most is not None
    assert asked.current_at_most.value == pytest.approx(math.sqrt(5 / 8), abs=0.02)
    assert asked.at == "b" or "run 2" in asked.at
    assert "the current is that in run 2" in asked.why


def thermometer(readings: list[dict[str, object]]) -> dict[str, list[dict[str, object]]]:
    """The chain's readings with the two ends of its run at 62 and 38 °C."""
    meter: dict[str, object] = {
        "instrument": "T1",
        "quantity": "temperature",
        "accuracy": "1",
        "counts": 2,
        "resolution": "0.1",
    }
    chain: list[dict[str, object]] = [{"instrument": "M1", "quantity": "voltage", "accuracy": "0.05", "counts": "1", "resolution": "0.001"},
             {"instrument": "K1", "quantity": "current", "accuracy": "0.3", "counts": "1", "resolution": "0.01"}]  # fmt: skip
    warm: list[dict[str, object]] = [
        {
            "circuit": "C1",
            "round": 1,
            "quantity": "temperature",
            "at": f"run 1 {end}",
            "value": value,
            "instrument": "T1",
        }
        for end, value in (("end", "62.0"), ("start", "38.0"))
    ]
    return {"instruments": [*chain, meter], "readings": [*readings, *warm]}


@pytest.mark.parametrize("volts_read", [False, True])
def test_a_hot_end_is_read_across_first(chains: ModuleType, volts_read: bool) -> None:
    """HT02 names the end of run 1: its millivolts come first, one leg and then the other, then what else tells most."""
    points = ["way", "p1"] if volts_read else []
    readings = chains.read(points, chains.drops([10.0], 8.0), 8.0)
    site = chains.chain([10.0], tables=thermometer(readings), device="breaker C", device_rating="16")
    asked = asked_of(site)
    assert (asked.what, asked.quantity, asked.at) == ("reading", "joint", "run 1 end")
    assert asked.leg in ("positive", "negative")
    assert asked.why.startswith("HT02, joint hotter than similar ones: it is read across before anything else")
    assert asked.current_at_most is not None
    assert asked.current_at_most.value <= 16
    assert "Live work" in asked.caution
    assert "Do not tighten a hot joint live." in asked.caution
    healthy: list[dict[str, object]] = [
        {
            "circuit": "C1",
            "round": 1,
            "quantity": "joint",
            "at": "run 1 end",
            "leg": leg,
            "value": "0.002",
            "instrument": "M1",
        }
        for leg in ("positive", "negative")
    ]
    both = chains.chain([10.0], tables=thermometer([*readings, *healthy]), device="breaker C", device_rating="16")
    found = assess(both, limits.of(both)).circuits[0].next_reading
    assert found is None or "HT02" not in found.why


@pytest.mark.parametrize(
    ("volts", "at", "quantity"),
    [({"bus": 24.0, "way": 0.0}, "device", ""), ({"bus": 24.0, "p2": 0.0}, "way", "voltage"), ({"way": 0.0}, "bus", "voltage"),
     ({"way": 24.0, "p1": 0.0}, "run 1", ""), ({"way": 24.0, "p2": 0.0}, "p1", "voltage")],
)  # fmt: skip
def test_a_lost_voltage_is_followed_from_the_source(
    chains: ModuleType, volts: dict[str, float], at: str, quantity: str
) -> None:
    """The first point not read yet between the last with a voltage and the first without; else what lies between."""
    readings = [
        {"circuit": "C1", "round": 1, "quantity": "voltage", "at": point, "value": value, "instrument": "M1"}
        for point, value in volts.items()
    ]
    asked = asked_of(chains.chain([5.0, 5.0], readings, device="breaker C", device_rating="10"))
    assert (asked.what, asked.at, asked.quantity) == ("reading", at, quantity)
    assert asked.why.startswith("no voltage at ")
    assert asked.current_at_least is None
    assert "does not prove a circuit dead" in asked.caution


def test_where_nobody_may_read_the_duty_holder_is_asked_first(chains: ModuleType) -> None:
    """And nothing says itself twice."""
    asked = asked_of(chains.chain([10.0], not_tested="no permission", device="breaker C", device_rating="10"))
    assert asked.why.startswith("ask the duty holder first, for it was not tested: no permission; ")
    assert "voltages" not in asked.why
    assert "with the current" not in asked.why
    assert next_reading_words(asked).startswith("a round with its current: voltages from bus to p1")
    assert "more than 10 A passes the rating of C1" in asked.why


def test_one_current_is_said_once() -> None:
    """``at 5.6 A or more, at most 5.6 A`` is one figure."""
    both = NextReading("reading", "joint", "run 1 end", leg="positive", current_at_least=Figure(5.6, "A"))
    assert next_reading_words(replace(both, current_at_most=Figure(5.6, "A"))).endswith("positive leg, at 5.6 A")
    assert next_reading_words(replace(both, current_at_most=Figure(7, "A"))).endswith("at 5.6 A or more, at most 7 A")
