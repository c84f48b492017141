"""What does not hold together is found, all of it in one go, and nothing else is."""

from __future__ import annotations

import math
import time
import tomllib
from copy import deepcopy
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest

from audit.intake.folder import site_of
from rules.consistency import problems
from rules.record import Board, Circuit, Feed, Instrument, Load, Reading, Run, Site, Source, Visit

Tables = dict[str, list[dict[str, str]]]

GOOD: Tables = {
    "sources": [
        {"source": "BATT", "kind": "battery", "nominal": "48", "lowest": "43", "highest": "56"},
        {"source": "CONV", "kind": "converter", "nominal": "24", "fed_from": "C2:lamp"},
    ],
    "boards": [{"board": "MDB", "fed_by": "BATT"}, {"board": "B2", "fed_by": "C1"}],
    "circuits": [
        {"circuit": "C1", "fed_from": "MDB", "device": "fuse gG"},
        {"circuit": "C2", "fed_from": "B2", "device": "none"},
        {"circuit": "C3", "fed_from": "CONV"},
    ],
    "runs": [
        {"circuit": "C1", "run": "1", "from": "way", "to": "p1", "length": "10", "size": "16 mm2"},
        {"circuit": "C1", "run": "2", "from": "p1", "to": "p2", "length": "5", "size": "16 mm2"},
        {"circuit": "C2", "run": "1", "from": "way", "to": "lamp", "length": "5", "size": "2.5 mm2"},
    ],
    "loads": [{"circuit": "C2", "point": "lamp", "load": "LAMP", "current": "2", "lowest": "20", "highest": "60"}],
    "instruments": [
        {"instrument": "DMM", "quantity": "voltage", "range": "60", "accuracy": "0.5", "counts": "2", "resolution": "0.01"},
        {"instrument": "DMM", "quantity": "voltage", "range": "0.6", "accuracy": "0.5", "counts": "2", "resolution": "1e-4"},
        {"instrument": "CLAMP", "quantity": "current", "range": "", "accuracy": "2", "counts": "5", "resolution": "0.1"},
    ],
    "visits": [{"visit": "1", "kind": "as found", "date": "2026-03-14"}],
    "readings": [
        {"circuit": "C1", "round": "1", "quantity": "voltage", "at": "p1", "value": "47", "instrument": "DMM"},
        {"circuit": "C1", "round": "1", "quantity": "drop", "at": "way", "to": "p2", "value": "0.4"},
        {"circuit": "C1", "round": "1", "quantity": "joint", "at": "run 2 end", "leg": "positive", "value": "0.01"},
        {"circuit": "C1", "round": "1", "quantity": "current", "at": "way", "value": "9", "instrument": "CLAMP"},
        {"circuit": "C1", "round": "1", "quantity": "residual", "at": "run 1", "value": "0.01"},
        {"circuit": "C1", "round": "1", "quantity": "temperature", "at": "run 1 start", "value": "31"},
        {"circuit": "C1", "round": "1", "quantity": "resistance", "at": "p1", "to": "p2", "leg": "positive", "value": "0.01"},
        {"board": "MDB", "circuit": "", "round": "1", "quantity": "voltage", "at": "bus", "value": "48", "reading": "R1"},
        {"circuit": "C1", "round": "1", "quantity": "voltage", "at": "p2", "value": "46", "reading": "R2", "replaces": "R1"},
    ],
}  # fmt: skip
"""A small site with every kind of row; each case below breaks it in one place."""


def judged(tables: Tables) -> list[str]:
    """Every problem as ``table row column: text``, the rows counted from 0."""
    return told(site_of(tables, check=False))


def told(site: Site) -> list[str]:
    places = {row.id: n for table in GOOD for n, row in enumerate(site.table(table))}
    return [f"{p.table} {places.get(p.row, '-')} {p.column}: {p.text}" for p in problems(site)]


def changed(changes: list[dict[str, Any]]) -> Tables:
    """The good tables with cells of some rows exchanged; a row number past the end adds a copy of the last."""
    tables = deepcopy(GOOD)
    for change in changes:
        rows = tables[change["table"]]
        if change["row"] >= len(rows):
            rows.append(dict(rows[-1]))
        rows[change["row"]] |= change["cells"]
    return tables


def test_a_good_site_has_no_problem() -> None:
    assert judged(GOOD) == []


CASES = tomllib.loads(Path(__file__).with_name("consistency.toml").read_text(encoding="utf-8"))["case"]


@pytest.mark.parametrize("case", CASES, ids=[case["name"] for case in CASES])
def test_what_does_not_hold_together_is_found(case: dict[str, Any]) -> None:
    assert judged(changed(case["changes"])) == case["problems"]


def test_case_names_are_unique() -> None:
    assert len({case["name"] for case in CASES}) == len(CASES)


def test_every_problem_is_found_in_one_go() -> None:
    """Cases that do not touch the same table together give what each gives alone."""
    names = ("circuit fed from nothing that is there", "no such size", "load at no point", "no such instrument")
    chosen = [case for case in CASES if case["name"] in names]
    together = judged(changed([change for case in chosen for change in case["changes"]]))
    assert len(chosen) == len(names)
    assert sorted(together) == sorted(problem for case in chosen for problem in case["problems"])


