"""Findings and what could not be judged, in lines."""

from __future__ import annotations

from collections.abc import Iterable

from audit.report.phrases import finding_place, number_words, some_of
from audit.tui.drawing.pieces import Line, Piece, cut, piece, wrapped
from rules.assessment import Finding, NotJudged, Severity

SEVERITY_SIGNS = {Severity.IMMEDIATE: "‼", Severity.SOON: "!", Severity.WATCH: "~", Severity.NOTE: "·"}
"""The sign that repeats each severity beside its word."""
SEVERITY_ROLES = {Severity.IMMEDIATE: "act", Severity.SOON: "act", Severity.WATCH: "watch", Severity.NOTE: "quiet"}
_LABEL = 11


def severity_piece(severity: Severity, cells: int = 0) -> Piece:
    """Sign and word of a severity."""
    return piece(f"{SEVERITY_SIGNS[severity]} {severity}".ljust(cells), SEVERITY_ROLES[severity])


def finding_lines(finding: Finding, width: int, *, place: bool = True) -> list[Line]:
    """A finding with why, what follows, what to do, the caution that goes with it, its numbers and its source."""
    where = finding_place(finding) if place else finding.where
    head = (piece(" "), severity_piece(finding.severity), piece("  "), piece(finding.title, "strong"))
    return [cut((*head, piece(f"  {where}", "quiet")), width), *detail_lines(finding, width)]


def detail_lines(finding: Finding, width: int) -> list[Line]:
    """What stands beneath a finding's title."""
    said = (
        ("why", finding.why, ""),
        ("if left", some_of(finding.consequences), ""),
        ("do", finding.remedy, "strong"),
        ("caution", finding.caution, "caution"),
        ("numbers", some_of(number_words(finding)), "quiet"),
        ("source", finding.source, "quiet"),
    )
    lines: list[Line] = []
    for label, text, role in said:
        if text:
            lines += wrapped(text, width - 1, _LABEL + 3, role, f"   {label}")
    return lines


def gap_lines(gaps: Iterable[NotJudged], width: int) -> list[Line]:
    """What could not be judged: a gap is not a pass."""
    from audit.report.sections import group_gaps  # with the judge's modules, for which the first screen does not wait

    lines: list[Line] = []
    for rules, why, where in group_gaps(gaps):
        lines += wrapped(f"{rules}: {why} ({where})", width - 1, 3, "quiet")
    return lines
