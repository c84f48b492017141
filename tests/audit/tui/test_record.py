"""The record by keyboard alone: adding with the least asked, forms that save each field, removal."""

from __future__ import annotations

import sqlite3
from pathlib import Path

import pytest

from audit.tui.screens.form import FormScreen
from audit.tui.screens.rows import RowsScreen
from audit.tui.screens.survey import SurveyScreen
from audit.tui.widgets.field_line import FieldLine
from db import connection
from db.store import SiteStore
from rules import limits
from rules.record import Feed, Visit
from tests.audit.tui.walker import Walk, cautions_read, walking


def field_at_hand(walk: Walk) -> str:
    """The field of the form that the cursor is in."""
    assert isinstance(walk.app.screen, FormScreen)
    return next(line.field.name for line in walk.app.screen.query(FieldLine) if line.has_focus_within)


async def test_a_new_circuit_with_run_load_and_round_from_an_empty_site(empty: Path) -> None:
    async with walking(empty) as walk:
        await walk.keys("a", "s", "enter")
        await walk.enter("BATT-A", "ba", "48 V", "53.5")
        await walk.keys("escape")
        await walk.keys("a", "b", "enter", "enter")
        await walk.quiet()
        await walk.keys("escape", "a", "c", "enter")
        await walk.enter("", "Fridge")
        assert field_at_hand(walk) == "location"
        await walk.keys("escape", "a", "r", "enter")
        await walk.enter("45 ft", "ta", "2.5 mm2")
        await walk.keys("escape", "a", "l", "enter")
        await walk.enter("", "4")
        await walk.keys("escape")
        await walk.judged()
        assert "DB1-01  Fridge" in walk.screen

        site = walk.record
        (source,), (board,), (circuit,), (run,), (load,) = (
            site.sources,
            site.boards,
            site.circuits,
            site.runs,
            site.loads,
        )
        assert (source.tag, source.kind, source.nominal_voltage_v, source.working_voltage_v) == (
            "BATT-A",
            "battery",
            48.0,
            53.5,
        )
        assert source.typed == (("nominal_voltage_v", "48 V"),)
        assert (board.tag, board.fed_by) == ("DB1", (Feed("sources", source.id),))
        assert (circuit.tag, circuit.description, circuit.fed_from) == ("DB1-01", "Fridge", Feed("boards", board.id))
        assert (run.number, run.from_point, run.to_point, run.one_way_length_m) == (1, "way", "p1", 13.716)
        assert (run.length_by, run.size, run.typed) == ("tape", "2.5 mm2", (("one_way_length_m", "45 ft"),))
        assert (load.tag, load.point, load.current_a) == ("load 1", "p1", 4.0)

        await cautions_read(walk)
        await walk.enter("4.1", "", "53.4", "52.5")
        await walk.judged()
        assert [reading.value for reading in walk.record.readings] == [4.1, 53.4, 52.5]
        assert "1 of 1 read" in (await back(walk))


async def back(walk: Walk) -> str:
    """The walk."""
    await walk.keys("escape")
    return walk.screen


async def test_the_next_run_goes_on_from_the_last_point_and_the_next_tag_counts_on(hut: Path) -> None:
    async with walking(hut) as walk:
        await walk.at("DB1-02")
        await walk.keys("a", "r", "enter", "escape")
        await walk.quiet()
        await walk.keys("a", "c", "enter")
        await walk.shows("The new circuit's tag DB1-03")
        await walk.enter("")
        run, circuit = walk.record.runs[-1], walk.record.circuits[-1]
        assert (run.circuit_id, run.number, run.from_point, run.to_point) == ("c2", 3, "p2", "p3")
        assert (circuit.tag, circuit.fed_from) == ("DB1-03", Feed("boards", "b"))


