"""The sample sites through every form: what is shown of a real check, and that all forms agree with its JSON."""

from __future__ import annotations

import csv
import html
import io
import json
import re
from dataclasses import replace
from functools import cache
from pathlib import Path
from typing import Any

import pytest
from jsonschema import Draft202012Validator
from rich.cells import cell_len

from audit.intake.folder import read_folder
from audit.opening import judge_site
from audit.report.as_json import as_json, schema
from audit.report.content import content_of
from audit.report.phrases import doubt_rows
from audit.report.records import as_shown
from audit.report.text import print_check
from audit.report.write import FORMS
from rules.assessment import STATUS_SIGNS, Assessment, Status
from rules.index import Index
from rules.record import Instrument, Reading, Site
from rules.units import show
from sample_sites.catalogue import SAMPLE_SITES, SampleSite

every_site = pytest.mark.parametrize("sample", SAMPLE_SITES, ids=lambda sample: sample.name)


@cache
def judged(sample: SampleSite) -> tuple[Site, Assessment]:
    site = read_folder(Path(str(sample.folder)))
    return site, judge_site(site, explain=True)


@cache
def forms_of(sample: SampleSite) -> dict[str, str]:
    """The inspector's report in every form and the text of check, as one long line each."""
    site, assessment = judged(sample)
    content = content_of(site, assessment, "inspector")
    written = {ending: form(content) for ending, form in FORMS.items()}
    written[".html"] = html.unescape(re.sub(r"<[^>]*>", " ", written[".html"]))
    written[".md"] = html.unescape(re.sub(r"\\([!-/:-@\[-`{-~])", r"\1", written[".md"]))
    written["text"] = checked(sample)
    return {name: " ".join(text.split()) for name, text in written.items()}


def checked(sample: SampleSite) -> str:
    stream = io.StringIO()
    print_check(*judged(sample), stream)
    return stream.getvalue()


def output_of(sample: SampleSite) -> Any:
    """The JSON as a script reads it."""
    return json.loads(json.dumps(as_json(judged(sample)[1])))


def sure(probability: float) -> str:
    """How a probability is written: never as certain."""
    if probability > 0.999:
        return "above 99.9 %"
    return "below 0.1 %" if probability < 0.001 else show(probability, "1", digits=3)


def shown(quantity: dict[str, Any]) -> str:
    return show(quantity["value"], quantity["unit"], quantity.get("u"))


@every_site
@pytest.mark.parametrize("audience", ["electrician", "inspector", "supervisor"])
def test_json_is_valid_with_and_without_a_report(sample: SampleSite, audience: str) -> None:
    validator = Draft202012Validator(schema())
    validator.validate(output_of(sample))
    site, assessment = judged(sample)
    report = json.loads(FORMS[".json"](content_of(site, assessment, audience)))
    validator.validate(report)
    assert {key: value for key, value in report.items() if key != "report"} == output_of(sample)


@every_site
def test_what_speaks_for_causes_and_against_them_stands_in_reports(sample: SampleSite) -> None:
    site, assessment = judged(sample)
    facts = {
        fact for result in assessment.circuits for place in result.causes
        for fact in (*place.speaks_for, *place.speaks_against)
    }  # fmt: skip
    assert len(facts) > 10
    told = {fact for circuit in output_of(sample)["circuits"] for row in circuit["causes"]
            for fact in (*row.get("for", ()), *row.get("against", ()))}  # fmt: skip
    assert told == facts
    for audience in ("electrician", "inspector"):
        content = content_of(site, assessment, audience)
        words = " ".join(html.unescape(re.sub(r"<[^>]*>", " ", FORMS[".html"](content))).split())
        assert not [fact for fact in facts if fact not in words]


