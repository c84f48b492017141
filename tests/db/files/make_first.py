"""
Makes ``first.ohmwalk``: a filled file of the first schema, kept for the migrations that follow.

    python tests/db/files/make_first.py

Run once, by the program whose newest migration was ``m001_create_site``; the file is never made anew. It has
rows in every table, typed texts, changes, a removal, an undoing and a redoing, by two people on two laptops.
"""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

from db.store import SiteStore
from rules.record import (
    Acknowledgement,
    Board,
    Circuit,
    Decision,
    Feed,
    Instrument,
    Load,
    Reading,
    Run,
    Site,
    Source,
    Visit,
)

TARGET = Path(__file__).with_name("first.ohmwalk")

START = Site(
    name="Salt store [north]",
    address="Quay 4",
    limits="ours.toml",
    nominal_voltage_v=48.0,
    ambient_temperature_c=30.0,
    surveyed_by="Ann",
    extent="both boards",
    limitations="the cellar was flooded",
    notes="two\nlines",
    prior=(("as_recorded", 0.8), ("bad_connection", 0.2)),
    own_limits='base = "general"\n',
    typed=(("ambient_temperature_c", "86 degF"),),
    sources=(
        Source(id="rect", tag="RECT-1", kind="rectifier", nominal_voltage_v=48.0, working_voltage_v=54.5, cells=24),
        Source(
            id="conv", tag="CONV-1", kind="converter", fed_from=Feed("circuits", "c2", "p1"), efficiency_percent=90.0
        ),
    ),
    boards=(
        Board(id="db1", tag="DB1", fed_by=(Feed("sources", "rect"),), location="plant room", walk_order=1.0),
        Board(id="db2", tag="DB2", fed_by=(Feed("sources", "conv"), Feed("circuits", "c1"))),
    ),
    circuits=(
        Circuit(id="c1", tag="DB1-01", fed_from=Feed("boards", "db1"), device="breaker C", rated_current_a=16.0),
        Circuit(id="c2", tag="DB1-02", fed_from=Feed("boards", "db1"), device_poles=2, not_tested="no access"),
        Circuit(id="c3", tag="DB2-01 = <b>", fed_from=Feed("boards", "db2")),
    ),
    runs=(
        Run(
            id="r1",
            circuit_id="c1",
            number=1,
            from_point="way",
            to_board_id="db2",
            one_way_length_m=13.716,
            size="12 AWG",
            typed=(("one_way_length_m", "45 ft"),),
        ),
        Run(
            id="r2", circuit_id="c2", number=1, from_point="way", to_point="p1", one_way_length_m=0.1 + 0.2, parallel=2
        ),
    ),
    loads=(Load(id="l1", circuit_id="c3", point="way", tag="lamp", power_w=20.0, function="life safety"),),
    instruments=(
        Instrument(id="m1", tag="DMM-1", quantity="voltage", full_scale=60.0, accuracy_percent=0.5, counts=2.0),
    ),
    visits=(Visit(id="v1", tag="2026-03 as found", kind="as found", date="2026-03-02"),),
    readings=(
        Reading(id="x1", circuit_id="c1", round="1", quantity="voltage", at="way", value=54.05, tag="R1"),
        Reading(id="x2", board=Feed("boards", "db1"), round="1", quantity="voltage", at="bus", value=54.1),
        Reading(
            id="x3",
            circuit_id="c1",
            round="1",
            quantity="voltage",
            at="way",
            value=54.04,
            replaces_id="x1",
            reason="slip",
        ),
    ),
    decisions=(
        Decision(
            id="d1", finding="VD01:DB1-01", decision="sent back", by="Ida", at="2026-03-03T09:00", reason="length?"
        ),
    ),
    acknowledged=(Acknowledgement(id="a1", caution="live", visit="2026-03 as found", by="Ann", at="2026-03-02T08:00"),),
)
"""What the first save put in."""

EXPECTED = replace(
    START,
    notes="dry again",
    circuits=(START.circuits[0], replace(START.circuits[1], notes="behind the pump"), START.circuits[2]),
    runs=(START.runs[0], replace(START.runs[1], one_way_length_m=8.0)),
    visits=(*START.visits, Visit(id="v2", tag="2026-04 as left")),
    acknowledged=(),
)
"""What all saves came to."""

WHYS = ("intake", "notes", "walk", "a second visit", "undo: a second visit", "redo: a second visit", "no caution")
"""What the saves were for, the earliest first."""


def main() -> None:
    """Make the file, where there is none."""
    with SiteStore.create(TARGET, START, "Ann", "laptop-a", "intake") as store, store.save("Ann", "notes") as save:
        save.settings(notes="dry again")
    with SiteStore(TARGET, laptop="laptop-b") as store:
        with store.save("Bob", "walk") as save:
            save.change("circuits", "c2", notes="behind the pump")
            save.change("runs", "r2", one_way_length_m=8.0)
        with store.save("Bob", "a second visit") as save:
            save.add("visits", Visit(id="v2", tag="2026-04 as left"))
        store.undo("Bob")
        store.redo("Bob")
        with store.save("Bob", "no caution") as save:
            save.remove("acknowledged", "a1")


if __name__ == "__main__":
    main()
