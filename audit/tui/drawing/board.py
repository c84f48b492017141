"""The page of a board or source: what feeds it, how its circuits stand, what was found and read on its busbar."""

from __future__ import annotations

from audit.report.phrases import counted, status_words
from audit.report.records import board_title
from audit.tui.drawing.findings import finding_lines
from audit.tui.drawing.pieces import Line, cut, piece, wrapped
from audit.tui.drawing.rounds import round_lines
from audit.tui.state import Survey
from rules.assessment import Status
from rules.record import Board, Feed, Source


def board_lines(survey: Survey, row_id: str, width: int) -> list[Line]:
    """The whole page; nothing for a row that is not there (any more)."""
    index = survey.index
    row: Board | Source | None = index.boards.get(row_id) or index.sources.get(row_id)
    if row is None:
        return []
    table = "boards" if isinstance(row, Board) else "sources"
    title = board_title(index, Feed(table, row.id)).removeprefix(row.tag).strip(", ")
    lines = [cut((piece(" "), piece(row.tag, "strong"), piece(f"  {title}")), width)]
    if isinstance(row, Board) and row.location:
        lines += wrapped(row.location, width - 1, 3, "quiet")
    if row.notes:
        lines += wrapped(row.notes, width - 1, 3)
    circuits = index.circuits_of(row.id)
    lines += [(), (piece(f"   {counted(len(circuits), 'circuit')}, {_read(survey, row.id)} read on this visit"),)]
    for status in Status:
        tags = [c.tag for c in circuits if c.id in survey.results and survey.results[c.id].status is status]
        lines += wrapped(", ".join(tags), width - 1, 18, str(status), f"   {status_words(status)}") if tags else []
    findings = survey.assessment.findings if survey.assessment is not None else ()
    for finding in findings:
        if finding.circuit is None and finding.board == row.tag:
            lines += [(), *finding_lines(finding, width, place=False)]
    rounds = round_lines(index, row.id, width)
    lines += [
        (),
        (piece(" on the busbar", "quiet"),),
        *(rounds or [(piece("   nothing was read: m measures", "measure"),)]),
    ]
    return [*lines, ()]


def _read(survey: Survey, row_id: str) -> int:
    return sum(circuit.id in survey.read_now for circuit in survey.index.circuits_of(row_id))
