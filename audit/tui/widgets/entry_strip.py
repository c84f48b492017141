"""
The entry strip: one line for a round at the foot of the page, always in walking order.

Enter saves a value and moves on, an empty Enter skips; beneath stands what was understood, beside what the
record makes of it. The page above shows the verdict as it would be, with every key.
"""

from __future__ import annotations

import time
from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from datetime import datetime
from typing import ClassVar

from textual import on
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import HorizontalScroll
from textual.message import Message
from textual.reactive import reactive
from textual.timer import Timer
from textual.widget import Widget

from audit.report.phrases import figure_words
from audit.tui.drawing.page import CircuitView
from audit.tui.drawing.pieces import Line, cut, line, piece
from audit.tui.entry.meters import NO_METER, Meter, meter_quantity
from audit.tui.entry.plausible import doubt_about
from audit.tui.entry.reading import Where, reading_from, value_words
from audit.tui.entry.slots import Place, Slot, next_round, readings_of_visit, resumed_words, round_at_hand, slots_of
from audit.tui.entry.typing import Typing
from audit.tui.state import Survey
from audit.tui.widgets.entry_cell import EntryCell, ValueInput
from audit.tui.widgets.few_lines import FewLines, remark
from rules.errors import RulesError
from rules.record import Reading

QUICK_S = 0.005
"""A verdict that takes no longer is given with every key; a slower one once the typing pauses. [s]"""
PAUSE_S = 0.15
"""What counts as a pause. [s]"""
ENTER_AGAIN = "Enter again saves it"
"""Said of a value that is hardly what the meter shows."""


@dataclass(frozen=True, slots=True)
class RoundAt:
    """What a round is of."""

    place: Place
    visit: str
    by: str
    meters: Mapping[str, Meter]
    """By what they measure."""


