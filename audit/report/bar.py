"""
The drop bar: one short bar a circuit, scaled to its allowed drop.

Solid is what was read, the soft end its doubt, the tick what was computed, the right edge the allowed
drop, an arrow in place of the edge what is past it. One function gives the geometry in shares of the
allowed drop; the terminal and the pages draw the same one.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from html import escape

CELLS = 11
"""Characters between the two edges."""


@dataclass(frozen=True, slots=True)
class Bar:
    """A drop bar in shares of the allowed drop: 0 the left edge, 1 the right edge."""

    measured: float | None
    """Where the reading ends, cut at the edges; ``None`` where nothing was read."""
    soft_from: float | None
    """Measured less its standard uncertainty, cut at the edges; ``None`` without a doubt."""
    soft_to: float | None
    """Measured plus its standard uncertainty, cut at the edges."""
    computed: float | None
    """Where the tick stands, cut at the edges; ``None`` where it cannot be computed."""
    past: bool
    """The reading is beyond the right edge; where nothing was read, the computed drop is."""
    below: bool
    """The reading is less than nothing by more than its doubt: the far end read higher than the near one."""
    words: str
    """The bar in words, for those who cannot see it."""

    @property
    def is_read(self) -> bool:
        return self.measured is not None


def drop_bar(
    measured: float | None, u: float | None, computed: float | None, allowed: float | None, words: str = ""
) -> Bar | None:
    """
    The geometry of a bar.

    Parameters
    ----------
    measured, u, computed, allowed : float or None
        Measured drop, its standard uncertainty, computed and allowed drop, all in one unit. [V or %]
    words : str
        What the bar says, in words.

    Returns
    -------
    Bar or None
        ``None`` where there is nothing to scale by or nothing to draw.

    Examples
    --------
    >>> bar = drop_bar(1.5, 0.3, 1.2, 3.0)
    >>> bar.measured, bar.soft_from, bar.soft_to, bar.computed, bar.past
    (0.5, 0.4, 0.6, 0.4, False)
    >>> drop_bar(1.5, 0.3, 1.2, None) is None
    True
    """
    scale, read, doubt, tick = (_finite(x) for x in (allowed, measured, u, computed))
    if scale is None or scale <= 0 or (read is None and tick is None):
        return None
    has_doubt = read is not None and doubt is not None and doubt > 0
    leading = tick if read is None else read
    return Bar(
        measured=None if read is None else _cut(read / scale),
        soft_from=_cut((read - doubt) / scale) if has_doubt and read is not None and doubt is not None else None,
        soft_to=_cut((read + doubt) / scale) if has_doubt and read is not None and doubt is not None else None,
        computed=None if tick is None else _cut(tick / scale),
        past=leading is not None and leading > scale,
        below=read is not None and read + (doubt or 0.0) < 0,
        words=words,
    )


@dataclass(frozen=True, slots=True)
class Strokes:
    """The characters of a bar."""

    left: str
    right: str
    solid: str
    soft: str
    tick: str
    past: str
    below: str


BLOCKS = Strokes(left="▕", right="▏", solid="█", soft="▒", tick="╵", past="▶", below="◀")
ASCII = Strokes(left="[", right="]", solid="#", soft=":", tick="|", past=">", below="<")


def legend(strokes: Strokes = BLOCKS) -> str:
    """What the signs of a bar mean, in one sentence."""
    return (
        f"Bar: {strokes.solid} read, {strokes.soft} its doubt, {strokes.tick} computed, {strokes.right} allowed, "
        f"{strokes.past} past it; between the points that were read, percent of nominal."
    )


def text_bar(bar: Bar | None, cells: int = CELLS, strokes: Strokes = BLOCKS) -> str:
    """
    A bar of ``cells`` characters between its edges; blanks where there is none.

    What was read fills every cell whose middle it reaches, and at least the one it lies in.

    Examples
    --------
    >>> text_bar(drop_bar(1.4, 0.2, 1.3, 3.0))
    '▕████╵▒     ▏'
    >>> text_bar(drop_bar(8.1, 0.1, 3.9, 5.0), strokes=ASCII)
    '[########|##>'
    >>> text_bar(drop_bar(None, None, 1.3, 3.0), strokes=ASCII)
    '[    |      ]'
    """
    if bar is None:
        return " " * (cells + 2)
    row = [" "] * cells
    if bar.measured is not None:
        solid_to = bar.measured if bar.soft_from is None else bar.soft_from
        soft_to = bar.measured if bar.soft_to is None else bar.soft_to
        for cell in range(cells):
            middle = (cell + 0.5) / cells
            row[cell] = strokes.solid if middle <= solid_to else strokes.soft if middle <= soft_to else " "
        end = _cell(bar.measured, cells)
        if bar.soft_from is not None and not bar.past and strokes.soft not in row:
            row[end] = strokes.soft
        elif bar.measured > 0 and row[end] == " " and end == 0:
            row[end] = strokes.solid
    if bar.computed is not None and bar.computed < 1:
        row[_cell(bar.computed, cells)] = strokes.tick
    left = strokes.below if bar.below else strokes.left
    return left + "".join(row) + (strokes.past if bar.past else strokes.right)


def svg_bar(bar: Bar | None, width: int = 132, height: int = 14) -> str:
    """
    A bar as inline SVG: readable without colour, which only helps (palette of Okabe and Ito).

    Solid ends in a wedge over the doubt, the tick passes over and under the bar, the arrow stands
    outside the edge.
    """
    if bar is None:
        return ""
    left, right = 8.0, width - 10.0
    top, foot, middle = 3.5, height - 3.5, height / 2
    ink = "#d55e00" if bar.past else "#0072b2"

    def x(share: float) -> float:
        return left + share * (right - left)

    parts: list[str] = []
    if bar.measured is not None:
        low = bar.measured if bar.soft_from is None else bar.soft_from
        high = bar.measured if bar.soft_to is None else bar.soft_to
        corners = [(left, top), (x(low), top), (x(high), middle), (x(low), foot), (left, foot)]
        points = " ".join(f"{_px(a)},{_px(b)}" for a, b in corners)
        parts.append(f'<polygon points="{points}" fill="{ink}"/>')
    parts.append(_line(left, 1.5, left, height - 1.5, 0.8))
    if bar.below:
        parts.append(_arrow(left - 1.5, middle, -5.5))
    if bar.past:
        parts.append(_arrow(right + 2, middle, 6.5))
    parts.append(_line(right, 1.5, right, height - 1.5, 1.4))
    if bar.computed is not None and bar.computed < 1:
        # A white edge keeps the black tick apart from the dark bar in print without colour.
        parts.append(_line(x(bar.computed), 0, x(bar.computed), height, 3.4, "#fff"))
        parts.append(_line(x(bar.computed), 0, x(bar.computed), height, 1.4))
    return (
        f'<svg class="bar" width="{width}" height="{height}" viewBox="0 0 {width} {height}" role="img" '
        f'aria-label="{escape(bar.words)}"><title>{escape(bar.words)}</title>{"".join(parts)}</svg>'
    )


def _finite(value: float | None) -> float | None:
    return value if value is not None and math.isfinite(value) else None


def _cut(share: float) -> float:
    return round(min(1.0, max(0.0, share)), 6)


def _cell(share: float, cells: int) -> int:
    return min(cells - 1, int(share * cells))


def _px(value: float) -> str:
    return f"{value:.2f}".rstrip("0").rstrip(".")


def _line(x1: float, y1: float, x2: float, y2: float, thickness: float, ink: str = "#000") -> str:
    return (
        f'<line x1="{_px(x1)}" y1="{_px(y1)}" x2="{_px(x2)}" y2="{_px(y2)}" '
        f'stroke="{ink}" stroke-width="{_px(thickness)}"/>'
    )


def _arrow(x: float, y: float, length: float) -> str:
    return f'<polygon points="{_px(x)},{_px(y - 4.5)} {_px(x + length)},{_px(y)} {_px(x)},{_px(y + 4.5)}" fill="#000"/>'
