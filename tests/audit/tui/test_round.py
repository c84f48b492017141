"""A round in the entry strip: each accepted value is saved at once, corrections replace, and nothing typed is lost."""

from __future__ import annotations

import os
import sqlite3
from collections.abc import Callable
from pathlib import Path

import pytest
from sqlite_utils import Database

from audit.tui.entry.slots import Place, slots_of
from audit.tui.screens.cautions import CautionScreen
from audit.tui.screens.survey import SurveyScreen
from db import connection
from db.store import SiteStore
from rules.index import Index
from rules.record import Acknowledgement, Reading
from tests.audit.tui.walker import NOON, Walk, cautions_read, site_of, walking


def values(path: Path) -> dict[str, float]:
    """What was read on the hut, by place."""
    return {f"{r.quantity} {r.at}": r.value for r in site_of(path).readings}


async def test_cautions_come_before_the_first_live_reading_and_one_key_acknowledges_them(hut: Path) -> None:
    async with walking(hut) as walk:
        await walk.keys("m")
        await walk.shows("Before the first live reading   2026-03 as found")
        assert "The highest voltage in the record is 12.6 V d.c." in walk.screen
        assert "Live readings are work on live parts" in walk.screen
        await walk.keys("escape")
        assert not walk.survey.strip.is_open
        assert walk.record.acknowledged == ()
        await cautions_read(walk)
        read: tuple[Acknowledgement, ...] = walk.record.acknowledged
        assert [row.caution for row in read] == ["live", "meter", "battery", "licensed"]
        assert {(row.visit, row.by, row.at) for row in read} == {
            ("2026-03 as found", "Ada", NOON.isoformat(timespec="seconds"))
        }
        await walk.keys("escape", "m")
        await walk.until(lambda: walk.survey.strip.is_open)
        assert not isinstance(walk.app.screen, CautionScreen)


async def test_each_accepted_value_is_in_the_file_before_the_next_is_typed(hut: Path) -> None:
    async with walking(hut) as walk:
        await cautions_read(walk)
        await walk.enter("4.02")
        assert values(hut) == {"current run 1": 4.02}
        await walk.enter("12.55", "12.07")
        assert values(hut) == {"current run 1": 4.02, "voltage way": 12.55, "voltage p1": 12.07}
        await walk.shows("round 1 of DB1-01 is saved")
        of_pump = walk.record.readings
        assert {(r.round, r.visit, r.by, r.taken_at) for r in of_pump} == {
            ("1", "2026-03 as found", "Ada", "2026-03-12T12:00:00+00:00")
        }
        assert [r.instrument for r in of_pump] == ["CLAMP", "DMM", "DMM"]
        await walk.judged()
        assert "12.07 V" in walk.screen


async def test_the_verdict_follows_each_key_and_nothing_of_it_is_saved(hut: Path) -> None:
    async with walking(hut) as walk:
        await cautions_read(walk)
        await walk.enter("4", "12.55")
        await walk.type("11.5")
        await walk.shows("as typed  ! act")
        assert "11.5 V, computed 12.1" in walk.screen
        assert "voltage p1" not in values(hut)
        await walk.keys("backspace", "backspace", "backspace", "2", "full_stop", "2")
        await walk.shows("as typed  ✓ sound")
        await walk.keys("escape")
        assert "as typed" not in walk.screen


async def test_an_empty_enter_skips(hut: Path) -> None:
    async with walking(hut) as walk:
        await walk.at("DB1-02")
        await cautions_read(walk)
        await walk.enter("1.01", "", "12.5", "12.3")
        assert values(hut) == {"current run 1": 1.01, "voltage p1": 12.5, "voltage p2": 12.3}
        await walk.keys("m")
        await walk.until(lambda: walk.survey.strip.is_open)
        assert walk.survey.strip.round_name == "1"
        at_hand = [cell.slot.at for cell in walk.survey.strip.cells if cell.has_focus_within and cell.slot]
        assert at_hand == ["way"]


