"""The sample sites: a check gives exactly the findings that each folder states, and their records hold together."""

from __future__ import annotations

import csv
import io
import subprocess
import sys
import tomllib
from collections import Counter
from functools import cache
from pathlib import Path
from typing import Any

import pytest

from audit.intake.folder import read_folder
from audit.opening import judge_site
from audit.report.sections import evidence_words
from rules import limits
from rules.assess import prepare
from rules.assessment import Assessment, Status
from rules.consistency import problems
from rules.index import Index
from rules.meters import instrument_row
from rules.record import TABLES, Site
from rules.verdict import CONDUCTORS, probability_words
from sample_sites.catalogue import EXPECTED, SAMPLE_SITES, SampleSite, UnknownSampleSite, sample_site

every_site = pytest.mark.parametrize("sample", SAMPLE_SITES, ids=lambda sample: sample.name)
Told = tuple[str, str | None, str, str, tuple[str, ...]]
INVENTED = "Invented building for demonstration; no real place, person or product"


@cache
def record_of(sample: SampleSite) -> Site:
    """The record of a sample site, read where it lies, stated findings beside it."""
    return read_folder(Path(str(sample.folder)))


@cache
def assessment_of(sample: SampleSite) -> Assessment:
    return judge_site(record_of(sample))


def stated(sample: SampleSite) -> dict[str, Any]:
    """What the folder states: findings that a check must give, and the faults that were put into it."""
    return tomllib.loads(sample.folder.joinpath(EXPECTED).read_text(encoding="utf-8"))


def key(row: dict[str, Any]) -> Told:
    """
    What tells a stated finding: its rule, the circuit, board or source (none for the site), where, how soon, and the rules
    of the findings that went under it.
    """
    return row["rule"], place(row), row["where"], row["severity"], tuple(sorted(row.get("holds", ())))


def place(row: dict[str, Any]) -> str | None:
    """The tag of what a stated finding or fault is about; ``None`` for the site."""
    return row.get("circuit") or row.get("board")


def found(assessment: Assessment) -> Counter[Told]:
    """The findings of a check, as they are stated."""
    return Counter(
        (f.rule, f.circuit or f.board, f.where, str(f.severity), tuple(sorted(held.rule for held in f.holds)))
        for f in assessment.findings
    )


@every_site
def test_check_gives_exactly_the_stated_findings(sample: SampleSite) -> None:
    assert found(assessment_of(sample)) == Counter(key(row) for row in stated(sample)["finding"])


@every_site
def test_earlier_visits_give_what_was_repaired_since(sample: SampleSite) -> None:
    for visit in {row["visit"] for row in stated(sample).get("earlier", [])}:
        earlier = found(judge_site(record_of(sample), visit)) - found(assessment_of(sample))
        assert earlier == Counter(key(row) for row in stated(sample)["earlier"] if row["visit"] == visit)


@every_site
def test_every_seeded_fault_is_found_and_every_finding_is_of_a_seeded_fault(sample: SampleSite) -> None:
    """A fault that no rule can find says why (``not_found``); one that was repaired names the visit that found it."""
    content = stated(sample)
    seeded = {
        (rule, place(fault), fault.get("visit", ""))
        for fault in content["seeded"]
        for rule in fault.get("found_by", [])
    }
    findings = [*content["finding"], *content.get("earlier", [])]
    assert {(row["rule"], place(row), row.get("visit", "")) for row in findings} == seeded
    assert all(bool(fault.get("found_by")) != bool(fault.get("not_found")) for fault in content["seeded"])


@every_site
def test_a_finding_and_its_line_of_claims_state_one_probability(sample: SampleSite) -> None:
    assessment = assessment_of(sample)
    words = evidence_words(assessment)
    stated = [
        (f, f.numbers["probability"].value) for f in assessment.findings if f.cause and "probability" in f.numbers
    ]
    assert stated
    for finding, probability in stated:
        said = words(finding)
        if finding.cause in CONDUCTORS:  # one claim of several causes: its own is told among them
            assert said.startswith("conductors not as recorded, probability ")
            assert f"{finding.cause} {probability_words(probability)}" in said
        else:
            assert said == f"{finding.cause}, probability {probability_words(probability)}"
        assert probability_words(probability) in finding.why


@every_site
def test_site_is_large_enough_to_show_the_program(sample: SampleSite) -> None:
    assert 18 <= len(record_of(sample).circuits) <= 32
    assert len(assessment_of(sample).findings) >= 6


@every_site
def test_every_complete_circuit_has_its_voltages(sample: SampleSite) -> None:
    """At every point of every run, at design and in the worst case, but where nothing arrives or the structure is the return."""
    record = record_of(sample)
    structure = {run.circuit_id for run in record.runs if run.return_or_default == "structure"}
    unsupplied = {finding.circuit for finding in assessment_of(sample).findings if finding.rule == "NW01"}
    for result in assessment_of(sample).circuits:
        if result.status is Status.INCOMPLETE or result.circuit in unsupplied or result.circuit_id in structure:
            continue
        points = {point.point: point for point in result.points}
        ends = {run.to_point for run in record.runs if run.circuit_id == result.circuit_id}
        assert {"way", *ends} <= set(points)
        assert all(point.design is not None and point.worst is not None for point in points.values())


