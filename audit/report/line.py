"""
The circuit line: current runs from left to right, what was read stands above the point where it was read,
what was computed below it.

``paths_of`` gives the paths of a circuit from its record; ``text_line`` and ``svg_line`` draw them.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from html import escape

from audit.report.blocks import Line, Path, Stop
from rules.index import Index
from rules.record import Circuit, Run

WIDTH = 680
"""Width of a drawn line. [px]"""

_LETTER = 5.9
"""Mean width of a letter in the drawing. [px]"""
_ROW = 60
"""Height of one row. [px]"""


def line_of(
    index: Index,
    circuit: Circuit,
    stretch: Callable[[Run], str],
    device: str,
    read: dict[str, str],
    computed: dict[str, str],
) -> Line | None:
    """
    The paths of a circuit: first from ``bus`` along the lowest-numbered runs, then each branch.

    Parameters
    ----------
    stretch : callable
        Words for a run: its length and size.
    device : str
        Words for the device; empty where bus and way are one point.
    read, computed : dict
        What stands above and below each point, by its name.

    Returns
    -------
    Line or None
        ``None`` for a circuit without runs.
    """
    left = list(index.runs_of(circuit.id))
    if not left:
        return None

    def stop(point: str) -> Stop:
        return Stop(point, read.get(point, ""), computed.get(point, ""))

    paths: list[Path] = []
    reached = {"way"}
    while left:
        # A run that starts nowhere still is drawn, as a path of its own.
        start = left[0].from_point
        points, words = [start], []
        while following := next((run for run in left if run.from_point == points[-1]), None):
            left.remove(following)
            end = index.end_of(following)
            points.append(end)
            words.append(stretch(following))
            if end in reached:
                break
            reached.add(end)
        through_device = not paths and start == "way" and bool(device)
        if through_device:
            points.insert(0, "bus")
            words.insert(0, device)
        paths.append(Path(tuple(map(stop, points)), tuple(words), through_device))
    return Line(tuple(paths))


def text_line(path: Path) -> str:
    """
    One path in one line of text.

    >>> text_line(Path((Stop("bus"), Stop("way", "54.0 V")), ("breaker C 16 A",), True))
    'bus ─┤breaker C 16 A├─ way (read 54.0 V)'
    """
    parts = [_stop_words(path.stops[0])]
    for number, (words, stop) in enumerate(zip(path.stretches, path.stops[1:], strict=True)):
        parts.append(f" ─┤{words}├─ " if path.through_device and number == 0 else f" ━━ {words} ━━ ")
        parts.append(_stop_words(stop))
    return "".join(parts)


def svg_line(line: Line) -> str:
    """The line as inline SVG, black on white; a path too long for the page goes on in the next row."""
    rows = [row for path in line.paths for row in _rows(path)]
    height = _ROW * len(rows) + 4
    drawn = "".join(_row(row, _ROW * number + 24) for number, row in enumerate(rows))
    words = escape("; ".join(text_line(path) for path in line.paths))
    return (
        f'<svg class="line" width="{WIDTH}" height="{height}" viewBox="0 0 {WIDTH} {height}" role="img" '
        f'aria-label="{words}">{drawn}</svg>'
    )


def _stop_words(stop: Stop) -> str:
    said = [f"read {stop.read}" if stop.read else "", f"computed {stop.computed}" if stop.computed else ""]
    known = ", ".join(text for text in said if text)
    return f"{stop.point} ({known})" if known else stop.point


def _rows(path: Path) -> Iterable[Path]:
    """The path cut where it would leave the page."""
    first = 0
    used = 0.0
    for number, words in enumerate(path.stretches):
        width = _stretch_width(words, path.stops[number], path.stops[number + 1])
        if number > first and used + width > WIDTH - 60:
            yield Path(path.stops[first : number + 1], path.stretches[first:number], path.through_device and first == 0)
            first, used = number, 0.0
        used += width
    yield Path(path.stops[first:], path.stretches[first:], path.through_device and first == 0)


def _stretch_width(words: str, start: Stop, end: Stop) -> float:
    beside = (_stop_width(start) + _stop_width(end)) / 2
    return min(WIDTH - 60.0, max(64.0, _LETTER * len(words) + 26, beside + 10))


def _stop_width(stop: Stop) -> float:
    return _LETTER * max(len(_shortened(text)) for text in (_below(stop), stop.read))


def _below(stop: Stop) -> str:
    # A name may run from right to left; isolated, it leaves the figure behind it in its place.
    return f"\u2068{stop.point}\u2069 · {stop.computed}" if stop.computed else stop.point


def _row(path: Path, y: int) -> str:
    """One row at the height ``y`` of its conductor."""
    parts: list[str] = []
    x = 24.0
    centres = [x]
    for number, words in enumerate(path.stretches):
        width = _stretch_width(words, path.stops[number], path.stops[number + 1])
        end = x + width
        if path.through_device and number == 0:
            parts.append(_stroke(x, end, y, 1.2))
            parts.append(
                f'<rect x="{x + 9:.1f}" y="{y - 7.5}" width="{width - 18:.1f}" height="15" '
                'fill="#fff" stroke="#000" stroke-width="1.2"/>'
            )
            parts.append(_text((x + end) / 2, y + 3.6, words))
        else:
            parts.append(_stroke(x, end, y, 2.4))
            parts.append(_text((x + end) / 2, y + 12, words, "quiet"))
        x = end
        centres.append(x)
    for centre, stop in zip(centres, path.stops, strict=True):
        parts.append(f'<circle cx="{centre:.1f}" cy="{y}" r="3.4" fill="#000"/>')
        parts.append(_text(centre, y - 12, stop.read, "read"))
        parts.append(_text(centre, y + 25, _below(stop), "point"))
    return "".join(parts)


def _stroke(x1: float, x2: float, y: float, thickness: float) -> str:
    return f'<line x1="{x1:.1f}" y1="{y}" x2="{x2:.1f}" y2="{y}" stroke="#000" stroke-width="{thickness}"/>'


def _text(x: float, y: float, text: str, style: str = "") -> str:
    if not text:
        return ""
    anchor = "start" if x < 30 and len(text) > 8 else "middle"
    at = x - 20 if anchor == "start" else x
    return f'<text x="{at:.1f}" y="{y:.1f}" text-anchor="{anchor}" class="{style}">{escape(_shortened(text))}</text>'


def _shortened(text: str) -> str:
    return text if len(text) <= 44 else text[:43] + "…"
