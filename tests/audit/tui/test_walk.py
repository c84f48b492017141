"""The walk: there on opening, in walking order, readable in one colour at 80 × 24."""

from __future__ import annotations

import threading
import time
from dataclasses import replace
from pathlib import Path

import pytest
from rich.cells import cell_len
from textual.events import Key

from audit.tui import type_ahead
from audit.tui.app import OhmwalkApp
from audit.tui.screens.survey import SurveyScreen
from audit.tui.session import Session
from audit.tui.settings import PassingSettings
from db.store import SiteStore
from rules.assessment import Status
from rules.record import Reading
from tests.audit.tui.walker import HUT, NOON, PATIENCE_S, Walk, walking


async def test_opens_on_the_walk_with_nothing_in_front_of_it(plant: Path) -> None:
    async with walking(plant, who="") as walk:
        assert [type(screen) for screen in walk.app.screen_stack] == [SurveyScreen]
        lines = walk.screen.split("\n")
        assert lines[0].startswith(" Beispielhausen exchange (invented)   2026-03 as found")
        assert walk.app.survey is not None
        read, act = len(walk.app.survey.read_now & walk.index.circuits.keys()), walk.app.survey.count_of(Status.ACT)
        assert f"{read} of {len(walk.index.circuits)} read   {act} act" in lines[0]
        assert lines[2:4] == [" power room", " ●   MDB, 48 V from RECT-1 + BATT-A"]
        assert "▸ F1" in lines[4]
        assert "0.9 of 2.1 %" in lines[4]
        assert "✓ sound" in lines[4]
        assert any("! act" in line for line in lines)


async def test_fits_80_by_24_and_the_last_lines_say_what_is_next_and_the_keys(plant: Path) -> None:
    async with walking(plant) as walk:
        lines = walk.screen.split("\n")
        assert len(lines) == 24
        assert max(map(cell_len, lines)) <= 80
        assert lines[-2].startswith(" next: ")
        assert lines[-1].startswith(" Enter open   m measure   a add   e record   / find   f findings   ? help")


async def test_the_trail_is_broken_where_nothing_was_read(plant: Path) -> None:
    async with walking(plant, size=(80, 40)) as walk:
        trail = {line.split()[1]: line[1] for line in walk.screen.split("\n") if line[1:2] in ("┃", "╎")}
        trail.pop("▸", None)
        assert trail["B-05"] == "╎"
        assert trail["B-04"] == "┃"
        assert " ◐   ROW-B" in walk.screen
        assert " ●   ROW-A" in walk.screen


async def test_the_chosen_circuit_says_why_beneath_it(plant: Path) -> None:
    async with walking(plant) as walk:
        await walk.at("F2")
        lines = walk.screen.split("\n")
        row = next(n for n, line in enumerate(lines) if "▸ F2" in line)
        assert lines[row + 1].strip().startswith("bad connection in run 1 end positive (")


async def test_enter_turns_to_the_circuit_and_escape_back(plant: Path) -> None:
    async with walking(plant) as walk:
        await walk.at("F2")
        await walk.keys("enter")
        assert walk.screen.split("\n")[0].startswith(" F2  Feeder to ROW-B")
        assert "52.703 V" in walk.screen
        assert "power room" not in walk.screen
        await walk.keys("escape")
        assert "▸ F2" in walk.screen


async def test_side_by_side_from_120_columns_on(plant: Path) -> None:
    async with walking(plant, size=(120, 30)) as walk:
        await walk.at("F2")
        await walk.keys("down")
        assert "▸ F3" in walk.screen
        assert "F3  Feeder to LHB" in walk.screen
        assert "52.73 V" in walk.screen
        await walk.pilot.resize_terminal(119, 30)
        await walk.pilot.pause()
        assert "52.73 V" not in walk.screen


async def test_find_goes_to_the_circuit_whose_words_hold_what_is_typed(plant: Path) -> None:
    async with walking(plant) as walk:
        await walk.keys("slash")
        await walk.type("frost")
        assert walk.survey.walk.chosen is not None
        assert walk.index.circuits[walk.survey.walk.chosen.id].tag == "L-03"
        await walk.keys("enter")
        assert len(walk.app.screen_stack) == 1
        await walk.keys("slash")
        await walk.type("no such place")
        await walk.shows("nothing in this site is called so")
        await walk.keys("escape")
        assert "▸ L-03" in walk.screen


async def test_find_goes_on_to_the_next_match(plant: Path) -> None:
    async with walking(plant) as walk:
        await walk.keys("slash")
        await walk.type("heater")
        first = walk.survey.walk.cursor
        await walk.keys("down")
        assert walk.survey.walk.cursor > first


async def test_n_goes_to_the_next_circuit_that_wants_doing(hut: Path) -> None:
    async with walking(hut) as walk:
        assert "next: DB1-01 (m): a round with its current" in walk.screen
        await walk.keys("n")
        assert walk.survey.page.place_id == "c2"


