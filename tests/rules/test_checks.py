"""Every rule: whole metadata, text with both examples, and its cases with the hand calculation."""

from __future__ import annotations

import tomllib
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

from audit.intake.folder import site_of
from rules import limits
from rules.assess import assess
from rules.record import Site
from rules.rule import Rule, catalogue

CASES = Path(__file__).parent / "cases"
CHECKS = Path(__file__).parent.parent.parent / "rules" / "checks"


def rows(tables: dict[str, list[dict[str, Any]]]) -> dict[str, list[dict[str, str]]]:
    return {name: [{key: str(cell) for key, cell in row.items()} for row in table] for name, table in tables.items()}


def cases() -> Iterator[Any]:
    for path in sorted(CASES.glob("*.toml")):
        content = tomllib.loads(path.read_text(encoding="utf-8"))
        for case in content["case"]:
            settings = content.get("site", {}) | case.get("site", {})
            site = {key: value for key, value in settings.items() if value != ""}
            tables = rows(content.get("base", {}) | case.get("tables", {}))
            own = case.get("own_limits")
            yield pytest.param(path.stem, case, tables, site, own, id=f"{path.stem}-{case['name']}")


def build(tables: dict[str, list[dict[str, str]]], settings: dict[str, Any], own: str | None, check: bool) -> Site:
    from dataclasses import replace

    site = site_of(tables, settings, check=check)
    return replace(site, limits="ours.toml", own_limits=own) if own else site


@pytest.mark.parametrize(("rule", "case", "tables", "settings", "own"), cases())
def test_case(
    rule: str, case: dict[str, Any], tables: dict[str, list[dict[str, str]]], settings: dict[str, Any], own: str | None
) -> None:
    assert case["worked"].strip(), "the hand calculation is missing"
    site = build(tables, settings, own, case.get("check", True))
    assessment = assess(site, limits.of(site))
    found = [finding for finding in assessment.findings if finding.rule == rule]
    assert [f"{finding.where}: {finding.why}" for finding in found] == case.get("finds", [])
    assert [str(finding.severity) for finding in found] == case.get("severity", [str(f.severity) for f in found])
    open_ = [gap for gap in assessment.not_judged if gap.rule == rule]
    assert [": ".join(part for part in (gap.where, gap.why) if part) for gap in open_] == case.get("not_judged", [])
    if "consequences" in case:
        assert [text for finding in found for text in finding.consequences] == case["consequences"]
    assert len({finding.id for finding in assessment.findings}) == len(assessment.findings)


@pytest.mark.parametrize("rule", catalogue(), ids=lambda rule: rule.id)
class TestEachRule:
    def test_says_everything_that_a_reader_asks(self, rule: Rule) -> None:
        assert rule.title
        assert not rule.title.endswith(".")
        assert rule.remedy.endswith(".")
        assert rule.caution.endswith(".")
        assert rule.source.document
        assert rule.source.status or rule.source.clause

    def test_has_both_examples_in_its_text(self, rule: Rule) -> None:
        assert "**Finds**:" in rule.text
        assert "**Leaves alone**:" in rule.text

    def test_lies_in_a_file_named_for_it(self, rule: Rule) -> None:
        assert len(list(CHECKS.glob(f"{rule.id.lower()}_*.py"))) == 1

    def test_has_cases_of_both_outcomes(self, rule: Rule) -> None:
        content = tomllib.loads((CASES / f"{rule.id}.toml").read_text(encoding="utf-8"))
        assert any(case.get("finds") for case in content["case"])
        assert any(not case.get("finds") for case in content["case"])


def test_no_case_is_without_a_rule() -> None:
    assert {path.stem for path in CASES.glob("*.toml")} == {rule.id for rule in catalogue()}


def test_no_file_in_the_folder_is_without_a_rule() -> None:
    assert len([p for p in CHECKS.glob("*.py") if p.name != "__init__.py"]) == len(catalogue())
