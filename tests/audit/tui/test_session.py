"""The thread that owns the file and the thread that judges, without a screen."""

from __future__ import annotations

import os
import queue
import threading
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest
from textual.message import Message

from audit.tui import judge as judging
from audit.tui.drawing.walk import walk_stops
from audit.tui.edits import Add, Change, ChangeSettings, Edit, Remove
from audit.tui.judge import Judge
from audit.tui.messages import Assessed, Crashed, Judged, Loaded, Outlined, Refused, Saved, Troubled, Undone, Unjudged
from audit.tui.run import run_survey
from audit.tui.session import Session
from audit.tui.settings import PassingSettings
from audit.tui.state import latest_visit
from db import connection
from db.errors import NoSuchSite, NotASiteFile
from db.store import SiteStore
from rules.index import Index
from rules.record import Feed, Load, Reading, Site, Visit, rows_of
from tests.audit.tui.walker import HUT, site_of

PATIENCE_S = 60.0


class Told:
    """What a thread told, in order."""

    def __init__(self) -> None:
        self.messages: queue.Queue[Message] = queue.Queue()
        self.outlines: list[Outlined] = []

    def __call__(self, message: Message) -> None:
        if isinstance(message, Outlined):
            self.outlines.append(message)
        else:
            self.messages.put(message)

    def next(self) -> Message:
        return self.messages.get(timeout=PATIENCE_S)


@contextmanager
def session(path: Path) -> Iterator[tuple[Session, Told]]:
    told = Told()
    thread = Session(path, "laptop", told)
    thread.start()
    try:
        yield thread, told
    finally:
        thread.stop()


def test_a_record_is_loaded_then_each_save_is_answered_with_the_record_up_to_date(hut: Path) -> None:
    with session(hut) as (thread, told):
        first = told.next()
        assert isinstance(first, Loaded)
        assert first.site == HUT
        assert not first.read_only
        load = Load(id="", circuit_id="c1", point="p1", tag="extra", current_a=1.0)
        edit = Edit("changes", (Add("loads", load), Change("circuits", "c1", {"description": "Well"}),
                                ChangeSettings({"address": "Lane 1"}), Remove("loads", "l2")))  # fmt: skip
        thread.save(edit, "Ada")
        loaded, saved = told.next(), told.next()
        assert isinstance(loaded, Loaded)
        assert isinstance(saved, Saved)
        assert saved.edit is edit
        assert saved.ids[1:] == ("c1", "", "l2")
        assert [row.tag for row in loaded.site.loads] == ["pump", "extra"]
        assert (loaded.site.circuits[0].description, loaded.site.address) == ("Well", "Lane 1")


def test_what_the_walk_shows_comes_before_all_the_rest(hut: Path) -> None:
    with session(hut) as (thread, told):
        thread.look()
        first = told.next()
        assert isinstance(first, Loaded)
        (outline,) = told.outlines
        whole, seen = first.site, outline.site
        assert (seen.sources, seen.boards, seen.circuits, seen.visits) == (
            whole.sources, whole.boards, whole.circuits, whole.visits,
        )  # fmt: skip
        assert (seen.runs, seen.loads, seen.readings) == ((), (), ())
        assert walk_stops(outline.index) == walk_stops(first.index)


def a_reading(value: float, circuit: str = "c1", **more: Any) -> Reading:
    return Reading(id="", circuit_id=circuit, round="1", quantity="voltage", at="way", value=value, **more)


