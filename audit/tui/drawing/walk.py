"""
The walk: locations and boards as headings, circuits in walking order, one line each.

A trail runs down the left edge. It is solid beside what was read on the visit at hand and broken beside what
was not, so that what is left to do shows from across the room; at each board it passes a stop, filled once
every circuit of the board is read.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from rich.cells import cell_len

from audit.report.bar import text_bar
from audit.report.phrases import drop_words, status_words
from audit.report.records import board_title
from audit.tui.drawing.pieces import Line, Piece, apart, cut, fit, line, piece, width_of
from audit.tui.state import Survey
from rules.assessment import CircuitResult, Status
from rules.index import Index
from rules.record import Board, Circuit, Feed, Source

READ, NOT_READ = "┃", "╎"
ALL_READ, SOME_READ, NONE_READ = "●", "◐", "○"
CHOSEN = "▸"

_BAR_CELLS = 13
_EDGES = 2
"""Of a bar."""
_LEAST_BAR_CELLS = 6
"""A shorter bar says nothing."""
_LEFT_OF_TAG, _BESIDE_TAG = 5, 3
"""Cells of the trail and the cursor, and those that part the tag from the status."""
_PERCENT_CELLS = 13
_STATUS_CELLS = 12
_LONGEST_TAG = 16
_LEAST_NAME = 8
"""Of the site's name in the head."""


@dataclass(frozen=True, slots=True)
class Stop:
    """One line of the walk."""

    kind: Literal["gap", "place", "board", "circuit"]
    id: str = ""
    """Of a circuit, board or source."""
    words: str = ""
    """A heading's text."""

    @property
    def is_choosable(self) -> bool:
        return self.kind in ("board", "circuit")


def walk_stops(index: Index) -> tuple[Stop, ...]:
    """Every line of a site's walk; time grows in proportion to its circuits."""
    stops: list[Stop] = []
    here: str | None = None

    def visit(feeder: Source | Board, table: str) -> None:
        nonlocal here
        location = feeder.location if isinstance(feeder, Board) else ""
        if location != here:
            stops.extend([Stop("gap")] if stops else [])
            stops.extend([Stop("place", words=location)] if location else [])
            here = location
        stops.append(Stop("board", feeder.id, board_title(index, Feed(table, feeder.id))))
        stops.extend(Stop("circuit", circuit.id) for circuit in index.circuits_of(feeder.id))

    feeding = {feed.id for board in index.walked_boards for feed in board.fed_by}
    for source in index.walked_sources:
        if index.circuits_of(source.id) or source.id not in feeding:
            visit(source, "sources")
    for board in index.walked_boards:
        visit(board, "boards")
    known = {stop.id for stop in stops}
    stray = [circuit for circuit in index.walked_circuits if circuit.id not in known]
    if stray:
        stops += [Stop("gap")] if stops else []
        stops.append(Stop("place", words="fed from nothing in the record"))
        stops += [Stop("circuit", circuit.id) for circuit in stray]
    return tuple(stops)


def tag_cells(index: Index) -> int:
    """Width of the column of tags."""
    return min(_LONGEST_TAG, max((len(row.tag) for row in index.circuits.values()), default=4))


def stop_line(stop: Stop, survey: Survey, width: int, tags: int, *, chosen: bool) -> Line:
    """
    A stop of the walk in one line.

    Parameters
    ----------
    width : int
        Cells of the line; below 70 it goes without percentages.
    tags : int
        Cells of the column of tags.
    chosen : bool
        The cursor stands on it.
    """
    mark = CHOSEN if chosen else " "
    if stop.kind == "gap":
        return ()
    if stop.kind == "place":
        return cut((piece(" "), piece(stop.words, "strong")), width)
    if stop.kind == "board":
        sign = Piece(f" {_board_sign(stop, survey)} ", "trail")
        return cut((sign, Piece(f"{mark} ", "cursor"), piece(stop.words, "title" if chosen else "quiet")), width)
    circuit = survey.index.circuits[stop.id]
    trail = Piece(f" {READ if circuit.id in survey.read_now else NOT_READ} ", "trail")
    # where there is little room, the bar gives way first, then the tag: the word of the status stays
    tags = max(1, min(tags, width - _LEFT_OF_TAG - _BESIDE_TAG - _STATUS_CELLS))
    head = (trail, Piece(f"{mark} ", "cursor"), piece(fit(circuit.tag, tags), "strong"), piece("  "))
    bar_cells = min(_BAR_CELLS, width - width_of(head) - _STATUS_CELLS - 2)
    tail = _tail(survey.results.get(circuit.id), bar_cells, with_percent=width >= 70)
    used = width_of((*head, *tail))
    return cut((*head, piece(fit(circuit.description, max(0, width - used))), *tail), width)


