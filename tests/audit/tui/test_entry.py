"""Rounds, meters, visits and other readings, as they are worked out from the record."""

from __future__ import annotations

from dataclasses import replace
from datetime import date

import pytest

from audit.tui.edits import Add, Change
from audit.tui.entry.meters import NO_METER, Meter, meter_used, meters_for, only_meter
from audit.tui.entry.other import correctable, goes_to, legs_for, places_for, quantities_at
from audit.tui.entry.reading import Where, edit_for, reading_from, value_words
from audit.tui.entry.slots import Place, round_at_hand, slots_of
from audit.tui.entry.typing import Typing
from audit.tui.entry.verdict import provisional
from audit.tui.entry.visits import acknowledgement, is_old, new_visit, unread_cautions
from rules.assess import prepare
from rules.assessment import Status
from rules.cautions import cautions_of
from rules.errors import InvalidQuantity, RulesError
from rules.index import Index
from rules.limits import of
from rules.record import Acknowledgement, Feed, Instrument, Reading, Run, Visit
from tests.audit.tui.walker import HUT, NOON

PUMP, LAMPS = Place(circuit_id="c1"), Place(circuit_id="c2")
VISIT = "2026-03 as found"


def reading(id_: str, quantity: str, at: str, value: float, **more: object) -> Reading:
    fields: dict[str, object] = {"circuit_id": "c1", "visit": VISIT, "round": "1", **more}
    return Reading(id=id_, quantity=quantity, at=at, value=value, **fields)  # type: ignore[arg-type]


def with_readings(*readings: Reading) -> Index:
    return Index(replace(HUT, readings=readings))


def labels(index: Index, place: Place, round_name: str = "1") -> list[str]:
    return [slot.label for slot in slots_of(index, place, VISIT, round_name)]


def test_a_round_is_the_current_then_the_voltages_as_one_walks() -> None:
    index = Index(HUT)
    assert labels(index, LAMPS) == ["A run 1", "way", "p1", "p2"]
    fused = replace(HUT, circuits=(HUT.circuits[0], replace(HUT.circuits[1], device="fuse gG")))
    assert labels(Index(fused), LAMPS) == ["A run 1", "bus", "way", "p1", "p2"]
    forked = replace(HUT, runs=(*HUT.runs, Run(id="r4", circuit_id="c2", number=3, from_point="way", to_point="p3")))
    assert labels(Index(forked), LAMPS) == ["A way", "way", "p1", "p2", "p3"]
    assert labels(with_readings(reading("x", "current", "way", 4.0)), PUMP) == ["A way", "way", "p1"]
    assert labels(index, Place(board=Feed("boards", "b"))) == ["bus", "positive to earth", "negative to earth", "A bus"]


def test_a_slot_holds_the_last_reading_that_is_not_replaced() -> None:
    first = reading("x", "voltage", "way", 12.5, tag="r-1")
    index = with_readings(
        first,
        reading("y", "voltage", "way", 12.4, replaces_id="x", reason="slip"),
        reading("z", "voltage", "way", 6.2, leg="positive"),
        reading("w", "voltage", "p1", 12.1, round="2"),
    )
    saved = {slot.at: slot.saved.id if slot.saved else None for slot in slots_of(index, PUMP, VISIT, "1")}
    assert saved == {"run 1": None, "way": "y", "p1": None}


def test_the_round_at_hand_is_the_unfinished_one() -> None:
    whole = [reading("a", "current", "run 1", 4), reading("b", "voltage", "way", 12), reading("c", "voltage", "p1", 12)]
    assert round_at_hand(Index(HUT), PUMP, VISIT) == "1"
    assert round_at_hand(with_readings(*whole[:2]), PUMP, VISIT) == "1"
    assert round_at_hand(with_readings(*whole), PUMP, VISIT) == "2"
    assert round_at_hand(with_readings(*whole), PUMP, "another visit") == "1"


def test_a_typed_value_becomes_a_reading() -> None:
    where = Where(PUMP, VISIT, "1", "joint", "run 1 end", leg="positive", meter=Meter("DMM", 0.6), by="Ada")
    made = reading_from(" 4.1 mV ", where, NOON)
    assert (made.value, made.typed, made.taken_at) == (0.0041, (("value", "4.1 mV"),), "2026-03-12T12:00:00+00:00")
    assert (made.instrument, made.full_scale, made.by, made.leg) == ("DMM", 0.6, "Ada", "positive")
    assert value_words(made) == "4.1 mV"
    assert reading_from("-3", replace(where, quantity="voltage"), NOON).typed == ()


