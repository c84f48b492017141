"""The walk as a list: 10,000 circuits paint as quickly as ten."""

from __future__ import annotations

from collections.abc import Iterator

from textual.reactive import reactive

from audit.tui.drawing.pieces import Line, text_of
from audit.tui.drawing.walk import Stop, reason_line, stop_line, tag_cells, walk_stops
from audit.tui.state import Survey
from audit.tui.widgets.pick_list import PickList


class WalkList(PickList):
    """Boards and circuits in walking order, with where each circuit stands."""

    DEFAULT_CSS = """
    WalkList { height: 1fr; }
    """

    survey: reactive[Survey | None] = reactive(None, init=False)
    """What is shown; another one keeps the cursor at the same place of the walk."""

    def __init__(self, *, id: str | None = None) -> None:  # noqa: A002
        super().__init__(id=id)
        self._stops: tuple[Stop, ...] = ()
        self._tags = 4

    def watch_survey(self, before: Survey | None, survey: Survey | None) -> None:
        if survey is None:
            return
        if before is not None and before.index is survey.index:
            self._place()
            return
        chosen = self.chosen
        self._stops = walk_stops(survey.index)
        self._tags = tag_cells(survey.index)
        self.renewed(self._item_of(chosen.id) if chosen is not None else self._first_circuit())

    @property
    def chosen(self) -> Stop | None:
        """The board or circuit at the cursor."""
        return self._stops[self.cursor] if 0 <= self.cursor < len(self._stops) else None

    @property
    def visible_circuits(self) -> tuple[str, ...]:
        """Ids of the circuits in sight."""
        top = self.scroll_offset.y
        seen = self._stops[top : top + max(self.size.height, 50)]
        return tuple(stop.id for stop in seen if stop.kind == "circuit")

    def choose(self, row_id: str) -> None:
        """Put the cursor on a board or circuit."""
        item = self._item_of(row_id)
        if item >= 0:
            self.cursor = item

    def find(self, text: str, further: bool) -> bool:
        """Put the cursor on a place whose tag, description or location holds a text; whether there is one."""
        wanted = text.casefold().strip()
        if not wanted or self.survey is None:
            return False
        start = max(0, self.cursor + further)
        order = [*range(start, len(self._stops)), *range(start)]
        found = next((n for n in order if self.is_choosable(n) and wanted in self._words_of(n)), -1)
        if found >= 0:
            self.cursor = found
        return found >= 0

    def _words_of(self, item: int) -> str:
        assert self.survey is not None
        stop = self._stops[item]
        if stop.kind == "circuit":
            circuit = self.survey.index.circuits[stop.id]
            return f"{circuit.tag} {circuit.description} {circuit.location}".casefold()
        board = self.survey.index.boards.get(stop.id)
        return f"{stop.words} {board.location if board is not None else ''}".casefold()

    def circuits_after(self) -> Iterator[str]:
        """Ids of the circuits that follow the cursor in the walk, then those before it."""
        order = [*range(self.cursor + 1, len(self._stops)), *range(max(0, self.cursor + 1))]
        return (self._stops[n].id for n in order if self._stops[n].kind == "circuit")

    def _item_of(self, row_id: str) -> int:
        return next((n for n, stop in enumerate(self._stops) if stop.id == row_id and stop.is_choosable), -1)

    def _first_circuit(self) -> int:
        return next((n for n, stop in enumerate(self._stops) if stop.kind == "circuit"), 0)

    # --- the list

    @property
    def item_count(self) -> int:
        return len(self._stops)

    def is_choosable(self, item: int) -> bool:
        return self._stops[item].is_choosable

    def item_line(self, item: int, *, chosen: bool) -> Line:
        assert self.survey is not None
        return stop_line(self._stops[item], self.survey, self.inner_width, self._tags, chosen=chosen)

    def more_lines(self, item: int) -> list[Line]:
        assert self.survey is not None
        said = reason_line(self._stops[item], self.survey, self.inner_width)
        return [said] if text_of(said).strip() else []
