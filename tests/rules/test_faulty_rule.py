"""A rule that raises is reported as not judged with its reason, everywhere that people read; the others go on."""

from __future__ import annotations

import io
import json
from collections.abc import Iterator
from pathlib import Path

import pytest

from audit.intake.folder import read_folder
from audit.report.as_json import as_json
from audit.report.content import AUDIENCES, content_of
from audit.report.text import print_check
from audit.report.write import FORMS
from audit.tui.drawing.findings import gap_lines
from audit.tui.drawing.pieces import text_of
from rules import limits, rule
from rules.assess import assess
from rules.assessment import Assessment, Citation, Finding, NotJudged, Severity
from rules.errors import MissingData
from rules.record import Site
from rules.rule import About, Case, Rule, catalogue
from sample_sites.catalogue import sample_site

SAID = "fault of the program in this rule: ZeroDivisionError: division by zero (test_faulty_rule.py, line "
FAULT_WORDS = rule.fault_words
"""As it is; the tests' own fixture lets faults surface instead."""


def raising(about: About, error: Exception, id_: str = "ZZ01") -> Rule:
    def check(case: Case) -> Iterator[Finding | NotJudged]:
        yield made.finding(case, "here", "found before the fault", numbers={})
        raise error

    made = Rule(
        id=id_,
        title="Raises",
        about=about,
        severity=Severity.NOTE,
        remedy="None.",
        caution="None.",
        source=Citation("this test"),
        check=check,
    )
    return made


@pytest.fixture(scope="module")
def site() -> Site:
    return read_folder(Path(str(sample_site("doors").folder)))


@pytest.fixture(scope="module")
def sound(site: Site) -> Assessment:
    return assess(site, limits.of(site))


def judged_with(extra: Rule, site: Site, monkeypatch: pytest.MonkeyPatch) -> Assessment:
    everything = (*catalogue(), extra)
    monkeypatch.setattr(rule, "catalogue", lambda: everything)
    monkeypatch.setattr(rule, "fault_words", FAULT_WORDS)
    return assess(site, limits.of(site))


@pytest.mark.parametrize("about", ["circuit", "board", "source", "site"])
def test_the_others_go_on(about: About, site: Site, sound: Assessment, monkeypatch: pytest.MonkeyPatch) -> None:
    told = judged_with(raising(about, ZeroDivisionError("division by zero")), site, monkeypatch)
    assert [f for f in told.findings if f.rule != "ZZ01"] == list(sound.findings)
    assert [gap for gap in told.not_judged if gap.rule != "ZZ01"] == list(sound.not_judged)
    assert [result.status for result in told.circuits] == [result.status for result in sound.circuits]
    places = {"circuit": len(site.circuits), "board": len(site.boards), "source": len(site.sources), "site": 1}[about]
    gaps = [gap for gap in told.not_judged if gap.rule == "ZZ01"]
    assert len(gaps) == len([f for f in told.findings if f.rule == "ZZ01"]) == places
    assert all(gap.why.startswith(SAID) for gap in gaps)


def test_what_is_missing_is_said_in_its_own_words(site: Site, monkeypatch: pytest.MonkeyPatch) -> None:
    told = judged_with(raising("site", MissingData("nobody knows the colour")), site, monkeypatch)
    assert [gap.why for gap in told.not_judged if gap.rule == "ZZ01"] == ["nobody knows the colour"]
    assert not told.rule_faults


def test_no_room_is_no_fault_of_a_rule(site: Site, monkeypatch: pytest.MonkeyPatch) -> None:
    with pytest.raises(MemoryError):
        judged_with(raising("site", MemoryError()), site, monkeypatch)


def test_json_screen_and_every_report_say_so(site: Site, monkeypatch: pytest.MonkeyPatch) -> None:
    told = judged_with(raising("circuit", ZeroDivisionError("division by zero")), site, monkeypatch)
    assert any(gap["why"].startswith(SAID) for gap in as_json(told)["not_judged"])
    printed = io.StringIO()
    print_check(site, told, printed)
    assert "".join(SAID.split()) in "".join(printed.getvalue().split())
    assert SAID in "".join(text_of(line) for line in gap_lines(told.not_judged, 10_000))
    for audience in AUDIENCES:
        content = content_of(site, told, audience)
        for ending, form in FORMS.items():
            words = form(content).replace("\\", "")
            assert (
                "ZZ01 could not judge: " + SAID in words or f"ZZ01 could not judge: {json.dumps(SAID)[1:-1]}" in words
            ), f"{ending} for the {audience}"


def test_in_these_tests_a_fault_surfaces(site: Site, monkeypatch: pytest.MonkeyPatch) -> None:
    everything = (*catalogue(), raising("site", ZeroDivisionError("division by zero")))
    monkeypatch.setattr(rule, "catalogue", lambda: everything)
    with pytest.raises(ZeroDivisionError):
        assess(site, limits.of(site))
