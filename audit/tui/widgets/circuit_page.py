"""The page of one circuit; it is drawn anew for every width and whenever the record or its judgement changes."""

from __future__ import annotations

from textual.reactive import reactive

from audit.tui.drawing.page import CircuitView, page_lines, view_of
from audit.tui.state import Survey
from audit.tui.widgets.lines_view import LinesView


class CircuitPage(LinesView):
    """Shows the circuit ``circuit_id`` of the survey, or what is being typed of it."""

    DEFAULT_CSS = """
    CircuitPage { height: 1fr; }
    """

    survey: reactive[Survey | None] = reactive(None, init=False)
    circuit_id: reactive[str] = reactive("", init=False)
    """The circuit shown; empty for none."""
    typing: reactive[CircuitView | None] = reactive(None, init=False)
    """The circuit as it would be with what is being typed; stands in for what is recorded."""

    def watch_survey(self) -> None:
        self.draw()

    def watch_circuit_id(self) -> None:
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
        if view is None or view.circuit.id != self.circuit_id:
            view = view_of(self.survey, self.circuit_id)
        self.show_lines([] if view is None else page_lines(self.survey, view, self.inner_width, self.size.height))
