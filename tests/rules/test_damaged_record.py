"""
Records that no intake lets through: the sample sites, harmed in memory as a damaged or foreign site file may be.

Whatever stands in a record, ``assess`` says what is wrong with it and judges the rest: it raises nothing, every circuit
has a status, and every figure is finite.
"""

from __future__ import annotations

import json
import math
from collections.abc import Callable, Iterator, Sequence
from dataclasses import fields, replace
from functools import cache
from importlib.resources import as_file
from io import StringIO
from random import Random
from typing import Any

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from audit.intake.folder import read_folder
from audit.report.as_json import as_json, as_text
from audit.report.content import content_of
from audit.report.markdown import markdown_report
from audit.report.text import print_check
from rules import limits
from rules.assess import assess, assess_circuit, prepare
from rules.assessment import Assessment, Status
from rules.consistency import problems
from rules.record import TABLES, Board, Circuit, Feed, Instrument, Load, Reading, Row, Run, Site, Source, rows_of
from rules.usable import usable
from sample_sites.catalogue import sample_site

FACTORS = (0.0, -1.0, 1e-300, 1e-12, 1e-6, 1e-3, 10.0, 1e3, 1e6, 1e12, 1e150, math.inf, math.nan)
WHOLE = (0, -1, 1, 2, 99, 2**53, 2**62)
WORDS = (
    "", "?gone", "gone", "way", "bus", "run 1", "run 1 end", "run 99 start", "device", "ambient", "p", "both",
    "positive", "copper", "12 AWG", "7 mm2", "shared:X", "structure", "own", "voltage", "drop", "joint", "current",
    "residual", "temperature", "resistance", "breaker B", "none", "2026-03-12", "constant power", "1", "\u202e",
    "x" * 20_000,
)  # fmt: skip
"""What may stand in any text, at its own place or at another's."""
SUPPLIES = ("sources", "boards", "circuits")

Harm = Callable[[Site, Random], Site]


@cache
def sample(name: str) -> Site:
    with as_file(sample_site(name).folder) as folder:
        return read_folder(folder)


def part_of(site: Site, circuits: Sequence[Circuit]) -> Site:
    """A site with some circuits, what feeds them, and their rows."""
    supplies = {row.id: row for table in SUPPLIES for row in site.table(table)}
    wanted: dict[str, Row] = {circuit.id: circuit for circuit in circuits}
    above = list(wanted.values())
    while above:
        for feed in feeds_of(above.pop()):
            if feed.id not in wanted:
                wanted[feed.id] = supplies[feed.id]
                above.append(wanted[feed.id])
    ends = {run.to_board_id for run in site.runs if run.circuit_id in wanted}
    boards = {row.id for row in site.boards if row.id in wanted or row.id in ends}
    return replace(
        site,
        sources=tuple(row for row in site.sources if row.fed_from is None or row.id in wanted),
        boards=tuple(row for row in site.boards if row.id in boards),
        circuits=tuple(row for row in site.circuits if row.id in wanted),
        runs=tuple(row for row in site.runs if row.circuit_id in wanted),
        loads=tuple(row for row in site.loads if row.circuit_id in wanted),
        readings=tuple(row for row in site.readings if row.circuit_id in wanted or not row.circuit_id),
    )


def feeds_of(row: Row) -> tuple[Feed, ...]:
    if isinstance(row, Board):
        return row.fed_by
    fed_from = row.fed_from if isinstance(row, Circuit | Source) else None
    return () if fed_from is None else (fed_from,)


def changed(site: Site, table: str, place: int, **values: Any) -> Site:
    rows = list(site.table(table))
    rows[place] = replace(rows[place], **values)
    return site.with_rows(table, tuple(rows))


def any_row(site: Site, chance: Random, tables: Sequence[str] = tuple(TABLES)) -> tuple[str, int, Row]:
    table = chance.choice([table for table in tables if site.table(table)] or ["sources"])
    place = chance.randrange(len(site.table(table)))
    return table, place, site.table(table)[place]


# --- harms


def a_number(site: Site, chance: Random) -> Site:
    """Many times too large or small, of the wrong sign, or none at all."""
    table, place, row = any_row(site, chance)
    found = [f.name for f in fields(row) if isinstance(getattr(row, f.name), int | float)]
    if not found:
        return site
    name = chance.choice(found)
    value = getattr(row, name)
    if isinstance(value, int):
        return changed(site, table, place, **{name: chance.choice(WHOLE)})
    other = chance.choice([*(value * factor for factor in FACTORS), -5.0, 1e308, None])
    return changed(site, table, place, **{name: 0.0 if other is None and name == "value" else other})


def a_text(site: Site, chance: Random) -> Site:
    """One that stands elsewhere, or nowhere."""
    table, place, row = any_row(site, chance)
    texts = [f.name for f in fields(row) if isinstance(getattr(row, f.name), str) and f.name != "id"]
    name = chance.choice(texts)
    others = [str(getattr(chance.choice(site.table(table)), text)) for text in texts]
    return changed(site, table, place, **{name: chance.choice([*WORDS, *others])})


