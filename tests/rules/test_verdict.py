"""What a diagnosis allows one to say: status, claims and the worst case, on one small circuit."""

from __future__ import annotations

import pytest

from rules import limits
from rules.assess import assess, assess_circuit, prepare
from rules.assessment import CircuitResult, Place, Status
from rules.diagnosis.hypotheses import (
    AS_RECORDED,
    BAD_CONNECTION,
    DOUBTFUL,
    LONGER,
    OTHER_METAL,
    SEMICONDUCTOR,
    SMALLER,
)
from rules.record import Site
from rules.verdict import claimed
from tests.rules.small_circuit import JOINTS, R_MM4, TABLES, read, result, site


def place_in(found: CircuitResult, where: str) -> Place:
    """The row of a bad connection at a place."""
    (row,) = [row for row in found.causes if row.cause == BAD_CONNECTION and row.where == where]
    return row


def test_readings_that_agree_with_the_record_make_a_circuit_sound() -> None:
    found = result(site(read()))
    assert found.status is Status.SOUND
    assert found.causes[0].cause == AS_RECORDED
    assert found.why == "the readings agree with the record: probability above 0.99"


def test_too_little_probability_of_as_recorded_is_measure() -> None:
    found = result(site(read(), '[decision]\nsource = "s"\nsound_at = 0.99999'))
    assert found.status is Status.MEASURE
    assert found.why.startswith("not settled: as recorded (above 0.99)")


def test_a_hot_joint_that_is_not_ruled_out_is_measure() -> None:
    """3 mΩ × √(10 / 4) at 8 A are 0.3 W: with a limit of 0.2 W any bad connection in run 1 is hot."""
    own = '[decision]\nsource = "s"\nsound_heat_share = 0.00001\n[heat]\nsource = "s"\nlimit_w = 0.2'
    found = result(site(read(), own))
    assert found.status is Status.MEASURE
    assert "a bad connection in run 1 of more than 0.2 W at design current is not ruled out" in found.why
    place = place_in(found, "run 1")
    assert place.heat == pytest.approx(place.probability)


def test_heat_is_judged_at_design_current() -> None:
    """At 8 A of design 10 W take 156 mΩ, far more than the readings leave open."""
    place = place_in(result(site(read(), '[heat]\nsource = "s"\nlimit_w = 10')), "run 1")
    assert place.probability > 1e-5
    assert place.heat is not None
    assert place.heat < 1e-12


def test_a_load_below_its_lowest_in_the_worst_case_is_not_sound() -> None:
    loads = [row | ({"lowest": "18.8"} if row["load"] == "far" else {}) for row in TABLES["loads"]]
    agreeing = site(read(), tables={"loads": loads})
    worst = next(point.worst for point in result(agreeing).points if point.point == "p2")
    assert worst is not None
    assert worst.value < 18.8
    assert result(agreeing).status is Status.ACT  # LV01 says so of the record itself
    lowered = site(read(), '[rules.LV01]\noff = true\nreason = "for this test"', tables={"loads": loads})
    assert result(lowered).status is Status.MEASURE
    assert "far would get" in result(lowered).why


def test_a_claimed_fault_of_little_heat_is_watch_and_of_more_is_soon() -> None:
    small = result(site(read(extra=(0.02, 0.0)) + read(extra=(0.02, 0.0), amps=(4.0, 2.5), round_=2)))
    assert (small.status, small.findings[0].cause, small.findings[0].where) == (Status.WATCH, BAD_CONNECTION, "run 1")
    assert small.findings[0].numbers["heat"].value == pytest.approx(0.02 * 8**2, rel=0.1)
    large = result(site(read(extra=(0.0, 0.15))))
    assert (large.status, large.findings[0].cause, large.findings[0].where) == (Status.ACT, BAD_CONNECTION, "run 2")
    assert large.findings[0].numbers["extra resistance"].value == pytest.approx(0.15, rel=0.02)
    # 0.15 Ω × (5 A)² = 3.75 W, read at 5 A and designed for 5 A; with the source at its lowest 0.15 Ω × 5 A = 0.75 V less
    heat, at_worst = large.findings[0].consequences
    assert heat == ("at design current 3.75 ± 0.02 W turn into heat in one place, 3.75 ± 0.02 W while it was read")
    # as recorded: 2.1 % of 2.33 V, by 2 % of resistance and 2 K of the conductors at 70 °C
    assert " gets 17.92 ± 0.07 V; of the source's 21 V 3.08 ± 0.07 V are lost, as recorded 2.33 ± 0.05 V" in at_worst
    (joint,) = (each for each in large.joints if each.where == "run 2")
    assert joint.read is not None
    assert joint.design is not None
    assert (joint.read.value, joint.design.value) == pytest.approx((3.75, 3.75), rel=0.02)
    numbers = large.findings[0].numbers
    assert numbers["at worst as recorded"].value - numbers["at worst"].value == pytest.approx(0.75, abs=0.01)


def test_a_doubtful_reading_settles_nothing() -> None:
    rows = read()
    slipped = [row | ({"value": "2.250"} if row["at"] == "p1" else {}) for row in rows]
    found = result(site(slipped))
    assert found.causes[0].cause == DOUBTFUL
    assert "voltage at p1, round 1" in found.causes[0].what
    assert "(a decimal place)" in found.causes[0].what
    assert not [f for f in found.findings if f.cause not in (None, DOUBTFUL)]


