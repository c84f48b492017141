"""A small site with an assessment written by hand, so that reports are tested apart from the rules."""

from __future__ import annotations

from dataclasses import replace

import pytest

from rules.assessment import (
    Assessment,
    CircuitResult,
    Drop,
    Finding,
    NextReading,
    NotJudged,
    Place,
    PointVoltage,
    Severity,
    Status,
)
from rules.record import Board, Circuit, Decision, Feed, Figure, Instrument, Load, Reading, Run, Site, Source, Visit

HOSTILE = (
    "<script>alert(1)</script>",
    '"><img src=x onerror=alert(1)>',
    '=HYPERLINK("http://evil.example";"x")',
    "[red]markup[/red] [link=http://evil.example]x[/link]",
    "**bold** | `code` | ![img](http://evil.example/x.png) http://evil.example www.evil.example a@evil.example",
    "\x1b[2J\x1b]0;title\x07\x00\x9b31m",
    "\u202eright to left\u202c",
    "שלום عربى",
    "{{ 7 * 7 }} {% raw %} ${7*7}",
    "very long " + "x" * 5000,
    "# heading\n\n- item\n\n```\ncode\n```\n<b>html</b>\n1. one\n===",
    ":smile: &amp; &lt;",
)
"""Texts that something would interpret if it were let."""


@pytest.fixture
def site() -> Site:
    """A cabin with one board: a circuit past its limit, one that agrees, one not read, one without a record."""
    board = Feed("boards", "b")
    return Site(
        name="Heron Point pump house",
        address="4 Reed Bank",
        nominal_voltage_v=24.0,
        ambient_temperature_c=18.0,
        surveyed_by="R. Ames",
        extent="Board P1 and its circuits",
        limitations="The roof was not reached",
        notes="An invented site.\nNothing here is real.",
        sources=(Source(id="s", tag="PSU-1", kind="power supply", nominal_voltage_v=24.0, working_voltage_v=24.6),),
        boards=(
            Board(
                id="b",
                tag="P1",
                fed_by=(Feed("sources", "s"),),
                nominal_voltage_v=24.0,
                location="Pump room",
                walk_order=1,
            ),
        ),
        circuits=(
            Circuit(
                id="c1",
                tag="P1-01",
                fed_from=board,
                description="Sluice motor",
                device="breaker C",
                rated_current_a=16.0,
                device_poles=1,
                device_leg="positive",
                allowed_drop_percent=5.0,
            ),
            Circuit(
                id="c2", tag="P1-02", fed_from=board, description="Level sensors", device="fuse gG", rated_current_a=4.0
            ),
            Circuit(id="c3", tag="P1-03", fed_from=board, description="Roof beacon", not_tested="no safe way up"),
            Circuit(id="c4", tag="P1-04", fed_from=board),
        ),
        runs=(
            Run(
                id="r1",
                circuit_id="c1",
                number=1,
                from_point="way",
                to_point="p1",
                one_way_length_m=13.716,
                length_by="tape",
                size="4 mm2",
                material="copper",
                stranding="stranded",
                typed=(("one_way_length_m", "45 ft"),),
            ),
            Run(
                id="r2", circuit_id="c1", number=2, from_point="p1", to_point="p2", one_way_length_m=8.0, size="2.5 mm2"
            ),
            Run(
                id="r3", circuit_id="c1", number=3, from_point="p1", to_point="p3", one_way_length_m=3.0, size="2.5 mm2"
            ),
            Run(
                id="r4",
                circuit_id="c2",
                number=1,
                from_point="way",
                to_point="box",
                one_way_length_m=21.0,
                size="14 AWG",
                conductor_temperature_c=22.0,
                temperature_by="probe",
            ),
        ),
        loads=(
            Load(id="l1", circuit_id="c1", point="p2", tag="motor", power_w=120.0, lowest_voltage_v=21.0),
            Load(id="l2", circuit_id="c2", point="box", tag="sensors", current_a=1.5),
        ),
        instruments=(
            Instrument(
                id="i1",
                tag="DMM-1",
                quantity="voltage",
                full_scale=60.0,
                accuracy_percent=0.1,
                counts=2.0,
                resolution=0.001,
                category="CAT III 600 V",
                calibrated_until="2026-11-30",
            ),
        ),
        visits=(Visit(id="v1", tag="2026-03 as found", kind="as found", date="2026-03-02", by="R. Ames"),),
        readings=(
            _reading("m1", "c1", "current", "way", 6.02, "CLAMP"),
            _reading("m2", "c1", "voltage", "way", 24.51),
            _reading("m3", "c1", "voltage", "p2", 22.49, tag="T1"),
            _reading("m4", "c1", "voltage", "p2", 23.49, tag="T0"),
            _reading("m5", "c2", "current", "way", 1.48, "CLAMP"),
            _reading("m6", "c2", "drop", "way", 0.42, to="box"),
        ),
        decisions=(
            Decision(id="d1", finding="VD02/P1-01/run 2", decision="accepted", by="K. Sand", at="2026-03-04T09:00"),
        ),
    )


