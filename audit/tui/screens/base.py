"""What all our screens have: a line that says what just happened, and one with the keys."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any, TypeVar, cast

from textual.screen import Screen

from audit.tui.widgets.few_lines import FewLines

if TYPE_CHECKING:
    from audit.tui.app import OhmwalkApp

R = TypeVar("R")

SAID_S = 8.0
"""How long a remark stays; what went wrong stays until the next word. [s]"""


class OurScreen(Screen[R]):
    """A screen with the lines ``#said`` and, where it has one, ``#next``, of which one is seen at a time."""

    @property
    def ohmwalk(self) -> OhmwalkApp:
        """The program."""
        return cast("OhmwalkApp", self.app)

    def say(self, words: str, role: str = "quiet") -> None:
        """One line about what just happened, in the place of what is next; empty for none."""
        self.query_one("#said", FewLines).say_words(words, role)
        for following in self.query("#next"):
            following.set_class(bool(words), "-hidden")
        if words and role == "quiet":
            self.set_timer(SAID_S, lambda: self._unsay(words))
        self._said = words

    _said = ""

    def action_help(self) -> None:
        """What the keys do here, and the cautions."""
        from audit.tui.screens.help import help_on  # it is a screen of ours itself

        self.open(help_on(self))

    def open(self, screen: Screen[Any]) -> None:
        """Show another screen; what it gives back is not asked for."""
        self.ohmwalk.flow(self.ohmwalk.ask(screen))

    def _unsay(self, words: str) -> None:
        if self._said == words:
            self.say("")
