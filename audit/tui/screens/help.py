"""What the keys of a screen do, what the signs mean, and the cautions of the site's voltages."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any, ClassVar

from textual.app import App, ComposeResult
from textual.binding import ActiveBinding, Binding, BindingType
from textual.containers import ScrollableContainer
from textual.screen import Screen
from textual.widgets import Input

from audit.tui.drawing.help import help_lines
from audit.tui.screens.base import OurScreen
from audit.tui.widgets.few_lines import FewLines
from audit.tui.widgets.keys_line import KeysLine
from audit.tui.widgets.lines_view import LinesView
from rules.cautions import cautions_of, highest_voltage_v

_EVERYWHERE = {
    binding.action
    for owner in (App, Screen, Input, ScrollableContainer)
    for binding in Binding.make_bindings(owner.BINDINGS)
} - {"app.quit"}
"""What keys do in any program of this toolkit: editing a line, moving the focus, scrolling."""


def keys_of(app: App[Any], bindings: Mapping[str, ActiveBinding]) -> list[tuple[str, str]]:
    """Keys and what they do; keys of one action stand together, keys that do nothing worth telling are left out."""
    by_action: dict[tuple[str, str], list[str]] = {}
    for active in bindings.values():
        binding = active.binding
        words = binding.tooltip or binding.description
        if words and binding.action not in _EVERYWHERE:
            name = binding.key_display or app.get_key_display(binding)
            by_action.setdefault((binding.action, words), []).append(name)
    return [(" ".join(dict.fromkeys(names)), words) for (_, words), names in by_action.items()]


class HelpScreen(OurScreen[None]):
    """Help on the screen that it was opened from."""

    CSS_PATH = "help.tcss"
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape,q,question_mark,left", "leave", "back", key_display="Esc"),
    ]

    def __init__(self, keys: list[tuple[str, str]]) -> None:
        super().__init__()
        self._keys = keys

    def compose(self) -> ComposeResult:
        yield LinesView(id="text")
        yield FewLines(id="said")
        yield KeysLine()

    def on_resize(self) -> None:
        text, survey = self.query_one("#text", LinesView), self.ohmwalk.survey
        cautions = cautions_of(survey.site) if survey is not None else ()
        highest = highest_voltage_v(survey.site) if survey is not None else 0.0
        text.show_lines(help_lines(self._keys, cautions, highest, text.inner_width))

    def action_leave(self) -> None:
        """Back to the screen."""
        self.dismiss()


def help_on(screen: OurScreen[Any]) -> HelpScreen:
    """Help on a screen as it is now."""
    return HelpScreen(keys_of(screen.app, screen.active_bindings))
