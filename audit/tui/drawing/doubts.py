"""The doubt budget of a circuit's drop: what the doubt of the difference is made of, as bars with words and numbers."""

from __future__ import annotations

from rich.cells import cell_len

from audit.report.phrases import doubt_rows, doubt_summary
from audit.tui.drawing.causes import probability_bar
from audit.tui.drawing.pieces import Line, Piece, fit, piece
from rules.assessment import CircuitResult

_BAR_CELLS, _NARROW_BAR_CELLS = 16, 8
_WIDE = 100
_ADDS_CELLS, _SHARE_CELLS = 8, 5


def doubt_lines(result: CircuitResult, width: int) -> list[Line]:
    """One bar a doubt, the largest first; nothing where no drop was compared."""
    drop = result.drop
    if drop is None or not drop.budget:
        return []
    rows = doubt_rows(drop)
    cells = max(cell_len(row.name) for row in rows)
    bar_cells = _BAR_CELLS if width > _WIDE else _NARROW_BAR_CELLS
    lines: list[Line] = [(piece(f"   {doubt_summary(drop)}"),)]
    for row in rows:
        words = f" {fit(row.adds, _ADDS_CELLS, 'right')} {fit(row.share, _SHARE_CELLS, 'right')}  "
        bar = Piece(probability_bar(row.part, bar_cells), "bar")
        lines.append((piece(f"   {fit(row.name, cells)} "), bar, piece(words), piece(row.stated, "quiet")))
    return lines