@pytest.mark.parametrize("text", ["", "  ", "abc", "1,000", "4 ohm", "1e999", "nan", "12 V; drop table"])
def test_what_is_no_value_is_refused(text: str) -> None:
    with pytest.raises(RulesError):
        reading_from(text, Where(PUMP, VISIT, "1", "voltage", "way"), NOON)


@pytest.mark.parametrize(
    ("quantity", "text", "said"),
    [
        ("voltage", "1e12 V", "1e+12 is not possible; accepted: a number in V from -10000 to 10000"),
        ("current", "1e308", "1e+308 is not possible; accepted: a number in A from -100000 to 100000"),
        ("current", "1e-300 A", "1e-300 is too near to 0; accepted: 0, or a number of at least 1e-12 in size"),
        ("temperature", "-274", "-274 is not possible; accepted: a number in degC from -273.15 to 2000"),
    ],
)
def test_a_value_far_beyond_what_can_be_is_refused(quantity: str, text: str, said: str) -> None:
    with pytest.raises(InvalidQuantity) as raised:
        reading_from(text, Where(PUMP, VISIT, "1", quantity, "way"), NOON)
    assert str(raised.value) == said


def test_a_correction_names_what_it_replaces_by_a_tag() -> None:
    old, new = reading("x", "voltage", "way", 12.5), reading("", "voltage", "way", 12.4)
    tagging, adding = edit_for(new, "DB1-01", old, "slip").steps
    assert isinstance(tagging, Change)
    assert isinstance(adding, Add)
    assert tagging.fields["tag"].startswith("r-")
    assert (adding.row.replaces_id, adding.row.reason) == ("x", "slip")  # type: ignore[attr-defined]
    (only,) = edit_for(new, "DB1-01", replace(old, tag="mine"), "slip").steps
    assert isinstance(only, Add)
    assert edit_for(new, "DB1-01").why == "DB1-01 round 1: voltage at way 12.4 V"


def test_the_meter_is_the_only_one_or_the_one_of_the_visit() -> None:
    index = Index(HUT)
    assert only_meter(index, "voltage") == Meter("DMM")
    assert only_meter(index, "resistance") == NO_METER
    two = Index(
        replace(
            HUT,
            instruments=(
                *HUT.instruments,
                Instrument(id="i3", tag="DMM", quantity="voltage", full_scale=60.0),
                Instrument(id="i4", tag="OLD", quantity="voltage"),
            ),
        )
    )
    assert only_meter(two, "voltage") is None
    assert [meter.words("voltage") for meter in meters_for(two, "voltage")] == ["DMM", "OLD"]
    used = with_readings(reading("x", "drop", "way", 0.1, to="p1", instrument="OLD", full_scale=60.0))
    assert meter_used(used, VISIT, "voltage") == Meter("OLD", 60.0)
    assert meter_used(used, VISIT, "current") is None
    assert NO_METER.words("voltage") == "a meter that is not recorded"


def test_each_range_can_be_held_where_there_are_several() -> None:
    ranges = [
        Instrument(id=f"i{n}", tag="DMM", quantity="voltage", full_scale=scale) for n, scale in enumerate((60.0, 0.6))
    ]
    index = Index(replace(HUT, instruments=tuple(ranges)))
    assert [meter.words("voltage") for meter in meters_for(index, "voltage")] == [
        "DMM",
        "DMM, range 0.6 V",
        "DMM, range 60 V",
    ]


