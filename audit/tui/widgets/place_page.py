"""The page of one circuit, or of a board; it is drawn anew for every width and whenever the record or its judgement changes."""

from __future__ import annotations

from textual.reactive import reactive

from audit.tui.drawing.board import board_lines
from audit.tui.drawing.page import CircuitView, page_lines, view_of
from audit.tui.state import Survey
from audit.tui.widgets.lines_view import LinesView


class PlacePage(LinesView):
    """Shows a circuit, board or source of the survey, or a circuit as it would be with what is being typed."""

    DEFAULT_CSS = """
    PlacePage { height: 1fr; }
    """

    survey: reactive[Survey | None] = reactive(None, init=False)
    place_id: reactive[str] = reactive("", init=False)
    """Of the circuit, board or source shown; empty for none."""
    typing: reactive[CircuitView | None] = reactive(None, init=False)
    """The circuit as it would be with what is being typed; stands in for what is recorded."""

    def watch_survey(self) -> None:
        self.draw()

    def watch_place_id(self) -> None:
        self.draw()
        self.scroll_home(animate=False)

    def watch_typing(self) -> None:
        self.draw()

    def on_resize(self) -> None:
        self.draw()

    def draw(self) -> None:
        """Draw the page for the size at hand."""
        if self.survey is None or not self.inner_width:
            return
        view = self.typing
        if view is None or view.circuit.id != self.place_id:
            view = view_of(self.survey, self.place_id)
        if view is not None:
            self.show_lines(page_lines(self.survey, view, self.inner_width, self.size.height))
        else:
            self.show_lines(board_lines(self.survey, self.place_id, self.inner_width))
