"""The walk and the page of the circuit at its cursor: side by side from 120 columns on, else one at a time."""

from __future__ import annotations

from collections.abc import Sequence
from typing import ClassVar

from textual import on
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Horizontal
from textual.reactive import reactive

from audit.tui.drawing.next_act import NextAct, next_act
from audit.tui.drawing.pieces import Line, cut, piece
from audit.tui.drawing.walk import cannot_judge_lines, head_line
from audit.tui.entry.slots import Place
from audit.tui.screens import changing, measuring, other_reading
from audit.tui.screens.base import OurScreen
from audit.tui.screens.find import Find
from audit.tui.screens.findings import FindingsScreen
from audit.tui.screens.form import FormScreen
from audit.tui.screens.rows import RowsScreen
from audit.tui.screens.rule import RULE_KEY, open_rule
from audit.tui.state import Survey
from audit.tui.widgets.entry_strip import EntryStrip
from audit.tui.widgets.few_lines import FewLines
from audit.tui.widgets.keys_line import KeysLine
from audit.tui.widgets.place_page import PlacePage
from audit.tui.widgets.walk_list import WalkList
from rules.assessment import Finding
from rules.record import Feed


class SurveyScreen(OurScreen[None]):
    """What is there on opening, with nothing in front of it."""

    CSS_PATH = "survey.tcss"
    HORIZONTAL_BREAKPOINTS = [(0, "-narrow"), (120, "-wide")]  # noqa: RUF012  # as Textual declares it
    AUTO_FOCUS: ClassVar[str | None] = "#walk"
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("right", "turn", "open the circuit or board at the cursor", show=False, key_display="→"),
        Binding("escape,left", "turn_back", "walk", key_display="Esc", tooltip="back to the walk"),
        Binding("m", "measure", "measure", tooltip="a round: the current, then the voltage at each point"),
        Binding("a", "add", "add", tooltip="add a circuit, run, load, board, source, meter or visit"),
        Binding("e", "edit", "record", tooltip="what is installed: circuit, runs, loads; of a board, its own form"),
        RULE_KEY,
        Binding("slash", "find", "find", key_display="/", tooltip="find a tag, description or location"),
        Binding("f", "show_findings", "findings", tooltip="all findings, the most urgent first"),
        Binding("question_mark", "help", "help", key_display="?", tooltip="what the keys do, and the cautions"),
        Binding("n", "go_next", "next", tooltip="to the next circuit that wants doing"),
        Binding("o", "take_other", "another reading: joint, drop along a lead, temperature, dead test …", show=False),
        Binding("c", "correct", "correct a reading; both stay", show=False),
        Binding("s", "show_site", "the site: settings, sources, boards, meters, visits", show=False),
        Binding("v", "choose_visit", "choose or begin the visit that readings belong to", show=False),
        Binding("i", "choose_meters", "choose the meters of the visit", show=False),
        Binding("r", "app.report", "write the audit report to a file", show=False),
        Binding("x", "remove", "remove the circuit or board at the cursor, after asking", show=False),
        Binding("u", "app.undo(False)", "undo your last save; it says what it undoes", show=False),
        Binding("U", "app.undo(True)", "do again what was undone last", show=False),
        Binding("t", "app.change_light", "colours for a dark room or for bright sun", show=False),
        Binding("q", "app.quit", "leave; everything accepted is saved", show=False),
    ]

    survey: reactive[Survey | None] = reactive(None, init=False)
    turned: reactive[bool] = reactive(False, toggle_class="-turned", bindings=True)
    """The page is in front; matters where there is room for one of the two."""
    act: reactive[NextAct | None] = reactive(None, init=False)
    """The next useful act from the cursor on."""

    def compose(self) -> ComposeResult:
        yield FewLines(id="head")
        with Horizontal(id="panes"):
            yield WalkList(id="walk")
            yield PlacePage(id="circuit")
        yield EntryStrip(self.ohmwalk.now)
        yield FewLines(id="next")
        yield FewLines(id="said")
        yield KeysLine()

    @property
    def walk(self) -> WalkList:
        return self.query_one(WalkList)

    @property
    def page(self) -> PlacePage:
        return self.query_one(PlacePage)

    @property
    def in_sight(self) -> tuple[str, ...]:
        """Ids of the circuits to be judged first."""
        return (*filter(None, [self.page.place_id]), *self.walk.visible_circuits)

    @property
    def strip(self) -> EntryStrip:
        return self.query_one(EntryStrip)

    # --- state

    def on_mount(self) -> None:
        self.watch(self.app, "survey", self._take)
        self.watch(self.app, "outline", self._take_outline)

    def _take(self, survey: Survey | None) -> None:
        is_first = self.survey is None
        self.survey = survey
        if is_first:
            self.refresh_bindings()

    def _take_outline(self, outline: Survey | None) -> None:
        if outline is not None and self.survey is None:
            self._show_walk(outline)
        elif self.survey is None:  # the record could not be read
            self.query_one("#head", FewLines).say(None)

    def _show_walk(self, survey: Survey) -> None:
        self.query_one("#head", FewLines).say(
            lambda width: [head_line(survey, width, read_only=survey.read_only), *cannot_judge_lines(survey, width)]
        )
        self.walk.survey = survey

    def watch_survey(self, survey: Survey | None) -> None:
        if survey is None:
            return
        self._show_walk(survey)
        self.page.survey = survey
        self.strip.survey = survey
        if not self.strip.is_open:
            if survey.is_judged:
                self.page.typing = None
            elif self.page.typing is not None:
                self.call_later(self._show_saved)
        self._look_ahead()

    @on(WalkList.Moved)
    def follow_the_cursor(self) -> None:
        chosen = self.walk.chosen
        self.page.place_id = chosen.id if chosen is not None else ""
        self._look_ahead()

    def _look_ahead(self) -> None:
        if self.survey is not None:
            self.act = next_act(self.survey, self.page.place_id, self.walk.circuits_after())

    def watch_act(self, act: NextAct | None) -> None:
        line: Line = (piece(" next: ", "quiet"), piece(act.words, "loud")) if act is not None else ()
        self.query_one("#next", FewLines).say((lambda width: [cut(line, width)]) if act is not None else None)

    # --- keys

    def check_action(self, action: str, parameters: tuple[object, ...]) -> bool | None:
        """While the strip is open its letters are typed, not pressed."""
        if self.is_mounted and self.strip.has_focus_within:
            return action in ("help", "quit")
        if self.survey is None:
            return action == "help"
        if action == "turn_back":
            return self.turned
        if action == "show_rule":  # where findings are in sight
            return self.turned or self.has_class("-wide")
        return True

    @on(WalkList.Opened)
    def action_turn(self) -> None:
        """Open the circuit or board at the cursor."""
        if self.page.place_id:
            self.turned = True
            self.set_focus(self.page)

    def action_turn_back(self) -> None:
        """Back to the walk."""
        self.turned = False
        self.set_focus(self.walk)

    def action_go_next(self) -> None:
        """To the next circuit that wants doing."""
        if self.survey is None:
            return
        act = next_act(self.survey, "", self.walk.circuits_after())
        if act is not None and act.circuit_id:
            self.walk.choose(act.circuit_id)

    def action_find(self) -> None:
        """Find a circuit or board by typing."""
        here = self.page.place_id
        self.open(Find(self.walk.find, lambda: self.walk.choose(here)))

    def action_show_findings(self) -> None:
        """All findings."""
        self.ohmwalk.flow(self._show_findings())

    async def _show_findings(self) -> None:
        """All findings; the circuit of the one that was opened is shown."""
        row_id = await self.ohmwalk.ask(FindingsScreen())
        if row_id:
            self.walk.choose(row_id)
            self.turned = True

    def action_show_rule(self) -> None:
        """The page of the rule behind a finding of the circuit or board at the cursor."""
        self.ohmwalk.flow(open_rule(self, self._findings_here()))

    def _findings_here(self) -> Sequence[Finding]:
        """Those of the circuit or board at the cursor."""
        survey, place_id, tag = self.survey, self.page.place_id, self.place_words()
        if survey is None or place_id in survey.index.circuits:
            result = survey.results.get(place_id) if survey is not None else None
            return result.findings if result is not None else ()
        findings = survey.assessment.findings if survey.assessment is not None else ()
        return [finding for finding in findings if finding.circuit is None and finding.board == tag]

    # --- the record

    def action_add(self) -> None:
        """Add a circuit, a run, a load …"""
        self.ohmwalk.flow(self._add())

    async def _add(self) -> None:
        chosen = self.walk.chosen
        new_id = await changing.add(self, chosen.id if chosen is not None else "")
        self.walk.choose(new_id)

    def action_edit(self) -> None:
        """The rows of the circuit at the cursor, or the form of the board."""
        chosen = self.walk.chosen
        if chosen is not None and chosen.kind == "circuit":
            self.open(RowsScreen(chosen.id))
        elif (place := self.place_at_hand()) is not None and place.board is not None:
            self.open(FormScreen(place.board.table, place.board.id))

    def action_remove(self) -> None:
        """Remove the circuit or board at the cursor, after asking."""
        if (place := self.place_at_hand()) is not None:
            table = "circuits" if place.board is None else place.board.table
            self.ohmwalk.flow(changing.remove(self, table, place.id))

    def action_show_site(self) -> None:
        """The site's settings, sources, boards, meters and visits."""
        self.open(RowsScreen())

    # --- readings

    def place_at_hand(self) -> Place | None:
        """The circuit or busbar at the cursor."""
        chosen = self.walk.chosen
        if chosen is None or self.survey is None:
            return None
        if chosen.kind == "circuit":
            return Place(circuit_id=chosen.id)
        table = "boards" if chosen.id in self.survey.index.boards else "sources"
        return Place(board=Feed(table, chosen.id))

    def place_words(self) -> str:
        """Tag of the circuit or board at the cursor."""
        place = self.place_at_hand()
        if place is None or self.survey is None:
            return ""
        index = self.survey.index
        row = index.circuits.get(place.id) or index.boards.get(place.id) or index.sources.get(place.id)
        return row.tag if row is not None else ""

    def action_measure(self) -> None:
        """Open the strip for a round on the circuit or busbar at the cursor."""
        if (place := self.place_at_hand()) is not None:
            self.ohmwalk.flow(self._measure(place))

    async def _measure(self, place: Place) -> None:
        of = await measuring.round_at(self, place)
        if of is not None:
            self.turned = True
            self.say("")
            self.add_class("-entering")
            self.page.scroll_home(animate=False)
            await self.strip.open(of)

    def action_take_other(self) -> None:
        """A reading beside the round: a joint, a drop along a lead, a temperature …"""
        if (place := self.place_at_hand()) is not None:
            self.ohmwalk.flow(other_reading.take(self, place))

    def action_correct(self) -> None:
        """Replace a reading; both stay."""
        if (place := self.place_at_hand()) is not None:
            self.ohmwalk.flow(other_reading.correct(self, place))

    @on(EntryStrip.Typed)
    def show_as_typed(self, message: EntryStrip.Typed) -> None:
        self.page.typing = message.view

    @on(EntryStrip.Accepted)
    def save_value(self, message: EntryStrip.Accepted) -> None:
        saving = measuring.save_value(self, self.strip, message)
        if message.replaced is not None:
            self.ohmwalk.flow(saving)  # it asks why
        else:
            self.run_worker(saving, group="save")

    @on(EntryStrip.Left)
    def leave_strip(self, message: EntryStrip.Left) -> None:
        self.strip.close()
        self.remove_class("-entering")
        self._show_saved()
        self.set_focus(self.page if self.turned else self.walk)
        if message.finished:
            self.say(
                f"round {self.strip.round_name} of {self.place_words()} is saved · n next circuit · m another round"
            )

    def _show_saved(self) -> None:
        """What is saved but not judged yet: else the old verdict would come back until the new one is there."""
        survey = self.survey
        view = self.strip.saved_view() if survey is not None and not survey.is_judged else None
        self.page.typing = view
        result = view.result if view is not None else None
        if result is not None and survey is not None and survey.results.get(result.circuit_id) != result:
            self.ohmwalk.take_provisional(result)

    def action_choose_meters(self) -> None:
        """Choose the meters of the visit anew."""
        self.ohmwalk.flow(measuring.choose_meters(self))

    def action_choose_visit(self) -> None:
        """Choose the visit that readings go to, or begin one."""
        self.ohmwalk.flow(measuring.choose_visit(self))
