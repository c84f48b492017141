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
from rules.fold import said
from rules.record import Site
from rules.rule import Rule, catalogue
from tests.rules.limits_read import groups_read

CASES = Path(__file__).parent / "cases"
FINDS, ALONE, LIMIT, OPEN = "finds", "leaves alone", "at the limit", "not judged"
STATUSES = (
    "verified",
    "computed",
    "from-memory",
    "common practice, no source",
    "our own rule",
    "our own default",
    "textbook, no edition",
)
KINDS = {FINDS, ALONE, LIMIT, OPEN}
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
    kind, finds, gaps = case["kind"], bool(case.get("finds")), bool(case.get("not_judged"))
    assert kind in KINDS
    assert {FINDS: finds, ALONE: not finds and not gaps, LIMIT: True, OPEN: gaps and not finds}[kind], (
        "kind and outcome"
    )
    assert kind != LIMIT or "the limit is" in case["worked"], "what the limit is"
    site = build(tables, settings, own, case.get("check", True))
    assessment = assess(site, limits.of(site))
    found = [finding for finding in said(assessment.findings) if finding.rule == rule]
    assert [f"{finding.where}: {finding.why}" for finding in found] == case.get("finds", [])
    assert [str(finding.severity) for finding in found] == case.get("severity", [str(f.severity) for f in found])
    open_ = [gap for gap in assessment.not_judged if gap.rule == rule]
    assert [": ".join(part for part in (gap.where, gap.why) if part) for gap in open_] == case.get("not_judged", [])
    if "stands_under" in case:
        assert [[above.id for above in assessment.findings if each in above.holds] for each in found] == [
            [name] if name else [] for name in case["stands_under"]
        ]
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
        for citation in (rule.source, *rule.also):
            assert citation.document
            assert citation.status in STATUSES, "whether it was read, computed, remembered or is our own"

    def test_has_both_examples_in_its_text(self, rule: Rule) -> None:
        assert "**Finds**:" in rule.text
        assert "**Leaves alone**:" in rule.text

    def test_lies_in_a_file_named_for_it(self, rule: Rule) -> None:
        assert len(list(CHECKS.glob(f"{rule.id.lower()}_*.py"))) == 1

    def test_names_the_limits_that_it_decides_by(self, rule: Rule) -> None:
        (path,) = CHECKS.glob(f"{rule.id.lower()}_*.py")
        assert groups_read(path) <= set(rule.limits), f"{rule.id} reads groups that it does not name"
        assert set(rule.limits) <= set(limits.of(Site(name="case")).groups), "a group that no profile has"
        assert len(set(rule.limits)) == len(rule.limits)

    def test_has_cases_of_all_four_kinds_or_says_why_not(self, rule: Rule) -> None:
        content = tomllib.loads((CASES / f"{rule.id}.toml").read_text(encoding="utf-8"))
        not_applicable = content.get("not_applicable", {})
        kinds = {case["kind"] for case in content["case"]}
        assert set(not_applicable) <= {LIMIT, OPEN}, "every rule finds something and leaves something alone"
        assert all(len(reason.split()) > 3 for reason in not_applicable.values())
        assert kinds.isdisjoint(not_applicable), "a kind that has a case cannot be said not to occur"
        assert kinds | set(not_applicable) == KINDS


def test_no_case_is_without_a_rule() -> None:
    assert {path.stem for path in CASES.glob("*.toml")} == {rule.id for rule in catalogue()}


def test_no_file_in_the_folder_is_without_a_rule() -> None:
    assert len([p for p in CHECKS.glob("*.py") if p.name != "__init__.py"]) == len(catalogue())
