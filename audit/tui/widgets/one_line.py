"""One line of pieces, drawn anew for every width."""

from __future__ import annotations

from collections.abc import Callable

from audit.tui.drawing.pieces import Line
from audit.tui.widgets.lines_view import LinesView


class OneLine(LinesView, can_focus=False):
    """A line that a function draws for the width at hand; it takes no room while there is nothing to say."""

    DEFAULT_CSS = """
    OneLine {
        height: 1;
        overflow: hidden;
        scrollbar-gutter: auto;
        &.-silent { display: none; }
    }
    """

    def __init__(self, *, id: str | None = None) -> None:  # noqa: A002
        super().__init__(id=id, classes="-silent")
        self._draw: Callable[[int], Line] | None = None

    def say(self, draw: Callable[[int], Line] | None) -> None:
        """Show another line, or none."""
        self._draw = draw
        self.set_class(draw is None, "-silent")
        self.resized()

    @property
    def count(self) -> int:
        return 0 if self._draw is None else 1

    def line_at(self, number: int) -> Line:
        return () if self._draw is None else self._draw(self.inner_width)
