"""The page of the rule behind a finding, with the limits in force on the site."""

from __future__ import annotations

from collections.abc import Iterable
from typing import TYPE_CHECKING, Any, ClassVar

from textual.app import ComposeResult
from textual.binding import Binding, BindingType

from audit.tui.drawing.rule import rule_lines
from audit.tui.screens.ask import Ask, Choice
from audit.tui.screens.base import OurScreen
from audit.tui.widgets.few_lines import FewLines
from audit.tui.widgets.keys_line import KeysLine
from audit.tui.widgets.lines_view import LinesView
from rules.assessment import Finding

if TYPE_CHECKING:
    from audit.rule_page import RulePage

RULE_KEY = Binding("w", "show_rule", "rule", tooltip="the rule behind a finding: its text, limits and sources")
"""Opens the page from wherever a finding stands."""


class RuleScreen(OurScreen[None]):
    """One rule's page."""

    CSS_PATH = "rule.tcss"
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape,q,w,left", "leave", "back", key_display="Esc", tooltip="back to the finding"),
        Binding("question_mark", "help", "help", key_display="?", tooltip="what the keys do, and the cautions"),
    ]

    def __init__(self, page: RulePage) -> None:
        super().__init__()
        self._page = page

    def compose(self) -> ComposeResult:
        yield LinesView(id="text")
        yield FewLines(id="said")
        yield KeysLine()

    def on_resize(self) -> None:
        text = self.query_one("#text", LinesView)
        text.show_lines(rule_lines(self._page, text.inner_width))

    def action_leave(self) -> None:
        """Back to the finding."""
        self.dismiss()


async def open_rule(screen: OurScreen[Any], findings: Iterable[Finding]) -> None:
    """Show the page of the rule behind some findings; of several rules it asks which."""
    survey = screen.ohmwalk.survey
    titles = {finding.rule: finding.title for finding in findings}
    if survey is None or survey.context is None or not titles:
        screen.say("no rule found anything here")
        return
    id_: str | None = next(iter(titles))
    if len(titles) > 1:
        choices = [Choice(rule, title) for rule, title in titles.items()]
        id_ = await screen.ohmwalk.ask(Ask("The page of rule", choices=choices, free=False))
    from audit.rule_page import rule_page  # with the judge's modules, for which the first screen does not wait
    from rules.rule import catalogue

    limits = survey.context.limits
    pages = [rule_page(rule, limits) for rule in catalogue() if rule.id == id_]
    for page in pages:
        await screen.ohmwalk.ask(RuleScreen(page))