async def test_a_tag_that_is_taken_is_asked_for_again(hut: Path) -> None:
    async with walking(hut) as walk:
        await walk.keys("a", "c", "enter")
        await walk.enter("DB1-02")
        await walk.shows("is there twice")
        assert len(walk.record.circuits) == 2
        await walk.keys("backspace")
        await walk.enter("7")
        assert [circuit.tag for circuit in walk.record.circuits] == ["DB1-01", "DB1-02", "DB1-07"] or [
            circuit.tag for circuit in walk.record.circuits
        ] == ["DB1-01", "DB1-02", "7"]


async def test_each_field_is_saved_as_it_is_accepted_and_the_verdict_follows(hut: Path) -> None:
    async with walking(hut) as walk:
        await walk.keys("e", "down", "enter")
        assert isinstance(walk.app.screen, FormScreen)
        assert "run 1 of DB1-01" in walk.screen
        await walk.keys("down", "down", "down")
        assert field_at_hand(walk) == "one_way_length_m"
        await walk.enter("60")
        assert walk.record.runs[0].one_way_length_m == 60.0
        assert field_at_hand(walk) == "length_by"
        await walk.judged()
        await walk.shows("! act")
        with SiteStore(hut, read_only=True) as store:
            assert store.history()[-1].why == "run 1 of DB1-01: length 60"


async def test_what_a_field_does_not_take_stays_in_it_with_what_is_accepted(hut: Path) -> None:
    """What is refused, and with which words: ``test_fields.py``."""
    async with walking(hut) as walk:
        before = walk.record
        await walk.keys("e", "down", "enter", "down", "down", "down")
        await walk.enter("ten m")
        await walk.shows("length: 'ten m' is not a number with a unit such as '12.5 m'")
        assert [line.text for line in walk.app.screen.query(FieldLine) if line.state == "refused"] == ["ten m"]
        assert walk.record == before
        await walk.keys("escape")
        assert not [line for line in walk.app.screen.query(FieldLine) if line.state == "refused"]


