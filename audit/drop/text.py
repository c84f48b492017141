"""The text of ``ohmwalk drop``: what follows, how each input was read, what would suffice; plain in a pipe."""

from __future__ import annotations

import sys
from collections.abc import Iterable
from typing import TextIO

from audit.drop.phrases import (
    Row,
    capacity_rows,
    caution_texts,
    read_rows,
    result_rows,
    sufficient_words,
    verdict_words,
)
from audit.drop.reading import Understood
from audit.report.text import Page, console_for
from rules.limits import Limits
from rules.one_run import Answer


def print_drop(
    understood: Understood, found: Answer, enough: Answer | None, limits: Limits, stream: TextIO | None = None
) -> None:
    """
    Print one computation.

    Parameters
    ----------
    found, enough : Answer
        For what was typed, and for what would suffice; ``None`` where nothing would.
    stream : TextIO, optional
        Standard output where none is given.
    """
    out = sys.stdout if stream is None else stream
    page = Page(console_for(out), getattr(out, "encoding", None) or "utf-8")
    page.line(verdict_words(found), "bold")
    _block(page, "Read as", read_rows(understood, found, limits))
    _block(page, "Computed", [*result_rows(found), *capacity_rows(found)])
    page.line()
    page.hang("Smallest sufficient  ", sufficient_words(enough, understood.asked.run), "bold")
    page.line()
    for caution in caution_texts(understood.asked.nominal_v):
        page.line(caution)
    page.line("± is the standard uncertainty u.")


def _block(page: Page, title: str, rows: Iterable[Row]) -> None:
    page.line()
    page.line(title, "bold")
    page.pairs(rows, indent=2)
