"""A small plot of characters: lines in braille, bands in shade, marks on top, all in one colour."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, field
from itertools import pairwise

from audit.tui.drawing.pieces import Line, Piece

_DOTS = ((0x01, 0x08), (0x02, 0x10), (0x04, 0x20), (0x40, 0x80))
"""Bit of each dot of a braille cell, by row and column."""
_EMPTY = 0x2800
_SHADE = "░"
_DOTS_COVERED = 1.5
"""A cell is shaded where a band covers so many of its four rows of dots."""

Point = tuple[float, float]


@dataclass(slots=True)
class Plot:
    """
    A canvas over a range of x and y.

    >>> plot = Plot(4, 1, (0.0, 3.0), (0.0, 1.0))
    >>> plot.curve([(0.0, 0.0), (3.0, 0.0)])
    >>> "".join(piece.text for piece in plot.rows()[0])
    '⣀⣀⣀⣀'
    """

    width: int
    height: int
    """Cells; each has two dots by four."""
    x_range: Point
    y_range: Point
    _dots: dict[tuple[int, int], int] = field(default_factory=dict)
    _shade: set[tuple[int, int]] = field(default_factory=set)
    _marks: dict[tuple[int, int], Piece] = field(default_factory=dict)
    _rules: set[int] = field(default_factory=set)

    def column(self, x: float) -> int:
        """The cell that an x lies in."""
        return round(self._share(x, self.x_range) * (self.width - 1))

    def row(self, y: float) -> int:
        """The cell that a y lies in, 0 the topmost."""
        return round((1 - self._share(y, self.y_range)) * (self.height * 4 - 1)) // 4

    def curve(self, points: Iterable[Point]) -> None:
        """Straight from point to point."""
        dots = [self._dot(*point) for point in points]
        for (x0, y0), (x1, y1) in pairwise(dots):
            steps = max(abs(x1 - x0), abs(y1 - y0), 1)
            for step in range(steps + 1):
                self._set(x0 + round((x1 - x0) * step / steps), y0 + round((y1 - y0) * step / steps))

    def band(self, lower: Iterable[Point], upper: Iterable[Point]) -> None:
        """Shade between two curves over the same x; a band much thinner than a cell is not drawn."""
        low = [self._dot(*point) for point in lower]
        high = [self._dot(*point) for point in upper]
        for (left, right), (left_up, right_up) in zip(pairwise(low), pairwise(high), strict=True):
            for x in range(left[0], right[0] + 1):
                share = (x - left[0]) / max(1, right[0] - left[0])
                bottom = left[1] + (right[1] - left[1]) * share + 1  # to the lower edge of its dot
                top = left_up[1] + (right_up[1] - left_up[1]) * share
                for y in range(int(top) // 4, int(bottom) // 4 + 1):
                    if min(bottom, 4 * y + 4) - max(top, 4 * y) >= _DOTS_COVERED:
                        self._shade.add((x // 2, y))

    def rule(self, y: float) -> None:
        """A limit all across."""
        self._rules.add(self.row(y))

    def mark(self, x: float, y: float, sign: Piece) -> None:
        """One sign on top of everything else; the first at a place stays."""
        self._marks.setdefault((self.column(x), self.row(y)), sign)

    def rows(self) -> list[Line]:
        """The plot, the topmost row first."""
        return [tuple(self._cell(x, y) for x in range(self.width)) for y in range(self.height)]

    def _cell(self, x: int, y: int) -> Piece:
        if (x, y) in self._marks:
            return self._marks[x, y]
        if (x, y) in self._dots:
            return Piece(chr(_EMPTY | self._dots[x, y]), "computed")
        if (x, y) in self._shade:
            return Piece(_SHADE, "band")
        return Piece("╌", "limit") if y in self._rules else Piece(" ")

    def _dot(self, x: float, y: float) -> tuple[int, int]:
        across = round(self._share(x, self.x_range) * (self.width * 2 - 1))
        return across, round((1 - self._share(y, self.y_range)) * (self.height * 4 - 1))

    def _set(self, x: int, y: int) -> None:
        cell = (x // 2, y // 4)
        self._dots[cell] = self._dots.get(cell, 0) | _DOTS[y % 4][x % 2]

    @staticmethod
    def _share(value: float, span: Point) -> float:
        low, high = span
        return min(1.0, max(0.0, (value - low) / (high - low))) if high > low else 0.0