@every_site
def test_heat_and_doubts_stand_in_json_and_in_reports(sample: SampleSite) -> None:
    site, assessment = judged(sample)
    content = content_of(site, assessment, "electrician")
    words = " ".join(html.unescape(re.sub(r"<[^>]*>", " ", FORMS[".html"](content))).split())
    heats = 0
    for circuit, result in zip(output_of(sample)["circuits"], assessment.circuits, strict=True):
        for row in circuit["causes"]:
            if "heat_read" in row and row["probability"] > 0.9:
                heats += 1
                assert f"{shown(row['heat_read'])} in it at " in words
        if "drop" in circuit:
            squares = sum(doubt["value"] ** 2 for doubt in circuit["drop"]["doubts"].values())
            assert squares == pytest.approx(circuit["drop"]["excess"]["u"] ** 2)
            assert result.drop is not None
            assert all(row.stated in words for row in doubt_rows(result.drop))
    claimed = [finding for finding in assessment.findings if finding.cause == "bad connection"]
    assert bool(heats) == bool(claimed)


@every_site
def test_every_number_of_a_finding_is_the_same_in_every_form(sample: SampleSite) -> None:
    findings = output_of(sample)["findings"]
    assert findings
    for finding in findings:
        for name, quantity in finding["numbers"].items():
            words = f"{name.replace('_', ' ')} {sure(quantity['value']) if name == 'probability' else shown(quantity)}"
            assert not [form for form, text in forms_of(sample).items() if words not in text]


@every_site
def test_every_drop_is_the_same_in_every_report(sample: SampleSite) -> None:
    drops = [circuit["drop"] for circuit in output_of(sample)["circuits"] if "drop" in circuit]
    assert drops
    for drop in drops:
        for name in ("measured", "computed", "excess"):
            missing = [form for form in (".html", ".md", ".json") if shown(drop[name]) not in forms_of(sample)[form]]
            assert not missing


@every_site
def test_the_walk_and_the_counts_say_what_the_json_says(sample: SampleSite) -> None:
    output = output_of(sample)
    text = checked(sample)
    for circuit in output["circuits"]:
        status = Status(circuit["status"])
        assert re.search(
            rf"^ +{re.escape(circuit['circuit'])} .* {re.escape(STATUS_SIGNS[status])} {status}$", text, re.M
        )
    for status in Status:
        if number := output["summary"][str(status)]:
            assert f"{number} {STATUS_SIGNS[status]} {status}" in re.sub(r"\s+", " ", text)
    severities = [finding["severity"] for finding in output["findings"]]
    for severity in set(severities):
        assert f"{severity.upper()} ({severities.count(severity)})" in text


@every_site
def test_the_text_fits_and_stays_plain(sample: SampleSite) -> None:
    lines = checked(sample).splitlines()
    assert max(cell_len(line) for line in lines) <= 80
    assert not [line for line in lines if line != line.rstrip() or "\x1b" in line]


@every_site
def test_the_table_of_findings_has_them_all(sample: SampleSite) -> None:
    site, assessment = judged(sample)
    text = FORMS[".csv"](content_of(site, assessment, "supervisor")).removeprefix("\ufeff")
    rows = list(csv.DictReader(io.StringIO(text, newline="")))
    assert sorted(row["finding"] for row in rows) == sorted(finding.id for finding in assessment.findings)


@every_site
def test_every_form_says_that_the_site_is_invented(sample: SampleSite) -> None:
    for form, text in forms_of(sample).items():
        assert "(invented)" in text
        assert form == ".csv" or "Invented building for demonstration" in text


@every_site
def test_every_reading_stands_in_the_inspectors_report(sample: SampleSite) -> None:
    site, _ = judged(sample)
    index = Index(site)
    for reading in site.readings:
        value = as_shown(reading, index)
        assert value.startswith(show(reading.value, reading.unit, digits=9).split()[0])
        assert not [form for form in (".html", ".md", ".json") if value not in forms_of(sample)[form]]


def test_a_reading_keeps_the_decimals_of_the_display() -> None:
    meter = Instrument(id="m", tag="M", quantity="voltage", accuracy_percent=0.1, counts=2, resolution=0.001)
    reading = Reading(id="r", round="1", quantity="voltage", at="way", value=53.5, instrument="M")
    index = Index(Site(name="x", instruments=(meter,)))
    assert as_shown(reading, index) == "53.500 V"
    assert as_shown(replace(reading, instrument=""), index) == "53.5 V"
    assert as_shown(replace(reading, value=0.1234567), index) == "0.1234567 V"
