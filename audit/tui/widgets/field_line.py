"""One field of a form: its name, what it says, its unit, and what counts while it is empty."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

from textual import on
from textual.app import ComposeResult
from textual.containers import Horizontal
from textual.message import Message
from textual.reactive import reactive
from textual.widgets import Input, Static

from audit.tui.entry.fields import Field, completed, meanings
from audit.tui.widgets.cell_input import CellInput, Completing
from rules.text import clean

SIGNS = {"idle": " ", "saving": "…", "saved": "✓", "refused": "×"}


class FieldLine(Horizontal):
    """A field with its input."""

    DEFAULT_CSS = """
    FieldLine {
        height: 1;
        & > .name { width: 20; color: $quiet; padding-left: 3; }
        & > CellInput { width: 32; }
        & > CellInput:blur { background: $background; border-left: inner $background; border-right: inner $background; }
        & > .aside { width: 1fr; color: $quiet; }
        &:focus-within > .name { color: $foreground; text-style: bold; }
        &.-saved > .aside { color: $status-sound; }
        &.-refused > .aside { color: $status-act; text-style: bold; }
    }
    """

    state: reactive[Literal["idle", "saving", "saved", "refused"]] = reactive("idle", init=False)

    @dataclass
    class Accepted(Message):
        """Enter was pressed in the field, or it was left by an arrow after a change."""

        field_line: FieldLine
        step: int
        """Where to go on: 1 the next field, -1 the one before."""

    @dataclass
    class Entered(Message):
        """The field was moved to."""

        field_line: FieldLine

    @dataclass
    class Mended(Message):
        """What was refused is given up: the field is empty, or says again what is saved."""

        field_line: FieldLine

    def __init__(self, field: Field, text: str, answers: Sequence[str], unit: str, assumed: str) -> None:
        super().__init__()
        self.field = field
        self._saved = text
        self._answers = tuple(answers)
        self._unit = unit
        self._assumed = assumed

    def compose(self) -> ComposeResult:
        yield Static(clean(self.field.label), classes="name", markup=False)
        yield CellInput(clean(self._saved), suggester=Completing(self._answers) if self._answers else None)
        yield Static(clean(self._aside), classes="aside", markup=False)

    @property
    def _aside(self) -> str:
        unit = {"degC": "°C", "ohm": "Ω"}.get(self._unit, self._unit)
        mark = "" if "assumed" in self._assumed else " (assumed)"
        words = f"{unit}  {self._assumed}{mark}".strip() if self._assumed and not self._saved else unit
        return f"{SIGNS[self.state]} {words}"

    @property
    def text(self) -> str:
        """What stands in the field."""
        return self.query_one(CellInput).value

    @property
    def meant(self) -> str:
        """The text with its letters completed to the answer that they mean."""
        return completed(self.text.strip(), self._answers) if self._answers else self.text

    @property
    def may_mean(self) -> tuple[str, ...]:
        """The answers that the text may mean; several where it is not yet clear."""
        return meanings(self.text.strip(), self._answers)

    def complete(self) -> None:
        """Show the text as it will be stored."""
        if self.meant != self.text:
            self.query_one(CellInput).value = self.meant

    @property
    def is_changed(self) -> bool:
        """Whether something else stands there than what is saved."""
        return self.text != clean(self._saved)

    def take(self, text: str, answers: Sequence[str], unit: str, assumed: str) -> None:
        """The record has changed: show what it says unless something else is being typed."""
        was_changed = self.is_changed and self.state != "saving"
        self._saved, self._answers, self._unit, self._assumed = text, tuple(answers), unit, assumed
        field = self.query_one(CellInput)
        if isinstance(field.suggester, Completing):
            field.suggester.answers = self._answers
        if not was_changed and field.value != clean(text):
            field.value = clean(text)
        self.query_one(".aside", Static).update(clean(self._aside))

    def restore(self) -> None:
        """Show what is saved again."""
        self.query_one(CellInput).value = clean(self._saved)
        self.state = "idle"

    def go_to(self) -> None:
        """Put the cursor here."""
        self.screen.set_focus(self.query_one(CellInput))

    def watch_state(self, state: str) -> None:
        self.query_one(".aside", Static).update(clean(self._aside))
        for name in ("saved", "refused"):
            self.set_class(state == name, f"-{name}")

    @on(Input.Submitted)
    def _submitted(self, event: Input.Submitted) -> None:
        event.stop()
        self.post_message(self.Accepted(self, 1))

    @on(Input.Changed)
    def _changed(self, event: Input.Changed) -> None:
        event.stop()
        if self.state == "refused" and (not self.text.strip() or not self.is_changed):
            self.state = "idle"
            self.post_message(self.Mended(self))

    def on_descendant_focus(self) -> None:
        self.post_message(self.Entered(self))
