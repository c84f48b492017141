"""A list of rows of the record under their headings."""

from __future__ import annotations

from collections.abc import Sequence

from audit.tui.drawing.pieces import Line
from audit.tui.drawing.rows import Item, item_line
from audit.tui.entry.fields import row_of
from audit.tui.state import Survey
from audit.tui.widgets.pick_list import PickList


class RowList(PickList):
    """Shows items of a survey."""

    def __init__(self, *, id: str | None = None) -> None:  # noqa: A002
        super().__init__(id=id)
        self._survey: Survey | None = None
        self._items: tuple[Item, ...] = ()

    def show(self, survey: Survey, items: Sequence[Item]) -> None:
        """Show other items; the cursor stays at its row, or at its place in the list."""
        chosen, place = self.chosen, self.cursor
        self._survey, self._items = survey, tuple(items)
        self.renewed(self._items.index(chosen) if chosen in self._items else place)

    @property
    def chosen(self) -> Item | None:
        """The row at the cursor."""
        return self._items[self.cursor] if 0 <= self.cursor < len(self._items) else None

    @property
    def item_count(self) -> int:
        return len(self._items)

    def is_choosable(self, item: int) -> bool:
        return self._items[item].is_choosable

    def item_line(self, item: int, *, chosen: bool) -> Line:
        assert self._survey is not None
        one = self._items[item]
        row = None if one.heading else row_of(self._survey.site, one.table, one.id)
        return item_line(one, row, self._survey.index, self.inner_width, chosen=chosen)
