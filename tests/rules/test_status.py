"""The status of a circuit, clause by clause as the format defines it: the first that holds."""

from __future__ import annotations

import math
from typing import Any

import pytest

from rules.assessment import CircuitResult, Severity, Status
from rules.diagnosis.hypotheses import AS_RECORDED
from tests.rules.small_circuit import TABLES, read, result, site

Tables = dict[str, list[dict[str, str]]]


def of(table: str, number: int, **cells: str) -> Tables:
    """A table with some cells of one row put otherwise; an empty one is not known."""
    rows = [dict(row) for row in TABLES[table]]
    rows[number] |= cells
    return {table: rows}


def decision(**values: float) -> str:
    return '[decision]\nsource = "this test"\n' + "\n".join(f"{key} = {value!r}" for key, value in values.items())


def as_recorded(found: CircuitResult) -> float:
    return sum(place.probability for place in found.causes if place.cause == AS_RECORDED)


# --- the order


@pytest.mark.parametrize("severity", ["immediate", "soon"])
def test_act_a_finding_of_severity_immediate_or_soon_whatever_is_missing(severity: str) -> None:
    """12 A behind a device of 10 A, on a circuit whose second length is missing and that is not settled."""
    tables = of("circuits", 0, device="fuse gG", device_rating="10") | of("runs", 1, length="")
    own = f'[rules.RD03]\nseverity = "{severity}"\nreason = "this test"'
    found = result(site(read(amps=(12.0, 5.0)), own, tables))
    assert "RC01" in {finding.rule for finding in found.findings}
    assert found.status is Status.ACT


@pytest.mark.parametrize(
    "missing",
    [
        of("runs", 1, length=""),
        of("runs", 1, size=""),
        of("loads", 1, current=""),
        of("sources", 0, nominal=""),
    ],
    ids=["length", "size", "load", "source voltage"],
)
@pytest.mark.parametrize("readings", [True, False])
def test_incomplete_where_length_size_load_or_source_voltage_is_missing(missing: Tables, readings: bool) -> None:
    assert result(site(read() if readings else [], "", missing)).status is Status.INCOMPLETE


def test_measure_no_readings() -> None:
    assert result(site([])).status is Status.MEASURE


def test_measure_what_the_readings_do_not_settle_before_watch() -> None:
    """20 A where 8 A are recorded is for watch (RD05), but the readings of one point settle nothing."""
    found = result(site([row for row in read(amps=(20.0, 5.0)) if row["at"] not in ("p1", "p2")]))
    assert [finding.severity for finding in found.findings] == [Severity.WATCH]
    assert found.status is Status.MEASURE


def test_watch_a_finding_of_severity_watch_on_what_is_settled() -> None:
    """A third run of no length, which carries nothing: NW02, on readings that agree with the record."""
    short = [*TABLES["runs"], TABLES["runs"][1] | {"run": "3", "from": "p2", "to": "p3", "length": "0"}]
    loads = [*TABLES["loads"][:1], TABLES["loads"][1] | {"point": "p3"}]
    rows = read()
    rows += [row | {"at": "p3"} for row in rows if row["at"] == "p2"]
    found = result(site(rows, decision(sound_at=0.5, sound_heat_share=0.5), {"runs": short, "loads": loads}))
    assert [finding.rule for finding in found.findings] == ["NW02"]
    assert found.status is Status.WATCH


# --- sound


def test_sound_needs_as_recorded_at_or_above_the_threshold() -> None:
    probability = as_recorded(result(site(read())))
    assert 0.95 < probability < 1
    assert result(site(read(), decision(sound_at=probability))).status is Status.SOUND
    above = math.nextafter(probability, 1)
    assert result(site(read(), decision(sound_at=above))).status is Status.MEASURE


def test_sound_needs_the_heat_of_each_place_below_the_share() -> None:
    """P(bad connection there) × P(its heat at design current above the limit, given that cause)."""
    heat = '\n[heat]\nsource = "this test"\nlimit_w = 0.2'
    found = result(site(read(), decision(sound_heat_share=1.0) + heat))
    assert found.status is Status.SOUND
    hottest = max(place.heat for place in found.causes if place.heat is not None)
    assert hottest > 0
    assert result(site(read(), decision(sound_heat_share=hottest) + heat)).status is Status.MEASURE
    just_more = math.nextafter(hottest, 1)
    assert result(site(read(), decision(sound_heat_share=just_more) + heat)).status is Status.SOUND


def test_sound_needs_no_load_below_its_lowest_in_the_worst_case() -> None:
    """With LV01 off, which would say so as ``act``: at the lowest itself it is not below."""
    off = '[rules.LV01]\noff = true\nreason = "this test"'
    worst = next(point.worst for point in result(site(read())).points if point.point == "p2")
    assert worst is not None
    for lowest, status in (
        (worst.value, Status.SOUND),
        (math.nextafter(worst.value, 99), Status.MEASURE),
    ):
        assert result(site(read(), off, of("loads", 1, lowest=repr(lowest)))).status is status


@pytest.mark.parametrize(
    ("missing", "gap"),
    [
        (of("loads", 1, lowest=""), "the lowest voltage of “far” is not known"),
        (of("sources", 0, lowest=""), "the lowest voltage of PSU is not known"),
    ],
    ids=["of the load", "of the source"],
)
def test_a_lowest_that_is_not_known_stands_in_not_judged_and_the_circuit_is_sound(missing: Tables, gap: str) -> None:
    found = result(site(read(), "", missing))
    assert found.status is Status.SOUND
    assert gap in {gap.why for gap in found.not_judged if gap.rule == "LV01"}


def test_what_fits_no_line_is_measure() -> None:
    """Settled, nothing found, and still not sound: a joint hotter than the profile's limit is not ruled out."""
    own = decision(sound_heat_share=1e-9) + '\n[heat]\nsource = "this test"\nlimit_w = 0.2'
    found = result(site(read(), own))
    assert not found.findings
    assert as_recorded(found) > 0.95
    assert found.status is Status.MEASURE


# --- what changes no status


def test_what_another_rule_could_not_judge_changes_no_status() -> None:
    """A device without its rating, so that RD03 has nothing to compare with."""
    device: dict[str, Any] = of("circuits", 0, device="electronic")
    found = result(site(read(), "", device))
    assert {gap.rule for gap in found.not_judged} >= {"RD03"}
    assert found.status is Status.SOUND


def test_a_note_changes_no_status() -> None:
    own = '[rules.RD05]\nseverity = "note"\nreason = "this test"'
    tables = of("loads", 1, current="1")
    watch, note = result(site(read(), "", tables)), result(site(read(), own, tables))
    assert [finding.severity for finding in watch.findings] == [Severity.WATCH]
    assert watch.status is Status.WATCH
    assert [finding.severity for finding in note.findings] == [Severity.NOTE]
    assert note.status is Status.SOUND


def test_a_rule_that_is_switched_off_changes_no_status() -> None:
    assert result(site(read(), '[rules.RD01]\noff = true\nreason = "this test"')).status is Status.SOUND