async def test_typed_units_are_understood_and_kept(hut: Path) -> None:
    async with walking(hut) as walk:
        await cautions_read(walk)
        await walk.type("4020 mA")
        assert "A run 1: 4.02 A" in walk.screen
        await walk.enter("")
        (reading,) = walk.record.readings
        assert (reading.value, reading.typed) == (4.02, (("value", "4020 mA"),))


async def test_what_is_no_value_is_refused_and_stays_in_its_cell(hut: Path) -> None:
    async with walking(hut) as walk:
        await cautions_read(walk)
        await walk.enter("12 apples")
        assert "'12 apples' has an unknown unit" in walk.screen
        cell = walk.survey.strip.cells[0]
        assert (cell.state, cell.text, cell.has_focus_within) == ("refused", "12 apples", True)
        assert len(walk.record.readings) == 0


async def test_a_correction_replaces_for_a_stated_reason_and_both_stay(hut: Path) -> None:
    async with walking(hut) as walk:
        await cautions_read(walk)
        await walk.enter("4.02", "12.55")
        await walk.keys("up")
        await walk.type("12.45")
        await walk.keys("enter")
        await walk.shows("Why in place of 12.55 V?")
        await walk.enter("typ")
        first, wrong, right = walk.record.readings
        assert (wrong.value, right.value, right.reason) == (12.55, 12.45, "typing slip")
        assert right.replaces_id == wrong.id
        assert wrong.tag.startswith("r-")
        assert first.tag == right.tag == ""
        await walk.keys("escape")
        await walk.judged()
        assert walk.index.replaced == {wrong.id}
        await walk.keys("end")
        assert "replaced, not judged: typing slip" in "\n".join(
            "".join(part.text for part in line) for line in walk.survey.page.lines
        )


async def test_a_correction_without_a_reason_is_not_saved(hut: Path) -> None:
    async with walking(hut) as walk:
        await cautions_read(walk)
        await walk.enter("4.02", "12.55")
        await walk.keys("up")
        await walk.type("12.45")
        await walk.keys("enter")
        await walk.shows("Why in place of")
        await walk.keys("escape")
        await walk.shows("a correction needs a reason")
        assert walk.survey.strip.cells[1].text == "12.45"
        assert values(hut)["voltage way"] == 12.55


async def test_any_reading_can_be_corrected_from_its_circuit(plant: Path) -> None:
    async with walking(plant) as walk:
        before = walk.record
        await walk.at("F2")
        await walk.keys("c")
        await walk.enter("joint at run 1 end, neg")
        await walk.shows("in place of 1.52 mV, which stays in the record")
        await walk.enter("1.62 mV")
        await walk.enter("the clip had slipped")
        await walk.judged()
        after = walk.record
        old = next(r for r in after.readings if r.quantity == "joint" and r.leg == "negative" and not r.replaces_id)
        new = after.readings[-1]
        assert (new.replaces_id, new.reason, new.value) == (old.id, "the clip had slipped", 0.00162)
        assert (new.instrument, new.round, new.visit, new.leg) == (old.instrument, old.round, old.visit, "negative")
        assert len(after.readings) == len(before.readings) + 1


async def test_another_reading_asks_quantity_place_leg_and_value(plant: Path) -> None:
    async with walking(plant) as walk:
        await walk.at("F2")
        await walk.keys("o")
        await walk.shows("Before the first live reading")
        await walk.keys("y")
        await walk.shows("Read what?")
        await walk.enter("jo")
        await walk.enter("run 1 st")
        await walk.enter("neg")
        await walk.shows("joint at run 1 start, negative leg")
        await walk.enter("0.9 mV")
        await walk.shows("saved: F2 round 1: joint at run 1 start 0.9 mV")
        reading = walk.record.readings[-1]
        assert (reading.quantity, reading.at, reading.leg, reading.value) == (
            "joint",
            "run 1 start",
            "negative",
            0.0009,
        )
        assert reading.instrument == "DMM-1"


