"""The supervisor's page: counts, the worst circuits, what is open, what was left out, and where to sign."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Mapping, Sequence
from typing import TypeAlias

from audit.report.blocks import Block, Bullets, Cell, Column, Facts, Paragraph, Section, Table
from audit.report.phrases import STATUS_MEANING, drop_words, finding_place, place_words, status_words
from audit.report.sections import (
    by_severity,
    decided_words,
    decisions_of,
    head,
    of_circuits,
    sign_off,
    statements,
    tested_facts,
)
from rules.assessment import Assessment, CircuitResult, Finding, Severity
from rules.index import Index
from rules.record import Site

_Action: TypeAlias = tuple[str, str, str, str]
"""How soon, what was found, what to do, and how it stands."""

MOST_WORST = 5
"""Circuits on the page."""
MOST_ACTIONS = 6
"""Open actions on the page."""
MOST_PLACES = 4
"""Places named for each action, and for each rule that could not judge."""


def one_page(site: Site, assessment: Assessment, made_at: str | None) -> tuple[Section, ...]:
    """The sections of the page."""
    index = Index(site)
    summary = assessment.summary
    states = ", ".join(f"{summary[str(status)]} {status_words(status)}" for status in STATUS_MEANING)
    found = ", ".join(f"{sum(f.severity is severity for f in assessment.findings)} {severity}" for severity in Severity)
    facts = Facts((("Circuits", states), ("Findings", found)))
    tested = Facts(tested_facts(site, assessment), side_by_side=True)
    bounds: list[Block] = [Bullets(assessment.cautions, "caution")] if assessment.cautions else []
    bounds.append(Bullets((*statements(assessment), *_gap_line(assessment)), "small"))
    return (
        head(site, assessment, "the supervisor", made_at),
        Section("State", (facts, tested)),
        Section("Worst circuits first", _worst(index, assessment)),
        Section("Open actions", _actions(site, assessment)),
        Section("How far this goes", tuple(bounds)),
        sign_off(),
    )


def _worst(index: Index, assessment: Assessment) -> tuple[Block, ...]:
    """The circuits with the most urgent findings first; of equals, the one furthest through its allowed drop."""
    by_circuit = of_circuits(assessment.findings)
    ranked = [
        (min(finding.severity.rank for finding in by_circuit[result.circuit]), -_used(result), result)
        for result in assessment.circuits
        if any(finding.severity is not Severity.NOTE for finding in by_circuit[result.circuit])
    ]
    ranked.sort(key=lambda entry: entry[:2])
    rows: list[tuple[Cell, ...]] = []
    for _, _, result in ranked[:MOST_WORST]:
        circuit = index.circuits.get(result.circuit_id)
        drop = drop_words(result)
        titles = dict.fromkeys(finding.title for finding in by_severity(by_circuit[result.circuit]))
        rows.append(
            (
                result.circuit,
                circuit.description if circuit is not None else "",
                drop.bar or "",
                drop.of_allowed,
                status_words(result.status),
                "; ".join(titles),
            )
        )
    if not rows:
        return (Paragraph("No circuit has a finding above a note."),)
    columns = (
        Column("Circuit", share=2), Column("Description", share=5), Column("Drop", share=4),
        Column("Measured", share=3), Column("Status", share=2), Column("Found", share=10),
    )  # fmt: skip
    return (Table(columns, tuple(rows)), *_more(len(ranked) - MOST_WORST, "circuit"))


def _used(result: CircuitResult) -> float:
    """Share of the allowed drop that was measured, or else computed; 0 where it is not known."""
    nominal, allowed = result.nominal_voltage_v, result.allowed_drop_percent
    drop = result.design_drop if result.drop is None else result.drop.measured
    if not nominal or not allowed or drop is None:
        return 0.0
    return 100 * drop.value / nominal / allowed


def _actions(site: Site, assessment: Assessment) -> tuple[Block, ...]:
    """What asks for action at once or soon; equal actions of equal standing in one row."""
    decided = decisions_of(site)
    places: dict[_Action, list[Finding]] = {}
    for finding in by_severity(assessment.findings):
        if finding.severity in (Severity.IMMEDIATE, Severity.SOON):
            standing = decided_words(finding, decided, "open")
            action = (str(finding.severity), finding.title, finding.remedy, standing)
            places.setdefault(action, []).append(finding)
    shown = _of_distinct_places(places)[:MOST_ACTIONS]
    rows: list[tuple[Cell, ...]] = [
        (severity, title, _some([finding_place(finding) for finding in places[action]]), remedy, standing)
        for action in shown
        for severity, title, remedy, standing in [action]
    ]
    if not rows:
        return (Paragraph("No finding asks for action at once or soon."),)
    columns = (
        Column("How soon", share=3), Column("Found", share=7), Column("Where", share=8), Column("Do", share=13),
        Column("Decided", share=3),
    )  # fmt: skip
    left_out = sum(len(findings) for action, findings in places.items() if action not in shown)
    return (Table(columns, tuple(rows)), *_more(left_out, "finding"))


def _of_distinct_places(places: Mapping[_Action, Sequence[Finding]]) -> list[_Action]:
    """
    Actions in the order in which a page takes them: of equal severity those of circuits that are not on it yet first.

    A circuit of many findings does not keep the others off the page; the most severe stay first.
    """
    on_it: set[str | None] = set()
    first: list[_Action] = []
    later: list[_Action] = []
    for action, findings in places.items():
        owners = {finding.circuit or finding.board for finding in findings}
        (later if owners <= on_it else first).append(action)
        on_it |= owners
    rank = {str(severity): severity.rank for severity in Severity}
    return sorted([*first, *later], key=lambda action: rank[action[0]])


def _more(left_out: int, noun: str) -> tuple[Block, ...]:
    """How many the page does not hold."""
    more = f"and {left_out} more {noun}{'s' if left_out > 1 else ''}, in the inspector's report"
    return (Paragraph(more, "small"),) if left_out > 0 else ()


def _gap_line(assessment: Assessment) -> tuple[str, ...]:
    """What was not judged, by rule: the whole stands in the inspector's report."""
    places: dict[str, list[str]] = defaultdict(list)
    for gap in assessment.not_judged:
        places[gap.rule].append(place_words(gap.circuit, None, gap.where))
    if not places:
        return ()
    return ("Not judged: " + ". ".join(f"{rule} at {_some(where)}" for rule, where in places.items()) + ".",)


def _some(places: list[str]) -> str:
    """The first places and how many more there are."""
    shown = list(dict.fromkeys(places))
    more = f" and {len(shown) - MOST_PLACES} more" if len(shown) > MOST_PLACES else ""
    return "; ".join(shown[:MOST_PLACES]) + more
