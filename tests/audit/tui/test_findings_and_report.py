"""Finding a fault, all findings, the report, help, undo, two at once, and names that are full of markup."""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path

from textual.widgets import Static

from audit.tui.screens.findings import FindingsScreen
from audit.tui.screens.survey import SurveyScreen
from db.store import SiteStore
from rules.record import Board, Circuit
from tests.audit.tui.walker import HUT, cautions_read, site_of, walking

HOSTILE = "[bold]x[/] [@click=app.quit]y[/] [TBD] :smile: =1+1 <b>"


async def test_a_fault_is_found_while_its_readings_are_typed(hut: Path) -> None:
    async with walking(hut) as walk:
        await walk.at("DB1-02")
        await cautions_read(walk)
        await walk.enter("1.0", "12.6", "12.3")
        await walk.type("11.6")
        await walk.shows("as typed  ! act")
        await walk.enter("")
        await walk.judged()
        await walk.keys("f")
        await walk.shows("DB1-02, way to p2")
        assert "Measured drop above" in walk.screen
        assert "do         " in walk.screen
        assert "caution    " in walk.screen


async def test_findings_stand_by_severity_and_enter_goes_to_the_circuit(plant: Path) -> None:
    async with walking(plant) as walk:
        await walk.keys("f")
        assert isinstance(walk.app.screen, FindingsScreen)
        listed = walk.app.screen.query_one("FindingList")
        severities = [finding.severity.rank for finding in listed._findings]  # type: ignore[attr-defined]
        assert severities == sorted(severities)
        await walk.keys("down")
        tag = listed.chosen.circuit  # type: ignore[attr-defined]
        await walk.keys("enter")
        assert isinstance(walk.app.screen, SurveyScreen)
        assert walk.index.circuits[walk.survey.page.place_id].tag == tag
        assert walk.screen.split("\n")[0].startswith(f" {tag}  ")


async def test_what_could_not_be_judged_stands_after_the_findings(plant: Path) -> None:
    async with walking(plant, size=(80, 60)) as walk:
        await walk.keys("f")
        lines = [
            "".join(part.text for part in line)
            for line in walk.app.screen.query_one("FindingList").lines  # type: ignore[attr-defined]
        ]
        assert any("not judged: a gap is not a pass" in line for line in lines)


async def test_the_report_asks_for_file_and_reader(plant: Path, tmp_path: Path) -> None:
    async with walking(plant) as walk:
        await walk.keys("r")
        await walk.shows("Report to")
        await walk.enter("out.pdx")
        await walk.shows("no report has the ending '.pdx'")
        await walk.keys("end", *["backspace"] * 10)
        await walk.type(str(tmp_path / "out.json"))
        await walk.keys("enter", "s")
        await walk.shows("wrote")
        report = json.loads((tmp_path / "out.json").read_text(encoding="utf-8"))
        assert report["site"]["name"] == "Beispielhausen exchange (invented)"

        await walk.keys("r")
        await walk.shows("Report to")
        await walk.type(str(tmp_path / "out.json"))
        await walk.keys("enter")
        await walk.shows("out.json is there already. Replace it?")
        await walk.keys("n")
        assert isinstance(walk.app.screen, SurveyScreen)


async def test_help_says_what_the_keys_do_and_shows_the_cautions_again(plant: Path) -> None:
    async with walking(plant, size=(80, 100)) as walk:
        await walk.keys("question_mark")
        for words in (
            "The keys here",
            "a round: the current, then the voltage at each point",
            "undo your last save",
            "What a circuit's status means",
            "Before any live reading",
            "The highest voltage in the record is 57 V d.c.",
            "Live readings are work on live parts",
        ):
            assert words in walk.screen
        assert "Focus Next" not in walk.screen
        await walk.keys("escape", "m", "y")
        await walk.until(lambda: walk.survey.strip.is_open)
        await walk.keys("question_mark")
        assert "Before any live reading" in walk.screen


async def test_undo_says_what_it_undoes_and_can_be_done_again(hut: Path) -> None:
    async with walking(hut) as walk:
        await walk.keys("u")
        await walk.shows("nothing of yours to undo")
        await cautions_read(walk)
        await walk.enter("4.02")
        await walk.keys("escape", "u")
        await walk.shows("undone: DB1-01 round 1: current at run 1 4.02 A · U does it again")
        assert [entry.value for entry in site_of(hut).readings] == []
        await walk.keys("U")
        await walk.shows("done again: DB1-01 round 1: current at run 1 4.02 A")
        assert [entry.value for entry in site_of(hut).readings] == [4.02]


async def test_two_on_one_file_see_each_others_saves_and_none_is_lost(hut: Path) -> None:
    async with walking(hut, "Ada") as ada, walking(hut, "Bob") as bob:
        await cautions_read(ada)
        await ada.enter("4.02")
        await bob.until(lambda: len(bob.index.site.readings) == 1, "Ada's reading")
        await bob.at("DB1-02")
        await cautions_read(bob)
        await bob.enter("1.01")
        await ada.until(lambda: len(ada.index.site.readings) == 2, "Bob's reading")
        assert {reading.by for reading in bob.record.readings} == {"Ada", "Bob"}


async def test_names_full_of_markup_are_shown_as_they_are(tmp_path: Path) -> None:
    circuit = replace(HUT.circuits[0], tag="[/]", description=HOSTILE)
    board = replace(HUT.boards[0], tag="[red]", location=HOSTILE)
    path = tmp_path / "hostile.ohmwalk"
    site = replace(HUT, name=HOSTILE, circuits=(circuit, HUT.circuits[1]), boards=(board,))
    SiteStore.create(path, site, "t", "l", "made").close()
    async with walking(path, size=(130, 40)) as walk:
        assert HOSTILE in walk.screen
        assert "[/]" in walk.screen
        await walk.at("[/]")
        await cautions_read(walk)
        await walk.enter("4")
        await walk.keys("escape", "e", "enter", "escape", "escape", "x")
        await walk.shows("Remove circuit [/]?")
        await walk.keys("n", "s", "escape", "f", "escape", "question_mark", "escape", "c", "escape", "v", "escape")
        assert isinstance(walk.app.screen, SurveyScreen)


async def test_control_codes_from_elsewhere_never_reach_the_terminal(tmp_path: Path) -> None:
    nasty = "pump\x1b]0;owned\x07\x9b2J\u202eevil"
    board: Board = replace(HUT.boards[0], location=nasty)
    circuit: Circuit = replace(HUT.circuits[0], tag=f"{nasty}1", description=nasty)
    path = tmp_path / "nasty.ohmwalk"
    site = replace(HUT, name=nasty, boards=(board,), circuits=(circuit, HUT.circuits[1]))
    SiteStore.create(path, site, "t", "l", "made").close()
    async with walking(path, size=(130, 40)) as walk:
        screens = [walk.screen]
        await walk.keys("enter", "e")
        screens.append(walk.screen)
        await walk.keys("enter")
        screens.append(walk.screen)
        await walk.keys("escape", "escape", "x")
        await walk.shows("Remove")
        screens.append(walk.screen)
        for shown in screens:
            assert "pump" in shown
            assert not set(shown) & set("\x1b\x07\x9b\u202e")
        assert all("\x1b" not in str(static.content) for static in walk.app.screen.query(Static))


async def test_the_theme_for_bright_sun(plant: Path) -> None:
    async with walking(plant) as walk:
        dark = walk.app.theme
        await walk.keys("t")
        assert walk.app.theme != dark
        await walk.keys("t")
        assert walk.app.theme == dark
