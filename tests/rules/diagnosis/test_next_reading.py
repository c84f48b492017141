"""What is asked for next, on small circuits whose answer is known."""

from __future__ import annotations

import math
from types import ModuleType
from typing import Any

import pytest

from rules import limits
from rules.assess import assess
from rules.assessment import CircuitResult, NextReading
from rules.diagnosis.hypotheses import BAD_CONNECTION
from rules.record import Site

JOINTS_ONLY = """
[prior]
source = "this test: a joint or nothing"
smaller_conductor = 0
other_metal = 0
longer_route = 0
series_semiconductor = 0
reading_or_record_doubtful = 0
"""


def result_of(site: Site) -> CircuitResult:
    """What is said of a site's first circuit."""
    return assess(site, limits.of(site)).circuits[0]


def asked_of(site: Site) -> NextReading:
    """What is asked for on a site's first circuit."""
    found = result_of(site).next_reading
    assert found is not None
    return found


def leg_drop(leg: str, volts: float, amps: float, to: str = "p1", round_: str = "2") -> list[dict[str, Any]]:
    """A drop along one leg of the first run, in a round of its own."""
    return [
        {"circuit": "C1", "round": round_, "quantity": "drop", "at": "way", "to": to, "leg": leg, "value": f"{volts:.4f}",
         "instrument": "M1"},
        {"circuit": "C1", "round": round_, "quantity": "current", "at": "run 1", "value": str(amps), "instrument": "K1"},
    ]  # fmt: skip


def test_two_joints_that_are_alike_are_told_by_either(chains: ModuleType) -> None:
    """0.1 ohm too much in the positive leg: its two ends are alike, and one of them read tells: ln 2."""
    volts = chains.drops([10.0], 8.0, extra=[0.1])
    leg = (10 * chains.OHM_PER_M + chains.JOINTS / 2 + 0.1) * 8.0
    readings = [*chains.read(["way", "p1"], volts, 8.0), *leg_drop("positive", leg, 8.0)]
    asked = asked_of(chains.chain([10.0], readings, own=JOINTS_ONLY))
    assert (asked.what, asked.quantity, asked.at, asked.leg) == ("reading", "joint", "run 1 start", "positive")
    assert asked.fall_nats == pytest.approx(math.log(2), abs=0.01)
    assert asked.why == (
        "tells a bad connection there from one elsewhere in run 1; "
        "more than 7 A turns more than 5 W into heat in a joint of 101 mΩ; with load taken off"
    )


def test_of_four_joints_one_is_read_since_a_leg_takes_longer(chains: ModuleType) -> None:
    """ln 4 before; one joint tells itself from three (0.562 in 6 minutes), a leg halves them (0.693 in 11)."""
    volts = chains.drops([10.0], 8.0, extra=[0.1])
    asked = asked_of(chains.chain([10.0], chains.read(["way", "p1"], volts, 8.0), own=JOINTS_ONLY))
    assert asked.quantity == "joint"
    assert asked.fall_nats == pytest.approx(math.log(4) - 0.75 * math.log(3), abs=0.01)
    quick = JOINTS_ONLY + '[next_reading]\nsource = "this test"\nleg_minutes = 1\n'
    asked = asked_of(chains.chain([10.0], chains.read(["way", "p1"], volts, 8.0), own=quick))
    assert (asked.quantity, asked.at, asked.to) == ("drop", "way", "p1")
    assert asked.fall_nats == pytest.approx(math.log(2), abs=0.01)
    assert ", and halves the suspected joints, quicker than one end after another; more than " in asked.why


def minutes_end_by_end(ends: int) -> float:
    """Expected, the last of some equal suspects known without being read; 6 minutes each."""
    return sum(6.0 * min(n, ends - 1) for n in range(1, ends + 1)) / ends