def test_a_text_of_ten_thousand_characters_is_the_longest() -> None:
    change = {"table": "circuits", "row": 0, "cells": {"description": "x" * 10_000}}
    assert judged(changed([change])) == []
    change["cells"] = {"description": "x" * 10_001}
    what = "circuits 0 description: text of 10,001 characters; accepted: up to 10,000 characters"
    assert judged(changed([change])) == [what]


# Records that no folder gives, but a damaged or hand-made site file can


def test_ids_that_name_nothing_are_found() -> None:
    site = Site(
        name="hut",
        boards=(Board(id="b", tag="B", fed_by=(Feed("sources", "gone"),)),),
        circuits=(Circuit(id="c", tag="C", fed_from=Feed("boards", "gone")),),
        runs=(Run(id="r", circuit_id="gone", number=1, from_point="way", to_point="p", to_board_id=""),),
        loads=(Load(id="l", circuit_id="gone", point="p", tag="L"),),
        readings=(Reading(id="m", circuit_id="gone", round="1", quantity="voltage", at="p", replaces_id="gone"),),
    )
    assert told(site) == [
        "boards 0 fed_by: 'gone' names no source or circuit; accepted: the tag of a source or circuit that is there",
        "circuits 0 fed_from: 'gone' names no board or source; accepted: the tag of a board or source that is there",
        "runs 0 circuit: 'gone' names no circuit; accepted: the tag of a circuit that is there",
        "loads 0 circuit: 'gone' names no circuit; accepted: the tag of a circuit that is there",
        "readings 0 circuit: 'gone' names no circuit; accepted: the tag of a circuit that is there",
        "readings 0 replaces: 'gone' names no reading; accepted: the tag of a reading that is there",
    ]


def test_empty_rows_miss_every_required_cell() -> None:
    site = Site(
        name="",
        limits="",
        circuits=(Circuit(id="c"),),
        runs=(Run(id="r"),),
        instruments=(Instrument(id="i"),),
        visits=(Visit(id="v"),),
    )
    assert told(site) == [
        "site - name: is empty; accepted: a text",
        "site - limits: is empty; accepted: a text",
        "circuits 0 circuit: is empty; accepted: a tag",
        "circuits 0 fed_from: is empty; accepted: the tag of a board or source",
        "runs 0 circuit: is empty; accepted: the tag of a circuit",
        "runs 0 run: 0 is not possible; accepted: a whole number from 1 to 1000000",
        "runs 0 from: is empty; accepted: the name of a point",
        "runs 0 to: is empty; accepted: the name of a point",
        "instruments 0 instrument: is empty; accepted: a tag",
        "instruments 0 quantity: is empty; accepted: voltage, current, resistance or temperature",
        "visits 0 visit: is empty; accepted: a tag",
    ]


@pytest.mark.parametrize("value", [math.nan, math.inf, -math.inf])
def test_numbers_that_are_not_finite_are_found(value: float) -> None:
    sources = (Source(id="s", tag="S", kind="pv", nominal_voltage_v=value, resistance_ohm=value),)
    site = Site(name="hut", nominal_voltage_v=value, sources=sources)
    assert told(site) == [
        f"site - nominal: {value} is not possible; accepted: a number in V from 0.001 to 10000",
        f"sources 0 nominal: {value} is not possible; accepted: a number in V from 0.001 to 10000",
        f"sources 0 resistance: {value} is not possible; accepted: a number in ohm from 0 to 1e+12",
    ]


def test_text_as_typed_is_held_to_the_same_rules() -> None:
    runs = (
        Run(id="r", circuit_id="c", number=1, from_point="way", to_point="p", typed=(("one_way_length_m", "4\x1bft"),)),
    )
    circuits = (Circuit(id="c", tag="C", fed_from=Feed("sources", "s")),)
    sources = (Source(id="s", tag="S", kind="pv"),)
    site = Site(name="hut", typed=(("nominal_voltage_v", "\u202e84 V"),), sources=sources, circuits=circuits, runs=runs)
    assert told(site) == [
        "site - nominal: '\ufffd84 V' holds the control character U+202E; accepted: text without control characters",
        "runs 0 length: '4\ufffdft' holds the control character U+001B; accepted: text without control characters",
    ]


def test_sizes_and_feeds_that_no_folder_gives_are_found() -> None:
    site = Site(
        name="hut",
        sources=(Source(id="s", tag="S", kind="pv"),),
        circuits=(Circuit(id="c", tag="C", fed_from=Feed("sources", "s", "p1")),),
        runs=(Run(id="r", circuit_id="c", number=1, from_point="way", to_point="p", size="2 mm2\x1b"),),
    )
    assert told(site) == [
        "circuits 0 fed_from: 'S:p1' names a point of a source; accepted: its tag alone",
        "runs 0 size: '2 mm2\ufffd' holds the control character U+001B; accepted: text without control characters",
    ]


