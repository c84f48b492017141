"""The cautions of a site's voltages, in lines."""

from __future__ import annotations

from collections.abc import Iterable

from audit.tui.drawing.pieces import Line, piece, wrapped
from rules.cautions import Caution
from rules.units import show


def caution_lines(cautions: Iterable[Caution], highest_v: float, visit: str, width: int) -> list[Line]:
    """What is to be read before the first live reading of a visit."""
    head: Line = (piece(" Before the first live reading", "strong"), piece(f"   {visit}", "quiet"))
    return [head, *bare_caution_lines(cautions, highest_v, width)]


def bare_caution_lines(cautions: Iterable[Caution], highest_v: float, width: int) -> list[Line]:
    """The highest voltage, then each caution with its source."""
    volts = f"The highest voltage in the record is {show(highest_v, 'V')} d.c." if highest_v else ""
    lines: list[Line] = [(piece(f" {volts or 'No voltage is recorded yet.'}", "act"),), ()]
    for caution in cautions:
        lines += [*wrapped(caution.text, width - 1, 3, "", " ! "), *_source(caution, width)]
    return lines


def _source(caution: Caution, width: int) -> list[Line]:
    return wrapped(str(caution.source), width - 1, 3, "quiet")