def test_the_plant_shows_a_mesh_sources_in_parallel_a_converter_and_a_shared_return() -> None:
    record = record_of(sample_site("plant"))
    network = prepare(record, limits.of(record)).network
    assert {network.place_of(network.node_at_run_end[run_id]) for run_id in network.meshed} == {
        f"run {number} of M-04" for number in (1, 2, 3, 4)
    }
    assert any(len(board.fed_by) > 1 for board in record.boards)
    assert [source.tag for source in record.sources if source.fed_from is not None] == ["CONV-24"]
    assert {shared.name: len(shared.runs) for shared in network.return_at.values()} == {"DAMPERS": 3}


@every_site
def test_notes_say_that_the_building_is_invented(sample: SampleSite) -> None:
    assert INVENTED in record_of(sample).notes
    assert "(invented)" in record_of(sample).name


@every_site
def test_record_holds_together(sample: SampleSite) -> None:
    assert problems(record_of(sample)) == ()


@every_site
def test_every_row_of_every_table_is_read(sample: SampleSite) -> None:
    record, files = record_of(sample), sample.files()
    tables = {name.removesuffix(".csv") for name in files if name.endswith(".csv")}
    assert tables == {"sources", "boards", "circuits", "runs", "loads", "instruments", "visits", "readings"}
    assert set(files) == {f"{table}.csv" for table in tables} | {"site.toml"}
    for table in TABLES:
        text = files.get(f"{table}.csv", b"").decode("utf-8")
        assert len(record.table(table)) == max(0, len(list(csv.reader(text.splitlines()))) - 1)


@every_site
def test_copy_without_the_stated_findings_is_the_same_site(sample: SampleSite, tmp_path: Path) -> None:
    for name, content in sample.files().items():
        (tmp_path / name).write_bytes(content)
    assert not (tmp_path / EXPECTED).exists()
    assert read_folder(tmp_path) == record_of(sample)


@every_site
def test_every_circuit_has_its_place_in_the_walk(sample: SampleSite) -> None:
    record = record_of(sample)
    assert all(board.location and board.walk_order is not None for board in record.boards)
    assert all(circuit.location and circuit.walk_order is not None for circuit in record.circuits)
    assert [circuit.tag for circuit in Index(record).walked_circuits] == [circuit.tag for circuit in record.circuits]


@every_site
def test_readings_are_what_their_meters_can_show(sample: SampleSite) -> None:
    index = Index(record_of(sample))
    shown = 0
    for reading in record_of(sample).readings:
        row = instrument_row(reading, index)
        if row is None:
            continue
        shown += 1
        assert row.resolution is not None
        steps = reading.value / row.resolution
        assert steps == pytest.approx(round(steps), abs=1e-6)
        assert row.full_scale is None or abs(reading.value) <= row.full_scale
    assert shown > 80


def test_the_default_is_the_48_v_plant() -> None:
    assert sample_site() is sample_site("plant")
    assert record_of(sample_site()).nominal_voltage_v == 48


def test_unknown_name_is_refused_with_the_nearest() -> None:
    with pytest.raises(
        UnknownSampleSite, match="no sample site 'plan'; the nearest is 'plant'; there are: plant, doors, station"
    ):
        sample_site("plan")


def simulated(name: str) -> str:
    """What ``python tests/sample_sites/simulate.py NAME`` prints."""
    script = Path(__file__).parent / "sample_sites" / "simulate.py"
    return subprocess.run([sys.executable, script, name], check=True, capture_output=True, encoding="utf-8").stdout


def test_the_readings_of_the_station_are_those_of_its_simulation() -> None:
    """Byte for byte."""
    assert simulated("station") == sample_site("station").files()["readings.csv"].decode("utf-8")


@pytest.mark.parametrize("name", ["plant", "doors"])
def test_readings_that_were_added_later_are_those_of_their_simulation(name: str) -> None:
    """The last rows of the table, value by value."""
    added = list(csv.DictReader(io.StringIO(simulated(name))))
    table = sample_site(name).files()["readings.csv"].decode("utf-8")
    last = list(csv.DictReader(io.StringIO(table)))[-len(added) :]
    assert len(added) > 10
    assert [{column: cell for column, cell in row.items() if cell} for row in last] == [
        {column: cell for column, cell in row.items() if cell} for row in added
    ]


def test_the_sample_sites_show_at_least_twenty_rules_at_work() -> None:
    assert len({row["rule"] for sample in SAMPLE_SITES for row in stated(sample)["finding"]}) >= 20


def test_the_station_shows_two_visits_peaks_and_a_repair() -> None:
    record = record_of(sample_site("station"))
    assert [visit.kind for visit in record.visits] == ["as found", "as left"]
    assert any(load.peak_current_a and load.function == "trip or close" for load in record.loads)
    repaired = {fault["circuit"] for fault in stated(sample_site("station"))["seeded"] if "visit" in fault}
    left = {record_circuit.tag for record_circuit in record.circuits if record_circuit.tag in repaired}
    status = {result.circuit: result.status for result in assessment_of(sample_site("station")).circuits}
    assert left
    assert {status[tag] for tag in left} == {Status.SOUND}
