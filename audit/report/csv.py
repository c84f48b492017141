"""
The CSV form: one row a finding, the same for every audience.

UTF-8 with a byte order mark: spreadsheets take a file without one for an older encoding and garble Ω and
±; programs read it as ``utf-8-sig``. Every cell is quoted, and a cell that a spreadsheet would run as a
formula is made text by an apostrophe in front of it.
"""

from __future__ import annotations

import csv
import io

from audit.report.blocks import Content
from audit.report.phrases import finding_place, number_words, status_words
from audit.report.sections import by_severity, decided_words, decisions_of, rules_set_aside
from rules.text import clean

BYTE_ORDER_MARK = "\ufeff"

COLUMNS = (
    "site", "finding", "severity", "rule", "place", "circuit", "board", "where", "visit", "status", "title", "why",
    "cause", "numbers", "consequences", "remedy", "caution", "source", "decided",
    "rules_set_aside",
)  # fmt: skip

_STARTS_A_FORMULA = ("=", "+", "-", "@", "\t", "\r", "＝", "＋", "－", "＠")
"""Also the full-width signs, which some spreadsheets take for the plain ones."""


def csv_report(content: Content) -> str:
    """
    The findings, the most urgent first, with their numbers in people's units.

    What the limits profile switches off or lowers, and what failed, has no row of its own: it stands in each row.
    """
    assessment = content.assessment
    results = {result.circuit: result for result in assessment.circuits}
    decided, set_aside = decisions_of(content.site), " ".join(rules_set_aside(assessment))
    text = io.StringIO(newline="")
    writer = csv.writer(text, quoting=csv.QUOTE_ALL, lineterminator="\r\n")
    writer.writerow(COLUMNS)
    for finding in by_severity(assessment.findings):
        result = results.get(finding.circuit or "")
        cells = (
            assessment.site,
            finding.id,
            str(finding.severity),
            finding.rule,
            finding_place(finding),
            finding.circuit or "",
            finding.board or "",
            finding.where,
            result.visit if result is not None else "",
            status_words(result.status) if result is not None else "",
            finding.title,
            finding.why,
            finding.cause or "",
            "; ".join(number_words(finding)),
            "; ".join(finding.consequences),
            finding.remedy,
            finding.caution,
            finding.source,
            decided_words(finding, decided),
            set_aside,
        )
        writer.writerow([safe_cell(cell) for cell in cells])
    return BYTE_ORDER_MARK + text.getvalue()


def safe_cell(text: str) -> str:
    """
    A cell that no spreadsheet runs.

    >>> safe_cell("=1+1"), safe_cell("run 2")
    ("'=1+1", 'run 2')
    """
    cleaned = clean(text)
    # Leading spaces do not keep every spreadsheet from seeing what follows them.
    return f"'{cleaned}" if text.startswith(("\t", "\r")) or cleaned.lstrip().startswith(_STARTS_A_FORMULA) else cleaned
