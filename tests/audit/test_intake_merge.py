"""What becomes of a site when rows come into it: new, equal, differing; readings are never overwritten."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from audit.intake.folder import site_of
from audit.intake.given import given_texts
from audit.intake.incoming import Incoming
from audit.intake.merge import REASON, Merge, merge
from audit.intake.told import differing_lines
from rules.consistency import problems
from rules.record import TABLES, Reading, Site

Tables = dict[str, list[dict[str, str]]]

BATTERY = {"source": "BATT", "kind": "battery", "nominal": "48"}
BASE: Tables = {
    "sources": [BATTERY],
    "circuits": [{"circuit": "C1", "fed_from": "BATT", "device_rating": "10"}, {"circuit": "C2", "fed_from": "BATT"}],
    "runs": [{"circuit": "C1", "run": "1", "from": "way", "to": "p1", "length": "10", "size": "2.5 mm2"}],
    "loads": [{"circuit": "C1", "point": "p1", "load": "LAMP", "current": "2"}],
    "readings": [{"circuit": "C1", "round": "1", "quantity": "voltage", "at": "p1", "value": "47", "reading": "R1"}],
}  # fmt: skip


def taken_into(into: Site, tables: Tables, **site_settings: Any) -> Merge:
    """Merge tables into a site, with settings only where some are named."""
    texts = given_texts(tables, {"name": "site", **site_settings})
    if not site_settings:
        texts.settings = None
    incoming = Incoming(texts, into)
    assert incoming.faults.lines() == ()
    coming = incoming.site
    fields = {table: incoming.given_fields(table) for table in TABLES if coming.table(table)}
    return merge(into, coming, fields, incoming.settings)


def differences(into: Site, merged: Merge) -> list[tuple[str, str, str, str]]:
    """Table, column, value there, value that comes in."""
    return [(found.table, found.column, here, comes) for found, here, comes in differing_lines(into, merged)]


def reading(**cells: str) -> Tables:
    return {"readings": [{**BASE["readings"][0], **cells}]}


def in_force(site: Site) -> list[tuple[str, float]]:
    """Tag and value of the readings that nothing replaces."""
    replaced = {row.replaces_id for row in site.readings}
    return [(row.tag, row.value) for row in site.readings if row.id not in replaced]


@pytest.fixture
def there() -> Site:
    """The site that rows come into."""
    return site_of(BASE)


# --- rows


def test_equal_rows_change_nothing(there: Site) -> None:
    merged = taken_into(there, BASE)
    assert not merged.is_change
    assert merged.site == there
    assert merged.left == {"sources": 1, "circuits": 2, "runs": 1, "loads": 1, "readings": 1}


def test_new_rows_come_after_those_that_are_there_and_may_refer_to_them(there: Site) -> None:
    merged = taken_into(there, {"loads": [{"circuit": "C1", "point": "p1", "load": "FAN", "current": "1"}]})
    assert [row.tag for row in merged.site.loads] == ["LAMP", "FAN"]
    assert merged.site.loads[1].circuit_id == there.circuits[0].id
    assert merged.site.loads[0] is there.loads[0]
    assert merged.differences == []


def test_a_differing_row_keeps_its_id_and_both_values_are_told(there: Site) -> None:
    rows = [{**BASE["circuits"][0], "device_rating": "16"}, BASE["circuits"][1]]
    merged = taken_into(there, {"circuits": rows})
    assert differences(there, merged) == [("circuits", "device_rating", "10", "16")]
    assert [(row.id, row.rated_current_a) for row in merged.site.circuits] == [
        (there.circuits[0].id, 16.0),
        (there.circuits[1].id, None),
    ]
    assert merged.left == {"circuits": 1}


def test_an_empty_cell_differs_from_a_value_and_a_column_that_is_not_there_says_nothing(there: Site) -> None:
    short = [{"circuit": "C1", "fed_from": "BATT"}]
    assert not taken_into(there, {"circuits": short}).is_change
    merged = taken_into(there, {"circuits": [{**short[0], "device_rating": ""}]})
    assert differences(there, merged) == [("circuits", "device_rating", "10", "")]


def test_a_text_that_was_typed_otherwise_differs(there: Site) -> None:
    merged = taken_into(there, {"runs": [{**BASE["runs"][0], "length": "1000 cm"}]})
    assert differences(there, merged) == [("runs", "length", "10", "1000 cm")]
    assert merged.site.runs[0].typed == (("one_way_length_m", "1000 cm"),)
    back = taken_into(merged.site, BASE)
    assert differences(merged.site, back) == [("runs", "length", "1000 cm", "10")]
    assert back.site == there


def test_references_are_told_by_their_tags(there: Site) -> None:
    rows: Tables = {
        "sources": [{**BATTERY, "source": "RECT"}],
        "circuits": [{"circuit": "C1", "fed_from": "RECT"}],
        "boards": [{"board": "B9", "fed_by": "C2"}],
        "runs": [{**BASE["runs"][0], "to": "board:B9"}],
    }
    merged = taken_into(there, rows)
    assert differences(there, merged) == [("circuits", "fed_from", "BATT", "RECT"), ("runs", "to", "p1", "board:B9")]
    assert merged.site.runs[0].to_board_id == merged.site.boards[0].id


def test_a_circuit_that_was_renamed_is_another_one_than_that_of_its_old_tag(there: Site) -> None:
    renamed = there.with_rows("circuits", (replace(there.circuits[0], tag="C7"), there.circuits[1]))
    merged = taken_into(renamed, {"circuits": [{"circuit": "C1", "fed_from": "BATT"}]})
    assert [row.tag for row in merged.site.circuits] == ["C7", "C2", "C1"]
    assert len({row.id for row in merged.site.circuits}) == 3
    assert not merged.differences


def test_a_tag_that_comes_in_twice_is_a_problem_though_it_is_there_once(there: Site) -> None:
    merged = taken_into(there, {"circuits": [BASE["circuits"][0], BASE["circuits"][0]]})
    assert [problem.what for problem in problems(merged.site)] == ["'C1' stands in an earlier row already"]


# --- readings


def test_readings_without_a_tag_are_known_by_their_whole_row_the_nth_alike_being_the_nth(there: Site) -> None:
    plain = reading(reading="")["readings"][0]
    once = taken_into(there, {"readings": [plain]})
    assert len(once.added["readings"]) == 1
    twice = taken_into(once.site, {"readings": [plain, plain]})
    assert (twice.left["readings"], len(twice.added["readings"])) == (1, 1)
    again = taken_into(twice.site, {"readings": [plain, {**plain, "value": "46"}, plain]})
    assert (again.left["readings"], [row.value for row in again.added["readings"] if isinstance(row, Reading)]) == (
        2,
        [46.0],
    )
    assert not again.differences


def test_a_reading_that_differs_is_replaced_and_stays(there: Site) -> None:
    merged = taken_into(there, reading(value="46.5"))
    assert differences(there, merged) == [("readings", "value", "47", "46.5")]
    old, new = merged.site.readings
    assert old is there.readings[0]
    assert (new.tag, new.value, new.replaces_id, new.reason) == ("R1.2", 46.5, old.id, REASON)
    assert merged.came_from == {new.id: old.id}
    assert problems(merged.site) == ()


def test_a_reading_that_was_taken_in_before_changes_nothing_and_neither_does_the_first(there: Site) -> None:
    once = taken_into(there, reading(value="46.5")).site
    assert not taken_into(once, reading(value="46.5")).is_change
    assert not taken_into(once, reading()).is_change
    twice = taken_into(once, reading(value="46", reason="read again")).site
    assert in_force(twice) == [("R1.3", 46.0)]
    assert twice.readings[2].reason == "read again"
    assert twice.readings[2].replaces_id == once.readings[1].id
    for value in ("47", "46.5", "46"):
        assert not taken_into(twice, reading(value=value)).is_change
    assert problems(twice) == ()


def test_a_correction_without_a_tag_gets_one_so_that_it_can_be_replaced(there: Site) -> None:
    corrected = Reading(
        id="x", circuit_id=there.circuits[0].id, round="1", quantity="voltage", at="p1", value=46.9,
        replaces_id=there.readings[0].id, reason="slip",
    )  # fmt: skip
    into = there.with_rows("readings", (*there.readings, corrected))
    merged = taken_into(into, reading(value="46.5"))
    assert [(row.id, row.tag) for row in merged.site.readings[:2]] == [(there.readings[0].id, "R1"), ("x", "R1.2")]
    assert in_force(merged.site) == [("R1.3", 46.5)]
    assert problems(merged.site) == ()


def test_a_reading_that_another_one_replaces_in_the_same_table_is_not_corrected(there: Site) -> None:
    both: Tables = {"readings": [*reading()["readings"], *reading(reading="R2", replaces="R1", value="46")["readings"]]}
    into = taken_into(there, both).site
    assert in_force(into) == [("R2", 46.0)]
    merged = taken_into(into, {"readings": [{**both["readings"][0], "value": "45"}, both["readings"][1]]})
    assert [difference.can_be_taken for difference in merged.differences] == [False]
    assert not merged.is_change


def test_a_reading_may_replace_one_that_is_there_by_its_tag(there: Site) -> None:
    merged = taken_into(there, reading(reading="R5", replaces="R1", value="46"))
    assert merged.site.readings[1].replaces_id == there.readings[0].id
    assert not taken_into(merged.site, reading(reading="R5", replaces="R1", value="46")).is_change


# --- settings


def test_settings_that_come_in_differ_or_not_and_those_that_are_not_named_stay() -> None:
    into = site_of(BASE, {"name": "site", "nominal": "48 V", "address": "Road 1", "prior": {"as_recorded": 0.8}})
    assert not taken_into(into, {}, nominal="48 V").is_change
    merged = taken_into(into, {}, nominal="110", prior={"as_recorded": 0.7, "other_metal": 0.3})
    assert differences(into, merged) == [
        ("site", "nominal", "48 V", "110"),
        ("site", "prior", "as_recorded = 0.8", "as_recorded = 0.7, other_metal = 0.3"),
    ]
    assert merged.site.address == "Road 1"
    assert (merged.site.nominal_voltage_v, merged.site.typed) == (110.0, ())


def test_a_profile_of_the_site_s_own_goes_with_its_name() -> None:
    into = Site(name="site", limits="ours.toml", own_limits="[drop]\n", notes="kept")
    merged = taken_into(into, {}, limits="general")
    assert (merged.site.limits, merged.site.own_limits) == ("general", None)
    assert merged.settings == ("limits", "own_limits")
    assert not taken_into(into, {}, notes="kept").is_change


def test_a_file_in_which_nothing_is_but_a_name_takes_the_settings_over() -> None:
    merged = taken_into(Site(name="file"), BASE, nominal="48 V")
    assert (merged.site.name, merged.differences) == ("site", [])


# --- any two sites

lengths = st.sampled_from(["", "10", "45 ft"])
values = st.sampled_from(["47", "46.5", "46"])


@st.composite
def surveys(draw: st.DrawFn) -> Tables:
    """A few circuits, each with a run, and readings of them with and without tags."""
    tags = draw(st.lists(st.sampled_from(["C1", "C2", "C3"]), unique=True, min_size=1))
    circuits = [{"circuit": tag, "fed_from": "BATT", "device_rating": draw(st.sampled_from(["", "6"]))} for tag in tags]
    runs = [{**BASE["runs"][0], "circuit": tag, "length": draw(lengths)} for tag in tags]
    names = draw(st.lists(st.sampled_from(["R1", "R2", "R3"]), unique=True))
    names += [""] * draw(st.integers(0, 3))
    readings = [
        {"circuit": draw(st.sampled_from(tags)), "round": "1", "quantity": "voltage", "at": "p1", "value": draw(values), "reading": name}
        for name in names
    ]  # fmt: skip
    return {"sources": [BATTERY], "circuits": circuits, "runs": runs, "readings": readings}


@given(surveys(), surveys(), surveys())
@settings(deadline=None, max_examples=60)
def test_whatever_comes_in_is_there_once_nothing_is_lost_and_it_holds_together(
    first: Tables, second: Tables, third: Tables
) -> None:
    site = site_of(first)
    for tables in (second, third, second):
        before, merged = site, taken_into(site, tables)
        site = merged.site
        assert problems(site) == ()
        assert not taken_into(site, tables).is_change
        there = {row.id: row for table in TABLES for row in site.table(table)}
        assert all(row.id in there for table in TABLES for row in before.table(table))
        assert all(there[row.id] == row for row in before.readings)
        assert len(there) == sum(len(site.table(table)) for table in TABLES)
        tags = {circuit.id: circuit.tag for circuit in site.circuits}
        lengths_now = {tags[run.circuit_id]: (run.one_way_length_m, run.typed) for run in site.runs}
        given_runs = zip(tables["runs"], site_of(tables).runs, strict=True)
        assert all(lengths_now[row["circuit"]] == (run.one_way_length_m, run.typed) for row, run in given_runs)