async def test_a_board_at_the_cursor_shows_how_its_circuits_stand(plant: Path) -> None:
    async with walking(plant) as walk:
        await walk.at("MDB")
        await walk.keys("enter")
        number = len(walk.index.circuits_of(next(board.id for board in walk.index.site.boards if board.tag == "MDB")))
        await walk.shows(f"{number} circuits, {number} read on this visit")
        assert "voltage at bus, negative to earth" in walk.screen


async def test_an_empty_site_says_how_to_begin(empty: Path) -> None:
    async with walking(empty) as walk:
        assert "next: a adds what is there: first a source" in walk.screen
        await walk.keys("enter", "m", "e", "x", "c", "o")
        assert len(walk.app.screen_stack) == 1


async def test_the_key_line_can_be_clicked(plant: Path) -> None:
    async with walking(plant) as walk:
        column = walk.screen.split("\n")[-1].index("findings")
        await walk.pilot.click("KeysLine", offset=(column, 0))
        await walk.shows("Measured drop above the computed drop")


async def test_a_click_chooses_and_a_click_on_the_chosen_opens(plant: Path) -> None:
    async with walking(plant) as walk:
        await walk.pilot.click("#walk", offset=(10, 5))
        assert "▸ F3" in walk.screen
        await walk.pilot.click("#walk", offset=(10, 4))
        await walk.shows("F3  Feeder to LHB")
        assert walk.survey.turned


async def test_ten_thousand_circuits_paint_like_ten(tmp_path: Path) -> None:
    """Drawing asks only for the lines in sight; the time itself is in ``tests/benchmarks/first_paint.py``."""
    circuits = [replace(HUT.circuits[0], id=f"n{n}", tag=f"N{n:05}") for n in range(10_000)]
    path = tmp_path / "long.ohmwalk"
    SiteStore.create(path, replace(HUT, circuits=tuple(circuits), runs=(), loads=()), "t", "l", "made").close()
    app = OhmwalkApp(path, PassingSettings("l", "Ada"))
    async with app.run_test(size=(80, 24)) as pilot:
        last = time.monotonic() + PATIENCE_S
        while app.survey is None:
            assert time.monotonic() < last
            await pilot.pause(0.01)
        walk = app.walk_screen.walk
        drawn: list[int] = []
        line_at = walk.line_at
        walk.line_at = lambda number: drawn.append(number) or line_at(number)  # type: ignore[func-returns-value, method-assign]
        await pilot.press("end")
        await pilot.pause()
        assert walk.chosen is not None
        assert walk.chosen.id == "n9999"
        # a judgement that arrives repaints what is in sight: the first lines until End has moved, then the last
        assert drawn
        assert [number for number in drawn if 24 <= number <= max(drawn) - 24] == []
        assert max(drawn) > 10_000


async def test_another_visit_shows_what_is_left_to_do_in_it(plant: Path) -> None:
    async with walking(plant) as walk:
        await walk.keys("v")
        await walk.enter("as left")
        await walk.judged()
        await walk.shows(f"0 of {len(walk.index.circuits)} read")
        assert walk.record.visits[-1].tag == "2026-03 as left"
        assert walk.record.visits[-1].walk_order == 2


async def test_a_visit_that_only_readings_name_is_the_one_at_hand(tmp_path: Path) -> None:
    reading = Reading(
        id="x", circuit_id="c1", round="1", quantity="voltage", at="way", value=12.0, taken_at="2026-01-01"
    )
    path = tmp_path / "named.ohmwalk"
    SiteStore.create(path, replace(HUT, visits=(), readings=(reading,)), "t", "l", "made").close()
    async with walking(path) as walk:
        assert "Hut   1 " in walk.screen
        assert "1 of 2 read" in walk.screen


async def test_the_walk_is_there_before_the_record_and_keys_wait_for_it(
    hut: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    may_read, look = threading.Event(), Session._look
    monkeypatch.setattr(Session, "_look", lambda self, store: may_read.wait(PATIENCE_S) and look(self, store))
    monkeypatch.setattr(type_ahead, "LONGEST_HOLD_S", PATIENCE_S)
    app = OhmwalkApp(hut, PassingSettings("this laptop", "Ada"), now=lambda: NOON)
    async with app.run_test(size=(80, 24)) as pilot:
        walk = Walk(app, pilot, hut)
        await walk.shows("DB1-02  Lamps")
        assert "reading …" in walk.screen
        assert "judging" not in walk.screen
        app.post_message(Key("m", "m"))
        await pilot.pause()
        assert app.survey is None
        assert not app.type_ahead.is_idle
        may_read.set()
        await walk.shows("Before the first live reading")
        assert app.survey is not None
