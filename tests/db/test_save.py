"""A save: all or nothing, and the record holds together after it."""

from __future__ import annotations

import sqlite3
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest

from db.errors import (
    DanglingReference,
    DuplicateTag,
    InvalidValue,
    RefusedSave,
    StillReferred,
    TakenId,
    UnknownRow,
)
from db.save import Save
from db.store import SiteStore
from rules.record import Board, Circuit, Feed, Instrument, Load, Reading, Row, Run, Site, Source, Visit, row_id

VOLTAGE: dict[str, Any] = {"circuit_id": "c1", "round": "1", "quantity": "voltage", "at": "way"}


def ask(store: SiteStore, *what: Callable[[Save], object]) -> None:
    """One save that asks for several things."""
    with store.save("ann", "asked") as save:
        for one in what:
            one(save)


def test_one_bad_row_saves_none(store: SiteStore, site: Site) -> None:
    version = store.version
    good, bad = (Reading(id="", **VOLTAGE, value=value) for value in (54.0, float("nan")))
    with pytest.raises(InvalidValue):
        ask(
            store,
            lambda save: save.add("readings", good),
            lambda save: save.settings(name="Changed"),
            lambda save: save.add_all("readings", [good, bad, good]),
        )
    assert store.site() == site
    assert store.version == version
    assert len(store.history()) == 1


def test_an_error_of_the_caller_saves_nothing_and_keeps_its_type(store: SiteStore, site: Site) -> None:
    def fail(_: Save) -> object:
        raise ZeroDivisionError

    with pytest.raises(ZeroDivisionError):
        ask(store, lambda save: save.settings(name="Changed"), fail)
    with pytest.raises(FileNotFoundError):
        ask(store, lambda save: save.settings(name="Changed"), lambda _: Path("nowhere").read_text())
    assert store.site() == site


def test_an_empty_save_leaves_no_trace(store: SiteStore, path: Path) -> None:
    before, version = path.read_bytes(), store.version
    with store.save("ann", "nothing") as save:
        pass
    with store.save("ann", "the same") as same:
        same.change("runs", "r1", size="12 AWG")
        same.remove("circuits", same.add("circuits", Circuit(id="", tag="for a moment")))
    assert not save.is_written
    assert not same.is_written
    assert path.read_bytes() == before
    assert store.version == version


@pytest.mark.parametrize("value", [float("nan"), float("inf"), -float("inf"), 10**400, "54", None, True])
def test_a_number_that_is_none_is_refused(store: SiteStore, value: Any) -> None:
    with pytest.raises(InvalidValue, match=r"^a voltage reading at 'way' .*: value takes a finite number, not "):
        ask(store, lambda save: save.change("readings", "x1", value=value))
    with pytest.raises(InvalidValue, match=r"^a reading: value takes a finite number"):
        ask(store, lambda save: save.add("readings", Reading(id="", **VOLTAGE, value=value)))


@pytest.mark.parametrize(
    ("table", "row"),
    [
        ("circuits", Circuit(id="n", tag="half \ud800")),
        ("circuits", Circuit(id="n", tag=None)),  # type: ignore[arg-type]
        ("circuits", Circuit(id="n", tag="B", device_poles=2**63)),
        ("circuits", Circuit(id="n", tag="B", device_poles=1.5)),  # type: ignore[arg-type]
        ("circuits", Circuit(id="n", tag="B", fed_from="db1")),  # type: ignore[arg-type]
        ("circuits", Circuit(id="n", tag="B", typed=(("colour", "red"),))),
        ("circuits", Circuit(id="n", tag="B", typed=(("notes", "\udfff"),))),
        ("circuits", Circuit(id="a/b", tag="B")),
        ("circuits", Circuit(id="?B", tag="B")),
        ("circuits", Run(id="n", circuit_id="c1", number=9)),
        ("boards", Board(id="n", tag="B", fed_by=[Feed("sources", "rect")])),  # type: ignore[arg-type]
        ("runs", Run(id="n", circuit_id="", number=9)),
    ],
)
def test_what_a_field_cannot_hold_is_refused(store: SiteStore, site: Site, table: str, row: Row) -> None:
    with pytest.raises(InvalidValue), store.save("ann", "bad") as save:
        save.add(table, row)
    assert store.site() == site


