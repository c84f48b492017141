"""One question at the foot of the screen: a text, or one of some choices by typing its letters."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import ClassVar

from textual import on
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Horizontal, Vertical
from textual.widgets import Input, Static

from audit.tui.drawing.pieces import Line, Piece, cut, piece
from audit.tui.drawing.walk import CHOSEN
from audit.tui.screens.foot import Foot
from audit.tui.widgets.pick_list import PickList
from rules.text import clean


@dataclass(frozen=True, slots=True)
class Choice:
    """One of the answers."""

    answer: str
    words: str = ""
    """What is said of it."""


class _Choices(PickList, can_focus=False):
    """The choices that what is typed may mean."""

    def __init__(self) -> None:
        super().__init__(id="choices")
        self.shown: tuple[Choice, ...] = ()

    def narrow(self, shown: Sequence[Choice]) -> None:
        self.shown = tuple(shown)
        self.set_class(not shown, "-none")
        self.renewed(0)
        self.refresh(layout=True)

    @property
    def item_count(self) -> int:
        return len(self.shown)

    def item_line(self, item: int, *, chosen: bool) -> Line:
        choice = self.shown[item]
        return cut(
            (
                Piece(f"{CHOSEN if chosen else ' '} ", "cursor"),
                piece(choice.answer, "strong"),
                piece(f"  {choice.words}", "quiet"),
            ),
            self.inner_width,
        )


class Ask(Foot[str | None]):
    """
    Asks, and gives the answer back; ``None`` for Escape.

    Parameters
    ----------
    question : str
        In a few words.
    default : str
        Stands in the answer already; what is typed replaces it.
    hint : str
        What is accepted.
    choices : sequence of Choice
        Answers to choose from. Without ``free`` one of them must be chosen.
    free : bool
        Any text is an answer.
    instant : bool
        A letter that only one choice begins with chooses it.
    check : callable
        What is wrong with an answer; empty where it will do.
    echo : callable
        What is understood of what is being typed, in the place of the hint; empty where nothing is.
    """

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape", "give_up", "leave", show=False),
        Binding("up", "step(-1)", show=False),
        Binding("down", "step(1)", show=False),
    ]

    def __init__(
        self,
        question: str,
        default: str = "",
        *,
        hint: str = "",
        choices: Sequence[Choice] = (),
        free: bool = True,
        instant: bool = False,
        check: Callable[[str], str] = lambda answer: "",
        echo: Callable[[str], str] = lambda typed: "",
    ) -> None:
        super().__init__()
        self._question = question
        self._default = default
        self._hint = hint
        self._choices = tuple(choices)
        self._free = free and not instant
        self._instant = instant
        self._check = check
        self._echo = echo

    def compose(self) -> ComposeResult:
        with Vertical(id="question"):
            yield _Choices()
            with Horizontal(id="line"):
                yield Static(clean(self._question), id="asked", markup=False)
                yield Input(self._default, id="answer", compact=True, select_on_focus=True)
            yield Static(clean(self._hint), id="hint", markup=False)

    def on_mount(self) -> None:
        self.query_one(_Choices).narrow(self._matching(""))

    def _matching(self, typed: str) -> list[Choice]:
        """The choices that a text may mean: those that begin with it, then those that hold it."""
        folded = typed.casefold().strip()
        begin = [choice for choice in self._choices if choice.answer.casefold().startswith(folded)]
        hold = [
            choice
            for choice in self._choices
            if choice not in begin and folded in f"{choice.answer} {choice.words}".casefold()
        ]
        return begin + hold

    @on(Input.Changed)
    def narrow(self, event: Input.Changed) -> None:
        """Show what the text may mean, and choose at once where that is asked for."""
        typed = event.value
        self._complain("")
        if typed == self._default:
            self.query_one(_Choices).narrow(self._matching(""))
            return
        matching = self._matching(typed)
        begin = [choice for choice in matching if choice.answer.casefold().startswith(typed.casefold())]
        if self._instant and typed and len(begin) == 1:
            self.dismiss(begin[0].answer)
            return
        if self._free and typed.strip():
            others = [choice for choice in matching if choice not in begin]
            matching = [*begin, Choice(typed.strip(), "as typed"), *others] if self._choices else []
        if self._choices and not matching:
            self._complain("nothing matches")
        self.query_one(_Choices).narrow(matching)

    @on(Input.Submitted)
    @on(PickList.Opened)
    def accept(self) -> None:
        """Give the answer back if it will do."""
        choices = self.query_one(_Choices)
        typed = self.query_one(Input).value.strip()
        if choices.shown and (typed != self._default.strip() or not typed):
            answer = choices.shown[choices.cursor].answer
        elif self._free or any(choice.answer == typed for choice in self._choices):
            answer = typed
        else:
            self._complain(f"{typed} is none of these" if typed else "choose one")
            return
        complaint = self._check(answer)
        if complaint:
            self._complain(complaint)
        else:
            self.dismiss(answer)

    def _complain(self, complaint: str) -> None:
        hint = self.query_one("#hint", Static)
        typed = self.query_one(Input).value.strip()
        understood = self._echo(typed) if typed else ""
        hint.update(clean(complaint or understood or self._hint))
        hint.set_class(bool(complaint), "-wrong")

    def action_step(self, by: int) -> None:
        """Another of the choices."""
        self.query_one(_Choices).action_step(by)

    def action_give_up(self) -> None:
        """Leave without an answer."""
        self.dismiss(None)


YES, NO = "yes", "no"


def confirm(question: str, hint: str = "") -> Ask:
    """A question that y or n answers."""
    return Ask(question, hint=hint, choices=(Choice(NO), Choice(YES)), instant=True)
