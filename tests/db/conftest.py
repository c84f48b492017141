"""A small site, and a file that holds it."""

from __future__ import annotations

import os
from collections.abc import Iterator
from pathlib import Path

import pytest

from db import connection
from db.store import SiteStore
from rules.record import Board, Circuit, Feed, Instrument, Load, Reading, Run, Site, Source, Visit


@pytest.fixture
def site() -> Site:
    """A rectifier, one board, two circuits with runs, loads and readings, one text typed in feet."""
    return Site(
        name="Pump house",
        nominal_voltage_v=48.0,
        prior=(("as_recorded", 0.9), ("bad_connection", 0.1)),
        sources=(Source(id="rect", tag="RECT-1", kind="rectifier", nominal_voltage_v=48.0),),
        boards=(Board(id="db1", tag="DB1", fed_by=(Feed("sources", "rect"),)),),
        circuits=(
            Circuit(id="c1", tag="DB1-01", fed_from=Feed("boards", "db1"), device="breaker C", rated_current_a=16.0),
            Circuit(id="c2", tag="DB1-02", fed_from=Feed("boards", "db1")),
        ),
        runs=(
            Run(
                id="r1",
                circuit_id="c1",
                number=1,
                from_point="way",
                to_point="p1",
                one_way_length_m=13.716,
                size="12 AWG",
                typed=(("one_way_length_m", "45 ft"),),
            ),
            Run(id="r2", circuit_id="c2", number=1, from_point="way", to_point="p1", one_way_length_m=8.0),
        ),
        loads=(Load(id="l1", circuit_id="c1", point="p1", tag="pump", current_a=8.0),),
        instruments=(Instrument(id="m1", tag="DMM-1", quantity="voltage", accuracy_percent=0.5),),
        visits=(Visit(id="v1", tag="2026-03 as found", kind="as found"),),
        readings=(
            reading(id="x1", at="way", value=54.05),
            reading(id="x2", at="p1", value=0.1 + 0.2),
        ),
    )


def reading(**fields: object) -> Reading:
    """A voltage read with ``DMM-1`` on the first circuit."""
    usual = {
        "circuit_id": "c1",
        "visit": "2026-03 as found",
        "round": "1",
        "quantity": "voltage",
        "instrument": "DMM-1",
    }
    return Reading(**{**usual, **fields})  # type: ignore[arg-type]


@pytest.fixture(scope="module")
def no_waiting_for_the_disk() -> Iterator[None]:
    """For stories of hundreds of saves, none of which is about what a power cut leaves."""
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(connection, "SYNCHRONOUS", "OFF")
        patch.setattr(os, "fsync", lambda _: None)
        yield


@pytest.fixture
def path(tmp_path: Path) -> Path:
    """Where a site file may be made."""
    return tmp_path / "pump.ohmwalk"


@pytest.fixture
def store(path: Path, site: Site) -> Iterator[SiteStore]:
    """The small site in a file, opened by laptop ``lap``; its first save is by ``ann``."""
    with SiteStore.create(path, site, "ann", "lap", "first") as opened:
        yield opened
