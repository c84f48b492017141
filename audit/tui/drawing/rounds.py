"""The rounds of a circuit with their readings, the latest visit first; replaced readings stay and say so."""

from __future__ import annotations

from rich.cells import cell_len

from audit.report.phrases import reading_words, time_words
from audit.report.records import READING_DIGITS, joined, quantity
from audit.tui.drawing.pieces import Line, Piece, cut, fit, piece
from rules.index import Index
from rules.record import Reading

_WORDS = 38
_VALUE = 14


def round_lines(index: Index, circuit_id: str, width: int) -> list[Line]:
    """Every reading of a circuit under its visit and round."""
    readings = index.readings_of(circuit_id)
    successors = {reading.replaces_id: reading for reading in readings if reading.replaces_id}
    states: dict[tuple[str, str], list[Reading]] = {}
    for reading in readings:
        states.setdefault((reading.visit_or_default, reading.round), []).append(reading)
    visits = {visit: n for n, visit in enumerate(dict.fromkeys(visit for visit, _ in states))}
    ordered = sorted(states, key=lambda state: -visits[state[0]])
    cells = max((cell_len(reading_words(reading)) for reading in readings), default=0)
    lines: list[Line] = []
    for visit, name in ordered:
        of_round = states[visit, name]
        day, by = (_alike(texts) for texts in ([_day(r) for r in of_round], [r.by for r in of_round]))
        about = joined(visit, day if day not in visit else "", f"by {by}" if by else "")
        lines.append(cut((piece(f"   round {name}", "strong"), piece(f"  {about}", "quiet")), width))
        lines += [
            reading_line(reading, successors, width, min(cells, _WORDS), day, by)
            for reading in _with_successors(states, visit, name)
        ]
    return lines


def reading_line(
    reading: Reading, successors: dict[str, Reading], width: int, cells: int = _WORDS, day: str = "", by: str = ""
) -> Line:
    """
    A reading with its value, meter, surveyor and time, and what became of it.

    ``day`` and ``by`` stand in the heading already.
    """
    successor = successors.get(reading.id)
    value = quantity(reading, "value", reading.value, reading.unit, READING_DIGITS)
    remarks = joined(
        time_words(reading.taken_at).removeprefix(day).strip(),
        reading.instrument or "no meter recorded",
        reading.by if reading.by != by else "",
        "loads off" if reading.is_unloaded else "",
        f"replaces an earlier one: {reading.reason}" if reading.replaces_id else "",
        reading.notes,
    )
    head = f"     {fit(reading_words(reading), cells)} "
    if successor is not None:
        said = f"  replaced, not judged: {successor.reason or 'no reason given'} · {remarks}"
        return cut((piece(head, "quiet"), piece(fit(value, _VALUE, "right"), "quiet"), piece(said, "quiet")), width)
    return cut((piece(head), Piece(_value(value), "read"), piece(f"  {remarks}", "quiet")), width)


def _alike(texts: list[str]) -> str:
    """The text that all are, or an empty one."""
    return texts[0] if len(set(texts)) == 1 else ""


def _day(reading: Reading) -> str:
    return time_words(reading.taken_at)[:10]


def _value(value: str) -> str:
    return fit(value, max(_VALUE, cell_len(value)), "right")


def _with_successors(states: dict[tuple[str, str], list[Reading]], visit: str, name: str) -> list[Reading]:
    """The readings of a round, each correction right beneath what it replaces."""
    of_round = states[visit, name]
    ids = {reading.id for reading in of_round}
    following: dict[str, list[Reading]] = {}
    for reading in of_round:
        following.setdefault(reading.replaces_id if reading.replaces_id in ids else "", []).append(reading)
    out: list[Reading] = []
    left = list(following.get("", ()))
    while left:
        reading = left.pop(0)
        if reading not in out:  # a damaged file may hold a circle
            out.append(reading)
            left[:0] = following.get(reading.id, ())
    return out + [reading for reading in of_round if reading not in out]
