"""The measured side where circuits share a return, or a run closes a mesh."""

from __future__ import annotations

from typing import Any

import pytest

from audit.intake.folder import site_of
from rules import limits
from rules.assess import assess
from rules.assessment import CircuitResult, Status
from rules.record import Site

R_MM4, R_MM10 = 4.61e-3, 1.83e-3
"""IEC 60228:2004, class 2. [ohm/m]"""
JOINT_4, JOINT_10 = 0.15e-3 * (10 / 4) ** 0.5 * 1.2715, 0.15e-3 * 1.2715
"""Healthy terminations. [ohm]"""

METERS = [
    {"instrument": "M1", "quantity": "voltage", "accuracy": "0.05", "counts": "2", "resolution": "0.001"},
    {"instrument": "K1", "quantity": "current", "accuracy": "1", "counts": "2", "resolution": "0.01"},
]
SHARED: dict[str, Any] = {
    "sources": [{"source": "PSU", "kind": "power supply", "nominal": "24", "lowest": "21"}],
    "circuits": [
        {"circuit": tag, "fed_from": "PSU", "device": "none", "allowed_drop": "20"} for tag in ("C1", "C2", "C3")
    ],
    "runs": [
        {
            "circuit": tag, "run": "1", "from": "way", "to": "box", "length": length, "length_by": "tape",
            "size": "4 mm2", "return": "shared:N", "return_size": "10 mm2",
        }
        for tag, length in (("C1", "20"), ("C2", "20"), ("C3", "25"))
    ],
    "loads": [{"circuit": tag, "point": "box", "load": tag, "current": "2"} for tag in ("C1", "C2", "C3")],
    "instruments": METERS,
}  # fmt: skip


def reading(circuit: str, quantity: str, at: str, value: float, **more: str) -> dict[str, str]:
    meter = "K1" if quantity == "current" else "M1"
    return {
        "circuit": circuit,
        "round": "1",
        "quantity": quantity,
        "at": at,
        "value": str(value),
        "instrument": meter,
    } | more


def judged(tables: dict[str, Any], *readings: dict[str, str]) -> dict[str, CircuitResult]:
    record: Site = site_of(
        tables | {"readings": list(readings)}, {"name": "x", "nominal": "24 V", "ambient": "20 degC"}
    )
    return {result.circuit: result for result in assess(record, limits.of(record)).circuits}


C1 = (
    reading("C1", "voltage", "way", 24.0),
    reading("C1", "voltage", "box", 23.6),
    reading("C1", "current", "run 1", 1.8),
)
OTHERS = (reading("C2", "current", "way", 1), reading("C3", "current", "run 1", 2))


def test_a_shared_return_loses_by_what_all_carry() -> None:
    """1.8 A out over 20 m of 4 mm², 4.8 A back over 25 m of 10 mm²."""
    drop = judged(SHARED, *C1, *OTHERS)["C1"].drop
    assert drop is not None
    assert drop.computed.value == pytest.approx(
        1.8 * (20 * R_MM4 + 2 * JOINT_4) + 4.8 * (25 * R_MM10 + 2 * JOINT_10), rel=1e-4
    )
    assert drop.current.value == pytest.approx(1.8)
    # one clamp: its gain of 1 % / √3 acts on the whole computed drop
    assert (drop.computed.u or 0) > drop.computed.value * 0.01 / 3**0.5


def test_a_current_missing_beside_it_leaves_the_circuit_to_be_measured() -> None:
    result = judged(SHARED, *C1, OTHERS[0])["C1"]
    assert result.drop is None
    assert result.status is Status.MEASURE
    assert result.why == "round 1 has no current of C3, which shares the return N"


@pytest.mark.parametrize("elsewhere", [{"round": "2"}, {"visit": "last year"}])
def test_a_current_of_another_round_or_visit_does_not_count(elsewhere: dict[str, str]) -> None:
    before = (reading("C3", "current", "run 1", 2) | elsewhere, *C1, OTHERS[0])
    assert judged(SHARED, *before)["C1"].why == "round 1 has no current of C3, which shares the return N"


