"""Texts of fields to values and back, what is refused, and what new rows begin with."""

from __future__ import annotations

from dataclasses import replace

import pytest

from audit.tui.entry import new_rows
from audit.tui.entry.assumed import MEANING, assumed
from audit.tui.entry.checks import complaint_about
from audit.tui.entry.fields import (
    SITE,
    Field,
    FieldRefused,
    answers_for,
    completed,
    fields_of,
    read_field,
    row_of,
    text_of,
    unit_of,
)
from rules.index import Index
from rules.limits import of
from rules.record import TABLES, Board, Circuit, Feed, Instrument, Load, Row, Run, Site, Source
from tests.audit.tui.walker import HUT

INDEX = Index(HUT)


def field(table: str, name: str) -> Field:
    return next(one for one in fields_of(table) if one.name == name)


def row(table: str, id_: str) -> Row | Site:
    found = row_of(HUT, table, id_)
    assert found is not None
    return found


def refusal(table: str, id_: str, name: str, text: str) -> str:
    """What a field says to a text; empty where it takes it."""
    one, of_row = field(table, name), row(table, id_)
    try:
        value = read_field(text, one, of_row, INDEX)
    except FieldRefused as error:
        return str(error)
    return complaint_about(one, of_row, value.fields, INDEX)


@pytest.mark.parametrize(
    ("table", "id_", "name", "text", "said"),
    [
        ("runs", "r1", "one_way_length_m", "ten m", "'ten m' is not a number with a unit such as '12.5 m'"),
        ("runs", "r1", "one_way_length_m", "-4", "-4 is not possible; accepted: a number in m from 0 to 100000"),
        (
            "runs",
            "r1",
            "one_way_length_m",
            "1e308 m",
            "1e+308 is not possible; accepted: a number in m from 0 to 100000",
        ),
        (
            "loads",
            "l1",
            "current_a",
            "1e-300",
            "1e-300 is too near to 0; accepted: 0, or a number of at least 1e-12 in",
        ),
        (SITE, "", "nominal_voltage_v", "1e12 V", "1e+12 is not possible; accepted: a number in V from 0.001 to 10000"),
        ("runs", "r1", "length_by", "x", "'x' is none of marks, tape, tdr, paced, drawing or guess"),
        ("runs", "r1", "size", "10", "'10' may be AWG, kcmil or mm2"),
        ("runs", "r1", "size", "3 mm2", "'3 mm2' is in no table of sizes"),
        ("runs", "r1", "material", "coppper", "did you mean 'copper'?"),
        ("runs", "r1", "from_point", "p9", "run 1 starts nowhere"),
        ("runs", "r1", "to_point", "bus", "is a name that a surveyor's point may not have"),
        ("runs", "r1", "to_point", "board:DB9", "'board:DB9' names no board that is there, did you mean"),
        ("runs", "r1", "to_point", "", "to is needed"),
        ("runs", "r3", "number", "1.5", "'1.5' is not a whole number"),
        ("loads", "l1", "point", "p7", "circuit 'DB1-01' has no point 'p7'"),
        ("loads", "l1", "lowest_voltage_v", "0", "0 is not possible"),
        ("circuits", "c1", "fed_from", "DB2", "'DB2' names no board or source that is there, did you mean 'DB1'?"),
        ("circuits", "c1", "tag", " ", "circuit is needed"),
        ("circuits", "c1", "tag", "a\x1bb", "holds the control character U+001B"),
        ("boards", "b", "fed_by", "BATT + PSU", "'BATT + PSU' names no source or circuit that is there"),
        ("boards", "b", "fed_by", "DB1-01", "'DB1' is fed by itself, through 'DB1-01'"),
        ("sources", "s", "cells", "0", "0 is not possible"),
        ("instruments", "i1", "calibrated_until", "soon", "'soon' is not a date"),
        (SITE, "", "name", "", "name is needed"),
        (SITE, "", "ambient_temperature_c", "-300", "-300 is not possible"),
    ],
)
def test_a_field_says_what_it_accepts(table: str, id_: str, name: str, text: str, said: str) -> None:
    assert said in refusal(table, id_, name, text)