def a_feed(site: Site, chance: Random) -> Site:
    """Something is fed from elsewhere: from nothing, from itself, in a ring."""
    table, place, _ = any_row(site, chance, SUPPLIES)
    feeds = [Feed(t, row.id, chance.choice(("", "way", "bus", "p9"))) for t in SUPPLIES for row in site.table(t)]
    feeds += [Feed("", "?gone"), Feed("boards", "gone"), Feed("circuits", "gone"), Feed("sources", "gone", "x")]
    if table == "boards":
        return changed(site, table, place, fed_by=tuple(chance.sample(feeds, chance.choice((0, 1, 1, 2, 3)))))
    return changed(site, table, place, fed_from=chance.choice([*feeds, None]))


def a_row_gone(site: Site, chance: Random) -> Site:
    table, place, _ = any_row(site, chance)
    rows = site.table(table)
    return site if len(rows) == 1 and table == "sources" else site.with_rows(table, rows[:place] + rows[place + 1 :])


def a_row_twice(site: Site, chance: Random) -> Site:
    """With its own id, or with another."""
    table, _, row = any_row(site, chance)
    twin = chance.choice((row, replace(row, id=f"twin {chance.randrange(10**6)}")))
    rows = site.table(table)
    at = chance.randrange(len(rows) + 1)
    return site.with_rows(table, (*rows[:at], twin, *rows[at:]))


def the_ends_of_a_run(site: Site, chance: Random) -> Site:
    """Loops, islands, runs that end where they start."""
    if not site.runs:
        return site
    place = chance.randrange(len(site.runs))
    run, other = site.runs[place], chance.choice(site.runs)
    board = chance.choice([*(row.id for row in site.boards), "", "?gone"])
    ends: list[dict[str, Any]] = [
        {"from_point": run.to_point, "to_point": run.from_point},
        {"from_point": other.to_point, "to_point": other.from_point},
        {"to_point": run.from_point},
        {"to_point": other.to_point},
        {"to_point": "way"},
        {"to_point": "", "to_board_id": board},
        {"number": other.number},
        {"circuit_id": other.circuit_id},
        {"one_way_length_m": 0.0},
        {"return_conductor": chance.choice(("shared:X", "structure", "own"))},
    ]
    return changed(site, "runs", place, **chance.choice(ends))


def a_mesh_of_no_length(site: Site, chance: Random) -> Site:
    if not site.runs:
        return site
    run = chance.choice(site.runs)
    short = [replace(row, one_way_length_m=0.0) if row.circuit_id == run.circuit_id else row for row in site.runs]
    beside = [replace(run, id=f"beside {n}", number=90 + n, one_way_length_m=0.0) for n in range(chance.choice((1, 2)))]
    return site.with_rows("runs", (*short, *beside))


def the_signs_of_a_round(site: Site, chance: Random) -> Site:
    if not site.readings:
        return site
    one = chance.choice(site.readings)
    place = (one.circuit_id, one.round)
    rows = [replace(r, value=-r.value) if (r.circuit_id, r.round) == place else r for r in site.readings]
    return site.with_rows("readings", tuple(rows))


HARMS: tuple[Harm, ...] = (
    a_number, a_number, a_number, a_text, a_text, a_feed, a_feed, a_row_gone, a_row_twice, the_ends_of_a_run,
    the_ends_of_a_run, a_mesh_of_no_length, the_signs_of_a_round,
)  # fmt: skip


def harmed(chance: Random) -> Site:
    site = sample(chance.choice(("plant", "doors")))
    site = part_of(site, chance.sample(site.circuits, chance.randint(1, 4)))
    for _ in range(chance.randint(1, 4)):
        site = chance.choice(HARMS)(site, chance)
    return site


# --- what is asked of every record


def numbers_in(document: object) -> Iterator[float]:
    if isinstance(document, dict):
        document = list(document.values())
    if isinstance(document, list):
        for part in document:
            yield from numbers_in(part)
    elif isinstance(document, float | int):
        yield document


def judged(site: Site) -> Assessment:
    """The assessment of a record, which must hold what any has."""
    assessment = assess(site, limits.of(site))
    document = json.loads(as_text(as_json(assessment)))
    assert all(map(math.isfinite, numbers_in(document)))
    assert {result.circuit_id for result in assessment.circuits} == {circuit.id for circuit in site.circuits}
    found = problems(site)
    assert len([finding for finding in assessment.findings if finding.rule == "RC02"]) == len(found)
    kept = usable(site, found)
    assert usable(kept, problems(kept)) == kept
    return assessment


def is_finite(site: Site) -> bool:
    """Whether a site file could hold the record: it refuses what is no number."""
    return all(
        not isinstance(value := getattr(row, f.name), float) or math.isfinite(value)
        for _, row in rows_of(site)
        for f in fields(row)
    )


def holds(chance: Random) -> None:
    site = harmed(chance)
    assessment = judged(site)
    if is_finite(site):
        print_check(site, assessment, StringIO())
        assert markdown_report(content_of(site, assessment, "inspector", None))