def test_a_prior_that_is_no_number_is_refused(store: SiteStore) -> None:
    with pytest.raises(InvalidValue, match="prior takes pairs of a cause and a finite number"):
        ask(store, lambda save: save.settings(prior=(("as_recorded", float("nan")),)))


@pytest.mark.parametrize(
    ("table", "row", "text"),
    [
        ("circuits", Circuit(id="", tag="DB1-01"), "circuit 'DB1-01' is there twice; each needs a tag of its own"),
        ("boards", Board(id="", tag="DB1"), "board 'DB1' is there twice"),
        ("sources", Source(id="", tag="RECT-1"), "source 'RECT-1' is there twice"),
        (
            "runs",
            Run(id="", circuit_id="c1", number=1),
            "run 1 of circuit 'DB1-01' is there twice; each needs a number",
        ),
        ("loads", Load(id="", circuit_id="c1", tag="pump"), "load 'pump' of circuit 'DB1-01' is there twice"),
        ("instruments", Instrument(id="", tag="DMM-1", quantity="voltage"), "instrument 'DMM-1' is there twice"),
        ("visits", Visit(id="", tag="2026-03 as found"), "visit '2026-03 as found' is there twice"),
    ],
)
def test_a_second_row_of_one_tag_is_refused(store: SiteStore, site: Site, table: str, row: Row, text: str) -> None:
    with pytest.raises(DuplicateTag, match=text), store.save("ann", "again") as save:
        save.add(table, row)
    assert store.site() == site


def test_readings_without_a_tag_may_be_alike_but_a_reading_s_tag_is_its_own(store: SiteStore) -> None:
    with store.save("ann", "twice") as save:
        save.add_all("readings", [Reading(id="", **VOLTAGE, value=54.0)] * 2)
        save.add("readings", Reading(id="", **VOLTAGE, value=54.0, tag="R1"))
    with pytest.raises(DuplicateTag, match="reading 'R1'"), store.save("ann", "again") as save:
        save.add("readings", Reading(id="", **VOLTAGE, value=53.0, tag="R1"))


def test_duplicates_among_very_many_rows_are_refused_too(store: SiteStore, site: Site) -> None:
    rows = [Circuit(id="", tag=f"C{n}") for n in range(1200)]
    with store.save("ann", "many") as save:
        save.add_all("circuits", rows)
    more = [*(Circuit(id="", tag=f"D{n}") for n in range(1200)), Circuit(id="", tag="C1199")]
    with pytest.raises(DuplicateTag, match="circuit 'C1199' is there twice"):
        ask(store, lambda save: save.add_all("circuits", more))
    assert len(store.site().circuits) == len(site.circuits) + 1200


def test_tags_may_change_places_within_one_save(store: SiteStore) -> None:
    with store.save("ann", "swap") as save:
        save.change("circuits", "c1", tag="DB1-02")
        save.change("circuits", "c2", tag="DB1-01")
    assert [(row.id, row.tag) for row in store.site().circuits] == [("c1", "DB1-02"), ("c2", "DB1-01")]


@pytest.mark.parametrize(
    ("table", "row", "text"),
    [
        (
            "circuits",
            Circuit(id="", tag="B", fed_from=Feed("", "?DB9")),
            "fed_from must name a board or a source .* no 'DB9'",
        ),
        ("circuits", Circuit(id="", tag="B", fed_from=Feed("boards", "db9")), "there is no board 'db9'"),
        (
            "circuits",
            Circuit(id="", tag="B", fed_from=Feed("circuits", "c1")),
            "fed_from must name a board or a source",
        ),
        ("boards", Board(id="", tag="B", fed_by=(Feed("sources", "rect"), Feed("sources", "s9"))), "no source 's9'"),
        ("runs", Run(id="", circuit_id="?X", number=1), "circuit_id must name a circuit .* no 'X'"),
        ("runs", Run(id="", circuit_id="c1", number=2, to_board_id="db9"), "to_board_id must name a board"),
        ("readings", Reading(id="", **VOLTAGE, replaces_id="x9"), "replaces_id must name a reading"),
        ("readings", Reading(id="", round="1", board=Feed("boards", "db9")), "board must name a board or a source"),
    ],
)
def test_a_reference_to_nothing_is_refused(store: SiteStore, site: Site, table: str, row: Row, text: str) -> None:
    with pytest.raises(DanglingReference, match=text), store.save("ann", "dangling") as save:
        save.add(table, row)
    assert store.site() == site


