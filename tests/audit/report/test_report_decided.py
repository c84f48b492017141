"""What was decided about a finding, and about those that are its consequences now."""

from __future__ import annotations

from dataclasses import replace

from audit.report.sections import decided_words, decisions_of
from rules.assessment import Assessment
from rules.record import Site


def test_a_decision_stays_with_its_finding_when_that_goes_under_another(site: Site, assessment: Assessment) -> None:
    decided = decisions_of(site)
    (finding,) = (row for row in assessment.findings if row.id in decided)
    own = decided_words(finding, decided)
    assert own.startswith("accepted by K. Sand")
    cause = replace(finding, id="VD01/P1-01/p1", holds=(finding,))
    assert decided_words(cause, decided) == f"{finding.id}: {own}"
    assert decided_words(cause, decided, "open") == f"open; {finding.id}: {own}"
    assert decided_words(replace(cause, holds=()), decided) == ""
