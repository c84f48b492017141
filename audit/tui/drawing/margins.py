"""The loads of a circuit: voltage at design and at worst, and the margin to the lowest that each lives with."""

from __future__ import annotations

from rich.cells import cell_len

from audit.report.phrases import fault_is_likely, figure_words, peak_words, source_words, with_and_without
from audit.tui.drawing.pieces import Line, Piece, fit, piece, wrapped
from rules.assessment import CircuitResult, LoadMargin
from rules.record import Figure
from rules.text import clean

_HEADS = ("at design", "at worst", "its lowest", "margin")
_INDENT = 3
_LEAST_NAME = 10


def margin_lines(result: CircuitResult, width: int) -> list[Line]:
    """
    One line a load under a head, and one at its peak where one is recorded; nothing where there is no load.

    What a column says of the source stands under them.
    """
    if not result.margins:
        return []
    rows = [row for margin in result.margins for row in _rows(margin)]
    columns = [
        max(cell_len(text) for text in texts) + 2 for texts in zip(_HEADS, *(texts for _, texts in rows), strict=True)
    ]
    name = max(_LEAST_NAME, width - 1 - _INDENT - sum(columns))
    head = tuple(piece(fit(text, cells, "right"), "quiet") for text, cells in zip(_HEADS, columns, strict=True))
    lines: list[Line] = [(piece(" " * (_INDENT + name), "quiet"), *head)]
    lines += [(piece(" " * _INDENT + fit(label, name)), *_cells(texts, columns)) for label, texts in rows]
    if said := source_words(result.margins):
        lines += wrapped(said, width - 1, _INDENT, "quiet")
    if fault_is_likely(result):
        for margin in result.margins:
            lines += wrapped(with_and_without(margin), width - 1, _INDENT) if with_and_without(margin) else []
    return lines


def _rows(margin: LoadMargin) -> list[tuple[str, tuple[str, ...]]]:
    """Of each state that the load is in: its name and the text of each column."""
    states = [(clean(f"{margin.load}, {margin.point}"), (margin.design, margin.worst, margin.lowest, margin.margin))]
    if margin.peak is not None:
        states.append((f"  {peak_words(margin)}", (margin.dip, margin.dip_worst, margin.lowest, margin.dip_margin)))
    return [(label, tuple(_volts(figure) for figure in figures)) for label, figures in states]


def _cells(texts: tuple[str, ...], columns: list[int]) -> tuple[Piece, ...]:
    """The columns of one row: its lowest is quiet, a margin that is not kept loud."""
    roles = ("", "", "quiet", "act" if texts[-1].startswith("-") else "")
    return tuple(
        piece(fit(text, cells, "right"), role) for text, cells, role in zip(texts, columns, roles, strict=True)
    )


def _volts(figure: Figure | None) -> str:
    return "not known" if figure is None else figure_words(figure)
