"""A line or two of pieces, drawn anew for every width."""

from __future__ import annotations

from collections.abc import Callable

from textual.geometry import Size

from audit.tui.drawing.pieces import Line, Piece, wrapped
from audit.tui.widgets.lines_view import LinesView

MOST = 2
"""Lines that a remark may take; the rest is cut."""
MOST_WRONG = 6
"""Lines that a complaint may take: the names that it lists are to be read whole."""


class FewLines(LinesView, can_focus=False):
    """Lines that a function draws for the width at hand; they take no room while there is nothing to say."""

    DEFAULT_CSS = """
    FewLines {
        height: auto;
        overflow: hidden;
        scrollbar-gutter: auto;
        &.-silent { display: none; }
    }
    """

    def __init__(self, *, id: str | None = None) -> None:  # noqa: A002
        super().__init__(id=id, classes="-silent")
        self._draw: Callable[[int], list[Line]] | None = None

    def say(self, draw: Callable[[int], list[Line]] | None) -> None:
        """Show other lines, or none."""
        self._draw = draw
        self.set_class(draw is None, "-silent")
        self._drawn()

    def say_words(self, words: str, role: str = "quiet") -> None:
        """Show a remark in few lines; empty for none."""
        self.say((lambda width: remark(words, role, width)) if words else None)

    def on_resize(self) -> None:
        self._drawn()

    def _drawn(self) -> None:
        width = self.inner_width or self.app.size.width
        self._lines = tuple(self._draw(width)) if self._draw is not None else ()
        if self.virtual_size.height != len(self._lines):
            self.virtual_size = Size(0, len(self._lines))
            self.refresh(layout=True)
        self.refresh()


def remark(words: str, role: str, width: int, lead: str = " ") -> list[Line]:
    """A remark in at most two lines; a complaint in more."""
    most = MOST_WRONG if role == "wrong" else MOST
    lines = wrapped(words, width - 1, len(lead), role, lead)
    if len(lines) > most:
        *kept, last = lines[:most]
        lines = [*kept, (*last[:-1], Piece(last[-1].text[: width - len(lead) - 2] + "…", role))]
    return lines
