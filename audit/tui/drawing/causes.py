"""Causes as bars: how probable each is, and how large the extra resistance would be."""

from __future__ import annotations

from audit.report.phrases import figure_words
from audit.tui.drawing.pieces import Line, Piece, cut, fit, piece
from audit.tui.drawing.walk import cause_words
from rules.assessment import CircuitResult, Place
from rules.record import Figure

LEAST_SHOWN = 0.01
"""Causes less probable than this are left out; the report has all of them."""
_BAR = 20
_EIGHTHS = " ▏▎▍▌▋▊▉█"


def cause_lines(result: CircuitResult, width: int) -> list[Line]:
    """One bar a cause, the likeliest first; nothing while causes are not judged."""
    shown = [place for place in result.causes if place.probability >= LEAST_SHOWN]
    if not shown:
        return []
    cells = min(34, max(len(cause_words(place)) for place in shown))
    return [(), *(_cause_line(place, cells, width) for place in shown)]


def probability_bar(probability: float, cells: int = _BAR) -> str:
    """
    A bar in eighths of a cell.

    >>> probability_bar(0.5, 4), probability_bar(0.03, 4)
    ('██  ', '▏   ')
    """
    eighths = max(1, round(probability * cells * 8)) if probability > 0 else 0
    full, part = divmod(eighths, 8)
    return ("█" * full + (_EIGHTHS[part] if part else "")).ljust(cells)


def _cause_line(place: Place, cells: int, width: int) -> Line:
    ohms = ""
    if place.best_ohm is not None and place.low_ohm is not None and place.high_ohm is not None:
        best, low, high = (figure_words(Figure(ohm, "ohm")) for ohm in (place.best_ohm, place.low_ohm, place.high_ohm))
        ohms = f"   {best} ({low} to {high})"
    role = "strong" if place.probability >= 0.5 else ""
    bar = Piece(probability_bar(place.probability), "read")
    return cut(
        (piece(f"   {fit(cause_words(place), cells)} ", role), bar, piece(f" {place.probability:.2f}{ohms}", role)),
        width,
    )
