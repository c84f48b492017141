"""
The sketch of a circuit: current runs from left to right, what was read stands above the line at the point
where it was read, what was computed beneath it.

    read        53.475            52.703 V
              ●──┤gG 100 A├──●━━━ 41.5 m · 120 mm² ━━━●
             bus            way                      lugs
    computed                        52.866 ± 0.018 V
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass

from rich.cells import cell_len

from audit.report.blocks import Path
from audit.tui.drawing.pieces import Line, Piece, fit, piece
from rules.text import clean

_LABEL = 10
"""Cells of the words at the left, ``read`` and ``computed``."""
_LONGEST_NAME = 24
NODE, BRANCH, CABLE, THIN, BAD = "●", "├", "━", "─", "╳"


@dataclass(frozen=True, slots=True)
class Bad:
    """Something wrong with a run: a sign on the line, and words beneath it."""

    words: str
    at_start: bool = False
    """At the end of the run that current comes from; else at, or anywhere before, the other."""


@dataclass(frozen=True, slots=True)
class _Stretch:
    """What lies between two nodes of a row."""

    start: int
    end: int
    """Columns of its nodes."""
    words: str
    is_device: bool
    bad: Bad | None

    @property
    def bad_column(self) -> int:
        """Where the sign of what is wrong stands."""
        return self.start + 2 if self.bad is not None and self.bad.at_start else self.end - 2


@dataclass(frozen=True, slots=True)
class _Row:
    """One row of a path: its nodes with their columns, and the stretches between them."""

    nodes: tuple[tuple[int, str], ...]
    """Column and name."""
    stretches: tuple[_Stretch, ...]
    is_continued: bool


def sketch_lines(
    paths: Sequence[Path],
    read: Mapping[str, str],
    computed: Mapping[str, str],
    width: int,
    bad: Mapping[str, Bad] | None = None,
) -> list[Line]:
    """
    The paths of a circuit, one beneath the other.

    Parameters
    ----------
    paths : sequence of Path
        From ``audit.report.line.line_of``.
    read, computed : mapping
        What stands above and beneath each point, by its name.
    width : int
        Cells of a line; a path too long goes on in a further row.
    bad : mapping
        What is wrong with stretches, by the point where each ends.
    """
    out: list[Line] = []
    for number, path in enumerate(paths):
        for row in _rows(path, read, computed, width - 1, bad or {}):
            if out:
                out.append(())
            is_branch = number > 0 and not row.is_continued
            shown = {name for _, name in (row.nodes[1:] if row.is_continued or is_branch else row.nodes)}
            out += _row_lines(row, read, computed, shown, bad or {}, is_branch=is_branch)
    return out


def _rows(
    path: Path, read: Mapping[str, str], computed: Mapping[str, str], width: int, bad: Mapping[str, Bad]
) -> Iterable[_Row]:
    """The path cut where it would leave the screen, each row spread over it."""
    names = [stop.point for stop in path.stops]
    half = [
        (max(cell_len(_name(name)), *(cell_len(of.get(name, "")) for of in (read, computed))) + 1) // 2
        for name in names
    ]
    lengths = [
        max(cell_len(clean(words)) + (8 if path.through_device and n == 0 else 6), half[n] + half[n + 1] + 2)
        for n, words in enumerate(path.stretches)
    ]
    first = 0
    while first < len(lengths):
        start = _LABEL + max(2, half[first])
        last = first + 1
        while last < len(lengths) and start + sum(lengths[first : last + 1]) + half[last + 1] <= width:
            last += 1
        spread = _spread(lengths[first:last], width - start - half[last], is_device=path.through_device and first == 0)
        nodes, stretches, column = [(start, names[first])], list[_Stretch](), start
        for n, length in enumerate(spread, first):
            end = column + length
            is_device = path.through_device and n == 0
            stretches.append(_Stretch(column, end, path.stretches[n], is_device, bad.get(names[n + 1])))
            nodes.append((end, names[n + 1]))
            column = end
        yield _Row(tuple(nodes), tuple(stretches), first > 0)
        first = last


def _spread(lengths: Sequence[int], room: int, *, is_device: bool) -> list[int]:
    """Lengths of a row's stretches that fill it: cables grow, the device does not; one too long is cut."""
    cables = len(lengths) - is_device
    over = max(0, room - sum(lengths))
    if not cables:
        return [min(lengths[0], max(8, room))]
    grown = [length + (0 if is_device and n == 0 else over // cables) for n, length in enumerate(lengths)]
    grown[-1] += over % cables
    return grown if len(grown) > 1 else [min(grown[0], max(8, room))]


def _row_lines(
    row: _Row,
    read: Mapping[str, str],
    computed: Mapping[str, str],
    shown: set[str],
    bad: Mapping[str, Bad],
    *,
    is_branch: bool,
) -> list[Line]:
    above = _placed([(column, read[name]) for column, name in row.nodes if name in shown and name in read])
    names = _placed([(column, _name(name)) for column, name in row.nodes])
    below = _placed([(column, computed[name]) for column, name in row.nodes if name in shown and name in computed])
    words = _placed([(one.bad_column, one.bad.words) for one in row.stretches if one.bad is not None])
    lines: list[Line] = []
    if above.strip():
        lines.append(_labelled("read", above, "read"))
    lines.append(_conductor(row, is_branch=is_branch))
    lines.append((Piece(names, "quiet"),))
    if below.strip():
        lines.append(_labelled("computed", below, "computed"))
    if words.strip():
        lines.append((Piece(words, "act"),))
    return lines


def _labelled(label: str, text: str, role: str) -> Line:
    # A value near the left edge may reach into the label's cells.
    lead = fit(f" {label}", _LABEL)
    return (Piece(lead, "quiet"), Piece(text[_LABEL:], role)) if not text[:_LABEL].strip() else (Piece(text, role),)


def _conductor(row: _Row, *, is_branch: bool) -> Line:
    parts: list[Piece] = []
    first = row.nodes[0][0]
    lead = "┄" if row.is_continued else " "
    parts.append(Piece(" " * (first - 2) + lead * 2, "quiet"))
    parts.append(Piece(BRANCH if is_branch else NODE))
    for stretch in row.stretches:
        parts += _stretch(stretch)
        parts.append(Piece(NODE))
    return tuple(parts)


def _stretch(stretch: _Stretch) -> list[Piece]:
    room = stretch.end - stretch.start - 1
    text = fit(clean(stretch.words), min(cell_len(clean(stretch.words)), max(1, room - 4)))
    left = max(1, (room - cell_len(text) - 2) // 2)
    right = max(1, room - cell_len(text) - 2 - left)
    if stretch.is_device:
        return [Piece(THIN * left), Piece("┤"), piece(text), Piece("├"), Piece(THIN * right)]
    before, after = [Piece(CABLE * left)], [Piece(CABLE * right)]
    if stretch.bad is not None and stretch.bad.at_start and left > 2:
        before = [Piece(CABLE), Piece(BAD, "act"), Piece(CABLE * (left - 2))]
    elif stretch.bad is not None and right > 2:
        after = [Piece(CABLE * (right - 2)), Piece(BAD, "act"), Piece(CABLE)]
    return [*before, Piece(" "), piece(text), Piece(" "), *after]


def _placed(texts: Iterable[tuple[int, str]]) -> str:
    """Texts centred at columns, each moved right where it would run into the one before."""
    out = ""
    for column, text in texts:
        text = clean(text)
        start = max(column - cell_len(text) // 2, cell_len(out) + 1 if out else 0)
        out += " " * (start - cell_len(out)) + text
    return out


def _name(name: str) -> str:
    name = clean(name)
    return name if cell_len(name) <= _LONGEST_NAME else fit(name, _LONGEST_NAME)
