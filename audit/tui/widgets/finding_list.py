"""All findings, the most urgent first; beneath the chosen one stands what it says."""

from __future__ import annotations

from audit.report.phrases import finding_place
from audit.tui.drawing.findings import detail_lines, gap_lines, severity_piece
from audit.tui.drawing.pieces import Line, Piece, cut, fit, piece
from audit.tui.drawing.walk import CHOSEN
from audit.tui.widgets.pick_list import PickList
from rules.assessment import Assessment, Finding

_SEVERITY_CELLS = 11
_PLACE_CELLS = 24


class FindingList(PickList):
    """Shows the findings of an assessment; what could not be judged stands after them."""

    def __init__(self, *, id: str | None = None) -> None:  # noqa: A002
        super().__init__(id=id)
        self._findings: list[Finding] = []
        self._assessment: Assessment | None = None
        self._gaps: list[Line] = []

    def show(self, assessment: Assessment) -> None:
        """Show another assessment; the cursor stays at its finding."""
        chosen = self.chosen
        self._assessment = assessment
        self._findings = sorted(assessment.findings, key=lambda finding: finding.severity.rank)
        self._draw_gaps()
        ids = [finding.id for finding in self._findings]
        self.renewed(ids.index(chosen.id) if chosen is not None and chosen.id in ids else 0)

    @property
    def chosen(self) -> Finding | None:
        """The finding at the cursor."""
        return self._findings[self.cursor] if 0 <= self.cursor < len(self._findings) else None

    def on_resize(self) -> None:
        self._draw_gaps()
        super().on_resize()

    def _draw_gaps(self) -> None:
        gaps = self._assessment.not_judged if self._assessment is not None else ()
        heading: list[Line] = [(), (piece(" not judged: a gap is not a pass", "strong"),)]
        self._gaps = heading + gap_lines(gaps, self.inner_width or self.app.size.width) if gaps else []

    # --- the list

    @property
    def item_count(self) -> int:
        return len(self._findings) + len(self._gaps)

    def is_choosable(self, item: int) -> bool:
        return item < len(self._findings)

    def item_line(self, item: int, *, chosen: bool) -> Line:
        if item >= len(self._findings):
            return self._gaps[item - len(self._findings)]
        finding = self._findings[item]
        place = piece(fit(finding_place(finding), _PLACE_CELLS), "strong")
        severity = severity_piece(finding.severity, _SEVERITY_CELLS)
        return cut(
            (
                Piece(f" {CHOSEN if chosen else ' '} ", "cursor"),
                severity,
                piece("  "),
                place,
                piece(f"  {finding.title}"),
            ),
            self.inner_width,
        )

    def more_lines(self, item: int) -> list[Line]:
        return detail_lines(self._findings[item], self.inner_width)