def test_what_was_written_is_all_that_is_read_anew(hut: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """The record and its index are after each save as if all of it had been read."""
    whole: list[SiteStore] = []
    read = SiteStore.site

    def site(store: SiteStore, *tables: Any) -> Site:
        whole.append(store)
        return read(store, *tables)

    monkeypatch.setattr(SiteStore, "site", site)

    def as_read(loaded: Loaded) -> None:
        there = site_of(hut)
        assert list(rows_of(loaded.site)) == list(rows_of(there))
        assert loaded.site == there
        fresh, index = Index(there), loaded.index
        assert (index.readings, index.replaced) == (fresh.readings, fresh.replaced)
        assert all(index.readings_of(id_) == fresh.readings_of(id_) for id_ in ("c1", "c2", "b", "s"))
        assert index.site is loaded.site
        assert walk_stops(index) == walk_stops(fresh)
        assert all(index.points_of(id_) == fresh.points_of(id_) for id_ in ("c1", "c2"))

    with session(hut) as (thread, told):
        loaded = told.next()
        assert isinstance(loaded, Loaded)

        def save(*steps: Any) -> tuple[str, ...]:
            whole.clear()
            thread.save(Edit("one", steps), "Ada")
            loaded, saved = told.next(), told.next()
            assert isinstance(loaded, Loaded)
            assert isinstance(saved, Saved)
            assert whole == []
            as_read(loaded)
            return saved.ids

        (first,) = save(Add("readings", a_reading(12.5)))
        (second,) = save(Add("readings", a_reading(12.3, "c2")))
        on_busbar = replace(a_reading(12.6, ""), board=Feed("boards", "b"), at="bus")
        save(Add("readings", on_busbar))
        save(Change("readings", first, {"tag": "r-1"}), Add("readings", a_reading(12.4, replaces_id=first)))
        save(Change("readings", second, {"circuit_id": "c1"}))
        save(Remove("readings", second))
        (load,) = save(Add("loads", Load(id="", circuit_id="c1", point="p1", tag="fan", current_a=1.0)))
        save(Remove("loads", load), Add("readings", a_reading(12.1)))
        save(Change("circuits", "c2", {"walk_order": -1.0}))
        for settings_too in (False, True):
            if settings_too:
                thread.save(Edit("one", (ChangeSettings({"name": "Shed"}),)), "Ada")
            else:
                thread.undo("Ada")
            loaded = told.next()
            assert isinstance(loaded, Loaded)
            as_read(loaded)
            told.next()
        with SiteStore(hut, laptop="another") as other, other.save("Bob", "one") as save_of_other:
            save_of_other.add("readings", a_reading(11.9, "c2"))
        loaded = told.next()
        assert isinstance(loaded, Loaded)
        as_read(loaded)
        save(Add("readings", a_reading(11.8, "c2")))


def test_an_edit_is_saved_whole_or_not_at_all(hut: Path) -> None:
    with session(hut) as (thread, told):
        told.next()
        edit = Edit("half", (Change("circuits", "c1", {"description": "Well"}), Remove("circuits", "c2")))
        thread.save(edit, "Ada")
        refused = told.next()
        assert isinstance(refused, Refused)
        assert refused.edit is edit
        assert refused.line.startswith("circuit 'DB1-02' cannot be removed")
    assert site_of(hut) == HUT


def test_undo_and_redo_tell_what_they_did(hut: Path) -> None:
    with session(hut) as (thread, told):
        told.next()
        thread.undo("Ada")
        nothing = told.next()
        assert isinstance(nothing, Undone)
        assert nothing.what is None
        thread.save(Edit("name", (ChangeSettings({"name": "Shed"}),)), "Ada")
        told.next(), told.next()
        thread.undo("Ada")
        loaded, undone = told.next(), told.next()
        assert isinstance(loaded, Loaded)
        assert isinstance(undone, Undone)
        assert (loaded.site.name, undone.what, undone.again) == ("Hut", "name", False)
        thread.undo("Ada", again=True)
        loaded, undone = told.next(), told.next()
        assert isinstance(loaded, Loaded)
        assert loaded.site.name == "Shed"


def test_what_another_program_saves_is_seen_within_two_seconds(hut: Path) -> None:
    """The quickest of some: this machine may be busy with something else for a while."""
    took: list[float] = []
    with session(hut) as (_, told), SiteStore(hut, laptop="another") as other:
        told.next()
        while len(took) < 10 and not (took and min(took) < 2):
            with other.save("Bob", "his") as save:
                save.settings(name=f"Bob's hut {len(took)}")
            start = time.monotonic()
            loaded = told.next()
            assert isinstance(loaded, Loaded)
            assert loaded.site.name == f"Bob's hut {len(took)}"
            took.append(time.monotonic() - start)
    assert min(took) < 2


def test_everything_asked_for_is_saved_before_the_end(hut: Path) -> None:
    with session(hut) as (thread, told):
        told.next()
        for number in range(5):
            thread.save(Edit("one", (ChangeSettings({"name": f"Hut {number}"}),)), "Ada")
    assert site_of(hut).name == "Hut 4"


def test_a_file_that_was_spoilt_is_said_once(hut: Path) -> None:
    with session(hut) as (_, told):
        told.next()
        hut.write_bytes(b"no database" * 1_000)
        trouble = told.next()
        assert isinstance(trouble, Troubled)
        assert str(hut) not in trouble.line
        with pytest.raises(queue.Empty):
            told.messages.get(timeout=1.2)


@pytest.mark.parametrize(
    ("harm", "line"),
    [
        (lambda path: os.truncate(path, 0), "this site file was emptied while it was open"),
        (lambda path: os.truncate(path, 5_000), "this site file is damaged (database disk image is malformed)"),
        (Path.unlink, "this file was removed or moved away while it was open"),
    ],
)
def test_a_save_in_a_file_that_is_spoilt_is_refused_with_a_line(
    hut: Path, harm: Callable[[Path], object], line: str
) -> None:
    with session(hut) as (thread, told):
        told.next()
        harm(hut)
        thread.save(Edit("a name", (ChangeSettings({"name": "Shed"}),)), "Ada")
        refused = next(message for message in iter(told.next, None) if isinstance(message, Refused))
        assert refused.line == line


def test_a_file_that_cannot_be_opened_is_told(tmp_path: Path) -> None:
    with session(tmp_path / "none.ohmwalk") as (_, told):
        trouble = told.next()
        assert isinstance(trouble, Troubled)
        assert trouble.line == "there is no such file"


def test_a_fault_of_the_program_is_not_swallowed(hut: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("audit.tui.session.read_by_visit", lambda site: 1 / 0)
    with session(hut) as (_, told):
        crashed = told.next()
        assert isinstance(crashed, Crashed)
        assert isinstance(crashed.error, ZeroDivisionError)


def test_a_file_is_looked_at_before_any_screen_is_drawn(tmp_path: Path) -> None:
    settings = PassingSettings("laptop", "Ada")
    with pytest.raises(NoSuchSite):
        run_survey(tmp_path / "none.ohmwalk", settings)
    (tmp_path / "plan.ohmwalk").write_text("%PDF", encoding="utf-8")
    with pytest.raises(NotASiteFile):
        run_survey(tmp_path / "plan.ohmwalk", settings)


def test_a_file_that_may_only_be_read_is_opened(hut: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(connection, "_may_write", lambda path: False)
    with session(hut) as (thread, told):
        loaded = told.next()
        assert isinstance(loaded, Loaded)
        assert loaded.read_only
        thread.save(Edit("name", (ChangeSettings({"name": "Shed"}),)), "Ada")
        refused = told.next()
        assert isinstance(refused, Refused)
        assert refused.line == "this file was opened for reading only"


# --- the judge


@contextmanager
def judge() -> Iterator[tuple[Judge, Told]]:
    told = Told()
    thread = Judge(told)
    thread.start()
    try:
        yield thread, told
    finally:
        thread.stop()
        thread.join()


def test_what_is_in_sight_is_judged_first_then_all() -> None:
    with judge() as (thread, told):
        thread.judge(HUT, ("c2", "gone"))
        first, rest, whole = told.next(), told.next(), told.next()
        assert isinstance(first, Judged)
        assert list(first.results) == ["c2"]
        assert first.site is HUT
        assert isinstance(rest, Judged)
        assert list(rest.results) == ["c1", "c2"]
        assert isinstance(whole, Assessed)
        assert [result.circuit_id for result in whole.assessment.circuits] == ["c1", "c2"]
        assert whole.assessment.circuits[1] == first.results["c2"]


def test_only_the_newest_record_is_judged_whole(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(judging, "LONGEST_WAIT_S", 5.0)
    with judge() as (thread, told):
        thread._last_took_s = 5.0  # as after a large site
        newer = replace(HUT, name="Newer")
        thread.judge(HUT, ("c1",))
        first = told.next()
        assert isinstance(first, Judged)
        thread._last_took_s = 0.0
        thread.judge(newer, ("c1",))
        second, third, whole = told.next(), told.next(), told.next()
        assert isinstance(second, Judged)
        assert isinstance(third, Judged)
        assert isinstance(whole, Assessed)
        assert second.site is third.site is whole.site is newer


def test_a_judgement_ends_where_something_newer_is_asked_for(monkeypatch: pytest.MonkeyPatch) -> None:
    """A site of 10,000 circuits takes minutes; what was just saved must not wait for them."""
    monkeypatch.setattr("rules.assess.TOGETHER", 1)
    newer = replace(HUT, name="Newer")
    with judge() as (thread, told):

        def post(message: Message) -> None:
            if isinstance(message, Judged) and list(message.results) == ["c1"] and message.site is HUT:
                thread.judge(newer, ())
            told(message)

        thread._post = post
        thread.judge(HUT, ())
        heard = [told.next()]
        while not isinstance(heard[-1], Assessed):
            heard.append(told.next())
        of_first = [message for message in heard if isinstance(message, Judged) and message.site is HUT]
        assert [list(message.results) for message in of_first] == [[], ["c1"]]
        assert heard[-1].site is newer


def test_limits_that_are_not_there_are_told() -> None:
    with judge() as (thread, told):
        thread.judge(replace(HUT, limits="none such"), ())
        trouble = told.next()
        assert isinstance(trouble, Unjudged)
        assert "none such" in trouble.line
        assert "\n" not in trouble.line
        thread.judge(HUT, ())
        assert isinstance(told.next(), Judged)


def test_a_fault_of_the_judge_is_not_swallowed(monkeypatch: pytest.MonkeyPatch) -> None:
    def broken(site: Site, limits: object) -> Callable[[], None]:
        raise ZeroDivisionError

    monkeypatch.setattr("rules.assess.prepare", broken)
    with judge() as (thread, told):
        thread.judge(HUT, ())
        assert isinstance(told.next(), Crashed)
    assert threading.active_count() >= 1


def test_the_latest_visit_goes_by_order_then_by_time() -> None:
    visits = (Visit(id="v", tag="two", walk_order=2.0), Visit(id="w", tag="one", walk_order=1.0))
    assert latest_visit(replace(HUT, visits=visits)) == "two"
    readings = tuple(
        Reading(id=name, circuit_id="c1", visit=name, round="1", quantity="voltage", at="way", value=1, taken_at=at)
        for name, at in (("late", "2026-05-01"), ("early", "2026-01-01"))
    )
    assert latest_visit(replace(HUT, visits=(), readings=readings)) == "late"
    assert latest_visit(Site(name="x")) == ""
