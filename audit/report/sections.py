"""The sections that reports share, each built once from the site and its assessment."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Callable, Iterable, Iterator, Mapping
from itertools import groupby

from audit.report.blocks import Blanks, Block, Bullets, Cell, Column, Facts, FindingCard, Paragraph, Section, Table
from audit.report.phrases import (
    CAUSES_NOT_JUDGED,
    NOT_DESIGN_SPARE,
    SAYS_AND_DOES_NOT_SAY,
    SEVERITY_MEANING,
    STATUS_MEANING,
    causes_are_judged,
    counted,
    drop_words,
    finding_place,
    limits_defer,
    number_words,
    place_words,
    share_words,
    some_of,
    status_words,
    time_words,
)
from audit.report.records import NOT_RECORDED, board_title, location_of
from audit.report.site_records import visits_words
from rules.assessment import Assessment, CircuitResult, Finding, NotJudged, Severity
from rules.index import Index
from rules.record import Decision, Feed, Site
from rules.units import show
from rules.verdict import CONDUCTORS, TOLD, probability_words

BAR_LEGEND = (
    "Bar: solid is the measured drop, its pointed or grey end the doubt (u), the tick the computed drop, "
    "the right edge the allowed drop, an arrow what is past it. Percentages are of nominal voltage."
)

LINE_LEGEND = (
    "Line: current runs from left to right. Above a point stands what was read there in the round that is judged, "
    "below it the voltage computed at design load."
)


def head(site: Site, assessment: Assessment, audience: str, made_at: str | None) -> Section:
    """What was audited, by whom and when."""
    ambient = NOT_RECORDED if site.ambient_temperature_c is None else show(site.ambient_temperature_c, "degC")
    own = " (the site's own profile)" if site.own_limits is not None else ""
    rows = [
        ("Address", site.address or NOT_RECORDED),
        ("Extent", site.extent or NOT_RECORDED),
        ("Limitations", site.limitations or NOT_RECORDED),
        ("Surveyed by", site.surveyed_by or NOT_RECORDED),
        ("Visits", visits_words(site)),
        ("Notes", site.notes),
    ]
    short = [
        ("Ambient", ambient),
        ("Limits profile", assessment.limits + own),
        ("Program", f"ohmwalk {assessment.program}"),
        ("Written for", audience),
        ("Made at", made_at or ""),
    ]
    return Section("What was audited", (_known(rows), _known(short, side_by_side=True)))


def _known(rows: Iterable[tuple[str, str]], side_by_side: bool = False) -> Facts:
    return Facts(tuple((label, text) for label, text in rows if text), side_by_side)


def statements(assessment: Assessment) -> tuple[str, ...]:
    """What the report says, and what nobody may read into it."""
    causes = () if causes_are_judged(assessment.circuits) else (CAUSES_NOT_JUDGED,)
    return (
        *SAYS_AND_DOES_NOT_SAY,
        NOT_DESIGN_SPARE,
        limits_defer(assessment.limits),
        *causes,
        *rules_set_aside(assessment),
    )


def rules_set_aside(assessment: Assessment) -> tuple[str, ...]:
    """Rules that the limits profile changes, with its reason, and those that failed."""
    faults = [f"{rule} could not judge: {why}" for rule, why in assessment.rule_faults.items()]
    return tuple(f"{words}." for words in (*(change.words for change in assessment.rule_changes), *faults))


def read_first(assessment: Assessment) -> Section:
    """Cautions, then how far the report can be trusted."""
    blocks: list[Block] = []
    if assessment.cautions:
        blocks.append(Paragraph("Before taking a live reading:", "caution"))
        blocks.append(Bullets(assessment.cautions, "caution"))
    blocks.append(Paragraph("What this report says, and what it does not:"))
    blocks.append(Bullets(statements(assessment)))
    return Section("Read this first", tuple(blocks))


def counts(site: Site, assessment: Assessment) -> Section:
    """Circuits by status, share read, findings by severity, what was not judged."""
    summary = assessment.summary
    by_status = Table(
        (Column("Circuits", "right"), Column("Status", share=2), Column("Meaning", share=7)),
        tuple((str(summary[str(status)]), status_words(status), meaning) for status, meaning in STATUS_MEANING.items()),
        "Circuits by status",
    )
    number = {severity: sum(f.severity is severity for f in assessment.findings) for severity in Severity}
    by_severity = Table(
        (Column("Findings", "right"), Column("How soon", share=2), Column("Meaning", share=7)),
        tuple((str(number[severity]), str(severity), meaning) for severity, meaning in SEVERITY_MEANING.items()),
        "Findings by how soon someone has to act",
    )
    return Section("At a glance", (by_status, by_severity, Facts(tested_facts(site, assessment), side_by_side=True)))


def tested_facts(site: Site, assessment: Assessment) -> tuple[tuple[str, str], ...]:
    """How much was read, and how much was not."""
    circuits = assessment.circuits
    read = sum(bool(result.visit) for result in circuits)
    refused = sum(bool(circuit.not_tested) for circuit in site.circuits)
    return (
        ("Circuits read", share_words(read, len(circuits))),
        ("Not tested", f"{counted(refused, 'circuit')}, with a reason"),
        ("Not judged", f"{counted(len(assessment.not_judged), 'judgement')} could not be made"),
    )


def by_feed(index: Index, circuits: Iterable[CircuitResult]) -> Iterator[tuple[Feed | None, list[CircuitResult]]]:
    """The circuits under what feeds them, in walking order."""

    def feed(result: CircuitResult) -> Feed | None:
        circuit = index.circuits.get(result.circuit_id)
        return circuit.fed_from if circuit is not None else None

    for fed_from, group in groupby(circuits, key=feed):
        yield fed_from, list(group)


def walk(index: Index, assessment: Assessment) -> Section:
    """One row a circuit in walking order, boards as headings."""
    rows: list[tuple[Cell, ...]] = []
    for feed, group in by_feed(index, assessment.circuits):
        place = location_of(index, feed)
        rows.append((board_title(index, feed) + (f" · {place}" if place else ""),))
        for result in group:
            circuit = index.circuits.get(result.circuit_id)
            drop = drop_words(result)
            rows.append(
                (
                    result.circuit,
                    circuit.description if circuit is not None else "",
                    drop.bar or "",
                    drop.of_allowed,
                    drop.computed,
                    status_words(result.status),
                )
            )
    columns = (
        Column("Circuit", share=3), Column("Description", share=6), Column("Drop", share=4),
        Column("Measured", share=3), Column("Computed", share=2), Column("Status", share=3),
    )  # fmt: skip
    if not rows:
        return Section("The walk", (Paragraph("No circuit is recorded."),))
    return Section("The walk", (Table(columns, tuple(rows)), Paragraph(BAR_LEGEND, "small")))


def evidence_words(assessment: Assessment) -> Callable[[Finding], str]:
    """How sure a finding's cause is, apart from how soon it asks for action: as the finding says itself, else as the causes do."""
    causes: dict[tuple[str, str, str], float] = defaultdict(float)
    for result in assessment.circuits:
        for place in result.causes:
            causes[result.circuit, place.cause, place.where] = place.probability
            causes[result.circuit, place.cause, ""] += place.probability if place.where else 0.0

    def words(finding: Finding) -> str:
        if finding.cause is None or finding.circuit is None:
            return ""
        if finding.cause in CONDUCTORS:
            each = {cause: causes.get((finding.circuit, cause, ""), 0.0) for cause in CONDUCTORS}
            return conductors_words(each) if any(each.values()) else finding.cause
        stated = finding.numbers.get("probability")
        of_cause = causes.get((finding.circuit, finding.cause, ""))
        of_place = causes.get((finding.circuit, finding.cause, finding.where), of_cause)
        probability = of_place if stated is None else stated.value
        return (
            finding.cause if probability is None else f"{finding.cause}, probability {probability_words(probability)}"
        )

    return words


