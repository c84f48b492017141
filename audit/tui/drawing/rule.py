"""The page of a rule in lines."""

from __future__ import annotations

from typing import TYPE_CHECKING

from audit.tui.drawing.pieces import Line, piece, wrapped

if TYPE_CHECKING:
    from audit.rule_page import RulePage

_GAP = 2
_MOST_LABEL = 24


def rule_lines(page: RulePage, width: int) -> list[Line]:
    """Everything that the page says, within a width."""
    lines: list[Line] = [(piece(f" {page.id}  {page.title}", "title"),)]
    for part in page.parts:
        lines.append(())
        if part.heading:
            lines.append((piece(f" {part.heading}", "strong"),))
        indent = 3 + min(_MOST_LABEL, max(len(row.label) for row in part.rows)) + _GAP
        for row in part.rows:
            lines += wrapped(row.words, width - 1, indent, row.role, f"   {row.label}")
    return lines
