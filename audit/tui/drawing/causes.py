"""Causes as bars: how probable each is, and how large the extra resistance would be."""

from __future__ import annotations

from rich.cells import cell_len

from audit.report.phrases import extra_words, heat_words
from audit.tui.drawing.pieces import Line, Piece, cut, fit, piece, wrapped
from rules.assessment import CircuitResult, Place

LEAST_SHOWN = 0.01
"""Causes less probable than this are left out; the report has all of them."""
LEAST_EXPLAINED = 0.05
"""Causes less probable than this stand without what speaks for and against them."""
_NAME_CELLS = 36
_FACT_INDENT = 14
_PROBABILITY_CELLS = 11
_EIGHTHS = " ▏▎▍▌▋▊▉█"


def cause_lines(result: CircuitResult, width: int) -> list[Line]:
    """One bar a cause with its facts, the likeliest first; nothing where readings say nothing of causes."""
    shown = [place for place in result.causes if place.probability >= LEAST_SHOWN]
    if not shown:
        return []
    cells = min(_NAME_CELLS, max(cell_len(_name(place)) for place in shown))
    said: set[str] = set()
    lines: list[Line] = [()]
    for place in shown:
        heat, extra = result.heat_of(place), extra_words(place)
        told = heat is not None and place.probability >= LEAST_EXPLAINED
        lines.append(_cause_line(place, cells, width, "" if told else extra))
        if told and heat is not None:
            words = f"{extra}: {heat_words(heat)}" if extra else heat_words(heat)
            lines += wrapped(words, width - 1, _FACT_INDENT, "", "     extra" if extra else "     heat")
        lines += _fact_lines(place, said, width)
    return lines


def _fact_lines(place: Place, said: set[str], width: int) -> list[Line]:
    """What speaks for a cause and against it, but for what stands above already; nothing for one of little weight."""
    if place.probability < LEAST_EXPLAINED:
        return []
    lines = []
    for word, facts in (("for", place.speaks_for), ("against", place.speaks_against)):
        for fact in facts:
            if fact not in said:
                said.add(fact)
                lines += wrapped(fact, width - 1, _FACT_INDENT, "quiet", f"     {word}")
                word = ""
    return lines


def probability_bar(probability: float, cells: int) -> str:
    """
    A bar in eighths of a cell.

    >>> probability_bar(0.5, 4), probability_bar(0.03, 4)
    ('██  ', '▏   ')
    """
    eighths = max(1, round(probability * cells * 8)) if probability > 0 else 0
    full, part = divmod(eighths, 8)
    return ("█" * full + (_EIGHTHS[part] if part else "")).ljust(cells)


def _name(place: Place) -> str:
    """Cause, place, and how where that is known: ``bad connection, run 2``."""
    return ", ".join(part for part in (place.cause, place.where, place.what) if part)


def _cause_line(place: Place, cells: int, width: int, extra: str) -> Line:
    from rules.verdict import probability_words  # who judged has it loaded; the first screen does not wait for it

    role = "strong" if place.probability >= 0.5 else ""
    bar = Piece(probability_bar(place.probability, 20 if width > 100 else 12), "bar")
    words = piece(f" {fit(probability_words(place.probability), _PROBABILITY_CELLS)} {extra}", role)
    return cut((piece(f"   {fit(_name(place), cells)} ", role), bar, words), width)