def _reading(
    id_: str, circuit: str, quantity: str, at: str, value: float, instrument: str = "DMM-1", to: str = "", tag: str = ""
) -> Reading:
    return Reading(
        id=id_,
        circuit_id=circuit,
        visit="2026-03 as found",
        round="1",
        taken_at="2026-03-02T10:14:00",
        quantity=quantity,
        at=at,
        to=to,
        value=value,
        instrument=instrument,
        by="R. Ames",
        tag=tag,
        replaces_id="m4" if tag == "T1" else "",
        reason="misread" if tag == "T1" else "",
    )


@pytest.fixture
def assessment() -> Assessment:
    """What a check could say of the cabin before causes are judged."""
    findings = (
        Finding(
            id="RD09/board P1/bus",
            rule="RD09",
            circuit=None,
            board="P1",
            where="bus",
            severity=Severity.NOTE,
            cause=None,
            title="Busbar read once",
            why="one reading in one round",
            numbers={},
            remedy="Read it before and after.",
            caution="",
            source="common practice, no source",
        ),
        Finding(
            id="VD02/P1-01/run 2",
            rule="VD02",
            circuit="P1-01",
            board=None,
            where="run 2",
            severity=Severity.SOON,
            cause=None,
            title="Measured drop above computed",
            why="2.02 V read, 0.95 V computed",
            numbers={
                "measured_drop": Figure(2.02, "V", 0.004),
                "computed": Figure(0.95, "V", 0.03),
                "share": Figure(0.084, "1"),
                "not_known": Figure(float("nan"), "V"),
            },
            remedy="Read millivolts across both ends of run 2.",
            caution="Live work: only by who may.",
            source="IEC 60364-6, from-memory",
            consequences=("the motor may stall",),
        ),
    )
    return Assessment(
        program="0.1.0",
        site="Heron Point pump house",
        limits="general",
        circuits=(
            CircuitResult(
                circuit="P1-01",
                circuit_id="c1",
                visit="2026-03 as found",
                status=Status.ACT,
                why="a finding is soon",
                drop=Drop(
                    "1",
                    "way",
                    "p2",
                    Figure(2.02, "V", 0.004),
                    Figure(0.95, "V", 0.03),
                    Figure(1.07, "V", 0.031),
                    Figure(6.02, "A", 0.05),
                    "two voltages",
                ),
                allowed_drop_percent=5.0,
                nominal_voltage_v=24.0,
                design_drop=Figure(0.97, "V"),
                findings=findings[1:],
            ),
            CircuitResult(
                circuit="P1-02",
                circuit_id="c2",
                visit="2026-03 as found",
                status=Status.MEASURE,
                why="the drop agrees within its doubt",
                drop=Drop(
                    "1",
                    "way",
                    "box",
                    Figure(0.42, "V", 0.003),
                    Figure(0.41, "V", 0.02),
                    Figure(0.01, "V", 0.02),
                    Figure(1.48, "A", 0.02),
                    "direct drops",
                ),
                allowed_drop_percent=3.0,
                nominal_voltage_v=24.0,
            ),
            CircuitResult(
                circuit="P1-03",
                circuit_id="c3",
                visit="",
                status=Status.INCOMPLETE,
                why="no run is recorded",
                allowed_drop_percent=3.0,
                nominal_voltage_v=24.0,
            ),
            CircuitResult(
                circuit="P1-04", circuit_id="c4", visit="", status=Status.INCOMPLETE, why="no run is recorded"
            ),
        ),
        findings=findings,
        not_judged=(
            NotJudged("VD01", "P1-03", "", "no run is recorded"),
            NotJudged("VD01", "P1-04", "", "no run is recorded"),
        ),
        cautions=("Live readings are work on live parts.", "A battery cannot be switched off."),
    )