def test_nothing_read_and_not_tested_are_measure_with_their_reason() -> None:
    assert result(site([])).why == "nothing was read"
    refused = [TABLES["circuits"][0] | {"not_tested": "locked"}]
    assert result(site([], tables={"circuits": refused})).why == "not tested: locked"
    assert result(site([])).causes == ()


def test_a_run_that_no_reading_reaches_stays_open() -> None:
    """Half of the places have not been looked at: the circuit is not sound."""
    near = [row for row in read() if row["at"] != "p2"]
    found = result(site(near))
    open_ = place_in(found, "run 2")
    assert open_.probability == pytest.approx(0.05, abs=0.01)
    assert open_.low_ohm == pytest.approx(3e-3 * 2.5**0.5 * 100**0.025, rel=1e-3)  # of the log-uniform range itself
    assert found.status is Status.MEASURE


def test_the_worst_case_holds_what_readings_support() -> None:
    """21 V, 70 °C: 8 A and 5 A through hot conductors and 150 mΩ more in run 2."""
    found = result(site(read(extra=(0.0, 0.15))))
    hot = 1 + 0.00393 * 50
    p1 = 21 - 8 * (2 * 20 * R_MM4 * hot + JOINTS)
    p2 = p1 - 5 * (2 * 10 * R_MM4 * hot + JOINTS + 0.15)
    worst = {point.point: point.worst for point in found.points}
    assert worst["p1"] is not None
    assert worst["p2"] is not None
    assert worst["p1"].value == pytest.approx(p1, abs=2e-3)
    assert worst["p2"].value == pytest.approx(p2, abs=5e-3)
    place = place_in(found, "run 2")
    assert place.low_ohm is not None
    assert place.high_ohm is not None
    sd = (place.high_ohm - place.low_ohm) / (2 * 1.96)
    assert worst["p1"].u is not None
    assert worst["p2"].u is not None
    # what lies behind p1 adds the doubt of the extra resistance, of two metres' worth of conductor and of four joints
    assert worst["p2"].u ** 2 - worst["p1"].u ** 2 > (5 * sd) ** 2


def test_a_fault_in_a_feeder_lowers_what_it_feeds() -> None:
    tables: dict[str, list[dict[str, str]]] = {
        "boards": [{"board": "B1", "fed_by": "C1"}],
        "circuits": [*TABLES["circuits"], {"circuit": "C2", "fed_from": "B1", "device": "none"}],
        "runs": [*TABLES["runs"], TABLES["runs"][0] | {"circuit": "C2"}],
        "loads": [TABLES["loads"][0], {"circuit": "C2", "point": "p1", "load": "end", "current": "5"}],
    }
    worst = []
    for extra in (0.0, 0.15):
        record = site(read(extra=(0.0, extra)), tables=tables)
        behind = next(r for r in assess(record, limits.of(record)).circuits if r.circuit == "C2")
        worst.append(next(p.worst for p in behind.points if p.point == "p1"))
    assert worst[0] is not None
    assert worst[1] is not None
    assert worst[0].value - worst[1].value == pytest.approx(0.15 * 5, rel=0.02)


def test_one_circuit_as_typed_is_judged_as_the_whole() -> None:
    record = site(read(extra=(0.0, 0.15)))
    context = prepare(record, limits.of(record))
    typed = assess_circuit(context, record.circuits[0], readings=record.readings)
    assert typed == result(record)


ROWS = (
    Place(BAD_CONNECTION, "run 1", 0.5),
    Place(BAD_CONNECTION, "run 2", 0.4),
    Place(SMALLER, "", 0.04),
    Place(AS_RECORDED, "", 0.06),
)


def test_places_that_readings_do_not_separate_are_named_together() -> None:
    in_force = limits.of(Site(name="x"))
    claim = claimed(ROWS, in_force)
    assert claim is not None
    assert (claim.cause, claim.where) == (BAD_CONNECTION, "run 1 or run 2")
    assert claim.probability == pytest.approx(0.9)


def test_size_metal_and_length_are_claimed_together() -> None:
    rows = (
        Place(SMALLER, "", 0.4),
        Place(LONGER, "", 0.3),
        Place(BAD_CONNECTION, "run 1", 0.2),
        Place(OTHER_METAL, "", 0.07),
        Place(AS_RECORDED, "", 0.03),
    )
    claim = claimed(rows, limits.of(Site(name="x")))
    assert claim is not None
    assert (claim.cause, claim.where) == (SMALLER, "")
    assert [row.cause for row in claim.others] == [LONGER, OTHER_METAL]
    assert [row.cause for row in claim.against] == [BAD_CONNECTION]


@pytest.mark.parametrize(
    "rows",
    [
        (Place(BAD_CONNECTION, "run 1", 0.89), Place(AS_RECORDED, "", 0.11)),
        (Place(DOUBTFUL, "", 0.95), Place(BAD_CONNECTION, "run 1", 0.05)),
        (Place(BAD_CONNECTION, "run 1", 0.47), Place(SEMICONDUCTOR, "run 1", 0.46), Place(SMALLER, "", 0.05)),
    ],
    ids=["not sure enough", "a slip", "which of two"],
)
def test_nothing_is_claimed_that_is_not_probable_enough(rows: tuple[Place, ...]) -> None:
    assert claimed(rows, limits.of(Site(name="x"))) is None
