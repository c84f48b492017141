"""Finding a circuit or board by typing: the cursor of the walk follows."""

from __future__ import annotations

from collections.abc import Callable
from typing import ClassVar

from textual import on
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Horizontal, Vertical
from textual.widgets import Input, Static

from audit.tui.screens.foot import Foot


class Find(Foot[None]):
    """
    Looks for what is typed as it is typed.

    Parameters
    ----------
    look : callable
        Puts the cursor on a place that matches, the next one where the second argument is true; says whether
        there is one.
    back : callable
        Puts the cursor back to where it was.
    """

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape", "leave", show=False),
        Binding("down", "further", show=False),
    ]

    def __init__(self, look: Callable[[str, bool], bool], back: Callable[[], object]) -> None:
        super().__init__()
        self._look = look
        self._back = back

    def compose(self) -> ComposeResult:
        with Vertical(id="question"):
            with Horizontal(id="line"):
                yield Static("Find", id="asked")
                yield Input(id="answer", compact=True)
            yield Static("a tag, a description, a location · ↓ the next one · Enter stays there", id="hint")

    @on(Input.Changed)
    def follow(self, event: Input.Changed) -> None:
        """Go to the first place that matches."""
        self._told(not event.value.strip() or self._look(event.value, False))

    def action_further(self) -> None:
        """Go to the next place that matches."""
        self._told(self._look(self.query_one(Input).value, True))

    def _told(self, is_found: bool) -> None:
        self.query_one("#hint").set_class(not is_found, "-wrong")
        words = "a tag, a description, a location · ↓ the next one · Enter stays there"
        self.query_one("#hint", Static).update(words if is_found else "nothing in this site is called so")

    @on(Input.Submitted)
    def stay(self) -> None:
        """Stay where the cursor is."""
        self.dismiss(None)

    def action_leave(self) -> None:
        """Leave, the cursor where it was before."""
        self._back()
        self.dismiss(None)