@pytest.fixture
def with_causes(assessment: Assessment) -> Assessment:
    """The same with everything that later rules fill: causes, points, a next reading."""
    first = replace(
        assessment.circuits[0],
        causes=(
            Place("bad connection", "run 2", 0.93, 0.151, 0.155, 0.159),
            Place("as recorded", "", 0.07),
        ),
        points=(
            PointVoltage("p1", Figure(23.9, "V", 0.02), Figure(20.1, "V", 0.05)),
            PointVoltage("p2", Figure(23.6, "V", 0.02), Figure(19.4, "V", 0.05), Figure(21.0, "V")),
        ),
        next_reading=NextReading(
            "reading",
            "joint",
            "run 2 end",
            leg="positive",
            current_at_least=Figure(4.0, "A"),
            why="tells the ends apart",
            caution="Live work.",
        ),
    )
    claimed = replace(assessment.findings[1], cause="bad connection")
    return replace(assessment, circuits=(first, *assessment.circuits[1:]), findings=(assessment.findings[0], claimed))


@pytest.fixture(params=HOSTILE, ids=range(len(HOSTILE)))
def hostile(request: pytest.FixtureRequest) -> str:
    """One text that something would interpret."""
    text: str = request.param
    return text


@pytest.fixture
def hostile_site(site: Site, hostile: str) -> Site:
    """The cabin with every free text hostile."""
    return replace(
        site,
        name=hostile,
        address=hostile,
        notes=hostile,
        extent=hostile,
        limitations=hostile,
        surveyed_by=hostile,
        boards=tuple(replace(row, tag=hostile, location=hostile, notes=hostile) for row in site.boards),
        circuits=tuple(
            replace(row, tag=f"{hostile} {n}", description=hostile, location=hostile, not_tested=hostile, notes=hostile)
            for n, row in enumerate(site.circuits)
        ),
        runs=tuple(replace(row, to_point=hostile, notes=hostile) for row in site.runs),
        loads=tuple(replace(row, tag=hostile, notes=hostile) for row in site.loads),
        readings=tuple(replace(row, by=hostile, notes=hostile, reason=hostile, round=hostile) for row in site.readings),
        visits=tuple(replace(row, by=hostile) for row in site.visits),
        decisions=tuple(replace(row, by=hostile, reason=hostile) for row in site.decisions),
    )


@pytest.fixture
def hostile_assessment(assessment: Assessment, hostile: str) -> Assessment:
    """What a check says of that site: its texts come back in places, reasons and remedies."""
    return replace(
        assessment,
        site=hostile,
        circuits=tuple(
            replace(row, circuit=f"{hostile} {n}", why=hostile) for n, row in enumerate(assessment.circuits)
        ),
        findings=tuple(
            replace(row, circuit=row.circuit and f"{hostile} 0", id=hostile, where=hostile, why=hostile, remedy=hostile)
            for row in assessment.findings
        ),
        not_judged=tuple(replace(row, circuit=hostile, why=hostile, where=hostile) for row in assessment.not_judged),
        cautions=(hostile,),
    )
