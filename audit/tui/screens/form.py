"""The form of one row: its fields one beneath the other, each saved as it is accepted."""

from __future__ import annotations

from typing import ClassVar

from textual import on
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import VerticalScroll

from audit.report.bar import text_bar
from audit.report.phrases import drop_words, status_words
from audit.tui.drawing.pieces import Line, apart, piece
from audit.tui.drawing.rows import row_title
from audit.tui.edits import Change, ChangeSettings, Edit
from audit.tui.entry.assumed import MEANING, assumed
from audit.tui.entry.checks import complaint_about
from audit.tui.entry.fields import (
    SITE,
    Field,
    FieldRefused,
    FieldValue,
    answers_for,
    fields_of,
    read_field,
    row_of,
    text_of,
    unit_of,
)
from audit.tui.messages import Refused
from audit.tui.screens.base import OurScreen
from audit.tui.state import Survey
from audit.tui.widgets.few_lines import FewLines
from audit.tui.widgets.field_line import FieldLine
from audit.tui.widgets.keys_line import KeysLine
from rules.problems.cells import accepted
from rules.record import Row, Site
from rules.text import either, quoted


class FormScreen(OurScreen[None]):
    """
    Shows and changes one row of a table, or the settings of the site.

    Parameters
    ----------
    table, row_id : str
        The row; ``site`` and an empty id for the settings.
    start : str
        Field at which to begin.
    """

    CSS_PATH = "form.tcss"
    AUTO_FOCUS: ClassVar[str | None] = ""
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("up,shift+tab", "step(-1)", "the field before; a change is saved", show=False, key_display="↑"),
        Binding("down,tab", "step(1)", "next field", key_display="↓", tooltip="the next field; a change is saved"),
        Binding("escape", "leave", "done", key_display="Esc", tooltip="give up what is being typed, else leave"),
        Binding("f1", "help", "help", key_display="? Enter", tooltip="what the keys do, and the cautions"),
    ]

    def __init__(self, table: str, row_id: str, start: str = "") -> None:
        super().__init__()
        self._table = table
        self._row_id = row_id
        self._start = start

    def compose(self) -> ComposeResult:
        yield FewLines(id="title")
        yield VerticalScroll(id="fields", can_focus=False)
        yield FewLines(id="hint")
        yield FewLines(id="said")
        yield KeysLine()

    async def on_mount(self) -> None:
        survey, row = self._survey, self._row
        if row is None or survey is None:
            self.dismiss()
            return
        lines = [FieldLine(field, *self._about(field, row, survey)) for field in fields_of(self._table)]
        await self.query_one("#fields").mount(*lines)
        first = next((one for one in lines if one.field.name == self._start), lines[0])
        first.go_to()
        self.watch(self.app, "survey", self._take)

    # --- the record

    @property
    def _survey(self) -> Survey | None:
        return self.ohmwalk.survey

    @property
    def _row(self) -> Row | Site | None:
        return None if self._survey is None else row_of(self._survey.site, self._table, self._row_id)

    @staticmethod
    def _about(field: Field, row: Row | Site, survey: Survey) -> tuple[str, tuple[str, ...], str, str]:
        """Text, answers, unit and assumption of a field."""
        limits = None if survey.context is None else survey.context.limits
        index = survey.index
        return (
            text_of(field, row, index),
            answers_for(field, row, index),
            unit_of(field, row),
            assumed(field, row, index, limits),
        )

    def _take(self, survey: Survey | None) -> None:
        row = self._row
        if survey is None or row is None:
            self.dismiss()  # someone else removed it
            return
        for field_line in self.query(FieldLine):
            field_line.take(*self._about(field_line.field, row, survey))
        self._show_title(survey, row)

    def _show_title(self, survey: Survey, row: Row | Site) -> None:
        title = (piece(" "), piece(row_title(self._table, row, survey.index), "strong"))
        verdict = self._verdict(survey, row)
        self.query_one("#title", FewLines).say(lambda width: [apart(title, verdict, width)])

    def _verdict(self, survey: Survey, row: Row | Site) -> Line:
        """Bar and status of the circuit that the row belongs to: they follow each change."""
        circuit_id = getattr(row, "circuit_id", "") or (self._row_id if self._table == "circuits" else "")
        result = survey.results.get(circuit_id)
        if result is None:
            return ()
        words = drop_words(result)
        return (
            piece(text_bar(words.bar), "bar"),
            piece(f"  {words.of_allowed}  "),
            piece(f"{status_words(result.status)} ", str(result.status)),
        )

    # --- moving

    @on(FieldLine.Entered)
    def _show_hint(self, message: FieldLine.Entered) -> None:
        self.query_one("#hint", FewLines).say_words(self._hint(message.field_line.field))
        if not any(one.state == "refused" for one in self.query(FieldLine)):
            self.say("")

    @on(FieldLine.Mended)
    def _unsay_refusal(self, message: FieldLine.Mended) -> None:
        message.stop()
        if not any(one.state == "refused" for one in self.query(FieldLine)):
            self.say("")

    def _hint(self, field: Field) -> str:
        row, survey = self._row, self._survey
        if row is None or survey is None:
            return ""
        answers = answers_for(field, row, survey.index)
        words = either(answers) if answers else accepted(field.column, unit_of(field, row))
        meaning = MEANING.get((field.table, field.name), "")
        return f"{field.label}: {meaning} · {words}" if meaning and meaning != words else f"{field.label}: {words}"

    def _at_hand(self) -> FieldLine | None:
        return next((one for one in self.query(FieldLine) if one.has_focus_within), None)

    def action_step(self, by: int) -> None:
        """To another field; a change is accepted on the way."""
        if (field_line := self._at_hand()) is not None:
            self._accept(field_line, by)

    @on(FieldLine.Accepted)
    def _accepted(self, message: FieldLine.Accepted) -> None:
        message.stop()
        self._accept(message.field_line, message.step, may_end=True)

    def _go_on(self, field_line: FieldLine, by: int, *, may_end: bool) -> None:
        lines = list(self.query(FieldLine))
        refused = next((one for one in lines if one.state == "refused" and one is not field_line), None)
        place = lines.index(field_line) + by
        if refused is not None and by > 0:
            refused.go_to()
        elif 0 <= place < len(lines):
            lines[place].go_to()
        elif may_end and not any(one.state in ("saving", "refused") for one in lines):
            self.dismiss()

    def action_leave(self) -> None:
        """Give up what is being typed, else leave."""
        field_line = self._at_hand()
        if field_line is not None and field_line.is_changed and field_line.state != "saving":
            field_line.restore()
            self._show_hint(FieldLine.Entered(field_line))
        else:
            self.dismiss()

    # --- saving

    def _accept(self, field_line: FieldLine, step: int, *, may_end: bool = False) -> None:
        row, survey = self._row, self._survey
        if row is None or survey is None:
            return
        if field_line.text.strip() == "?":
            field_line.restore()
            self.action_help()
            return
        if not field_line.is_changed:
            self._go_on(field_line, step, may_end=may_end)
            return
        try:
            value = self._checked(field_line, row, survey)
        except FieldRefused as error:
            self._refuse(field_line, str(error))
            return
        field_line.state = "saving"
        saving = self._save(field_line, value, row_title(self._table, row, survey.index))
        if self.ohmwalk.settings.who:
            self.run_worker(saving, group="save")
        else:
            self.ohmwalk.flow(saving)  # it asks for the name
        self._go_on(field_line, step, may_end=False)

    def _checked(self, field_line: FieldLine, row: Row | Site, survey: Survey) -> FieldValue:
        field = field_line.field
        if len(meant := field_line.may_mean) > 1:
            raise FieldRefused(f"{quoted(field_line.text.strip())} may mean {either(meant)}")
        field_line.complete()
        value = read_field(field_line.meant, field, row, survey.index)
        complaint = complaint_about(field, row, value.fields, survey.index)
        if complaint:
            raise FieldRefused(complaint)
        return value

    async def _save(self, field_line: FieldLine, value: FieldValue, title: str) -> None:
        said = field_line.meant.strip() or "not known"
        why = f"{title}: {field_line.field.label} {said}"
        step = (
            ChangeSettings(value.fields, value.typed)
            if self._table == SITE
            else Change(self._table, self._row_id, value.fields, value.typed)
        )
        answer = await self.ohmwalk.save(Edit(why, (step,)))
        if isinstance(answer, Refused):
            self._refuse(field_line, f"{answer.line} · Enter tries again")
        else:
            field_line.state = "saved"

    def _refuse(self, field_line: FieldLine, complaint: str) -> None:
        """
        What was typed stays in the field; its sign and a line say why, and with the next Enter the cursor goes back.

        Not at once: her fingers may be typing into the next field already.
        """
        field_line.state = "refused"
        self.say(f"{field_line.field.label}: {complaint}", "wrong")