def test_a_row_may_be_added_before_what_it_refers_to(store: SiteStore) -> None:
    with store.save("ann", "in any order") as save:
        save.add("runs", Run(id="", circuit_id="new", number=1))
        save.add("circuits", Circuit(id="new", tag="B", fed_from=Feed("boards", "newer")))
        save.add("boards", Board(id="newer", tag="DB2", fed_by=(Feed("circuits", "new", "p1"),)))
    assert store.site().boards[-1].fed_by == (Feed("circuits", "new", "p1"),)
    assert store.verify() == ()


@pytest.mark.parametrize(
    ("table", "id_", "text"),
    [
        ("circuits", "c1", "circuit 'DB1-01' cannot be removed: run 1.*, load 'pump'.*, .* 1 more refer to it"),
        ("boards", "db1", "board 'DB1' cannot be removed: circuit 'DB1-01', circuit 'DB1-02' refer to it"),
        ("sources", "rect", "source 'RECT-1' cannot be removed: board 'DB1' refers to it"),
        ("instruments", "m1", "instrument 'DMM-1' cannot be removed: a voltage reading at 'way'"),
        ("visits", "v1", "visit '2026-03 as found' cannot be removed: a voltage reading"),
    ],
)
def test_the_removal_of_what_others_refer_to_is_refused(
    store: SiteStore, site: Site, table: str, id_: str, text: str
) -> None:
    with pytest.raises(StillReferred, match=text), store.save("ann", "remove") as save:
        save.remove(table, id_)
    assert store.site() == site
    assert store.verify() == ()


def test_a_row_and_all_that_refers_to_it_may_go_together(store: SiteStore) -> None:
    with store.save("ann", "remove") as save:
        save.remove("circuits", "c1")
        for table, id_ in (("runs", "r1"), ("loads", "l1"), ("readings", "x1"), ("readings", "x2")):
            save.remove(table, id_)
    assert [row.id for row in store.site().circuits] == ["c2"]
    assert store.verify() == ()


def test_a_removal_is_refused_where_another_row_comes_to_refer_in_the_same_save(store: SiteStore) -> None:
    with pytest.raises(DanglingReference):
        ask(
            store,
            lambda save: save.remove("circuits", "c2"),
            lambda save: save.add("runs", Run(id="", circuit_id="c2", number=2)),
        )


@pytest.mark.parametrize(
    "what",
    [
        lambda save: save.change("circuits", "c9", tag="B"),
        lambda save: save.change("circuits", "c1", colour="red"),
        lambda save: save.change("circuits", "c1", position=0),
        lambda save: save.remove("circuits", "c9"),
        lambda save: save.remove("cupboards", "c1"),
        lambda save: save.add("saves", Circuit(id="", tag="B")),
        lambda save: (save.remove("loads", "l1"), save.change("loads", "l1", point="p2")),
    ],
)
def test_a_change_to_what_is_not_there_is_refused(store: SiteStore, site: Site, what: Any) -> None:
    with pytest.raises(UnknownRow):
        ask(store, what)
    assert store.site() == site


def test_ids_of_tagged_rows_follow_the_tag_and_are_salted_where_taken_even_by_a_removed_row(store: SiteStore) -> None:
    def added(tag: str) -> str:
        with store.save("ann", "add") as save:
            return save.add("circuits", Circuit(id="", tag=tag))

    assert added("B1-07") == row_id("circuits", "B1-07")
    with store.save("ann", "rename") as save:
        save.change("circuits", row_id("circuits", "B1-07"), tag="B1-08")
    again = added("B1-07")
    assert again == row_id("circuits", "B1-07", salt=1)
    with store.save("ann", "remove") as save:
        save.remove("circuits", again)
    assert added("B1-07") == row_id("circuits", "B1-07", salt=2)
    with store.save("ann", "both at once") as save:
        assert save.add_all("circuits", [Circuit(id="", tag="N")] * 2) == [
            row_id("circuits", "N"),
            row_id("circuits", "N", salt=1),
        ]
        save.remove("circuits", row_id("circuits", "N"))


def test_ids_of_readings_are_random(store: SiteStore) -> None:
    with store.save("ann", "twice") as save:
        ids = save.add_all("readings", [Reading(id="", **VOLTAGE, value=54.0)] * 2)
    assert len(set(ids)) == 2
    assert all(len(id_) == 32 for id_ in ids)