@pytest.mark.parametrize(
    ("table", "id_", "name", "text", "fields", "typed"),
    [
        ("runs", "r1", "one_way_length_m", "45 ft", {"one_way_length_m": 13.716}, (("one_way_length_m", "45 ft"),)),
        ("runs", "r1", "one_way_length_m", "12.50", {"one_way_length_m": 12.5}, ()),
        ("runs", "r1", "one_way_length_m", "", {"one_way_length_m": None}, ()),
        ("runs", "r1", "size", "AWG 12", {"size": "12 AWG"}, ()),
        ("runs", "r1", "to_point", "board:DB1", {"to_point": "", "to_board_id": "b"}, ()),
        ("runs", "r1", "to_point", "end", {"to_point": "end", "to_board_id": ""}, ()),
        ("circuits", "c1", "fed_from", "BATT", {"fed_from": Feed("sources", "s")}, ()),
        ("circuits", "c1", "notes", "one␤two", {"notes": "one\ntwo"}, ()),
        ("boards", "b", "fed_by", "DB1-02:p1", {"fed_by": (Feed("circuits", "c2", "p1"),)}, ()),
        ("instruments", "i1", "full_scale", "600 mV", {"full_scale": 0.6}, (("full_scale", "600 mV"),)),
        (SITE, "", "nominal_voltage_v", "12", {"nominal_voltage_v": 12.0}, ()),
    ],
)
def test_a_text_becomes_the_value_that_intake_would_read(
    table: str, id_: str, name: str, text: str, fields: dict[str, object], typed: object
) -> None:
    value = read_field(text, field(table, name), row(table, id_), INDEX)
    assert (value.fields, value.typed) == (fields, typed)


@pytest.mark.parametrize("table", [SITE, *(t for t in TABLES if t not in ("readings", "decisions", "acknowledged"))])
def test_every_field_shows_what_it_holds_and_reads_it_back(table: str) -> None:
    for of_row in (HUT,) if table == SITE else HUT.table(table):
        for one in fields_of(table):
            text = text_of(one, of_row, INDEX)
            if text or not one.column.filled:
                value = read_field(text, one, of_row, INDEX)
                changed = replace(of_row, **value.fields)
                assert text_of(one, changed, INDEX) == text
                assert complaint_about(one, of_row, value.fields, INDEX) == ""


def test_what_is_wrong_with_one_field_does_not_stop_another() -> None:
    """A run that starts nowhere may still get its length; another wrong start is refused as well."""
    broken = replace(HUT, runs=(replace(HUT.runs[0], from_point="p8"), *HUT.runs[1:]))
    index = Index(broken)
    assert complaint_about(field("runs", "one_way_length_m"), broken.runs[0], {"one_way_length_m": 3.0}, index) == ""
    assert "starts nowhere" in complaint_about(field("runs", "from_point"), broken.runs[0], {"from_point": "p9"}, index)


def test_a_meters_range_needs_what_it_measures() -> None:
    meter = Instrument(id="m", tag="M")
    with pytest.raises(FieldRefused, match="say first what the meter measures"):
        read_field("10", field("instruments", "full_scale"), meter, INDEX)
    assert unit_of(field("instruments", "full_scale"), replace(meter, quantity="resistance")) == "ohm"


def test_answers_are_choices_tags_and_points() -> None:
    assert answers_for(field("runs", "length_by"), HUT.runs[0], INDEX)[:2] == ("marks", "tape")
    assert answers_for(field("circuits", "fed_from"), HUT.circuits[0], INDEX) == ("DB1", "BATT")
    assert answers_for(field("loads", "point"), HUT.loads[1], INDEX) == ("way", "p1", "p2")
    assert answers_for(field("runs", "one_way_length_m"), HUT.runs[0], INDEX) == ()
    assert completed("breaker c", answers_for(field("circuits", "device"), HUT.circuits[0], INDEX)) == "breaker C"


def test_every_meaning_is_of_a_field_that_is_there() -> None:
    known = {(table, one.name) for table in (SITE, *TABLES) for one in fields_of(table)}
    assert MEANING.keys() <= known


@pytest.mark.parametrize(
    ("table", "name", "of_row", "said"),
    [
        ("runs", "material", HUT.runs[0], "copper"),
        ("runs", "conductor_temperature_c", HUT.runs[0], "25 °C, of the limits profile"),
        ("runs", "return_size", HUT.runs[0], "same as outwards, 4 mm²"),
        ("circuits", "nominal_voltage_v", HUT.circuits[0], "12 V, of what feeds it"),
        ("circuits", "allowed_drop_percent", HUT.circuits[0], "3 %, of the limits profile"),
        ("sources", "working_voltage_v", HUT.sources[0], "12 V, nominal"),
        ("loads", "notes", HUT.loads[0], ""),
    ],
)
def test_what_counts_while_a_field_is_empty(table: str, name: str, of_row: Row, said: str) -> None:
    assert assumed(field(table, name), of_row, INDEX, of(HUT)) == said