@pytest.mark.parametrize(("runs", "quantity"), [(1, "joint"), (3, "drop"), (4, "drop")])
def test_a_leg_is_read_first_where_that_takes_fewer_minutes(chains: ModuleType, runs: int, quantity: str) -> None:
    """
    Nobody gets at the points between. Of 4 ends one after another takes 13.5 minutes, a leg first 11 + 6; of 12 ends 38.5
    against 11 + 20, of 16 50.6 against 11 + 26.25. The choice by what a minute tells is the one that takes fewer in all.
    """
    ends = 4 * runs
    leg_first = 11.0 + minutes_end_by_end(ends // 2)
    assert (minutes_end_by_end(ends) > leg_first) is (quantity == "drop")
    lengths = [5.0] * runs
    volts = chains.drops(lengths, 8.0, extra=[0.1])
    closed = JOINTS_ONLY + '[next_reading]\nsource = "this test"\npoint_minutes = 100\n'
    asked = asked_of(chains.chain(lengths, chains.read(["way", f"p{runs}"], volts, 8.0), own=closed))
    assert asked.quantity == quantity
    if quantity == "drop":
        assert (asked.at, asked.to) == ("way", f"p{runs}")
        assert "halves the suspected joints, quicker than one end after another" in asked.why


@pytest.mark.parametrize(("runs", "middle"), [(2, {"p1"}), (4, {"p2"}), (5, {"p2", "p3"}), (8, {"p4"})])
def test_of_equal_suspects_in_a_chain_the_middle_comes_first(chains: ModuleType, runs: int, middle: set[str]) -> None:
    lengths = [5.0] * runs
    volts = chains.drops(lengths, 8.0, extra=[0.0] * (runs - 1) + [0.1])
    site = chains.chain(lengths, chains.read(["way", f"p{runs}"], volts, 8.0), own=JOINTS_ONLY)
    asked = asked_of(site)
    assert (asked.what, asked.quantity) == ("reading", "voltage")
    assert asked.at in middle
    assert asked.why.startswith("measure the middle first")
    assert "together with way and the current" in asked.why


def test_halving_again_and_again_finds_the_run(chains: ModuleType) -> None:
    """Eight runs: three voltages name the run."""
    lengths = [5.0] * 8
    volts = chains.drops(lengths, 8.0, extra=[0.0] * 5 + [0.1, 0.0, 0.0])
    points = {"way", "p8"}

    def found() -> CircuitResult:
        read = [point for point in ("way", *(f"p{n}" for n in range(1, 9))) if point in points]
        return result_of(chains.chain(lengths, chains.read(read, volts, 8.0), own=JOINTS_ONLY))

    for _ in range(3):
        asked = found().next_reading
        assert asked is not None
        assert asked.quantity == "voltage"
        points.add(asked.at)
    best = found().causes[0]
    assert (best.cause, best.where) == (BAD_CONNECTION, "run 6")
    assert best.probability > 0.95


def test_a_joint_and_a_conductor_are_told_by_a_leg(chains: ModuleType) -> None:
    """An excess that a size, a length or a joint explains: along one leg, all or half of it is lost."""
    volts = chains.drops([20.0], 8.0, extra=[0.075])
    asked = asked_of(chains.chain([20.0], chains.read(["way", "p1"], volts, 8.0)))
    assert (asked.quantity, asked.at, asked.to) == ("drop", "way", "p1")
    assert asked.leg in ("positive", "negative")
    assert asked.current_at_least is not None


def test_a_semiconductor_is_told_from_a_joint(chains: ModuleType) -> None:
    """0.5 V at 8 A: a leg shows in which leg it lies, and a second round at another current which of the two it is."""
    one = chains.read(["way", "p1"], chains.drops([20.0], 8.0, offset=0.5), 8.0)
    first = asked_of(chains.chain([20.0], one))
    assert first.quantity == "drop"
    both = JOINTS_ONLY.replace("series_semiconductor = 0\n", "") + SLOW_LEADS
    second = asked_of(chains.chain([20.0], one, own=both))
    assert (second.what, second.quantity, second.at, second.to) == ("round", "voltage", "way", "p1")
    assert second.current_at_least is not None
    assert second.current_at_least.value <= 0.4 * 8.0
    assert second.why == (
        "tells a bad connection in run 1 from a semiconductor in run 1; "
        "a second round at less current, at which a semiconductor loses as much; "
        "more than 8.4 A turns more than 5 W into heat in a joint of 70 mΩ"
    )


def test_the_words_name_the_causes_that_a_reading_decides_between_most(chains: ModuleType) -> None:
    """README's mill: a semiconductor has 7 %, a bad connection 19 % at four ends alike: the leg is read for those."""
    meters: dict[str, list[dict[str, Any]]] = {"instruments": []}
    cells = [("current", "run 1", 8.02), ("voltage", "way", 23.91), ("voltage", "p1", 21.30)]
    meters["readings"] = [{"circuit": "C1", "round": 1, "quantity": q, "at": at, "value": v} for q, at, v in cells]
    found = result_of(chains.chain([29.0], tables=meters, device="fuse blade", device_rating="10"))
    share = {place.cause: place.probability for place in found.causes if not place.joints}
    assert share[BAD_CONNECTION] > 2 * share["series semiconductor"]
    assert found.next_reading is not None
    assert found.next_reading.quantity == "drop"
    assert found.next_reading.why.startswith("tells a bad connection in this leg from ")


SLOW_LEADS = '[next_reading]\nsource = "this test"\nleg_minutes = 100\njoint_minutes = 100\n'
