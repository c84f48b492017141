"""One cell of the entry strip: what is expected, the value being typed, and whether it is saved."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from textual import on
from textual.app import ComposeResult
from textual.containers import Horizontal
from textual.events import Key
from textual.message import Message
from textual.reactive import reactive
from textual.widgets import Input, Static

from audit.tui.entry.reading import value_words
from audit.tui.entry.slots import Slot
from audit.tui.widgets.cell_input import CellInput
from rules.text import clean

SIGNS = {"empty": " ", "typing": " ", "saving": "…", "saved": "✓", "refused": "×"}
"""What stands behind a cell; the line beneath says the same in words."""


class ValueInput(CellInput):
    """A value; no value holds a question mark, which is help, or begins with n, which is a new round."""

    @dataclass
    class NewRound(Message):
        """Another round is to begin in place of the one that goes on."""

    async def on_key(self, event: Key) -> None:
        """Ask for help, or for a new round, in place of typing the letter."""
        if event.key == "question_mark":
            event.stop()
            event.prevent_default()
            await self.run_action("screen.help")
        elif event.key == "n" and not self.value:
            event.stop()
            event.prevent_default()
            self.post_message(self.NewRound())


class EntryCell(Horizontal):
    """A slot of a round with its input."""

    DEFAULT_CSS = """
    EntryCell {
        width: auto;
        height: 1;
        margin-right: 2;
        & > .name { width: auto; color: $quiet; }
        & > ValueInput { width: 12; }
        &.-round > ValueInput { width: 6; }
        & > .sign { width: 1; }
        &:focus-within > .name { color: $foreground; text-style: bold; }
        &.-saved > .sign { color: $status-sound; }
        &.-refused > .sign { color: $status-act; text-style: bold; }
    }
    """

    state: reactive[Literal["empty", "typing", "saving", "saved", "refused"]] = reactive("empty", init=False)

    @dataclass
    class Accepted(Message):
        """Enter was pressed in the cell."""

        cell: EntryCell

    @dataclass
    class Typed(Message):
        """What stands in the cell has changed."""

        cell: EntryCell

    @dataclass
    class Entered(Message):
        """The cell was moved to."""

        cell: EntryCell

    def __init__(self, slot: Slot | None, text: str = "", name: str = "") -> None:
        super().__init__(classes="" if slot is not None else "-round")
        self.slot = slot
        """``None`` for the cell that names the round."""
        self.label = name or (slot.label if slot is not None else "")
        self.complaint = ""
        """What is wrong with a value that was refused."""
        self.doubted = ""
        """The text that was asked about; accepted once more, it is saved."""
        self._shown = text or self._saved_text

    def compose(self) -> ComposeResult:
        yield Static(f"{clean(self.label)} ", classes="name", markup=False)
        yield ValueInput(self._shown)
        yield Static(SIGNS["empty"], classes="sign")

    def on_mount(self) -> None:
        if self.slot is not None and self.slot.saved is not None:
            self.state = "saved"

    @property
    def _saved_text(self) -> str:
        saved = self.slot.saved if self.slot is not None else None
        return "" if saved is None else saved.as_typed("value") or value_words(saved)

    @property
    def text(self) -> str:
        """What stands in the cell."""
        return self.query_one(ValueInput).value.strip()

    @property
    def is_changed(self) -> bool:
        """Whether something stands there that is not saved."""
        return bool(self.text) and self.text != self._saved_text

    def take(self, slot: Slot) -> None:
        """The record has changed: show what is saved unless something else is being typed."""
        before, self.slot = self._saved_text, slot
        field = self.query_one(ValueInput)
        if self._saved_text == before:
            return
        if self.state == "saving" or field.value.strip() in ("", before):
            field.value = self._saved_text
            self.state = "saved" if slot.saved is not None else "empty"

    def restore(self) -> None:
        """Show what is saved again."""
        self.query_one(ValueInput).value = self._saved_text

    def go_to(self) -> None:
        """Put the cursor here."""
        self.screen.set_focus(self.query_one(ValueInput))

    def accept(self) -> None:
        """As if Enter were pressed here."""
        self.post_message(self.Accepted(self))

    def watch_state(self, state: str) -> None:
        self.query_one(".sign", Static).update(SIGNS[state])
        for name in ("saved", "refused"):
            self.set_class(state == name, f"-{name}")

    @on(Input.Submitted)
    def _accepted(self, event: Input.Submitted) -> None:
        event.stop()
        self.post_message(self.Accepted(self))

    @on(Input.Changed)
    def _typed(self, event: Input.Changed) -> None:
        event.stop()
        if self.slot is not None and self.state != "saving":
            self.state = "typing" if self.is_changed else "saved" if self.slot.saved is not None else "empty"
        self.post_message(self.Typed(self))

    def on_descendant_focus(self) -> None:
        self.post_message(self.Entered(self))