def test_the_sites_ambient_stands_in_for_a_runs_temperature() -> None:
    index = Index(replace(HUT, ambient_temperature_c=31.0))
    said = assumed(field("runs", "conductor_temperature_c"), HUT.runs[0], index, None)
    assert said == "31 °C, the site's ambient"


# --- new rows


def test_a_run_begins_at_the_last_point_and_ends_at_a_new_one() -> None:
    run = new_rows.new_run(INDEX, "c2")
    assert (run.number, run.from_point, run.to_point) == (3, "p2", "p3")
    bare = replace(HUT, runs=())
    first = new_rows.new_run(Index(bare), "c2")
    assert (first.number, first.from_point, first.to_point) == (1, "way", "p1")
    closing = replace(HUT.runs[0], to_point="", to_board_id="b")
    assert new_rows.new_run(Index(replace(HUT, runs=(closing,))), "c1").from_point == "way"


def test_a_load_hangs_at_the_last_point_that_has_none() -> None:
    assert new_rows.new_load(INDEX, "c2", "x").point == "p1"
    assert new_rows.new_load(INDEX, "c1", "x").point == "p1"
    assert new_rows.new_load(Index(replace(HUT, runs=())), "c1", "x").point == "way"


def test_a_board_hangs_on_the_only_source_and_a_circuit_on_the_board_at_the_cursor() -> None:
    assert new_rows.new_board("DB2", INDEX).fed_by == (Feed("sources", "s"),)
    two = replace(HUT, sources=(*HUT.sources, Source(id="t", tag="PSU")))
    assert new_rows.new_board("DB2", Index(two)).fed_by == ()
    assert new_rows.feed_at(INDEX, "b") == Feed("boards", "b")
    assert new_rows.feed_at(INDEX, "s") == Feed("sources", "s")
    assert new_rows.feed_at(INDEX, "c2") == Feed("boards", "b")
    assert new_rows.feed_at(INDEX, "") == Feed("boards", "b")
    assert new_rows.feed_at(Index(replace(HUT, boards=())), "") == Feed("sources", "s")
    assert new_rows.feed_at(Index(Site(name="x")), "") is None
    assert new_rows.new_circuit("C", None).fed_from is None
    assert new_rows.new_source("S").tag == "S"


def test_tags_count_on() -> None:
    assert new_rows.tag_for("circuits", INDEX, Feed("boards", "b"), "") == "DB1-03"
    assert new_rows.tag_for("circuits", INDEX, None, "") == "DB1-03"
    assert new_rows.tag_for("loads", INDEX, None, "c1") == "load 1"
    assert new_rows.tag_for("boards", INDEX, None, "") == "DB2"
    assert new_rows.tag_for("instruments", INDEX, None, "") == "DMM-1"
    fresh = replace(HUT, boards=(*HUT.boards, Board(id="b2", tag="R")))
    assert new_rows.tag_for("circuits", Index(fresh), Feed("boards", "b2"), "") == "R-01"
    taken = replace(fresh, circuits=(*HUT.circuits, Circuit(id="c3", tag="R-01")))
    assert new_rows.tag_for("circuits", Index(taken), Feed("boards", "b2"), "") == ""


def test_a_second_range_of_a_meter_is_of_the_other_quantity() -> None:
    assert new_rows.new_instrument(INDEX, "NEW").quantity == "voltage"
    assert new_rows.new_instrument(INDEX, "DMM").quantity == "current"


def test_rows_are_found_by_id_and_the_site_is_a_row_of_its_own() -> None:
    assert row_of(HUT, SITE, "") is HUT
    assert isinstance(row_of(HUT, "loads", "l2"), Load)
    assert isinstance(row_of(HUT, "runs", "r3"), Run)
    assert row_of(HUT, "runs", "gone") is None


def test_where_nothing_is_there_to_feed_a_circuit_the_refusal_says_what_to_add_first() -> None:
    circuit = Circuit(id="c", tag="C1")
    field = next(field for field in fields_of("circuits") if field.name == "fed_from")
    with pytest.raises(
        FieldRefused, match=r"names no board or source that is there: add the source first \(Esc, a, source\)"
    ):
        read_field("PSU-1", field, circuit, Index(Site(name="x", circuits=(circuit,))))
