"""A list with a cursor: one line an item, and beneath the chosen one the lines that say more."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

from textual import events
from textual.binding import Binding, BindingType
from textual.geometry import Region
from textual.message import Message
from textual.reactive import reactive

from audit.tui.drawing.pieces import Line
from audit.tui.widgets.lines_view import LinesView


class PickList(LinesView, inherit_bindings=False):
    """Subclasses give the items: how many, which can be chosen, and their lines."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("up", "step(-1)", "up", show=False, key_display="↑"),
        Binding("down", "step(1)", "down", show=False, key_display="↓"),
        Binding("pageup", "page(-1)", "a screen up", show=False),
        Binding("pagedown,space", "page(1)", "a screen down", show=False),
        Binding("home", "edge(-1)", "the first", show=False),
        Binding("end", "edge(1)", "the last", show=False),
        Binding("enter", "open", "open", key_display="Enter", tooltip="open what is at the cursor"),
    ]

    cursor = reactive(-1)
    """Number of the chosen item; -1 where none can be chosen."""

    @dataclass
    class Moved(Message):
        """Another item was chosen."""

        picks: PickList
        item: int

        @property
        def control(self) -> PickList:
            return self.picks

    @dataclass
    class Opened(Message):
        """The chosen item is to be opened."""

        picks: PickList
        item: int

        @property
        def control(self) -> PickList:
            return self.picks

    # --- for subclasses

    @property
    def item_count(self) -> int:
        """How many items there are; a bare list has none."""
        return 0

    def is_choosable(self, item: int) -> bool:
        """Whether the cursor may stand on an item; on a heading it may not."""
        return True

    def item_line(self, item: int, *, chosen: bool) -> Line:
        """The line of an item."""
        return ()

    def more_lines(self, item: int) -> list[Line]:
        """What stands beneath an item while it is chosen."""
        return []

    # --- lines

    def renewed(self, cursor: int) -> None:
        """The items have changed; the cursor goes to one of them, or the nearest that can be chosen."""
        self._more: list[Line] = []
        self.set_reactive(PickList.cursor, -1)
        self.cursor = self._nearest(cursor)
        self._place()

    @property
    def count(self) -> int:
        return self.item_count + len(self._more)

    def line_at(self, number: int) -> Line:
        beneath = number - self.cursor - 1
        if self.cursor >= 0 and 0 <= beneath < len(self._more):
            return self._more[beneath]
        item = number if number <= self.cursor or self.cursor < 0 else number - len(self._more)
        return self.item_line(item, chosen=item == self.cursor)

    def is_chosen(self, number: int) -> bool:
        return self.cursor >= 0 and self.cursor <= number <= self.cursor + len(self._more)

    _more: list[Line] = []  # noqa: RUF012  # replaced as a whole, never changed

    # --- the cursor

    def watch_cursor(self, cursor: int) -> None:
        self._place()
        if cursor >= 0:
            self.post_message(self.Moved(self, cursor))

    def _place(self) -> None:
        """Draw what stands beneath the cursor, and keep both in sight."""
        self._more = self.more_lines(self.cursor) if self.cursor >= 0 else []
        self.resized()
        if self.cursor >= 0:
            # With the line above: a heading stays in sight over the first item under it.
            top = max(0, self.cursor - 2)
            region = Region(0, top, self.size.width, self.cursor - top + 1 + len(self._more))
            self.scroll_to_region(region, animate=False, force=True, x_axis=False)

    def on_resize(self) -> None:
        self._place()

    def _nearest(self, item: int) -> int:
        """The item itself or the nearest one after it, else before it, that can be chosen."""
        item = min(max(item, 0), self.item_count - 1)
        after = (n for n in range(max(item, 0), self.item_count) if self.is_choosable(n))
        before = (n for n in range(item, -1, -1) if self.is_choosable(n))
        return next(after, next(before, -1))

    def action_step(self, by: int) -> None:
        """To the next item that can be chosen, up or down."""
        item = self.cursor + by
        while 0 <= item < self.item_count and not self.is_choosable(item):
            item += by
        if 0 <= item < self.item_count:
            self.cursor = item
        elif by < 0:
            self.scroll_home(animate=False)

    def action_page(self, by: int) -> None:
        """As many items as fit on the screen."""
        if self.cursor >= 0:
            target = self.cursor + by * max(1, self.size.height - 3)
            self.cursor = self._nearest(target)

    def action_edge(self, side: int) -> None:
        """The first item or the last."""
        self.cursor = self._nearest(0 if side < 0 else self.item_count - 1)

    def action_open(self) -> None:
        if self.cursor >= 0:
            self.post_message(self.Opened(self, self.cursor))

    def on_click(self, event: events.Click) -> None:
        """A click chooses, a click on the chosen item opens."""
        number = event.y + self.scroll_offset.y
        beneath = len(self._more)
        item = number if number <= self.cursor else max(self.cursor, number - beneath)
        if not 0 <= item < self.item_count or not self.is_choosable(item):
            return
        if item == self.cursor:
            self.action_open()
        else:
            self.cursor = item