@pytest.mark.parametrize("ids", [["c1"], ["gone"], ["n", "n"]])
def test_an_id_that_is_or_was_taken_is_refused(store: SiteStore, ids: list[str]) -> None:
    with store.save("ann", "add") as save:
        save.add("circuits", Circuit(id="gone", tag="GONE"))
    with store.save("ann", "remove") as save:
        save.remove("circuits", "gone")
    with pytest.raises(TakenId), store.save("ann", "again") as save:
        save.add_all("circuits", [Circuit(id=id_, tag=f"B{n}") for n, id_ in enumerate(ids)])


def test_a_typed_text_goes_when_its_field_is_set_otherwise_and_others_stay(store: SiteStore) -> None:
    def typed(**fields: Any) -> tuple[tuple[str, str], ...]:
        with store.save("ann", "change") as save:
            save.change("runs", "r1", **fields)
        assert store.verify() == ()
        return store.site().runs[0].typed

    assert typed(notes="wet") == (("one_way_length_m", "45 ft"),)
    assert typed(conductor_temperature_c=25.0, typed=(("conductor_temperature_c", "77 degF"),)) == (
        ("conductor_temperature_c", "77 degF"),
        ("one_way_length_m", "45 ft"),
    )
    assert typed(one_way_length_m=14.0) == (("conductor_temperature_c", "77 degF"),)
    # Only the text differs: that is a change too.
    assert typed(one_way_length_m=14.0, typed=(("one_way_length_m", "14 m"),))[1] == ("one_way_length_m", "14 m")
    with pytest.raises(InvalidValue, match="which is not being set"), store.save("ann", "bad") as save:
        save.change("runs", "r1", notes="", typed=(("one_way_length_m", "14 m"),))


def test_rows_stand_in_the_order_in_which_they_were_added(store: SiteStore) -> None:
    with store.save("ann", "one") as save:
        save.add_all("circuits", [Circuit(id="z", tag="Z"), Circuit(id="a", tag="A")])
    with store.save("ann", "two") as save:
        save.add("circuits", Circuit(id="m", tag="M"))
        save.change("circuits", "c1", notes="changed, not moved")
    assert [row.id for row in store.site().circuits] == ["c1", "c2", "z", "a", "m"]


def test_settings_are_saved_one_by_one(store: SiteStore, site: Site) -> None:
    with store.save("ann", "settings") as save:
        save.settings(limits="ours.toml", own_limits="", prior=())
        save.settings(ambient_temperature_c=30, typed=(("ambient_temperature_c", "86 degF"),))
    expected = replace(site, limits="ours.toml", own_limits="", prior=(), ambient_temperature_c=30.0)
    assert store.site() == replace(expected, typed=(("ambient_temperature_c", "86 degF"),))
    with store.save("ann", "no profile of our own") as save:
        save.settings(own_limits=None, limits="general")
    assert store.site().own_limits is None
    assert store.verify() == ()


def test_put_takes_over_the_settings_and_adds_the_rows(path: Path, site: Site) -> None:
    with SiteStore.create(path, None, "ann", "lap", "new") as store:
        assert store.site() == Site(name="pump")
        with store.save("ann", "intake") as save:
            save.put(site)
        assert store.site() == site
        assert store.site().circuits[0].id == "c1"


def test_who_and_why_must_be_text(store: SiteStore) -> None:
    with pytest.raises(InvalidValue, match="who takes text"), store.save("half \ud800", "bad") as save:
        save.settings(name="x")


def test_a_save_within_a_save_sees_what_was_before_and_cannot_begin(store: SiteStore, site: Site) -> None:
    with store.save("ann", "outer") as save:
        save.settings(name="outer")
        assert store.site() == site
        with pytest.raises(sqlite3.OperationalError), store.save("ann", "inner"):
            pass
    assert store.site().name == "outer"


def test_every_refusal_is_a_single_line(store: SiteStore) -> None:
    def refused(what: Any) -> str:
        with pytest.raises(RefusedSave) as caught:
            ask(store, what)
        return str(caught.value)

    def add(save: Save, tag: str) -> None:
        save.add_all("circuits", [Circuit(id="", tag=tag)] * 2)

    assert refused(lambda save: add(save, "two\nlines\x1b[2J")).isprintable()
    assert refused(lambda save: save.change("circuits", "two\nlines")).isprintable()
    assert refused(lambda save: save.add("circuits", Circuit(id="", tag="B", fed_from=Feed("", "?a\nb")))).isprintable()
