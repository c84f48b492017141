"""An input of one line between two edges, which show where it is also in one colour."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import takewhile

from textual.suggester import Suggester
from textual.widgets import Input

from audit.tui.entry.fields import meanings


class CellInput(Input):
    """Typing replaces what stands there; the edges are borders, since a form has very many of these."""

    DEFAULT_CSS = """
    CellInput {
        height: 1;
        padding: 0;
        border: none;
        border-left: inner $quiet;
        border-right: inner $quiet;
        background: $cell;

        &:focus {
            border: none;
            border-left: inner $foreground;
            border-right: inner $foreground;
            background-tint: $foreground 0%;
        }
    }
    """

    def __init__(self, text: str = "", *, suggester: Suggester | None = None) -> None:
        super().__init__(text, suggester=suggester, select_on_focus=True)


class Completing(Suggester):
    """Shows how the answers that the typed letters may mean go on."""

    def __init__(self, answers: Sequence[str]) -> None:
        super().__init__(use_cache=False, case_sensitive=True)
        self.answers = tuple(answers)

    async def get_suggestion(self, value: str) -> str | None:
        whole = _alike(meanings(value, self.answers)) or value
        # What is shown continues what was typed, so that the letters must agree in case too.
        return value + whole[len(value) :] if whole != value and len(whole) > len(value) else None


def _alike(answers: Sequence[str]) -> str:
    """What several answers begin with alike."""
    columns = zip(*answers, strict=False)
    agreed = takewhile(lambda column: len({letter.casefold() for letter in column}) == 1, columns)
    return "".join(column[0] for column in agreed)
