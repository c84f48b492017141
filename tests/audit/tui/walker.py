"""The interface as tests drive it: an app at a steady clock, a person at its keys, and waiting for what threads tell."""

from __future__ import annotations

import time
from collections.abc import AsyncIterator, Callable
from contextlib import asynccontextmanager
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import Path

from textual.events import Key
from textual.pilot import Pilot

from audit.tui.app import OhmwalkApp
from audit.tui.screens.survey import SurveyScreen
from audit.tui.settings import PassingSettings
from db.store import SiteStore
from rules.index import Index
from rules.record import Board, Circuit, Feed, Instrument, Load, Run, Site, Source, Visit

NOON = datetime(2026, 3, 12, 12, 0, tzinfo=UTC)
"""When the tests take place: the day after the sample site's visit."""
PATIENCE_S = 60.0

HUT = Site(
    name="Hut",
    sources=(Source(id="s", tag="BATT", kind="battery", nominal_voltage_v=12.0, working_voltage_v=12.6),),
    boards=(Board(id="b", tag="DB1", fed_by=(Feed("sources", "s"),), location="Kitchen"),),
    circuits=(
        Circuit(id="c1", tag="DB1-01", fed_from=Feed("boards", "b"), description="Pump", device="none"),
        Circuit(id="c2", tag="DB1-02", fed_from=Feed("boards", "b"), description="Lamps", device="none"),
    ),
    runs=(
        Run(id="r1", circuit_id="c1", number=1, from_point="way", to_point="p1", one_way_length_m=10.0,
            length_by="tape", size="4 mm2"),
        Run(id="r2", circuit_id="c2", number=1, from_point="way", to_point="p1", one_way_length_m=6.0,
            length_by="tape", size="2.5 mm2"),
        Run(id="r3", circuit_id="c2", number=2, from_point="p1", to_point="p2", one_way_length_m=6.0,
            length_by="tape", size="2.5 mm2"),
    ),
    loads=(
        Load(id="l1", circuit_id="c1", point="p1", tag="pump", current_a=4.0),
        Load(id="l2", circuit_id="c2", point="p2", tag="lamp", current_a=1.0),
    ),
    instruments=(
        Instrument(id="i1", tag="DMM", quantity="voltage", accuracy_percent=0.5, counts=2.0, resolution=0.01),
        Instrument(id="i2", tag="CLAMP", quantity="current", accuracy_percent=1.5, counts=3.0, resolution=0.01),
    ),
    visits=(Visit(id="v", tag="2026-03 as found", kind="as found", date="2026-03-12"),),
)  # fmt: skip
"""Two circuits on a board; nothing was read yet."""


def site_of(path: Path) -> Site:
    """What a site file holds now."""
    with SiteStore(path, read_only=True) as store:
        return store.site()


_NAMES = {" ": "space", ".": "full_stop", "/": "slash", "-": "minus", "?": "question_mark", ",": "comma"}
"""What the toolkit calls the keys of these letters."""


@dataclass
class Walk:
    """An app that is running, as a person at the keyboard and the screen."""

    app: OhmwalkApp
    pilot: Pilot[None]
    path: Path

    @property
    def survey(self) -> SurveyScreen:
        return self.app.walk_screen

    @property
    def index(self) -> Index:
        assert self.app.survey is not None
        return self.app.survey.index

    @property
    def screen(self) -> str:
        """The text on the screen, line by line."""
        strips = self.app.screen._compositor.render_strips()
        return "\n".join(strip.text.rstrip() for strip in strips)

    @property
    def record(self) -> Site:
        """What the file holds."""
        return site_of(self.path)

    async def keys(self, *keys: str) -> None:
        """Press keys, as quickly as a person who does not look up; the toolkit's names of keys."""
        letters = {name: letter for letter, name in _NAMES.items()}
        for key in keys:
            self.app.post_message(Key(key, letters.get(key, key if len(key) == 1 else None)))
        await self.until(lambda: self.app.type_ahead.is_idle, "the last key")
        await self.pilot.pause()

    async def type(self, text: str) -> None:
        """Type letters."""
        await self.keys(*(_NAMES.get(letter, letter) for letter in text))

    async def enter(self, *texts: str) -> None:
        """Type texts, each with Enter, and wait until it is saved."""
        for text in texts:
            await self.type(text)
            await self.keys("enter")
            await self.quiet()

    async def until(self, holds: Callable[[], bool], what: str = "") -> None:
        """Wait for something that a thread brings about."""
        last = time.monotonic() + PATIENCE_S
        while not holds():
            assert time.monotonic() < last, f"{what or 'it'} did not come about:\n{self.screen}"
            await self.pilot.pause(0.01)
        await self.pilot.pause()

    async def quiet(self) -> None:
        """Wait until nothing asked of the threads is open."""
        await self.until(lambda: not self.app._answers, "an answer of the store")

    async def judged(self) -> None:
        """Wait until all of the record is judged."""
        await self.quiet()
        await self.until(lambda: self.app.survey is not None and self.app.survey.assessment is not None, "a judgement")

    async def shows(self, text: str) -> None:
        """Wait until a text is on the screen."""
        await self.until(lambda: text in self.screen, repr(text))

    async def at(self, tag: str) -> None:
        """Put the cursor of the walk on a circuit or board."""
        site = self.index.site
        ids = {row.tag: row.id for row in site.sources} | {row.tag: row.id for row in site.boards}
        ids |= {row.tag: row.id for row in site.circuits}
        self.survey.walk.choose(ids[tag])
        await self.pilot.pause()


@asynccontextmanager
async def walking(path: Path, who: str = "Ada", size: tuple[int, int] = (80, 24)) -> AsyncIterator[Walk]:
    """Run the app on a site file until all of it is judged."""
    app = OhmwalkApp(path, PassingSettings("this laptop", who), now=lambda: NOON)
    async with app.run_test(size=size) as pilot:
        walk = Walk(app, pilot, path)
        await walk.judged()
        yield walk


async def cautions_read(walk: Walk) -> None:
    """Press m at the cursor and acknowledge the cautions."""
    await walk.keys("m")
    await walk.shows("Before the first live reading")
    await walk.keys("y")
    await walk.until(lambda: walk.survey.strip.is_open, "the strip")
