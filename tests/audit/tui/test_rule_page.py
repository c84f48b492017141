"""One key opens the page of the rule behind a finding: on the findings page and on a circuit's."""

from __future__ import annotations

from pathlib import Path

from audit.tui.screens.ask import Ask
from audit.tui.screens.findings import FindingsScreen
from audit.tui.screens.rule import RuleScreen
from audit.tui.screens.survey import SurveyScreen
from tests.audit.tui.walker import walking


async def test_w_opens_the_rule_of_the_finding_at_the_cursor(plant: Path) -> None:
    async with walking(plant) as walk:
        await walk.keys("f")
        assert isinstance(walk.app.screen, FindingsScreen)
        assert "w rule" in walk.screen.splitlines()[-1]
        finding = walk.app.screen.query_one("FindingList").chosen  # type: ignore[attr-defined]
        await walk.keys("w")
        assert isinstance(walk.app.screen, RuleScreen)
        assert walk.screen.splitlines()[0].strip() == f"{finding.rule}  {finding.title}"
        assert "finds" in walk.screen
        await walk.keys("end")
        await walk.shows("Sources")
        await walk.keys("escape")
        assert isinstance(walk.app.screen, FindingsScreen)


async def test_on_a_circuits_page_it_asks_which_where_several_rules_found_something(plant: Path) -> None:
    async with walking(plant) as walk:
        several = next(
            result for result in walk.survey.survey.results.values()  # type: ignore[union-attr]
            if len({finding.rule for finding in result.findings}) > 1
        )  # fmt: skip
        await walk.at(several.circuit)
        await walk.keys("enter")
        assert "w rule" in walk.screen.splitlines()[-1]
        await walk.keys("w")
        assert isinstance(walk.app.screen, Ask)
        second = list(dict.fromkeys(finding.rule for finding in several.findings))[1]
        await walk.enter(second)
        assert isinstance(walk.app.screen, RuleScreen)
        assert walk.screen.splitlines()[0].startswith(f" {second}  ")
        await walk.keys("w")
        assert isinstance(walk.app.screen, SurveyScreen)
        await walk.keys("w", "escape")
        assert isinstance(walk.app.screen, SurveyScreen)


async def test_where_no_rule_found_anything_it_says_so(plant: Path) -> None:
    async with walking(plant) as walk:
        quiet = next(
            result for result in walk.survey.survey.results.values() if not result.findings  # type: ignore[union-attr]
        )  # fmt: skip
        await walk.at(quiet.circuit)
        await walk.keys("enter", "w")
        await walk.shows("no rule found anything here")
        assert isinstance(walk.app.screen, SurveyScreen)


async def test_help_tells_the_key_on_both_pages(plant: Path) -> None:
    async with walking(plant, size=(80, 100)) as walk:
        words = "the rule behind a finding: its text, limits and sources"
        await walk.keys("enter", "question_mark")
        assert words in walk.screen
        await walk.keys("escape", "f", "question_mark")
        assert words in walk.screen