def test_other_readings_are_offered_where_they_can_be_taken() -> None:
    index = Index(HUT)
    assert quantities_at(PUMP) == ("voltage", "drop", "joint", "current", "residual", "temperature", "resistance")
    assert quantities_at(Place(board=Feed("boards", "b"))) == ("voltage", "current", "residual", "temperature")
    assert places_for(index, PUMP, "joint") == ("run 1 start", "run 1 end")
    assert places_for(index, Place(board=Feed("boards", "b")), "temperature") == ("bus", "ambient")
    assert goes_to(index, LAMPS, "drop", "way") == ("p1", "p2")
    assert goes_to(index, LAMPS, "drop", "p2") == ("bus", "way", "p1")
    assert goes_to(index, LAMPS, "resistance", "run 1 end") == ()
    assert goes_to(index, LAMPS, "voltage", "way") == ()
    assert legs_for(index, PUMP, "joint", "run 1 end") == ("positive", "negative")
    assert legs_for(index, PUMP, "joint", "device") == ("positive", "negative", "both")
    one_pole = replace(HUT.circuits[0], device="breaker C", device_poles=1, device_leg="negative")
    single = Index(replace(HUT, circuits=(one_pole, *HUT.circuits[1:])))
    assert legs_for(single, PUMP, "joint", "device") == ("negative",)
    assert legs_for(single, PUMP, "joint", "run 1 end") == ("positive", "negative")
    assert legs_for(index, PUMP, "resistance", "way") == ("positive", "negative")
    assert legs_for(index, PUMP, "drop", "way") == ("both", "positive", "negative")
    assert legs_for(index, PUMP, "temperature", "ambient") == ()
    assert legs_for(index, PUMP, "residual", "way") == ("both",)
    assert legs_for(index, PUMP, "current", "way")[-1] == "not recorded"
    replaced = with_readings(
        reading("x", "voltage", "way", 1, tag="t"), reading("y", "voltage", "way", 2, replaces_id="x")
    )
    assert [r.id for r in correctable(replaced, PUMP)] == ["y"]


def test_a_visit_is_old_after_two_weeks() -> None:
    assert not is_old(HUT, VISIT, date(2026, 3, 26))
    assert is_old(HUT, VISIT, date(2026, 3, 27))
    assert not is_old(HUT, "only in readings", date(2030, 1, 1))
    vague = replace(HUT, visits=(Visit(id="v", tag="v", date="March"), Visit(id="w", tag="w")))
    assert not is_old(vague, "v", date(2030, 1, 1))
    assert not is_old(vague, "w", date(2030, 1, 1))


def test_a_new_visit_has_a_tag_of_its_own_and_comes_last() -> None:
    today = date(2026, 3, 30)
    assert new_visit(HUT, "as left", today, "Ada").tag == "2026-03 as left"
    assert new_visit(HUT, "as found", today, "Ada").tag == "2026-03-30 as found"
    crowded = replace(HUT, visits=(*HUT.visits, Visit(id="w", tag="2026-03-30 as found", walk_order=4.0)), readings=())
    again = new_visit(crowded, "as found", today, "Ada")
    assert (again.tag, again.walk_order) == ("2026-03-30 as found 2", 5.0)


def test_cautions_are_read_once_a_person_and_visit() -> None:
    all_of_them = cautions_of(HUT)
    assert unread_cautions(HUT, VISIT, "Ada") == all_of_them
    edit = acknowledgement(all_of_them, VISIT, "Ada", NOON)
    added = [step.row for step in edit.steps if isinstance(step, Add)]
    rows = tuple(row for row in added if isinstance(row, Acknowledgement))
    assert len(rows) == len(added) == len(all_of_them)
    read = replace(HUT, acknowledged=rows)
    assert unread_cautions(read, VISIT, "Ada") == ()
    assert unread_cautions(read, VISIT, "Bob") == all_of_them
    assert unread_cautions(read, "another visit", "Ada") == all_of_them
    assert unread_cautions(replace(HUT, acknowledged=(replace(rows[0], by=""),)), VISIT, "") == all_of_them


def test_the_verdict_as_typed_is_that_of_the_readings_once_saved() -> None:
    typed = (
        reading("a", "current", "run 1", 4.0, instrument="CLAMP"),
        reading("b", "voltage", "way", 12.6, instrument="DMM"),
        reading("c", "voltage", "p1", 11.0, instrument="DMM"),
    )
    view = provisional(prepare(HUT, of(HUT)), Typing("c1", "1", typed))
    assert view is not None
    assert view.result is not None
    assert view.result.status is Status.ACT
    assert view.is_typing
    assert view.expected["way"].value == 12.6
    assert 12.1 < view.expected["p1"].value < 12.6
    assert provisional(prepare(HUT, of(HUT)), Typing("c1", "1", ())) is None
    assert provisional(prepare(HUT, of(HUT)), Typing("new", "1", typed)) is None
