"""Values that are hardly what the meter shows are asked for twice; units that could be two are asked for."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest

from audit.tui.entry.plausible import doubt_about
from db.store import SiteStore
from rules.index import Index
from rules.record import Feed, Figure, Reading
from tests.audit.tui.walker import HUT, cautions_read, site_of, walking

RATED = Index(replace(HUT, circuits=(replace(HUT.circuits[0], rated_current_a=10.0), HUT.circuits[1])))


def reading(quantity: str, value: float, **more: object) -> Reading:
    fields: dict[str, object] = {"circuit_id": "c1", "at": "p1", **more}
    return Reading(id="", quantity=quantity, value=value, **fields)  # type: ignore[arg-type]


@pytest.mark.parametrize(
    ("one", "computed", "said"),
    [
        (reading("voltage", 12.1), 12.2, ""),
        (reading("voltage", 121.0), 12.2, "121 V is far above the highest named, 12.6 V"),
        (reading("voltage", -12.1), 12.2, "-12.1 V has the wrong sign: are the leads swapped?"),
        (reading("voltage", -6.3, leg="negative"), None, ""),
        (reading("voltage", 0.0, leg="positive"), None, ""),
        (reading("voltage", -63.0, leg="negative"), None, "-63 V is far above the highest named"),
        (reading("voltage", 8.5), 12.2, "8.5 V is far from the computed 12.2 V"),
        (reading("voltage", 8.7), 12.2, ""),
        (reading("voltage", 1.21), None, "1.21 V is far from the nominal 12 V"),
        (reading("voltage", 1.21), 1.21, "1.21 V is far from the nominal 12 V"),
        (reading("voltage", 1.26, circuit_id="", board=Feed("boards", "b")), None, "far from the nominal 12 V"),
        (reading("joint", 0.0041), None, ""),
        (reading("joint", 41.0), None, "41 V is more than the nominal 12 V"),
        (reading("drop", -12.5, to="way"), None, "-12.5 V is more than the nominal 12 V"),
        (reading("current", 15.0), None, ""),
        (reading("current", 15.1), None, "15.1 A is more than 1.5 times the device's 10 A"),
        (reading("current", 900.0, circuit_id="c2"), None, ""),
        (reading("temperature", 90.0), None, ""),
    ],
)
def test_what_is_doubted(one: Reading, computed: float | None, said: str) -> None:
    doubt = doubt_about(one, RATED, None if computed is None else Figure(computed, "V"))
    assert said in doubt.replace("−", "-")
    assert bool(doubt) == bool(said)


async def test_a_doubted_value_is_kept_and_a_second_enter_saves_it(hut: Path) -> None:
    async with walking(hut) as walk:
        await cautions_read(walk)
        await walk.enter("4.02", "125.5")
        await walk.shows("far above the highest named, 12.6 V")
        assert "Enter again saves it" in walk.screen
        cell = walk.survey.strip.cells[1]
        assert (cell.text, cell.has_focus_within) == ("125.5", True)
        assert len(site_of(hut).readings) == 1
        await walk.keys(*["backspace"] * 5)
        await walk.enter("12.55", "8.4")
        await walk.shows("8.4 V is far from the computed")
        assert [r.value for r in site_of(hut).readings] == [4.02, 12.55]
        await walk.enter("")
        assert [r.value for r in site_of(hut).readings] == [4.02, 12.55, 8.4]


async def test_another_text_is_doubted_anew(hut: Path) -> None:
    async with walking(hut) as walk:
        await cautions_read(walk)
        await walk.enter("", "125.5", "5")
        await walk.shows("125.55 V is far above")
        assert site_of(hut).readings == ()


async def test_a_joint_says_its_unit_what_was_understood_and_is_asked_twice(hut: Path) -> None:
    async with walking(hut) as walk:
        await cautions_read(walk)
        await walk.keys("escape", "o")
        await walk.enter("joint", "run 1 st", "pos")
        await walk.shows("in mV or V · round 1")
        await walk.enter("41")
        await walk.shows("V or mV? A joint needs its unit: 4.1 mV or 0.8 V")
        await walk.type(" V")
        await walk.shows("understood: 41 V")
        await walk.enter("")
        await walk.shows("41 V is more than the nominal 12 V · Enter again saves it")
        assert site_of(hut).readings == ()
        await walk.keys("backspace")
        await walk.enter("mV")
        await walk.shows("saved: DB1-01 round 1: joint at run 1 start 41 mV")
        assert [r.value for r in site_of(hut).readings] == [0.041]


async def test_a_point_that_nothing_follows_yet_changes_nothing(hut: Path) -> None:
    async with walking(hut) as walk:
        await cautions_read(walk)
        await walk.enter("4", "12.5")
        await walk.type("12")
        await walk.shows("as typed")
        before = walk.survey.page.lines
        assert "p1: 12 V" in walk.screen
        await walk.keys("full_stop")
        assert walk.survey.page.lines == before
        assert "p1: 12 V" in walk.screen


async def test_a_current_beyond_the_device_is_asked_twice(hut: Path) -> None:
    with SiteStore(hut, laptop="another") as other, other.save("Bob", "rating") as save:
        save.change("circuits", "c1", rated_current_a=6.0)
    async with walking(hut) as walk:
        await cautions_read(walk)
        await walk.enter("40.2")
        await walk.shows("40.2 A is more than 1.5 times the device's 6 A")
        await walk.enter("")
        assert [r.value for r in site_of(hut).readings] == [40.2]