@given(st.randoms())
@settings(max_examples=100, deadline=None, suppress_health_check=[HealthCheck.too_slow])
def test_a_damaged_record_is_judged(chance: Random) -> None:
    holds(chance)


@pytest.mark.long
@given(st.randoms())
@settings(max_examples=5000, deadline=None, suppress_health_check=[HealthCheck.too_slow])
def test_any_damaged_record_is_judged(chance: Random) -> None:
    holds(chance)


STRAY: tuple[tuple[str, Row], ...] = (
    ("runs", Run(id="x1", circuit_id="gone", number=1, from_point="way", to_point="p", one_way_length_m=1.0)),
    ("runs", Run(id="x2", circuit_id="?gone", number=1, return_conductor="shared:DAMPERS", size="2.5 mm2")),
    ("loads", Load(id="x3", circuit_id="gone", point="p", tag="lamp", current_a=4.0)),
    ("readings", Reading(id="x4", circuit_id="gone", round="1", quantity="voltage", at="way", value=3e8)),
    ("readings", Reading(id="x5", board=Feed("boards", "gone"), round="1", quantity="voltage", at="bus", value=48.0)),
    ("instruments", Instrument(id="x6", tag="M-9", quantity="speed", accuracy_percent=1e12)),
    ("boards", Board(id="x7", tag="B-99", fed_by=(Feed("boards", "x7"),))),
)  # fmt: skip


@pytest.mark.parametrize(("table", "row"), STRAY, ids=lambda part: part if isinstance(part, str) else part.id)
@pytest.mark.parametrize("name", ["plant", "doors"])
def test_a_row_that_belongs_nowhere_changes_no_verdict(name: str, table: str, row: Row) -> None:
    site = sample(name)
    with_it = site.with_rows(table, (*site.table(table), row))
    assert judged(with_it).circuits == judged(site).circuits


def test_values_a_million_times_too_large_are_left_out() -> None:
    """The diagnosis once ended in a matrix that was not positive definite."""
    site = sample("plant")
    circuit = next(row for row in site.circuits if row.tag == "A-01")
    large = [replace(row, value=row.value * 1e6) if row.circuit_id == circuit.id else row for row in site.readings]
    without = [row for row in site.readings if row.circuit_id != circuit.id]
    of_large = judged(site.with_rows("readings", tuple(large)))
    of_none = judged(site.with_rows("readings", tuple(without)))
    (result,) = (result for result in of_large.circuits if result.circuit == "A-01")
    (bare,) = (result for result in of_none.circuits if result.circuit == "A-01")
    assert (result.drop, result.causes, result.points) == (bare.drop, bare.causes, bare.points)
    assert any(finding.rule == "RC02" and "is not possible" in finding.why for finding in result.findings)


def test_two_runs_beside_each_other_may_share_a_return() -> None:
    """Two positive cables and one common negative: the second closes no loop in the negative leg."""
    site = sample("doors")
    run = next(row for row in site.runs if row.circuit_id == next(r.id for r in site.circuits if r.tag == "E-04"))
    both = [replace(run, return_conductor="shared:E"), replace(run, id="y", number=90, return_conductor="shared:E")]
    rows = tuple(row for row in site.runs if row.id != run.id)
    one, two = (judged(site.with_rows("runs", (*rows, *both[:n]))) for n in (1, 2))
    drops = [
        next(result.design_drop for result in assessment.circuits if result.circuit == "E-04")
        for assessment in (one, two)
    ]
    assert drops[0] is not None
    assert drops[1] is not None
    assert drops[1].value < drops[0].value


def test_what_is_typed_into_a_damaged_round_is_judged_without_it() -> None:
    site = sample("plant")
    first = next(row for row in site.readings if row.circuit_id)
    damaged = [replace(row, value=1e9) if row.id == first.id else row for row in site.readings]
    record = site.with_rows("readings", tuple(damaged))
    context = prepare(record, limits.of(record))
    circuit = context.index.circuits[first.circuit_id]
    visit = [row for row in record.readings if row.circuit_id == circuit.id and row.visit == first.visit]
    assert assess_circuit(context, circuit, visit) == assess_circuit(context, circuit, visit[1:])


def test_a_converter_that_feeds_itself_is_taken_as_fed_by_nothing() -> None:
    site = sample("plant")
    converter = next(row for row in site.sources if row.kind == "converter")
    board = next(row for row in site.boards if Feed("sources", converter.id) in row.fed_by)
    behind = next(row for row in site.circuits if row.fed_from is not None and row.fed_from.id == board.id)
    rows = [
        replace(row, fed_from=Feed("circuits", behind.id)) if row.id == converter.id else row for row in site.sources
    ]
    assessment = judged(site.with_rows("sources", tuple(rows)))
    assert any("is fed by itself" in finding.why for finding in assessment.findings)
    assert {result.status for result in assessment.circuits} != {Status.INCOMPLETE}
