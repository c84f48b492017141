"""
The centre: ``assess(site, limits) -> Assessment``, pure, the same answer for the same record.

``prepare`` solves the network once a saved change; ``assess_circuit`` judges one circuit in it, quick enough
for each keystroke; ``assess`` is ``prepare``, every circuit, and the rules about boards, sources and the site.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import replace
from importlib.metadata import version

from rules.assessment import Assessment, CircuitResult, Finding, LoadMargin, NotJudged, PointVoltage, Severity, Status
from rules.case import CircuitCase, case_of
from rules.cautions import cautions_of
from rules.checks.rc01_record_incomplete import gaps_of
from rules.consistency import problems
from rules.context import Context
from rules.diagnosis.learning import diagnose_told, learn
from rules.diagnosis.next_reading import next_readings
from rules.explain import with_facts
from rules.fold import folded
from rules.heat import similar_joints
from rules.index import Index
from rules.joints import heats_of
from rules.limits import Limits
from rules.margins import lowest_dip, margins_of
from rules.measured import measured_of, posed_by, ties_by, unused_readings
from rules.network import network_of
from rules.record import Circuit, Figure, Reading, Site
from rules.rounds import visit_ranks
from rules.rule import BoardCase, SiteCase, changes_of, judge, switched_off
from rules.runs import figures
from rules.service import service_of
from rules.usable import usable
from rules.verdict import agrees, unsettled, unsound

TOGETHER = 1000
"""Circuits whose cases are kept until it is clear what to read next on them."""
FROM_THE_RECORD = ("RC01", "VD01", "VD03", "LV01", "LV02", "LV03", "NW01", "NW02", "NW03", "CP01", "CP02")


def assess(site: Site, limits: Limits, explain: bool = False) -> Assessment:
    """Everything that can be said of a site under its limits; ``explain`` adds the facts for and against each cause."""
    return assess_prepared(prepare(site, limits), explain=explain)


def assess_prepared(
    context: Context, told: Callable[[Sequence[CircuitResult]], object] | None = None, explain: bool = False
) -> Assessment:
    """
    Everything that can be said of a prepared site.

    ``told``, where given, gets the circuits' results as they come, in walking order; what it raises ends the judging.
    ``explain`` adds the facts that speak for and against each cause, a millisecond for each circuit that was read.
    """
    site, limits, index = context.site, context.limits, context.index
    findings, gaps = judge(SiteCase(context), "site")
    gaps = [*switched_off(limits), *gaps]
    for about, rows in (("source", index.walked_sources), ("board", index.walked_boards)):
        for row in rows:
            found, open_ = judge(BoardCase(context, row), "source" if about == "source" else "board")
            findings += found
            gaps += open_
    of_circuit: dict[str, list[Finding]] = {}
    for finding in findings:
        if finding.circuit is not None:
            of_circuit.setdefault(finding.circuit, []).append(finding)
    results: list[CircuitResult] = []
    for start in range(0, len(index.walked_circuits), TOGETHER):
        some = index.walked_circuits[start : start + TOGETHER]
        judged = _followed([_judged(context, circuit, None, of_circuit.get(circuit.tag, ())) for circuit in some])
        if explain:
            judged = with_facts(context, judged)
        results += judged
        if told is not None:
            told(judged)
    told_of = {finding.id: finding for result in results for finding in result.findings}
    judged_tags = {result.circuit for result in results}
    first = {finding.id for finding in findings}
    # what stands under another finding of its circuit is told there
    findings = [
        told_of.get(finding.id, finding)
        for finding in findings
        if finding.circuit not in judged_tags or finding.id in told_of
    ]
    for result in results:
        findings += [finding for finding in result.findings if finding.id not in first]
        gaps += result.not_judged
    return Assessment(
        program=version("ohmwalk"),
        site=site.name,
        limits=limits.name,
        circuits=tuple(results),
        findings=tuple(folded(findings)),
        not_judged=tuple(gaps),
        cautions=tuple(caution.text for caution in cautions_of(site)),
        rule_changes=changes_of(limits),
    )


def prepare(site: Site, limits: Limits) -> Context:
    """Index, resistances, network, readings, what they teach, and diagnoses of a site: what circuits are judged in."""
    recorded, found = site, problems(site)
    site = usable(recorded, found)
    index = Index(site)
    known = figures(site.runs, site, limits)
    context = Context(
        recorded=recorded,
        site=site,
        limits=limits,
        index=index,
        figures=known,
        network=network_of(index, known, limits),
        visit_ranks=visit_ranks(index),
        problems=found,
        left_out=frozenset({row.id for row in recorded.readings}.difference(index.readings)) if found else frozenset(),
    )
    measured = {circuit.id: measured_of(context, circuit) for circuit in site.circuits}
    posed = {id_: posed_by(context, side) for id_, side in measured.items()}
    some = {id_: problem for id_, problem in posed.items() if problem is not None}
    diagnoses = dict(zip(some, diagnose_told(list(some.values()), limits), strict=True))
    tied = {id_: (problem, ties_by(context, measured[id_], problem)) for id_, problem in some.items()}
    taught = learn(tied, diagnoses, limits)
    told = {id_: taught.told(id_, *both) for id_, both in tied.items() if taught.touches(both[1])}
    context = replace(context, measured=measured)
    return replace(
        context,
        joints=similar_joints(context),
        diagnoses=diagnoses | dict(zip(told, diagnose_told(list(told.values()), limits), strict=True)),
        taught=taught,
        common={id_: problem.common.relative for id_, problem in told.items() if problem.common is not None},
        unused={id_: names for id_, side in measured.items() if (names := unused_readings(side, posed[id_]))},
    )


def assess_circuit(
    context: Context,
    circuit: Circuit,
    readings: Sequence[Reading] | None = None,
    more: Sequence[Finding] = (),
    next_reading: bool = True,
) -> CircuitResult:
    """
    Judge one circuit in a prepared site.

    Parameters
    ----------
    context : Context
        From ``prepare``; the rest of the site stays as in it.
    circuit : Circuit
        One of the context's circuits.
    readings : sequence of Reading, optional
        Readings of one visit that stand in for the recorded ones: what is being typed.
    more : sequence of Finding, optional
        What rules about the site say of this circuit.
    next_reading : bool
        Without it the result comes some milliseconds sooner.
    """
    judged = _judged(context, circuit, readings, more)
    return _followed([judged])[0] if next_reading else judged[1]


def _followed(judged: Sequence[tuple[CircuitCase, CircuitResult]]) -> list[CircuitResult]:
    """Results with what to read next, where a circuit is not settled."""
    open_ = [number for number, (_, result) in enumerate(judged) if result.status is not Status.SOUND]
    asked = next_readings([judged[n][0] for n in open_], [judged[n][1].findings for n in open_])
    found = dict(zip(open_, asked, strict=True))
    return [replace(result, next_reading=found.get(number)) for number, (_, result) in enumerate(judged)]


def _judged(
    context: Context, circuit: Circuit, readings: Sequence[Reading] | None, more: Sequence[Finding]
) -> tuple[CircuitCase, CircuitResult]:
    """A circuit's case and what is said of it, but for the next reading."""
    case = case_of(context, circuit, readings)
    found, gaps = judge(case, "circuit")
    status, why = _status(case, sorted([*more, *found], key=lambda finding: finding.severity.rank))
    findings = sorted(folded([*more, *found]), key=lambda finding: finding.severity.rank)
    known = [load for load in case.loads if not load.gap]
    worst = max(known, key=lambda load: load.drop_v, default=None)
    return case, CircuitResult(
        circuit=circuit.tag,
        circuit_id=circuit.id,
        visit=case.visit,
        status=status,
        why=why,
        drop=case.drop,
        allowed_drop_percent=case.allowed_drop_percent,
        nominal_voltage_v=case.nominal_v,
        design_drop=Figure(worst.drop_v, "V", worst.drop_u) if worst else None,
        causes=case.diagnosis.causes if case.diagnosis is not None else (),
        joints=heats_of(case),
        points=_points(case),
        margins=_margins(case),
        service=service_of(case),
        findings=tuple(findings),
        not_judged=tuple(gaps),
    )


