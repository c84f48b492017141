"""The keys of the screen at hand in one line of plain words; each can be clicked."""

from __future__ import annotations

from rich.cells import cell_len
from rich.segment import Segment
from textual import events
from textual.strip import Strip
from textual.widget import Widget

from rules.text import clean

_GAP = 3


class KeysLine(Widget):
    """The screen's bindings that are to be shown, as many as fit."""

    COMPONENT_CLASSES = {"keys--key"}  # noqa: RUF012  # as Textual declares it
    DEFAULT_CSS = """
    KeysLine {
        height: 1;
        color: $quiet;
        background: $background;
        & > .keys--key { color: $foreground; text-style: bold; }
    }
    """

    def on_mount(self) -> None:
        self.screen.bindings_updated_signal.subscribe(self, lambda _: self.refresh())

    def shown(self) -> list[tuple[int, str, str, str]]:
        """Column, key, words and action of each binding that fits."""
        column, found, actions = 1, [], set[str]()
        for key, active in self.screen.active_bindings.items():
            binding = active.binding
            if not binding.show or not active.enabled or binding.action in actions:
                continue
            actions.add(binding.action)
            name = clean(binding.key_display or self.app.get_key_display(binding))
            width = cell_len(name) + 1 + cell_len(binding.description)
            if column + width > self.size.width:
                continue
            found.append((column, name, binding.description, key))
            column += width + _GAP
        return found

    def render_line(self, y: int) -> Strip:
        plain, strong = self.rich_style, self.get_component_rich_style("keys--key")
        segments, column = [], 0
        for start, name, words, _ in self.shown():
            segments += [Segment(" " * (start - column), plain), Segment(name, strong), Segment(f" {words}", plain)]
            column = start + cell_len(name) + 1 + cell_len(words)
        return Strip(segments).adjust_cell_length(self.size.width, plain)

    async def on_click(self, event: events.Click) -> None:
        """Do what the key under the pointer does."""
        for start, name, words, key in self.shown():
            if start <= event.x < start + cell_len(name) + 1 + cell_len(words):
                active = self.screen.active_bindings[key]
                await self.app.run_action(active.binding.action, active.node)
                return
