"""What a person at the keys may rely on: rounds that go on, menus, forms that refuse, and the visit that is asked once."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest

from audit.tui.screens.form import FormScreen
from audit.tui.screens.survey import SurveyScreen
from audit.tui.widgets.field_line import FieldLine
from tests.audit.tui.test_record import field_at_hand
from tests.audit.tui.walker import NOON, cautions_read, site_of, walking


async def test_a_round_that_goes_on_says_so_and_one_key_begins_another(hut: Path) -> None:
    async with walking(hut) as walk:
        await cautions_read(walk)
        assert "begins a new round" not in walk.screen
        await walk.enter("4", "12.5")
        await walk.keys("escape", "m")
        await walk.shows("round 1 goes on at p1, begun 12:00 today · n begins a new round")
        await walk.keys("n")
        await walk.until(lambda: walk.survey.strip.round_name == "2", "round 2")
        assert "goes on" not in walk.screen
        await walk.keys("n")
        assert (walk.survey.strip.round_name, walk.survey.strip.cells[0].text) == ("2", "")
        await walk.enter("4.1")
        await walk.quiet()
        assert [r.round for r in site_of(hut).readings] == ["1", "1", "2"]


async def test_a_round_of_another_day_names_the_day(hut: Path) -> None:
    async with walking(hut) as walk:
        await cautions_read(walk)
        await walk.enter("4")
        walk.app.now = lambda: NOON.replace(day=13)
        walk.survey.strip._now = walk.app.now
        await walk.keys("escape", "m")
        await walk.shows("round 1 goes on at way, begun 2026-03-12 12:00")


async def test_the_typed_verdict_stays_until_the_new_one_is_there(hut: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    async with walking(hut) as walk:
        old = "? measure"
        assert old in walk.screen
        await cautions_read(walk)
        await walk.enter("4", "12.55")
        await walk.judged()
        asked: list[tuple[Any, ...]] = []
        monkeypatch.setattr(walk.app._judge, "judge", lambda *request: asked.append(request))
        await walk.enter("12.2")
        await walk.shows("round 1 of DB1-01 is saved")
        assert "as typed  ✓ sound" in walk.screen
        monkeypatch.undo()
        walk.app._judge.judge(*asked[-1])
        await walk.judged()
        assert "as typed" not in walk.screen
        assert "✓ sound" in walk.screen


async def test_letters_filter_what_can_be_added_and_enter_chooses(empty: Path) -> None:
    async with walking(empty) as walk:
        await walk.keys("a")
        await walk.type("xy")
        await walk.shows("nothing matches")
        await walk.keys("backspace", "backspace")
        await walk.shows("one survey of the site")
        assert "nothing matches" not in walk.screen
        await walk.enter("source")
        await walk.shows("The new source's tag PSU-1")
        await walk.enter("")
        assert [source.tag for source in walk.record.sources] == ["PSU-1"]


async def test_a_choice_that_is_not_clear_is_refused_with_what_it_may_be(hut: Path) -> None:
    async with walking(hut) as walk:
        await walk.keys("e", "enter", *["down"] * 5)
        assert field_at_hand(walk) == "device"
        await walk.enter("breaker")
        await walk.shows("device: 'breaker' may mean breaker B, breaker C or breaker D")
        assert walk.record.circuits[0].device == "none"
        await walk.enter(" c")
        assert walk.record.circuits[0].device == "breaker C"
        line = next(one for one in walk.app.screen.query(FieldLine) if one.field.name == "device")
        assert line.text == "breaker C"


async def test_a_refused_field_that_is_emptied_is_forgiven(hut: Path) -> None:
    async with walking(hut) as walk:
        await walk.keys("e", "enter", *["down"] * 6)
        assert field_at_hand(walk) == "rated_current_a"
        await walk.enter("x")
        await walk.shows("'x' is not a number")
        await walk.keys("backspace")
        assert "'x' is not a number" not in walk.screen
        await walk.enter("", "")
        assert field_at_hand(walk) == "device_leg"
        assert walk.record == walk.index.site


async def test_help_of_a_form_tells_our_keys_alone(hut: Path) -> None:
    async with walking(hut) as walk:
        await walk.keys("e", "enter", "f1")
        await walk.shows("The keys here")
        assert "next field" in walk.screen
        for foreign in ("Scroll", "Page Left", "Page Up"):
            assert foreign not in walk.screen


async def test_ctrl_c_says_how_to_leave_and_leaves_nothing(hut: Path) -> None:
    async with walking(hut) as walk:
        await walk.keys("ctrl+c")
        await walk.shows("q quits, from the walk")
        assert isinstance(walk.app.screen, SurveyScreen)
        assert not walk.app._notifications


async def test_a_new_load_begins_at_its_current(hut: Path) -> None:
    async with walking(hut) as walk:
        await walk.keys("a", "l", "enter", "enter")
        await walk.until(lambda: isinstance(walk.app.screen, FormScreen), "the form")
        assert field_at_hand(walk) == "current_a"


async def test_a_visit_is_asked_about_once_a_day(hut: Path) -> None:
    later = NOON.replace(month=6)
    async with walking(hut) as walk:
        walk.app.now = lambda: later
        walk.survey.strip._now = walk.app.now
        await walk.keys("m")
        await walk.shows("The last visit is not of today")
        await walk.enter("go on")
        await walk.shows("Before the first live reading")
        await walk.keys("y")
        await walk.until(lambda: walk.survey.strip.is_open)
        await walk.enter("4")
    async with walking(hut) as walk:
        walk.app.now = lambda: later
        await walk.keys("m")
        await walk.until(lambda: walk.survey.strip.is_open, "the strip, unasked")
        await walk.keys("escape")
        walk.app.now = lambda: later.replace(day=13)
        await walk.keys("m")
        await walk.shows("The last visit is not of today")
