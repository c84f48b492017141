"""The terminal interface on one site file: it opens on the walk at once, with nothing in front of it."""

from __future__ import annotations

import asyncio
from collections.abc import Callable, Coroutine
from dataclasses import replace
from datetime import datetime
from pathlib import Path
from typing import Any, TypeVar

from textual import on
from textual.app import App
from textual.events import Event, Key, Paste
from textual.reactive import reactive
from textual.screen import Screen

from audit.tui.edits import Edit
from audit.tui.entry.habits import Habits
from audit.tui.judge import Judge
from audit.tui.messages import Assessed, Crashed, Judged, Loaded, Outlined, Refused, Saved, Troubled, Undone, Unjudged
from audit.tui.screens import reporting
from audit.tui.screens.ask import Ask
from audit.tui.screens.base import OurScreen
from audit.tui.screens.survey import SurveyScreen
from audit.tui.session import Session
from audit.tui.settings import UserSettings
from audit.tui.state import Survey, latest_visit
from audit.tui.theme import THEMES
from audit.tui.type_ahead import TypeAhead
from rules.assessment import CircuitResult
from rules.problems.cells import text_complaint

R = TypeVar("R")


class OhmwalkApp(App[None]):
    """Holds the state that all screens show; the threads' messages change it."""

    TITLE = "ohmwalk"
    ENABLE_COMMAND_PALETTE = False
    MODES = {"survey": SurveyScreen}  # noqa: RUF012  # as Textual declares it
    DEFAULT_MODE = "survey"
    survey: reactive[Survey | None] = reactive(None, init=False)
    """What the screens show; ``None`` until the file is read."""
    outline: reactive[Survey | None] = reactive(None, init=False)
    """What the walk shows until then."""

    def __init__(
        self,
        site_file: Path,
        settings: UserSettings,
        *,
        now: Callable[[], datetime] = lambda: datetime.now().astimezone(),
    ) -> None:
        super().__init__()
        self.site_file = site_file
        self.settings = settings
        self.now = now
        self._session = Session(site_file, settings.laptop, self.post_message)
        self._judge = Judge(self.post_message)
        self._answers: dict[Edit, asyncio.Future[Saved | Refused]] = {}
        self._saving = asyncio.Lock()
        self.type_ahead = TypeAhead(self, super().on_event, lambda: self.is_reading)
        self.habits = Habits()
        """What was chosen once and is not asked again."""
        for theme in THEMES:
            self.register_theme(theme)
        self.theme = THEMES[0].name

    @property
    def walk_screen(self) -> SurveyScreen:
        """The screen beneath all others."""
        screen = self.screen_stack[0]
        assert isinstance(screen, SurveyScreen)
        return screen

    async def on_event(self, event: Event) -> None:
        """Keys wait for their turn; everything else is dealt with at once."""
        if isinstance(event, Key | Paste) and not event.is_forwarded:
            self.type_ahead.take(event)
        else:
            await super().on_event(event)

    def on_mount(self) -> None:
        self.run_worker(self.type_ahead.give(), group="keys")
        self._session.start()
        self._judge.start()

    def on_unmount(self) -> None:
        self._judge.stop()
        self._session.stop()

    # --- what the threads tell

    @on(Outlined)
    def show_outline(self, message: Outlined) -> None:
        """Show the walk; what the keys do waits for the record."""
        if self.survey is None:
            visit = latest_visit(message.site)
            outline = Survey(message.site, message.index, visit, {}, read_only=message.read_only, is_outline=True)
            self.outline = outline
            self.call_after_refresh(self._session.look)

    @on(Loaded)
    def take_record(self, message: Loaded) -> None:
        visit = self.habits.visit or latest_visit(message.site)
        if self.survey is None:
            self.survey = Survey(message.site, message.index, visit, message.read, read_only=message.read_only)
        else:
            self.survey = self.survey.of(message.site, message.index, visit, message.read)
        self._judge.judge(message.site, self.walk_screen.in_sight)

    def take_provisional(self, result: CircuitResult) -> None:
        """What is said of a circuit whose readings are saved, until it is judged with all the others."""
        if self.survey is not None:
            self.survey = replace(self.survey, results={**self.survey.results, result.circuit_id: result})

    @on(Judged)
    def take_some_results(self, message: Judged) -> None:
        if self.survey is not None and message.site is self.survey.site:
            results = {**self.survey.results, **message.results}
            self.survey = replace(self.survey, context=message.context, results=results)

    @on(Assessed)
    def take_assessment(self, message: Assessed) -> None:
        if self.survey is not None and message.site is self.survey.site:
            results = {result.circuit_id: result for result in message.assessment.circuits}
            self.survey = replace(self.survey, context=message.context, results=results, assessment=message.assessment)

    @on(Unjudged)
    def take_why_it_cannot_be_judged(self, message: Unjudged) -> None:
        """No verdict of an earlier record is left standing."""
        if self.survey is not None and message.site is self.survey.site:
            self.survey = replace(self.survey, context=None, results={}, assessment=None, cannot_judge=message.line)

    @property
    def is_reading(self) -> bool:
        """The walk is on the screen, and what the keys would act on is being read."""
        return self.outline is not None and self.survey is None

    @on(Saved)
    @on(Refused)
    def answer(self, message: Saved | Refused) -> None:
        future = self._answers.pop(message.edit, None)
        if future is not None and not future.done():
            future.set_result(message)

    @on(Undone)
    def tell_what_was_undone(self, message: Undone) -> None:
        if message.what is None:
            self.say("nothing of yours to do again" if message.again else "nothing of yours to undo")
        else:
            self.say(f"done again: {message.what}" if message.again else f"undone: {message.what} · U does it again")

    @on(Troubled)
    def tell_trouble(self, message: Troubled) -> None:
        self.outline = None
        self.say(message.line, "wrong")

    @on(Crashed)
    def stop_with_the_fault(self, message: Crashed) -> None:
        raise message.error

    # --- what the screens ask for

    def flow(self, work: Coroutine[Any, Any, object]) -> None:
        """Run work that asks one question after another with ``ask``."""
        self.type_ahead.flow(work)

    async def ask(self, screen: Screen[R]) -> R | None:
        """Show a screen in a flow, and wait for what it gives back."""
        return await self.type_ahead.ask(screen)

    def say(self, words: str, role: str = "quiet") -> None:
        """One line on the screen in front."""
        screens = [screen for screen in self.screen_stack if isinstance(screen, OurScreen)]
        if screens:
            screens[-1].say(words, role)

    async def save(self, edit: Edit) -> Saved | Refused:
        """Have an edit saved, in the order of asking; to be awaited in a worker, never in a handler."""
        async with self._saving:
            who = await self.who()
            if not who:
                return Refused(edit, "not saved: a save needs a name")
            future: asyncio.Future[Saved | Refused] = asyncio.get_running_loop().create_future()
            self._answers[edit] = future
            self._session.save(edit, who)
        return await future

    async def who(self) -> str:
        """The name to save under, asked for once where it is not known; empty where she does not say."""
        if not self.settings.who:
            hint = "it stands beside everything you save in this file, and is kept on this laptop"
            name = await self.ask(Ask("Your name", self.settings.who_or_login, hint=hint, check=complaint_about_name))
            if name:
                self.settings.remember_who(name)
        return self.settings.who

    def choose_visit(self, tag: str) -> None:
        """Have readings go to a visit."""
        self.habits.visit = tag
        if self.survey is not None:
            self.survey = replace(self.survey, visit=tag)

    def action_undo(self, again: bool) -> None:
        """Write back what one's last save replaced, or do it again."""
        if self.settings.who:
            self._session.undo(self.settings.who, again=again)
        else:
            self.say("nothing of yours to undo")

    def action_report(self) -> None:
        """Write the audit report to a file."""
        self.flow(reporting.write(self))

    def action_help_quit(self) -> None:
        """Ctrl+C leaves nothing: what is being typed would be lost."""
        self.say("q quits, from the walk")

    def action_change_light(self) -> None:
        """From the theme for a dark room to that for bright sun and back."""
        names = [theme.name for theme in THEMES]
        self.theme = names[(names.index(self.theme) + 1) % len(names)]


def complaint_about_name(name: str) -> str:
    """What is wrong with a name to save under; empty where it will do."""
    if not name.strip():
        return "a save needs a name"
    complaint = text_complaint(name)
    return f"{complaint[0]}; accepted: {complaint[1]}" if complaint is not None else ""
