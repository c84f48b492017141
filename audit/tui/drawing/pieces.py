"""
Lines of a screen as plain data: pieces of text, each with a role that the widgets turn into a style.

Drawing functions return these, so that what a screen says can be tested without one. Every piece is cleaned:
text from the site may hold control codes when it comes from elsewhere.
"""

from __future__ import annotations

import textwrap
from collections.abc import Iterable
from dataclasses import dataclass
from typing import TypeAlias

from rich.cells import cell_len, set_cell_size

from rules.text import clean

ROLES = (
    "quiet",
    "strong",
    "title",
    "loud",
    "read",
    "bar",
    "computed",
    "limit",
    "band",
    "sound",
    "watch",
    "act",
    "measure",
    "incomplete",
    "trail",
    "cursor",
    "caution",
    "typed",
    "wrong",
)
"""What a piece is, apart from plain text; a status is a role of its own name."""


@dataclass(frozen=True, slots=True)
class Piece:
    """Some text of one role."""

    text: str
    role: str = ""


Line: TypeAlias = tuple[Piece, ...]


def piece(text: str, role: str = "") -> Piece:
    """A piece whose text is fit to be shown."""
    return Piece(clean(text), role)


def line(*parts: str | Piece) -> Line:
    """
    A line of pieces; bare text is plain.

    >>> line("a\\x1b", Piece("b", "strong"))
    (Piece(text='a\\ufffd', role=''), Piece(text='b', role='strong'))
    """
    return tuple(part if isinstance(part, Piece) else piece(part) for part in parts)


def width_of(line: Line) -> int:
    """How many cells of the terminal a line takes; some letters take two."""
    return sum(cell_len(part.text) for part in line)


def text_of(line: Line) -> str:
    """The bare text of a line."""
    return "".join(part.text for part in line)


def fit(text: str, width: int, align: str = "left") -> str:
    """
    The text in exactly ``width`` cells, cut with ``…`` or filled with blanks.

    >>> fit("Mast heater", 6), fit("ab", 4, "right"), fit("東京駅前", 5)
    ('Mast …', '  ab', '東京…')
    """
    text = clean(text)
    if width <= 0:
        return ""
    length = cell_len(text)
    if length > width:
        return _cut(text, width)
    blank = " " * (width - length)
    return blank + text if align == "right" else text + blank


def _cut(text: str, width: int) -> str:
    # set_cell_size leaves a blank in place of half a wide letter
    kept = set_cell_size(text, width - 1)
    return kept + "…"


def cut(line: Line, width: int) -> Line:
    """A line that is no wider than ``width``; what is cut off leaves ``…``."""
    if width_of(line) <= width:
        return line
    kept: list[Piece] = []
    left = width
    for part in line:
        length = cell_len(part.text)
        if length < left or (length == left and part is line[-1]):
            kept.append(part)
            left -= length
            continue
        if left > 0:
            kept.append(Piece(fit(part.text + " ", left) if length == left else fit(part.text, left), part.role))
        break
    return tuple(kept)


def apart(left: Line, right: Line, width: int) -> Line:
    """Two lines at the two ends of one; the left one gives way."""
    space = width - width_of(right)
    left = cut(left, max(0, space - 1))
    return (*left, Piece(" " * max(1, space - width_of(left))), *right)


def wrapped(text: str, width: int, indent: int = 0, role: str = "", first: str = "") -> list[Line]:
    """
    Running text in lines of ``width`` cells, indented; newlines in it are kept.

    ``first`` stands in the indent of the first line: a label.
    """
    room = max(10, width - indent)
    out: list[Line] = []
    for paragraph in clean(text, lines=True).replace("\t", " ").split("\n"):
        for words in _broken(paragraph, room):
            lead = fit(first, indent) if not out and first else " " * indent
            out.append((Piece(lead, "quiet"), Piece(words, role)))
    return out


def _broken(paragraph: str, room: int) -> Iterable[str]:
    if cell_len(paragraph) == len(paragraph):
        return textwrap.wrap(paragraph, room) or [""]
    return _broken_wide(paragraph, room)


def _broken_wide(paragraph: str, room: int) -> list[str]:
    """As ``textwrap.wrap``, where letters may take two cells."""
    lines: list[str] = []
    for word in paragraph.split():
        while cell_len(word) > room:
            head = next(n for n in range(len(word), 0, -1) if cell_len(word[:n]) <= room)
            lines.append(word[:head])
            word = word[head:]
        joined = f"{lines[-1]} {word}" if lines else word
        if lines and cell_len(joined) <= room:
            lines[-1] = joined
        else:
            lines.append(word)
    return lines or [""]