async def test_a_clamp_is_read_with_the_loads_off(plant: Path) -> None:
    async with walking(plant) as walk:
        await walk.at("F2")
        await walk.keys("o")
        await walk.shows("Before the first live reading")
        await walk.keys("y")
        await walk.enter("cur", "run 1", "pos")
        await walk.shows("current at run 1: the loads are")
        await walk.enter("off")
        await walk.shows("current at run 1, positive leg, loads off")
        await walk.enter("0.31")
        await walk.shows("saved: F2 round 1: current at run 1 0.31 A, loads off")
        reading = walk.record.readings[-1]
        assert (reading.quantity, reading.at, reading.leg, reading.value, reading.loads_off) == (
            "current",
            "run 1",
            "positive",
            0.31,
            "yes",
        )
        shown = slots_of(Index(walk.record), Place(reading.circuit_id), reading.visit, "1")
        assert reading.id not in {slot.saved.id for slot in shown if slot.saved}


async def test_a_reading_on_a_busbar(hut: Path) -> None:
    async with walking(hut) as walk:
        await walk.at("DB1")
        await cautions_read(walk)
        await walk.enter("12.61", "6.3")
        bus, pole = walk.record.readings
        assert (bus.circuit_id, bus.board.id if bus.board else "", bus.at, bus.leg) == ("", "b", "bus", "")
        assert (pole.leg, pole.value) == ("positive", 6.3)


async def test_another_round_begins_once_the_last_is_whole(hut: Path) -> None:
    async with walking(hut) as walk:
        await cautions_read(walk)
        await walk.enter("4", "12.5", "12.1")
        await walk.keys("m")
        await walk.until(lambda: walk.survey.strip.is_open)
        assert walk.survey.strip.round_name == "2"
        await walk.keys("up")
        await walk.enter("1")
        assert [cell.text for cell in walk.survey.strip.cells] == ["4 A", "12.5 V", "12.1 V"]


async def test_the_name_is_asked_at_the_first_save_and_never_again(hut: Path) -> None:
    async with walking(hut, who="") as walk:
        await walk.keys("m", "y")
        await walk.shows("Your name")
        await walk.enter("Grace")
        await walk.until(lambda: walk.survey.strip.is_open)
        await walk.enter("4")
        assert walk.app.settings.who == "Grace"
        assert {row.by for row in walk.record.acknowledged} == {"Grace"}
        with SiteStore(hut, read_only=True) as store:
            assert [entry.who for entry in store.history()][1:] == ["Grace", "Grace"]


async def test_the_first_visit_begins_with_the_first_reading(empty: Path) -> None:
    async with walking(empty) as walk:
        await walk.keys("a", "s", "enter")
        await walk.enter("PSU", "")
        await walk.keys("escape")
        await walk.at("PSU")
        await cautions_read(walk)
        await walk.enter("24.1")
        (visit,) = walk.record.visits
        assert (visit.tag, visit.kind, visit.date, visit.by) == ("2026-03 as found", "as found", "2026-03-12", "Ada")
        assert [r.visit for r in walk.record.readings] == ["2026-03 as found"]


async def test_a_visit_of_another_time_is_asked_about_once(plant: Path) -> None:
    async with walking(plant) as walk:
        walk.app.now = lambda: NOON.replace(month=6)
        await walk.keys("m")
        await walk.shows("The last visit is not of today")
        await walk.keys("escape")
        assert not walk.survey.strip.is_open
        await walk.keys("m")
        await walk.shows("The last visit is not of today")
        await walk.enter("periodic")
        await walk.shows("Before the first live reading   2026-06 periodic")
        assert walk.record.visits[-1].date == "2026-06-12"


async def test_which_meter_is_asked_where_there_is_a_choice_and_kept_for_the_visit(plant: Path) -> None:
    async with walking(plant) as walk:
        await walk.keys("i")
        await walk.shows("Which meter reads voltage?")
        await walk.enter("DMM-2")
        await walk.shows("Which meter reads current?")
        await walk.enter("CLAMP-1, range 40")
        await cautions_read(walk)
        await walk.enter("39.1", "53.4")
        amps, volts = walk.record.readings[-2:]
        assert (amps.instrument, amps.full_scale) == ("CLAMP-1", 40.0)
        assert (volts.instrument, volts.full_scale) == ("DMM-2", None)


