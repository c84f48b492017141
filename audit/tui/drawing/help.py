"""Help in lines."""

from __future__ import annotations

from collections.abc import Iterable

from audit.report.bar import BLOCKS, drop_bar, text_bar
from audit.report.phrases import STATUS_MEANING, status_words
from audit.tui.drawing.cautions import bare_caution_lines
from audit.tui.drawing.pieces import Line, fit, piece, wrapped
from audit.tui.drawing.walk import ALL_READ, NOT_READ, READ, SOME_READ
from rules.cautions import Caution

_KEY_CELLS = 16
_STATUS_CELLS = 16
_BAR = drop_bar(1.4, 0.25, 1.2, 3.0)
_PAST = drop_bar(8.1, 0.1, 3.9, 5.0)


def help_lines(
    keys: Iterable[tuple[str, str]], cautions: Iterable[Caution], highest_v: float, width: int
) -> list[Line]:
    """Keys, signs, then the cautions."""
    lines: list[Line] = [(piece(" The keys here", "strong"),)]
    for key, words in keys:
        lines += wrapped(words, width - 2, _KEY_CELLS, "", f"   {key}")
    lines += [(), (piece(" What a circuit's status means", "strong"),)]
    for status, meaning in STATUS_MEANING.items():
        lines += wrapped(meaning, width - 2, _STATUS_CELLS, "", f"   {status_words(status)}")
    lines += [(), (piece(" The bar and the trail", "strong"),)]
    for sign, words in (
        (
            text_bar(_BAR),
            f"solid: measured so far; {BLOCKS.soft}: its doubt; {BLOCKS.tick}: computed; right edge: allowed",
        ),
        (text_bar(_PAST), "past the allowed drop"),
        (f"{READ} {NOT_READ}", "something was read on the visit at hand, nothing was read"),
        (f"{ALL_READ} {SOME_READ}", "every circuit of the board was read, some were"),
    ):
        lines += wrapped(words, width - 2, _STATUS_CELLS + 3, "", f"   {fit(sign, 13)}")
    lines += [(), (piece(" Before any live reading", "strong"),)]
    return [*lines, *bare_caution_lines(cautions, highest_v, width)]