def test_a_return_of_unknown_length_has_no_computed_drop() -> None:
    runs = [*SHARED["runs"][:2], SHARED["runs"][2] | {"length": ""}]
    result = judged(SHARED | {"runs": runs}, *C1, *OTHERS)["C1"]
    assert result.drop is None
    assert "length of run 1" in result.why


RING: dict[str, Any] = SHARED | {
    "circuits": SHARED["circuits"][:1],
    "runs": [
        {"circuit": "C1", "run": str(k), "from": start, "to": end, "length": "10", "length_by": "tape", "size": "4 mm2"}
        for k, start, end in ((1, "way", "p1"), (2, "p1", "p2"), (3, "p2", "p3"), (4, "way", "p3"))
    ],
    "loads": [{"circuit": "C1", "point": point, "load": point, "current": "2"} for point in ("p1", "p3")],
}
RUN = 2 * 10 * R_MM4 + 4 * JOINT_4
WAY, P1 = reading("C1", "voltage", "way", 24.0), reading("C1", "voltage", "p1", 23.7)
P3 = reading("C1", "voltage", "p3", 23.7)


def test_a_ring_is_judged_by_the_currents_read_in_its_runs() -> None:
    drop = judged(RING, WAY, P1, reading("C1", "current", "run 1", 2.1))["C1"].drop
    assert drop is not None
    assert drop.computed.value == pytest.approx(2.1 * RUN, rel=1e-4)


def test_no_share_of_loads_stands_in_for_a_current_in_a_ring() -> None:
    result = judged(RING, WAY, P1, reading("C1", "current", "way", 4))["C1"]
    assert result.drop is None
    assert result.why == "run 1 is part of a mesh, where no share of the loads says what a run carries"


def test_the_other_way_round_serves_where_its_current_was_read() -> None:
    """p3 is reached by runs 1 to 3, whose currents were not read, and by run 4, whose was."""
    drop = judged(RING, WAY, P3, reading("C1", "current", "run 4", 1.9))["C1"].drop
    assert drop is not None
    assert (drop.start, drop.end) == ("way", "p3")
    assert drop.computed.value == pytest.approx(1.9 * RUN, rel=1e-4)


def test_against_the_tree_a_current_counts_backwards() -> None:
    """From p1 round the far side: down run 2 and run 3 backwards, 0.2 A from p3 towards p1."""
    at = (P1, reading("C1", "voltage", "p3", 23.72))
    drop = judged(RING, *at, reading("C1", "current", "run 2", -0.2), reading("C1", "current", "run 3", -0.2))[
        "C1"
    ].drop
    assert drop is not None
    assert drop.computed.value == pytest.approx(-0.4 * RUN, rel=1e-4)


def test_a_voltage_that_rises_along_a_ring_is_no_mistake() -> None:
    low = (WAY, reading("C1", "voltage", "p2", 23.0), P3)
    rules = {f.rule for result in judged(RING, *low).values() for f in result.findings}
    assert "RD02" not in rules
    chain = RING | {"runs": RING["runs"][:3]}
    assert "RD02" in {f.rule for f in judged(chain, *low)["C1"].findings}


def test_a_current_against_a_run_of_a_ring_is_no_mistake() -> None:
    readings = (WAY, P1, reading("C1", "current", "run 1", -2.1))
    assert "RD06" not in {f.rule for f in judged(RING, *readings)["C1"].findings}
    chain = RING | {"runs": RING["runs"][:3]}
    assert "RD06" in {f.rule for f in judged(chain, *readings)["C1"].findings}


def test_a_current_in_a_ring_is_not_compared_with_loads_behind_it() -> None:
    """Run 2 carries next to nothing by the record, more if p3 draws less than recorded; at the way all loads count."""
    in_ring = (WAY, reading("C1", "current", "run 2", 1.1))
    assert "RD05" not in {f.rule for f in judged(RING, *in_ring)["C1"].findings}
    assert "RD05" in {f.rule for f in judged(RING, WAY, reading("C1", "current", "way", 5))["C1"].findings}