# --- saves that are refused


@pytest.fixture
def impatient(monkeypatch: pytest.MonkeyPatch) -> None:
    """Do not wait five seconds for another program."""
    monkeypatch.setattr(connection, "BUSY_TIMEOUT_S", 0.1)


async def typed_while_locked(walk: Walk) -> None:
    """Accept two values while another program holds the file."""
    other = sqlite3.connect(walk.path, isolation_level=None)
    other.execute("BEGIN IMMEDIATE")
    try:
        await walk.type("4.02")
        await walk.keys("enter")
        await walk.type("12.5")
        await walk.shows("another program has been saving")
    finally:
        other.execute("ROLLBACK")
        other.close()


async def test_a_refused_save_keeps_the_value_and_enter_tries_again(hut: Path, impatient: None) -> None:
    async with walking(hut) as walk:
        await cautions_read(walk)
        await typed_while_locked(walk)
        first, second, _ = walk.survey.strip.cells
        assert (first.state, first.text) == ("refused", "4.02")
        assert (second.text, second.has_focus_within) == ("12.5", True)
        assert values(hut) == {}
        await walk.enter("")
        assert values(hut) == {"voltage way": 12.5}
        assert first.has_focus_within
        await walk.enter("")
        assert values(hut) == {"voltage way": 12.5, "current run 1": 4.02}


@pytest.mark.parametrize(
    ("harm", "said"),
    [
        (lambda path: os.truncate(path, 0), "this site file was emptied while it was open"),
        (Path.unlink, "this file was removed or moved away while it was open"),
    ],
)
async def test_a_file_that_goes_while_it_is_open_keeps_the_value_on_the_screen(
    hut: Path, harm: Callable[[Path], object], said: str
) -> None:
    async with walking(hut) as walk:
        await cautions_read(walk)
        harm(hut)
        await walk.enter("4.02")
        await walk.shows(said)
        first, *_ = walk.survey.strip.cells
        assert (first.state, first.text) == ("refused", "4.02")
        assert "4.02" in walk.screen


async def test_a_full_disk_keeps_the_value(hut: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    who = "A" * 20_000  # what she saves needs pages of its own
    async with walking(hut, who) as walk:
        await cautions_read(walk)
    unlimited = connection._connect

    def full(uri: str) -> Database:
        db = unlimited(uri)
        (pages,) = db.conn.execute("PRAGMA page_count").fetchone()
        db.conn.execute(f"PRAGMA max_page_count = {pages}")
        return db

    monkeypatch.setattr(connection, "_connect", full)
    async with walking(hut, who) as walk:
        await walk.keys("m")
        await walk.until(lambda: walk.survey.strip.is_open)
        await walk.type("4.02")
        await walk.keys("enter")
        await walk.shows("no space left to save in")
        assert walk.survey.strip.cells[0].text == "4.02"
        assert values(hut) == {}


async def test_a_file_that_may_not_be_written_says_so_and_takes_no_reading(
    hut: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(connection, "_may_write", lambda path: False)
    async with walking(hut) as walk:
        assert "read only" in walk.screen
        await walk.keys("m")
        await walk.shows("this file may not be written: no reading can be saved")
        assert [type(screen) for screen in walk.app.screen_stack] == [SurveyScreen]


async def test_what_someone_else_reads_meanwhile_appears_in_the_cells(hut: Path) -> None:
    async with walking(hut) as walk:
        await cautions_read(walk)
        await walk.type("4.0")
        with SiteStore(hut, laptop="another") as other, other.save("Bob", "his reading") as save:
            save.add(
                "readings",
                Reading(
                    id="",
                    circuit_id="c1",
                    visit="2026-03 as found",
                    round="1",
                    quantity="voltage",
                    at="way",
                    value=12.52,
                ),
            )
        await walk.until(lambda: walk.survey.strip.cells[1].text == "12.52 V", "his reading")
        assert walk.survey.strip.cells[0].text == "4.0"
