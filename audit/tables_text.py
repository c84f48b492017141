"""The text of ``ohmwalk tables``: plain in a pipe, within 80 columns, in the encoding of the output."""

from __future__ import annotations

import sys
from typing import TextIO

from audit.errors import WrongUse
from audit.limit_words import limit_words
from audit.report.text import Page, console_for
from rules import limits
from rules.limits import Limits
from rules.record import Site
from rules.tables.loader import Cell, Group, groups
from rules.text import nearest

DIGITS = 7
"""Significant digits of a figure: more than any print has, fewer than would pass for knowledge."""
GAP = 2
"""Blanks between two columns."""


def print_tables(stream: TextIO | None = None) -> None:
    """One entry a group: its name, what it holds, and where that comes from; then the limits profiles."""
    page = _page(stream)
    widest = max(len(group.name) for group in groups())
    for group in groups():
        page.hang(f"{group.name.ljust(widest)}  ", group.title, "bold")
        page.line(_origin(group), indent=widest + GAP)
    page.line()
    page.line("Limits profiles")
    widest = max(map(len, limits.names()))
    for name in limits.names():
        this = limits.of(Site(name="", limits=name))
        inherits = f", from {this.inherited[0]}" if this.inherited else ""
        page.hang(f"{name.ljust(widest)}  ", f"{this.title}{inherits}")
    page.line()
    page.line("ohmwalk tables NAME prints the values of one table or profile.")


def print_table(name: str, stream: TextIO | None = None) -> None:
    """
    All values of one group, or of one limits profile.

    Raises
    ------
    WrongUse
        If there is neither of that name.
    """
    if name in limits.names():
        _print_profile(limits.of(Site(name="", limits=name)), _page(stream))
        return
    known = {group.name: group for group in groups()}
    if name not in known:
        every = [*known, *limits.names()]
        close = nearest(name, every)
        meant = f"; did you mean {close!r}?" if close else ""
        raise WrongUse(f"no table {name!r}{meant}; there are: {', '.join(every)}")
    group = known[name]
    page = _page(stream)
    page.line(group.title, "bold")
    page.pairs(
        (("source", group.source), ("edition", group.edition), ("status", group.status), ("unit", group.unit)), 0
    )
    page.line()
    for number, row in enumerate(_grid(group)):
        page.line(row, "bold" if number == 0 else "")
    if group.note:
        page.line()
        page.line(group.note)


def _print_profile(profile: Limits, page: Page) -> None:
    """Every value of a profile, with where it comes from and the profile that states it."""
    page.line(profile.title, "bold")
    page.line(f"limits profile {profile.name}" + "".join(f", from {name}" for name in profile.inherited))
    for group in profile.groups.values():
        page.line()
        page.line(group.title, "bold")
        for stated, keys in group.by_source().items():
            page.hang(f"{group.name}  ", "; ".join(limit_words(group, key) for key in keys))
            page.line(str(stated) + ("; status verified" if stated.status == "verified" else ""), indent=GAP)


def _page(stream: TextIO | None) -> Page:
    out = sys.stdout if stream is None else stream
    return Page(console_for(out), getattr(out, "encoding", None) or "utf-8")


def _origin(group: Group) -> str:
    edition = f"edition {group.edition}" if group.edition[:1].isdigit() else group.edition
    return f"{group.source} · {edition} · {group.status}"


def _grid(group: Group) -> list[str]:
    """Header and rows as aligned lines: texts to the left, numbers to the right."""
    shown = [list(group.columns), *([_shown(cell) for cell in row] for row in group.rows)]
    widths = [max(len(texts[place]) for texts in shown) for place in range(len(group.columns))]
    left = [any(isinstance(row[place], str) for row in group.rows) for place in range(len(group.columns))]
    lines = []
    for texts in shown:
        cells = zip(texts, widths, left, strict=True)
        lines.append(
            (" " * GAP).join(text.ljust(width) if to_left else text.rjust(width) for text, width, to_left in cells)
        )
    return lines


def _shown(cell: Cell) -> str:
    """A value as people read it; a gap in the source as a dash."""
    if cell is None:
        return "–"
    return cell if isinstance(cell, str) else f"{cell:.{DIGITS}g}"
