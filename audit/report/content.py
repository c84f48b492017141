"""
The content of a report for each audience, built once; every form draws it (``audit.report.blocks``).

The electrician reads by board, with what to do at each place; the inspector reads everything; the
supervisor reads one page. Nothing is judged here: statuses, findings and figures are the assessment's.
"""

from __future__ import annotations

from collections.abc import Callable

from audit.limit_words import limit_words
from audit.report.blocks import Block, Cell, Column, Content, Paragraph, Section, Table, cleaned
from audit.report.circuit import circuit_section
from audit.report.records import board_title, readings_table
from audit.report.sections import (
    BAR_LEGEND,
    LINE_LEGEND,
    by_feed,
    by_severity,
    counts,
    finding_cards,
    head,
    not_judged,
    not_tested,
    of_circuits,
    read_first,
    sign_off,
    walk,
)
from audit.report.site_records import boards_table, instruments_table, sources_table
from audit.report.supervisor import one_page
from rules.assessment import Assessment
from rules.index import Index
from rules.limits import Limits, of
from rules.record import Site
from rules.text import clean

AUDIENCES = ("electrician", "inspector", "supervisor")
"""Who a report can be for; the inspector's is the whole."""

_LEGENDS = (Paragraph(BAR_LEGEND, "small"), Paragraph(LINE_LEGEND, "small"))


def content_of(site: Site, assessment: Assessment, audience: str, made_at: str | None = None) -> Content:
    """
    The report's content.

    Parameters
    ----------
    audience : str
        One of ``AUDIENCES``.
    made_at : str or None
        Date and time to print; none is taken from the clock.

    Raises
    ------
    KeyError
        If there is no such audience (``write_report`` asks first).
    """
    sections = _AUDIENCES[audience](site, assessment, made_at)
    title = f"D.c. distribution audit: {assessment.site}"
    made = None if made_at is None else clean(made_at)
    return Content(site, assessment, audience, made, clean(title), cleaned(sections))


def _electrician(site: Site, assessment: Assessment, made_at: str | None) -> tuple[Section, ...]:
    index, limits = Index(site), of(site)
    by_circuit = of_circuits(assessment.findings)
    elsewhere = [finding for finding in assessment.findings if finding.circuit is None]
    sections = [head(site, assessment, "the electrician", made_at), read_first(assessment)]
    sections.append(counts(site, assessment))
    if elsewhere:
        cards = finding_cards(site, assessment, by_severity(elsewhere), full=False)
        sections.append(Section("Boards, sources and the site", cards))
    sections.append(Section("Circuits by board", _LEGENDS))
    for feed, group in by_feed(index, assessment.circuits):
        sections.append(Section(board_title(index, feed), (), level=2))
        for result in group:
            cards = finding_cards(site, assessment, by_severity(by_circuit[result.circuit]), full=False)
            sections.append(circuit_section(index, limits, result, cards, result.visit))
    sections += [not_judged(assessment.not_judged), not_tested(index, assessment.circuits)]
    return tuple(sections)


def _inspector(site: Site, assessment: Assessment, made_at: str | None) -> tuple[Section, ...]:
    index, limits = Index(site), of(site)
    findings = finding_cards(site, assessment, by_severity(assessment.findings), full=True)
    sections = [
        head(site, assessment, "the inspector", made_at),
        read_first(assessment),
        counts(site, assessment),
        walk(index, assessment),
        Section("Findings", findings or (Paragraph("No rule found anything."),)),
        not_judged(assessment.not_judged),
        not_tested(index, assessment.circuits),
        Section("Circuits: record and readings", _LEGENDS, new_page=True),
    ]
    for feed, group in by_feed(index, assessment.circuits):
        sections.append(Section(board_title(index, feed), (), level=2))
        sections += [circuit_section(index, limits, result, (), None) for result in group]
    sections += [_plant(site, index), _limits(limits), sign_off()]
    return tuple(sections)


_AUDIENCES: dict[str, Callable[[Site, Assessment, str | None], tuple[Section, ...]]] = {
    "electrician": _electrician,
    "inspector": _inspector,
    "supervisor": one_page,
}


def _plant(site: Site, index: Index) -> Section:
    """Sources and boards with the readings on their busbars, and the meters."""
    parts: list[Block | None] = [sources_table(site, index), boards_table(index)]
    busbars = [(row.id, row.tag) for row in index.walked_sources] + [(row.id, row.tag) for row in index.walked_boards]
    for id_, tag in busbars:
        if (readings := readings_table(index, id_)) is not None:
            parts += [Paragraph(f"On the busbar of {tag}:"), readings]
    parts.append(instruments_table(site))
    blocks = tuple(part for part in parts if part is not None)
    return Section("Sources, boards and meters", blocks or (Paragraph("None is recorded."),))


def _limits(limits: Limits) -> Section:
    """Every limit and doubt in force, with its source."""
    rows: list[tuple[Cell, ...]] = []
    for group in limits.groups.values():
        for stated, keys in group.by_source().items():
            rows.append((group.title, "; ".join(limit_words(group, key) for key in keys), str(stated)))
    for rule, setting in limits.rules.items():
        changed = "switched off" if setting.off else f"severity {setting.severity}"
        rows.append((f"Rule {rule}", changed, f"{setting.reason}; limits profile {setting.origin}"))
    settled = (
        f"A limit counts as kept where the probability of being past it is {limits['decision.passes_at']:g} or less, "
        f"as not kept where it is {limits['decision.fails_at']:g} or more, and as not settled between. A measured "
        f"drop counts as different from the computed one at a probability of {limits['decision.beyond_doubt']:g}."
    )
    columns = (Column("What", share=4), Column("In force", share=5), Column("Where from", share=4))
    return Section("Decision rule, limits and doubts in force", (Paragraph(settled), Table(columns, tuple(rows))))