class EntryStrip(Widget):
    """The cells of one round of the place at hand."""

    DEFAULT_CSS = """
    EntryStrip {
        height: auto;
        background: $background;
        border-top: solid $quiet;
        display: none;
        &.-open { display: block; }
        & > #cells { height: 1; scrollbar-size: 0 0; padding-left: 1; background: $background; }
    }
    """
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding(
            "up,shift+tab", "back", "back", key_display="↑", tooltip="the cell before: a value typed over corrects"
        ),
        Binding("down,tab", "ahead", "the next cell, as Enter", show=False, key_display="↓"),
        Binding("f1", "screen.help", "help", key_display="?", tooltip="what the keys do, and the cautions"),
        Binding("escape", "leave", "leave", key_display="Esc", tooltip="leave; what was not accepted is given up"),
    ]

    survey: reactive[Survey | None] = reactive(None, init=False)
    is_open: reactive[bool] = reactive(False, toggle_class="-open", bindings=True)

    @dataclass
    class Accepted(Message):
        """A value is to be saved; ``settle`` or ``refuse`` tells the strip what came of it."""

        cell: EntryCell
        reading: Reading
        replaced: Reading | None
        """What stands there already, which this one corrects."""

    @dataclass
    class Typed(Message):
        """What would be said of the circuit with what is typed; ``None`` for nothing."""

        view: CircuitView | None

    @dataclass
    class Left(Message):
        """The strip was left."""

        finished: bool
        """The last cell was passed."""

    def __init__(self, now: Callable[[], datetime]) -> None:
        super().__init__(id="strip")
        self._now = now
        self._of = RoundAt(Place(), "", "", {})
        self._round = ""
        self._resumed = ""
        """That an unfinished round goes on; said until a value is accepted."""
        self._is_at_end = False
        self._view: CircuitView | None = None
        self._took_s = 0.0
        self._pause: Timer | None = None

    def compose(self) -> ComposeResult:
        yield HorizontalScroll(id="cells", can_focus=False)
        yield FewLines(id="echo")

    # --- opening and leaving

    async def open(self, of: RoundAt, round_name: str = "") -> None:
        """Show a round, by default the one that is not finished, and go to its first empty cell."""
        assert self.survey is not None
        self._of = of
        self._round = round_name or round_at_hand(self.survey.index, of.place, of.visit)
        self._is_at_end = False
        self._view = None
        self._took_s = 0.0
        self._resumed = resumed_words(self.survey.index, of.place, of.visit, self._round, self._now())
        cells = self.query_one("#cells", HorizontalScroll)
        await cells.remove_children()
        await cells.mount(EntryCell(None, self._round, "round"), *(EntryCell(slot) for slot in self._slots()))
        self.is_open = True
        empty = (cell for cell in self.cells if cell.slot is not None and cell.slot.saved is None)
        self._go_to(next(empty, self.cells[0]))

    def close(self) -> None:
        """Fold up."""
        if self._pause is not None:
            self._pause.stop()
        self.is_open = False

    @property
    def cells(self) -> list[EntryCell]:
        """The cells of the slots."""
        return [cell for cell in self.query(EntryCell) if cell.slot is not None]

    @property
    def round_name(self) -> str:
        """The round at hand."""
        return self._round

    def _slots(self) -> tuple[Slot, ...]:
        assert self.survey is not None
        return slots_of(self.survey.index, self._of.place, self._of.visit, self._round)

    def watch_survey(self) -> None:
        if not self.is_open or self.survey is None:
            return
        if not self._is_there():
            self.action_leave()
            return
        fresh = {(slot.quantity, slot.at, slot.leg): slot for slot in self._slots()}
        for cell in self.cells:
            assert cell.slot is not None
            cell.take(fresh.get((cell.slot.quantity, cell.slot.at, cell.slot.leg), replace(cell.slot, saved=None)))
        self._judge()

    def _is_there(self) -> bool:
        """Whether the place is still in the record: someone else may have removed it."""
        assert self.survey is not None
        index, place = self.survey.index, self._of.place
        return place.circuit_id in index.circuits or place.id in index.boards or place.id in index.sources

    # --- the cells

    @on(EntryCell.Accepted)
    async def _accept(self, message: EntryCell.Accepted) -> None:
        message.stop()
        cell = message.cell
        if cell.slot is None:
            await self.open(self._of, cell.text or self._round)
            return
        if not cell.is_changed:
            cell.restore()
            self._go_on(cell)
            return
        try:
            reading = self._reading(cell)
        except RulesError as error:
            self.refuse(cell, str(error))
            return
        doubt = self._doubt(cell, reading)
        if doubt and cell.doubted != cell.text:
            cell.doubted = cell.text
            self.refuse(cell, f"{doubt} · {ENTER_AGAIN}", go_back=True)
            return
        self._resumed = ""
        cell.state = "saving"
        self.post_message(self.Accepted(cell, reading, cell.slot.saved))
        self._go_on(cell)

    def _doubt(self, cell: EntryCell, reading: Reading) -> str:
        """Why a value is hardly what the meter shows."""
        assert self.survey is not None
        assert cell.slot is not None
        self._judge()  # a slow verdict may not have followed the last key yet
        computed = self._view.expected.get(cell.slot.at) if self._view is not None else None
        return doubt_about(reading, self.survey.index, computed)

    @on(ValueInput.NewRound)
    async def _begin_round(self, message: ValueInput.NewRound) -> None:
        """A new round in place of the one that goes on."""
        message.stop()
        if self._resumed and self.survey is not None:
            names = [r.round for r in readings_of_visit(self.survey.index, self._of.place, self._of.visit)]
            await self.open(self._of, next_round(list(dict.fromkeys(names))))

    def settle(self, cell: EntryCell) -> None:
        """The value of a cell is in the file."""
        cell.state = "saved"
        self._finish()

    def refuse(self, cell: EntryCell, complaint: str, *, go_back: bool = False) -> None:
        """
        The value of a cell was not saved: it stays in the cell, and the cursor goes back there with the next Enter.

        Not at once (but for ``go_back``): her eyes may be on the meter while her fingers type the next value.
        """
        go_back = go_back or self._is_at_end
        self._is_at_end = False
        cell.state = "refused"
        cell.complaint = complaint
        at_hand = self._cell_at_hand()
        if go_back or at_hand is None:
            self._go_to(cell)
        else:
            self._echo(at_hand)

    def _go_on(self, cell: EntryCell) -> None:
        cells = self.cells
        refused = next((one for one in cells if one.state == "refused"), None)
        if refused is not None:
            self._go_to(refused)
        elif cell is cells[-1]:
            self._is_at_end = True
            self._finish()
        else:
            self._go_to(cells[cells.index(cell) + 1])

    def _finish(self) -> None:
        """Leave once the last cell is passed and everything is saved."""
        if self._is_at_end and not any(cell.state in ("saving", "refused") for cell in self.cells):
            self.post_message(self.Left(finished=True))

    def _go_to(self, cell: EntryCell) -> None:
        cell.go_to()
        self._echo(cell)

    @on(EntryCell.Entered)
    def _entered(self, message: EntryCell.Entered) -> None:
        message.stop()
        self._echo(message.cell)

    def action_back(self) -> None:
        """To the cell before; what is typed stays in its cell, unsaved."""
        cells, cell = list(self.query(EntryCell)), self._cell_at_hand()
        if cell is not None and cell is not cells[0]:
            self._go_to(cells[cells.index(cell) - 1])

    def action_ahead(self) -> None:
        """To the cell after, as Enter."""
        cell = self._cell_at_hand()
        if cell is not None:
            cell.accept()

    def _cell_at_hand(self) -> EntryCell | None:
        return next((cell for cell in self.query(EntryCell) if cell.has_focus_within), None)

    def action_leave(self) -> None:
        """Leave; what was not accepted is given up."""
        self.post_message(self.Left(finished=False))

    # --- what is understood, and the verdict

    def _reading(self, cell: EntryCell) -> Reading:
        """What stands in a cell, as a reading."""
        slot, of = cell.slot, self._of
        assert slot is not None
        meter = of.meters.get(meter_quantity(slot.quantity), NO_METER)
        where = Where(
            of.place, of.visit, self._round, slot.quantity, slot.at, leg=slot.leg, meter=meter, by=of.by
        )  # fmt: skip
        return reading_from(cell.text, where, self._now())

    @on(EntryCell.Typed)
    def _typed(self, message: EntryCell.Typed) -> None:
        message.stop()
        if message.cell.slot is None:
            return
        if self._pause is not None:
            self._pause.stop()
        if self._took_s > QUICK_S:
            self._pause = self.set_timer(PAUSE_S, self._judge)
            self._echo(message.cell)
        else:
            self._judge()

    def _judge(self) -> None:
        """Say what the circuit would be with what is typed."""
        from audit.tui.entry.verdict import provisional  # it brings numpy, for which the first screen does not wait

        if not self.is_open or self.survey is None:
            return
        start = time.perf_counter()
        typing = self._typing()
        context = self.survey.context
        is_typed = any(cell.is_changed for cell in self.cells)
        self._view = provisional(context, typing) if context is not None and typing.circuit_id else None
        self._took_s = time.perf_counter() - start
        # Until what is saved is judged too, what was said of it as typed is newer than what stands in the survey.
        self.post_message(self.Typed(self._view if is_typed or not self.survey.is_judged else None))
        cell = self._cell_at_hand()
        if cell is not None:
            self._echo(cell)

    def saved_view(self) -> CircuitView | None:
        """What the circuit is said to be with what is saved of it, for as long as that is not judged; ``None`` for nothing."""
        from audit.tui.entry.verdict import provisional

        context = self.survey.context if self.survey is not None else None
        if self.survey is None or context is None or not self._of.place.circuit_id:
            return None
        readings = readings_of_visit(self.survey.index, self._of.place, self._of.visit)
        return provisional(context, Typing(self._of.place.circuit_id, self._round, tuple(readings)))

    def _typing(self) -> Typing:
        assert self.survey is not None
        place = self._of.place
        readings = {reading.id: reading for reading in readings_of_visit(self.survey.index, place, self._of.visit)}
        for number, cell in enumerate(self.cells):
            if cell.slot is None or not cell.is_changed:
                continue
            try:
                typed = replace(self._reading(cell), id=f"typing {number}")
            except RulesError:
                continue  # half a number is typed
            if cell.slot.saved is not None:
                readings.pop(cell.slot.saved.id, None)
            readings[typed.id] = typed
        return Typing(place.circuit_id, self._round, tuple(readings.values()))

    def _echo(self, cell: EntryCell) -> None:
        """Beneath the cells: what was understood of the one at hand, and what is wrong with one that was refused."""
        refused = cell if cell.state == "refused" else next((c for c in self.cells if c.state == "refused"), None)
        said = self._understood(cell) if cell is not refused else ()
        label = f"{refused.label}: " if refused is not None and refused is not cell else ""

        def draw(width: int) -> list[Line]:
            resumed = remark(f"{self._resumed} · n begins a new round", "caution", width) if self._resumed else []
            wrong = remark(f"{label}{refused.complaint}", "wrong", width) if refused is not None else []
            return resumed + ([cut(said, width)] if said else []) + wrong

        self.query_one("#echo", FewLines).say(draw)

    def _understood(self, cell: EntryCell) -> Line:
        slot = cell.slot
        if slot is None:
            return line(piece(" Enter keeps this round; the name of another begins or opens that", "quiet"))
        words = [piece(f" {slot.label}: ", "quiet")]
        if cell.text:
            try:
                words.append(piece(value_words(self._reading(cell)), "strong"))
            except RulesError as error:
                words.append(piece(str(error), "quiet"))
        else:
            words.append(piece(f"what the meter shows, in {slot.unit}", "quiet"))
        expected = self._view.expected.get(slot.at) if self._view is not None else None
        if slot.quantity == "voltage" and not slot.leg and expected is not None and expected.u is not None:
            words.append(piece(f", computed {figure_words(expected)}"))
        if not self._of.meters.get(meter_quantity(slot.quantity), NO_METER).tag:
            words.append(piece(" · no meter recorded: counts as a poor one", "quiet"))
        state = {"saving": "saving", "saved": "saved"}.get(cell.state, "")
        hint = f" · {state}" if state else " · Enter next · empty skips"
        return (*words, piece(hint, "quiet"))