def _status(case: CircuitCase, findings: Sequence[Finding]) -> tuple[Status, str]:
    """The first that holds, with its reason."""
    urgent = [finding for finding in findings if finding.severity in (Severity.IMMEDIATE, Severity.SOON)]
    if urgent:
        return Status.ACT, min(urgent, key=_weight).why
    gaps = gaps_of(case)
    if gaps:
        return Status.INCOMPLETE, gaps[0][1]
    open_ = unsettled(case)
    if open_:
        return Status.MEASURE, open_
    watched = [finding for finding in findings if finding.severity is Severity.WATCH]
    if watched:
        return Status.WATCH, min(watched, key=_weight).why
    against = unsound(case)
    return (Status.MEASURE, against) if against else (Status.SOUND, agrees(case))


def _weight(finding: Finding) -> tuple[int, bool]:
    """The most urgent first; of those alike, what was read before what the record alone says."""
    return finding.severity.rank, finding.rule in FROM_THE_RECORD


def _margins(case: CircuitCase) -> tuple[LoadMargin, ...]:
    """The loads' margins, the worst case with what readings support."""

    def volts(value: float | None) -> Figure | None:
        return None if value is None else Figure(value, "V")

    rows = []
    for margin, point in zip(margins_of(case), case.loads, strict=True):
        load = margin.load
        worst, lowest, dip = case.worst.get(load.point), load.lowest_voltage_v, lowest_dip(margin, point)
        held_v = point.design_v + point.total_drop_v
        rows.append(
            LoadMargin(
                load=load.tag,
                point=load.point,
                design=volts(margin.design_v),
                worst=worst,
                worst_recorded=None if point.lowest_gap else Figure(point.lowest_v, "V", point.lowest_u),
                source_lowest=None if math.isnan(point.source_lowest_v) else volts(point.source_lowest_v),
                lowest=volts(lowest),
                margin=None if worst is None or lowest is None else Figure(worst.value - lowest, "V", worst.u),
                below_highest=volts(margin.below_highest_v),
                source_working=None if math.isnan(held_v) else volts(held_v),
                dip=volts(margin.peak.design_v) if margin.peak is not None else None,
                peak=None if margin.peak is None else Figure(margin.peak.current_a, "A"),
                dip_worst=dip,
                dip_margin=None if dip is None or lowest is None else Figure(dip.value - lowest, "V", dip.u),
            )
        )
    return tuple(rows)


def _points(case: CircuitCase) -> tuple[PointVoltage, ...]:
    """Voltages of the circuit's points at design and in the worst case."""
    network = case.context.network
    nodes = network.nodes_of.get(case.circuit.id)
    if nodes is None:
        return ()
    lowest: dict[str, float] = {}
    for load in case.loads:
        if load.load.lowest_voltage_v is not None:
            limit = load.load.lowest_voltage_v
            lowest[load.load.point] = max(limit, lowest.get(load.load.point, limit))
    points = []
    for point, node in nodes.items():
        if point == "bus" and not case.tree.device_ohm:
            continue
        known = not network.gap_of(node) and not network.design.collapsed[node]
        points.append(
            PointVoltage(
                point,
                design=Figure(float(network.design.voltage_v[node]), "V") if known else None,
                worst=case.worst.get(point),
                lowest=Figure(lowest[point], "V") if point in lowest else None,
            )
        )
    return tuple(points)


__all__ = ["NotJudged", "assess", "assess_circuit", "prepare"]