def conductors_words(probabilities: Mapping[str, float]) -> str:
    """
    The claim that conductors are not as recorded, and what they may be instead.

    >>> conductors_words({"smaller conductor": 0.34, "other metal": 0.001, "longer route": 0.33})
    'conductors not as recorded, probability 0.67: smaller conductor 0.34, longer route 0.33'
    """
    told = {cause: p for cause, p in sorted(probabilities.items(), key=lambda item: -item[1]) if p >= TOLD}
    each = ", ".join(f"{cause} {probability_words(p)}" for cause, p in told.items())
    return f"conductors not as recorded, probability {probability_words(sum(told.values()))}: {each}"


def decisions_of(site: Site) -> dict[str, str]:
    """The last decision on each finding, in words."""
    last: dict[str, Decision] = {}
    for decision in sorted(site.decisions, key=lambda row: row.at):
        last[decision.finding] = decision
    return {
        finding: f"{row.decision} by {row.by}, {time_words(row.at)}" + (f": {row.reason}" if row.reason else "")
        for finding, row in last.items()
    }


def decided_words(finding: Finding, decided: Mapping[str, str], open_: str = "") -> str:
    """The decision on a finding (``open_`` where there is none), and those on what went under it, each with its id."""
    of_others = [f"{held.id}: {decided[held.id]}" for held in finding.holds if held.id in decided]
    return "; ".join(part for part in (decided.get(finding.id, open_), *of_others) if part)


