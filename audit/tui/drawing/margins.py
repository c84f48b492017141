"""The loads of a circuit: voltage at design and at worst, and the margin to the lowest that each lives with."""

from __future__ import annotations

from audit.report.phrases import fault_is_likely, figure_words, with_and_without
from audit.tui.drawing.pieces import Line, fit, piece, wrapped
from rules.assessment import CircuitResult, LoadMargin
from rules.record import Figure
from rules.text import clean

_HEADS = ("at design", "at worst", "its lowest", "margin")
_CELLS = 14


def margin_lines(result: CircuitResult, width: int) -> list[Line]:
    """One line a load under a head; nothing where there is no load."""
    if not result.margins:
        return []
    name = max(10, width - 4 - _CELLS * len(_HEADS))
    head: Line = (piece(" " * (3 + name), "quiet"), *(piece(fit(text, _CELLS, "right"), "quiet") for text in _HEADS))
    lines = [head, *(_line(margin, name) for margin in result.margins)]
    if fault_is_likely(result):
        for margin in result.margins:
            lines += wrapped(with_and_without(margin), width - 1, 3) if with_and_without(margin) else []
    return lines


def _line(margin: LoadMargin, name: int) -> Line:
    kept = margin.margin is None or margin.margin.value >= 0
    cells = (
        piece(_volts(margin.design)),
        piece(_volts(margin.worst)),
        piece(_volts(margin.lowest), "quiet"),
        piece(_volts(margin.margin), "" if kept else "act"),
    )
    return (piece(f"   {fit(clean(f'{margin.load}, {margin.point}'), name)}"), *cells)


def _volts(figure: Figure | None) -> str:
    return " " + fit("not known" if figure is None else figure_words(figure), _CELLS - 1, "right")
