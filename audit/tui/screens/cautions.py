"""What is to be read before the first live reading of a visit; one key acknowledges it."""

from __future__ import annotations

from typing import ClassVar

from textual.app import ComposeResult
from textual.binding import Binding, BindingType

from audit.tui.drawing.cautions import caution_lines
from audit.tui.screens.base import OurScreen
from audit.tui.widgets.few_lines import FewLines
from audit.tui.widgets.keys_line import KeysLine
from audit.tui.widgets.lines_view import LinesView
from rules.cautions import Caution


class CautionScreen(OurScreen[bool]):
    """Gives back whether the cautions were acknowledged."""

    CSS_PATH = "cautions.tcss"
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("y", "acknowledge", "I have read this and may do it"),
        Binding("question_mark", "help", "help", key_display="?", tooltip="what the keys do, and the cautions"),
        Binding("escape", "leave", "not now", key_display="Esc"),
    ]

    def __init__(self, cautions: tuple[Caution, ...], highest_v: float, visit: str) -> None:
        super().__init__()
        self._cautions = cautions
        self._highest_v = highest_v
        self._visit = visit

    def compose(self) -> ComposeResult:
        yield LinesView(id="text")
        yield FewLines(id="said")
        yield KeysLine()

    def on_resize(self) -> None:
        text = self.query_one("#text", LinesView)
        text.show_lines(caution_lines(self._cautions, self._highest_v, self._visit, text.inner_width))

    def action_acknowledge(self) -> None:
        """She has read them."""
        self.dismiss(True)

    def action_leave(self) -> None:
        """No reading is taken."""
        self.dismiss(False)
