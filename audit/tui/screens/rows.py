"""The rows of a circuit, or the site's settings, sources, boards, meters and visits: open, add, remove."""

from __future__ import annotations

from typing import ClassVar

from textual import on
from textual.app import ComposeResult
from textual.binding import Binding, BindingType

from audit.tui.drawing.page import circuit_sketch, view_of
from audit.tui.drawing.pieces import piece
from audit.tui.drawing.rows import Item, circuit_items, row_title, site_items
from audit.tui.screens import changing
from audit.tui.screens.base import OurScreen
from audit.tui.screens.form import FormScreen
from audit.tui.state import Survey
from audit.tui.widgets.few_lines import FewLines
from audit.tui.widgets.keys_line import KeysLine
from audit.tui.widgets.pick_list import PickList
from audit.tui.widgets.row_list import RowList


class RowsScreen(OurScreen[None]):
    """Rows of one circuit, or of the site where ``circuit_id`` is empty."""

    CSS_PATH = "rows.tcss"
    AUTO_FOCUS: ClassVar[str | None] = "#rows"
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("a", "add", "add"),
        Binding("x", "remove", "remove"),
        Binding("u", "app.undo(False)", "undo"),
        Binding("U", "app.undo(True)", "do again", show=False),
        Binding("question_mark", "help", "help", key_display="?", tooltip="what the keys do, and the cautions"),
        Binding("escape,left", "leave", "back", key_display="Esc"),
    ]

    def __init__(self, circuit_id: str = "") -> None:
        super().__init__()
        self._circuit_id = circuit_id

    def compose(self) -> ComposeResult:
        yield FewLines(id="title")
        yield FewLines(id="sketch")
        yield RowList(id="rows")
        yield FewLines(id="said")
        yield KeysLine()

    def on_mount(self) -> None:
        self.watch(self.app, "survey", self._take)

    def _take(self, survey: Survey | None) -> None:
        if survey is None:
            return
        circuit = survey.index.circuits.get(self._circuit_id)
        if self._circuit_id and circuit is None:
            self.dismiss()  # removed, here or by someone else
            return
        name = (
            row_title("circuits", circuit, survey.index) if circuit is not None else f"the record of {survey.site.name}"
        )
        self.query_one("#title", FewLines).say(lambda width: [(piece(f" {name}", "strong"),)])
        view = view_of(survey, circuit.id) if circuit is not None else None
        if view is not None:
            self.query_one("#sketch", FewLines).say(lambda width: circuit_sketch(survey, view, width))
        items = circuit_items(survey.index, circuit.id) if circuit is not None else site_items(survey.site)
        self.query_one(RowList).show(survey, items)

    @property
    def _chosen(self) -> Item | None:
        return self.query_one(RowList).chosen

    @on(PickList.Opened)
    def open_row(self) -> None:
        """Open the form of the row at the cursor."""
        if (item := self._chosen) is not None:
            self.open(FormScreen(item.table, item.id))

    def action_add(self) -> None:
        """Add a row."""
        self.ohmwalk.flow(changing.add(self, self._circuit_id))

    def action_remove(self) -> None:
        """Remove the row at the cursor, after asking."""
        if (item := self._chosen) is not None:
            self.ohmwalk.flow(changing.remove(self, item.table, item.id))

    def action_leave(self) -> None:
        """Back to where it was opened."""
        self.dismiss()
