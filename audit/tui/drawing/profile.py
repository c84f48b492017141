"""The profile of a circuit: volts over metres, what was read as marks, what was computed as a line with its doubt."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from rich.cells import cell_len

from audit.tui.drawing.pieces import Line, Piece, fit, piece
from audit.tui.drawing.plot import Plot
from rules.index import Index
from rules.record import Figure
from rules.text import clean
from rules.units import show

_AXIS = 10
"""Cells of the volts at the left."""
_WIDTHS_OF_DOUBT = 2.0
"""The band reaches so many standard uncertainties up and down."""
_NEAR = 1.5
"""A limit is drawn where it lies within so many heights of the rest below it; else it is said."""
READ_SIGN = "◆"


@dataclass(frozen=True, slots=True)
class Profile:
    """What is plotted of one circuit."""

    segments: tuple[tuple[str, str], ...]
    """Runs as pairs of points, in the order of their numbers; the device leads from ``bus`` to ``way``."""
    metres: Mapping[str, float]
    """Way along the cable to each point, from ``way``. [m]"""
    computed: Mapping[str, Figure]
    read: Mapping[str, tuple[float, ...]]
    lowest: Mapping[str, float]
    """The lowest voltage that the loads at a point can do with. [V]"""


def profile_of(
    index: Index,
    circuit_id: str,
    computed: Mapping[str, Figure],
    read: Mapping[str, tuple[float, ...]],
) -> Profile:
    """Gather a profile; a point behind a run whose length is not known is left out."""
    metres = {"bus": 0.0, "way": 0.0}
    segments = [("bus", "way")]
    for run in index.runs_of(circuit_id):
        end = index.end_of(run)
        if run.from_point in metres and run.one_way_length_m is not None and end not in metres:
            metres[end] = metres[run.from_point] + run.one_way_length_m
            segments.append((run.from_point, end))
    lowest: dict[str, float] = {}
    for load in index.loads_of(circuit_id):
        if load.lowest_voltage_v is not None:
            lowest[load.point] = max(load.lowest_voltage_v, lowest.get(load.point, load.lowest_voltage_v))
    return Profile(tuple(segments), metres, computed, read, lowest)


def profile_lines(profile: Profile, width: int, height: int) -> list[Line]:
    """
    The plot with its axes; nothing where fewer than two points have a voltage.

    Parameters
    ----------
    width, height : int
        Cells, the names of the points and the lines beneath included.
    """
    computed = {point: figure for point, figure in profile.computed.items() if point in profile.metres}
    read = {point: values for point, values in profile.read.items() if point in profile.metres}
    if len({profile.metres[point] for point in (*computed, *read)}) < 2:
        return []
    band = {point: _WIDTHS_OF_DOUBT * (figure.u or 0.0) for point, figure in computed.items()}
    values = [figure.value + side * band[point] for point, figure in computed.items() for side in (-1, 1)]
    values += [value for of_point in read.values() for value in of_point]
    low, high = min(values), max(values)
    span = max(high - low, 0.05)
    limit = max(profile.lowest.values(), default=None)
    is_near = limit is not None and low - _NEAR * span < limit < high + _NEAR * span
    if limit is not None and is_near:
        low, high = min(low, limit), max(high, limit)
        span = max(high - low, span)
    room = span * 0.06
    inner = width - _AXIS - 2
    plot = Plot(inner, height - 2, (0.0, max(profile.metres[p] for p in (*computed, *read))), (low - room, high + room))
    for start, end in profile.segments:
        if start in computed and end in computed:
            ends = [(profile.metres[point], computed[point].value, band[point]) for point in (start, end)]
            plot.band([(x, y - u) for x, y, u in ends], [(x, y + u) for x, y, u in ends])
            plot.curve([(x, y) for x, y, _ in ends])
    if limit is not None and is_near:
        plot.rule(limit)
    for point, of_point in read.items():
        for value in of_point:
            plot.mark(profile.metres[point], value, Piece(READ_SIGN, "read"))
    return [*_with_volts(plot), *_under(plot, profile, (*computed, *read), width), _legend(limit, is_near=is_near)]


def _with_volts(plot: Plot) -> list[Line]:
    low, high = plot.y_range
    digits = 4 if high - low > 0.5 else 5
    lines: list[Line] = []
    for number, row in enumerate(plot.rows()):
        volts = high - (high - low) * (number + 0.5) / plot.height
        is_named = number in (0, plot.height - 1) or (plot.height > 5 and number == plot.height // 2)
        label = fit(show(volts, "V", digits=digits) + " ", _AXIS, "right") if is_named else " " * _AXIS
        lines.append((Piece(label, "quiet"), Piece("┤" if is_named else "│", "quiet"), *row))
    return lines


def _under(plot: Plot, profile: Profile, points: tuple[str, ...], width: int) -> list[Line]:
    """Names and metres of the points, each beneath its place; one that does not fit is left out."""
    row = ""
    for point in sorted(set(points) - {"bus"}, key=lambda point: profile.metres[point]):
        name = f"{clean(point)} {show(profile.metres[point], 'm')}" if point != "way" else "way"
        name = fit(name, min(cell_len(name), 20))
        start = _AXIS + 1 + plot.column(profile.metres[point]) - cell_len(name) // 2
        start = min(max(start, _AXIS), width - cell_len(name))
        if not row or start > cell_len(row):
            row += " " * (start - cell_len(row)) + name
    return [(Piece(row, "quiet"),)]


def _legend(limit: float | None, *, is_near: bool) -> Line:
    said = [
        piece(" " * (_AXIS + 1)),
        Piece(f"{READ_SIGN} read", "quiet"),
        Piece("   ⠒⠒ computed, ░ its doubt (2 u)", "quiet"),
    ]
    if limit is not None:
        words = (
            f"   ╌ the load's lowest, {show(limit, 'V')}" if is_near else f"   the load's lowest is {show(limit, 'V')}"
        )
        said.append(Piece(words, "quiet"))
    return tuple(said)
