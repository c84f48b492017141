"""All findings by severity; Enter goes to the circuit in the walk."""

from __future__ import annotations

from typing import ClassVar

from textual import on
from textual.app import ComposeResult
from textual.binding import Binding, BindingType

from audit.tui.drawing.findings import SEVERITY_ROLES
from audit.tui.drawing.pieces import Line, apart, piece
from audit.tui.drawing.walk import cannot_judge_lines
from audit.tui.screens.base import OurScreen
from audit.tui.screens.rule import RULE_KEY, open_rule
from audit.tui.state import Survey
from audit.tui.widgets.few_lines import FewLines
from audit.tui.widgets.finding_list import FindingList
from audit.tui.widgets.keys_line import KeysLine
from audit.tui.widgets.pick_list import PickList
from rules.assessment import Severity


class FindingsScreen(OurScreen[str]):
    """Gives back the id of the circuit or board to go to; empty for none."""

    CSS_PATH = "findings.tcss"
    AUTO_FOCUS: ClassVar[str | None] = "#findings"
    BINDINGS: ClassVar[list[BindingType]] = [
        RULE_KEY,
        Binding("r", "app.report", "report", tooltip="write the audit report to a file"),
        Binding("question_mark", "help", "help", key_display="?", tooltip="what the keys do, and the cautions"),
        Binding("escape,left,f", "leave", "the walk", key_display="Esc", tooltip="back to the walk"),
    ]

    def compose(self) -> ComposeResult:
        yield FewLines(id="title")
        yield FindingList(id="findings")
        yield FewLines(id="said")
        yield KeysLine()

    def on_mount(self) -> None:
        self.watch(self.app, "survey", self._take)

    def _take(self, survey: Survey | None) -> None:
        assessment = survey.assessment if survey is not None else None
        title = self.query_one("#title", FewLines)
        if survey is not None and survey.cannot_judge:
            title.say(lambda width: [(piece(" findings", "strong"),), *cannot_judge_lines(survey, width)])
            return
        if survey is None or assessment is None:
            title.say(lambda width: [(piece(" findings", "strong"), piece("   judging …", "quiet"))])
            return
        counts: list[Line] = [
            (piece(f"{number} {severity}   ", SEVERITY_ROLES[severity]),)
            for severity in Severity
            if (number := sum(finding.severity is severity for finding in assessment.findings))
        ]
        said = tuple(part for line in counts for part in line) or (piece("none   "),)
        name = (piece(" findings", "strong"), piece(f"   {survey.site.name}", "quiet"))
        title.say(lambda width: [apart(name, said, width)])
        self.query_one(FindingList).show(assessment)

    @on(PickList.Opened)
    def go_to_circuit(self) -> None:
        """Show the finding's circuit or board in the walk."""
        finding, survey = self.query_one(FindingList).chosen, self.ohmwalk.survey
        if finding is None or survey is None:
            return
        site = survey.site
        if finding.circuit is None:
            ids = {row.tag: row.id for row in site.sources} | {row.tag: row.id for row in site.boards}
            row_id = ids.get(finding.board or "")
        else:
            row_id = next((row.id for row in site.circuits if row.tag == finding.circuit), None)
        if row_id is None:
            self.say("this finding is about the whole site")
        else:
            self.dismiss(row_id)

    def action_show_rule(self) -> None:
        """The page of the rule behind the finding at the cursor."""
        finding = self.query_one(FindingList).chosen
        self.ohmwalk.flow(open_rule(self, [] if finding is None else [finding]))

    def action_leave(self) -> None:
        """Back to the walk."""
        self.dismiss("")
