"""A widget that shows lines of pieces and scrolls over any number of them: only what is seen is drawn."""

from __future__ import annotations

from collections.abc import Sequence
from typing import ClassVar

from rich.segment import Segment
from rich.style import Style
from textual.binding import Binding, BindingType
from textual.geometry import Size
from textual.scroll_view import ScrollView
from textual.strip import Strip

from audit.tui.drawing.pieces import ROLES, Line


class LinesView(ScrollView, can_focus=True, inherit_bindings=False):
    """Lines that were drawn beforehand; subclasses draw theirs when they are seen (``count`` and ``line_at``)."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("up", "scroll_up", "a line up", show=False, key_display="↑"),
        Binding("down", "scroll_down", "a line down", show=False, key_display="↓"),
        Binding("pageup", "page_up", "a screen up", show=False),
        Binding("pagedown,space", "page_down", "a screen down", show=False),
        Binding("home", "scroll_home", "to the top", show=False),
        Binding("end", "scroll_end", "to the end", show=False),
    ]
    COMPONENT_CLASSES: ClassVar[set[str]] = {f"lines--{role}" for role in (*ROLES, "chosen")}
    DEFAULT_CSS = """
    LinesView {
        background: $background;
        overflow-x: hidden;
        scrollbar-size-vertical: 1;
        scrollbar-gutter: stable;

        & > .lines--quiet { color: $quiet; }
        & > .lines--strong { text-style: bold; }
        & > .lines--title { text-style: bold; }
        & > .lines--loud { color: $loud; text-style: bold; }
        & > .lines--read { text-style: bold; }
        & > .lines--bar { color: $bar; }
        & > .lines--computed { color: $foreground; }
        & > .lines--band { color: $quiet; }
        & > .lines--limit { color: $status-act; }
        & > .lines--trail { color: $quiet; }
        & > .lines--cursor { color: $loud; text-style: bold; }
        & > .lines--caution { color: $status-act; }
        & > .lines--typed { background: $cell; text-style: bold; }
        & > .lines--wrong { color: $status-act; text-style: bold; }
        & > .lines--sound { color: $status-sound; }
        & > .lines--watch { color: $status-watch; text-style: bold; }
        & > .lines--act { color: $status-act; text-style: bold; }
        & > .lines--measure { color: $status-measure; }
        & > .lines--incomplete { color: $status-incomplete; }
        & > .lines--chosen { background: $chosen; }
    }
    """

    def __init__(self, lines: Sequence[Line] = (), *, id: str | None = None, classes: str | None = None) -> None:  # noqa: A002
        super().__init__(id=id, classes=classes)
        self._lines = tuple(lines)

    def show_lines(self, lines: Sequence[Line]) -> None:
        """Show other lines."""
        self._lines = tuple(lines)
        self.resized()

    @property
    def lines(self) -> tuple[Line, ...]:
        """What is shown; of a list that draws only what is seen, all of it."""
        return tuple(self.line_at(n) for n in range(self.count))

    # --- for subclasses

    @property
    def count(self) -> int:
        """How many lines there are."""
        return len(self._lines)

    def line_at(self, number: int) -> Line:
        """One line, 0 the first."""
        return self._lines[number]

    def is_chosen(self, number: int) -> bool:
        """Whether a line stands out as the one at the cursor."""
        return False

    def resized(self) -> None:
        """The number or the content of the lines has changed."""
        self.virtual_size = Size(0, self.count)
        self.refresh()

    # --- drawing

    @property
    def inner_width(self) -> int:
        """Cells of a line beside the scrollbar."""
        return self.scrollable_content_region.width

    def render_line(self, y: int) -> Strip:
        number = self.scroll_offset.y + y
        style = self.rich_style
        if number >= self.count:
            return Strip.blank(self.inner_width, style)
        if self.is_chosen(number):
            style += self.get_component_rich_style("lines--chosen", partial=True)
        segments = [Segment(part.text, style + self._role_style(part.role)) for part in self.line_at(number)]
        return Strip(segments).adjust_cell_length(self.inner_width, style)

    def _role_style(self, role: str) -> Style:
        return self.get_component_rich_style(f"lines--{role}", partial=True) if role else Style.null()
