"""A rule that the limits profile lowers or switches off, with its reason, in everything that people read."""

from __future__ import annotations

import io
from dataclasses import replace
from pathlib import Path

import pytest
from jsonschema import Draft202012Validator

from audit.intake.folder import read_folder
from audit.report.as_json import as_json, schema
from audit.report.content import AUDIENCES, content_of
from audit.report.text import print_check
from audit.report.write import FORMS
from rules import limits
from rules.assess import assess
from rules.assessment import Assessment, Severity
from rules.record import Site
from sample_sites.catalogue import sample_site

PROFILE = """
[rules.VD01]
severity = "note"
reason = "the owner accepts the drop in writing"

[rules.VD02]
off = true
reason = "the meters are at the calibration house"
"""
LOWERED = (
    "VD01 (Computed drop above the allowed drop) reports note, usually soon, by limits profile ours.toml: "
    "the owner accepts the drop in writing."
)
OFF = (
    "VD02 (Measured drop above the computed drop) is switched off, by limits profile ours.toml: "
    "the meters are at the calibration house."
)


@pytest.fixture(scope="module")
def site() -> Site:
    return replace(read_folder(Path(str(sample_site("doors").folder))), limits="ours.toml", own_limits=PROFILE)


@pytest.fixture(scope="module")
def assessment(site: Site) -> Assessment:
    return assess(site, limits.of(site))


@pytest.mark.parametrize("audience", AUDIENCES)
@pytest.mark.parametrize("ending", FORMS)
def test_every_form_prints_it_with_its_reason(ending: str, audience: str, site: Site, assessment: Assessment) -> None:
    written = FORMS[ending](content_of(site, assessment, audience)).replace("\\", "")
    assert LOWERED in written
    assert OFF in written


def test_check_prints_it_with_its_reason(site: Site, assessment: Assessment) -> None:
    printed = io.StringIO()
    print_check(site, assessment, printed)
    told = " ".join(printed.getvalue().split())
    assert LOWERED in told
    assert "switched off by limits profile ours.toml: the meters are at the calibration house" in told


def test_json_has_it(assessment: Assessment) -> None:
    told = as_json(assessment)
    Draft202012Validator(schema()).validate(told)
    assert told["rule_changes"] == [
        {
            "rule": "VD01", "off": False, "severity": "note", "usual": "soon",
            "reason": "the owner accepts the drop in writing", "profile": "ours.toml",
        },
        {
            "rule": "VD02", "off": True, "usual": "watch",
            "reason": "the meters are at the calibration house", "profile": "ours.toml",
        },
    ]  # fmt: skip


def test_a_finding_of_a_lowered_rule_says_so(assessment: Assessment) -> None:
    (first, *_) = [finding for finding in assessment.findings if finding.rule == "VD01"]
    assert first.severity is Severity.NOTE
    assert "note in place of soon by limits profile ours.toml: the owner accepts the drop in writing" in first.source
    assert not [finding for finding in assessment.findings if finding.rule == "VD02"]