def finding_cards(site: Site, assessment: Assessment, findings: Iterable[Finding], full: bool) -> tuple[Block, ...]:
    """
    Findings as cards.

    ``full`` adds numbers, consequences, source and id; without it a card holds what the work needs.
    """
    evidence, decided = evidence_words(assessment), decisions_of(site)
    cards: list[Block] = []
    for finding in findings:
        rows = [
            ("Place", finding_place(finding)),
            ("Why", finding.why),
            ("Claims", evidence(finding)),
            ("Numbers", some_of(number_words(finding)) if full else ""),
            ("If left", some_of(finding.consequences)),
            ("Do", finding.remedy),
            ("Caution", finding.caution),
            ("Source", finding.source if full else ""),
            ("Decided", decided_words(finding, decided)),
        ]
        cards.append(FindingCard(finding.id, finding.severity, finding.title, tuple((k, v) for k, v in rows if v)))
    return tuple(cards)


def by_severity(findings: Iterable[Finding]) -> list[Finding]:
    """The most urgent first; otherwise in walking order."""
    return sorted(findings, key=lambda finding: finding.severity.rank)


def of_circuits(findings: Iterable[Finding]) -> dict[str, list[Finding]]:
    """The findings of each circuit by its tag; none for one that has none."""
    groups: dict[str, list[Finding]] = defaultdict(list)
    for finding in findings:
        if finding.circuit is not None:
            groups[finding.circuit].append(finding)
    return groups


def sign_off() -> Section:
    """Where people sign."""
    return Section("Signatures", (Blanks(("Surveyed by", "Inspected by", "Accepted by")),))


def group_gaps(gaps: Iterable[NotJudged]) -> list[tuple[str, str, str]]:
    """
    Rules, reason and places of what could not be judged.

    Equal reasons of one rule stand together, and so do rules that miss the same at the same places.
    """
    places: dict[tuple[str, str], dict[str, None]] = defaultdict(dict)
    for gap in gaps:
        places[gap.rule, gap.why][place_words(gap.circuit, None, gap.where)] = None
    rules: dict[tuple[str, str], list[str]] = defaultdict(list)
    for (rule, why), where in places.items():
        rules[why, "; ".join(where)].append(rule)
    return [(", ".join(names), why, where) for (why, where), names in rules.items()]


def not_judged(gaps: Iterable[NotJudged]) -> Section:
    """What could not be judged, and why."""
    rows: tuple[tuple[Cell, ...], ...] = tuple(group_gaps(gaps))
    if not rows:
        return Section("Not judged", (Paragraph("Every rule could be judged."),))
    note = Paragraph("A gap is not a pass. These judgements could not be made:")
    return Section(
        "Not judged", (note, Table((Column("Rules", share=2), Column("Why", share=5), Column("Where", share=4)), rows))
    )


def not_tested(index: Index, circuits: Iterable[CircuitResult]) -> Section:
    """Circuits that were not read, each with its recorded reason."""
    rows: list[tuple[Cell, ...]] = []
    for result in circuits:
        circuit = index.circuits.get(result.circuit_id)
        reason = circuit.not_tested if circuit is not None else ""
        if reason or not result.visit:
            description = circuit.description if circuit is not None else ""
            rows.append((result.circuit, description, reason or "no reason is recorded"))
    if not rows:
        return Section("Not tested", (Paragraph("Every circuit was read."),))
    columns = (Column("Circuit", share=2), Column("Description", share=4), Column("Reason", share=6))
    return Section("Not tested", (Table(columns, tuple(rows)),))