def test_spaces_around_a_tag_are_found() -> None:
    site = Site(name="hut", visits=(Visit(id="v", tag=" first"), Visit(id="w", tag="first", notes=" kept ")))
    what = "visits 0 visit: ' first' begins or ends with a space; accepted: the same text without"
    assert told(site) == [what]


def test_a_replaced_reading_without_a_tag_is_found() -> None:
    """The site folder names readings by tag, so that the replacement could not be written down."""
    old = Reading(id="a", board=Feed("sources", "s"), round="1", quantity="voltage", at="bus", value=48.0)
    new = replace(old, id="b", value=49.0, replaces_id="a")
    site = Site(name="hut", sources=(Source(id="s", tag="S", kind="pv"),), readings=(old, new))
    what = "readings 1 replaces: the reading that it replaces has no tag, by which the site folder could name it"
    assert told(site) == [f"{what}; accepted: a reading with a tag"]


@pytest.mark.parametrize(
    ("prior", "expected"),
    [
        ((("as recorded", 0.8), ("bad connection", 0.2)), []),
        (
            (("bad connection", 1.0),),
            ["does not name as_recorded; accepted: the share of as_recorded beside the others"],
        ),
        ((("as recorded", 0.0),), ["gives every cause the share 0; accepted: at least one share above 0"]),
        (
            (("as recorded", -0.1), ("other metal", math.inf)),
            [
                "the share of as_recorded: -0.1 is not possible; accepted: a number from 0 to 1000000000",
                "the share of other_metal: inf is not possible; accepted: a number from 0 to 1000000000",
            ],
        ),
        (
            (("as recorded", 0.0), ("bad connection", 1.0)),
            ["gives as_recorded the share 0; accepted: a share of as_recorded above 0"],
        ),
        (
            (("as recorded", 1.0), ("bad conection", 1.0)),
            [
                "'bad_conection' is no cause; accepted: as_recorded, bad_connection, smaller_conductor, other_metal, "
                "longer_route, series_semiconductor or reading_or_record_doubtful, did you mean bad_connection?"
            ],
        ),
        (
            (("as recorded", 1.0), ("as recorded", 1.0)),
            ["'as_recorded' stands there twice; accepted: each cause once"],
        ),
    ],
)
def test_prior_names_known_causes_with_possible_shares(
    prior: tuple[tuple[str, float], ...], expected: list[str]
) -> None:
    assert told(Site(name="hut", prior=prior)) == [f"site - prior: {what}" for what in expected]


@pytest.mark.parametrize("name", ["general", "../ours.toml", "site.toml", ".toml", "a\\b.toml"])
def test_own_profile_has_the_name_of_a_file_beside(name: str) -> None:
    what = f"site - limits: '{name}' cannot be the file of the site's own profile; accepted: NAME.toml"
    assert told(Site(name="hut", limits=name, own_limits="")) == [what]


def test_a_large_record_full_of_mistakes_is_judged_in_seconds() -> None:
    """Nearest words are sought for some mistakes only; for all of 5,000 it would take several minutes."""
    circuits = tuple(Circuit(id=f"c{n}", tag=f"C{n}", fed_from=Feed("", f"?B{n}")) for n in range(5_000))
    runs = tuple(Run(id=f"r{n}", circuit_id=f"?D{n}", number=1, from_point="way", to_point="p") for n in range(5_000))
    start = time.perf_counter()
    found = problems(Site(name="hut", circuits=circuits, runs=runs))
    assert len(found) == 10_000
    assert time.perf_counter() - start < 20


def test_of_many_circuits_alike_the_one_with_a_wrong_reading_is_told() -> None:
    tables = deepcopy(GOOD)
    alike = [{**row, "circuit": "C4"} for row in tables["runs"] if row["circuit"] == "C1"]
    tables["circuits"].append({"circuit": "C4", "fed_from": "MDB", "device": "fuse gG"})
    tables["runs"] += alike
    tables["readings"] += [
        {"circuit": "C4", "round": "1", "quantity": "voltage", "at": at, "value": "47", "instrument": "DMM"}
        for at in ("p1", "p9", "p1", "p9")
    ]
    assert [line.partition(": ")[0] for line in judged(tables)] == ["readings 10 at", "readings 12 at"]


def test_a_value_that_is_no_number_is_told_once_and_its_instrument_is_looked_for() -> None:
    circuit = Circuit(id="c", tag="C1")
    meter = Instrument(id="m", tag="DMM", quantity="voltage", accuracy_percent=1, counts=1, resolution=1)
    rows = tuple(
        Reading(id=tag, circuit_id="c", round="1", quantity="voltage", at="way", value=math.nan, instrument=tag)
        for tag in ("DMM", "DMN")
    )
    site = Site(name="hut", circuits=(circuit,), instruments=(meter,), readings=rows)
    assert [line for line in told(site) if "readings" in line] == [
        "readings 0 value: nan is not possible; accepted: a number",
        "readings 1 value: nan is not possible; accepted: a number",
        "readings 1 instrument: 'DMN' names no instrument; accepted: the tag of an instrument that is there, "
        "or an empty cell, did you mean 'DMM'?",
    ]