async def test_a_refused_save_of_a_field_keeps_what_was_typed(hut: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(connection, "BUSY_TIMEOUT_S", 0.1)
    async with walking(hut) as walk:
        await walk.keys("e", "enter", "down", "down")
        other = sqlite3.connect(hut, isolation_level=None)
        other.execute("BEGIN IMMEDIATE")
        await walk.type("Well")
        await walk.keys("enter")
        await walk.shows("another program has been saving")
        other.execute("ROLLBACK")
        other.close()
        await walk.keys("up")
        await walk.enter("")
        assert walk.record.circuits[0].description == "Well"


async def test_letters_complete_a_choice_and_a_tag(hut: Path) -> None:
    async with walking(hut) as walk:
        await walk.keys("e", "enter", "down", "down", "down", "down", "down")
        assert field_at_hand(walk) == "device"
        await walk.enter("breaker c")
        assert walk.record.circuits[0].device == "breaker C"
        await walk.keys("up", "up", "up", "up", "up")
        assert field_at_hand(walk) == "fed_from"
        await walk.enter("batt")
        assert walk.record.circuits[0].fed_from == Feed("sources", "s")


async def test_an_emptied_field_is_not_known(hut: Path) -> None:
    async with walking(hut) as walk:
        await walk.keys("e", "down", "enter", "down", "down", "down", "backspace", "enter")
        await walk.quiet()
        assert walk.record.runs[0].one_way_length_m is None
        await walk.judged()
        await walk.shows("… incomplete")


async def test_settings_sources_meters_and_visits_are_under_s(hut: Path) -> None:
    async with walking(hut) as walk:
        await walk.keys("s")
        assert isinstance(walk.app.screen, RowsScreen)
        for words in ("Hut", "BATT", "DB1", "DMM", "CLAMP", "2026-03 as found"):
            assert words in walk.screen
        await walk.keys("enter")
        await walk.enter("Hütte", "Nowhere 1")
        assert (walk.record.name, walk.record.address) == ("Hütte", "Nowhere 1")
        await walk.keys("escape", "a", "m", "enter")
        await walk.enter("THERM")
        await walk.enter("te", "100", "1", "10", "0.1")
        meter = walk.record.instruments[-1]
        assert (meter.tag, meter.quantity, meter.full_scale, meter.resolution) == ("THERM", "temperature", 100.0, 0.1)
        await walk.keys("escape", "a", "v", "enter")
        await walk.enter("as left")
        assert walk.record.visits[-1] == Visit(
            id=walk.record.visits[-1].id, tag="2026-03 as left", kind="as left", date="2026-03-12", by="Ada"
        )


async def test_an_unknown_limits_profile_is_refused_at_entry_with_the_names_there_are(hut: Path) -> None:
    async with walking(hut) as walk:
        await walk.keys("s", "enter")
        await walk.enter("", "", "telcom-48")
        said = " ".join(walk.screen.split())
        assert "did you mean 'telecom-48'?" in said
        assert all(name in said for name in limits.names())
        assert walk.record.limits == "general"
        await walk.keys("escape", "escape")


async def test_a_file_with_an_unknown_profile_says_so_and_shows_no_verdict_of_before(hut: Path) -> None:
    async with walking(hut) as walk:
        await walk.shows("measure")
        with SiteStore(hut, laptop="elsewhere") as store, store.save("Bob", "limits") as save:
            save.settings(limits="telcom-48")
        await walk.shows("there is no limits profile")
        assert "not judged" in walk.screen.splitlines()[0]
        assert "judging" not in walk.screen
        assert "? measure" not in walk.screen
        await walk.keys("f")
        await walk.shows("there is no limits profile")
        assert "judging" not in walk.screen
        await walk.keys("escape")
        with SiteStore(hut, laptop="elsewhere") as store, store.save("Bob", "limits") as save:
            save.settings(limits="general")
        await walk.judged()
        await walk.shows("? measure")
        assert "no limits profile" not in walk.screen


async def test_removal_is_asked_and_refused_with_what_refers(hut: Path) -> None:
    async with walking(hut) as walk:
        await walk.keys("x", "n")
        await walk.keys("x", "y")
        await walk.shows("cannot be removed: run 1, load 'pump' refer to it")
        await walk.keys("e", "end", "x", "y")
        await walk.quiet()
        assert [load.tag for load in walk.record.loads] == ["lamp"]
        await walk.keys("u")
        await walk.until(lambda: len(walk.index.site.loads) == 2, "the load")
        assert "undone: load pump of DB1-01 removed" in walk.screen


async def test_a_row_that_someone_else_removes_closes_its_form(hut: Path) -> None:
    async with walking(hut) as walk:
        await walk.keys("e", "end", "enter")
        assert isinstance(walk.app.screen, FormScreen)
        with SiteStore(hut, laptop="another") as other, other.save("Bob", "away") as save:
            save.remove("loads", "l1")
        await walk.until(lambda: not isinstance(walk.app.screen, FormScreen), "the list")


async def test_notes_keep_their_lines(hut: Path) -> None:
    with SiteStore(hut, laptop="another") as other, other.save("Bob", "notes") as save:
        save.change("circuits", "c1", notes="first\nsecond")
    async with walking(hut) as walk:
        await walk.keys("e", "enter", "up", "end")
        notes = next(line for line in walk.app.screen.query(FieldLine) if line.field.name == "notes")
        assert notes.text == "first␤second"
        notes.go_to()
        await walk.keys("end")
        await walk.enter("!")
        assert walk.record.circuits[0].notes == "first\nsecond!"


async def test_a_lone_question_mark_in_a_form_is_help(hut: Path) -> None:
    async with walking(hut) as walk:
        await walk.keys("e", "enter")
        await walk.enter("?")
        await walk.shows("The keys here")
        await walk.keys("escape", "escape", "escape")
        assert isinstance(walk.app.screen, SurveyScreen)
        assert walk.record.circuits[0].tag == "DB1-01"