def reason_line(stop: Stop, survey: Survey, width: int) -> Line:
    """The line beneath the chosen circuit: why it has its status."""
    indent = piece(" " * 7)
    result = survey.results.get(stop.id)
    if stop.kind != "circuit" or result is None:
        return ()
    return cut((indent, piece(reason(result))), width)


def reason(result: CircuitResult) -> str:
    """Why a circuit has its status: the likeliest cause where one is claimed, and the sentence of its status."""
    leading = max(result.causes, key=lambda place: place.probability, default=None)
    if leading is None or leading.cause == "as recorded":
        return result.why
    from rules.verdict import cause_words  # who judged has it loaded; the first screen does not wait for it

    return f"{cause_words(leading)} · {result.why}"


def head_line(survey: Survey, width: int, *, read_only: bool) -> Line:
    """What site and visit are at hand, and how the walk stands."""
    circuits = survey.index.circuits
    read = len(survey.read_now & circuits.keys())
    said = [piece(f"{read} of {len(circuits)} read")] if circuits and not survey.is_outline else []
    for status in (Status.ACT, Status.WATCH):
        count = survey.count_of(status)
        said += [piece("   "), piece(f"{count} {status}", str(status))] if count else []
    if survey.cannot_judge:
        said += [piece("   "), piece("not judged", "wrong")]
    elif survey.assessment is None and circuits:
        said += [piece("   "), piece("reading …" if survey.is_outline else "judging …", "quiet")]
    visit = [piece("   "), piece(survey.visit or ("" if survey.is_outline else "not visited yet"), "quiet")]
    if read_only:
        visit += [piece("   "), piece("read only", "act")]
    # the site's name gives way: the visit says what was counted
    room = width - width_of((*said, *visit)) - 3  # for the edges and what parts them
    name = survey.site.name if cell_len(survey.site.name) <= room else fit(survey.site.name, max(_LEAST_NAME, room))
    return apart((piece(" "), piece(name, "strong"), *visit), (*said, piece(" ")), width)


def cannot_judge_lines(survey: Survey, width: int) -> list[Line]:
    """Why nothing is judged, in one line; nothing where it is."""
    return [cut((piece(f" {survey.cannot_judge}", "wrong"),), width)] if survey.cannot_judge else []


def _board_sign(stop: Stop, survey: Survey) -> str:
    circuits: tuple[Circuit, ...] = survey.index.circuits_of(stop.id)
    read = sum(circuit.id in survey.read_now for circuit in circuits)
    return NONE_READ if not read else ALL_READ if read == len(circuits) else SOME_READ


def _tail(result: CircuitResult | None, bar_cells: int, *, with_percent: bool) -> Line:
    has_bar = bar_cells >= _LEAST_BAR_CELLS
    if result is None:
        blank = (bar_cells + 1 if has_bar else 0) + (_PERCENT_CELLS + 2 if with_percent else 0)
        return line(" " * (blank + 1), Piece(fit("…", _STATUS_CELLS), "quiet"))
    words = drop_words(result)
    status = Piece(fit(status_words(result.status), _STATUS_CELLS), str(result.status))
    if not has_bar:
        return (piece(" "), status)
    is_past = words.bar is not None and words.bar.past
    bar = Piece(text_bar(words.bar, bar_cells - _EDGES), "act" if is_past else "bar")
    percent = (piece("  "), piece(fit(words.of_allowed, _PERCENT_CELLS))) if with_percent else ()
    return (piece(" "), bar, *percent, piece(" "), status)
