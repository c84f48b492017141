"""
What a report is made of: sections of a few kinds of blocks, all plain text.

Content is built once for an audience (``audit.report.content``); each form (HTML, Markdown, JSON) only
draws the blocks, so that all of them say the same words and figures. No block holds markup: text from
the site is data, and ``cleaned`` has taken control codes out of it.
"""

from __future__ import annotations

from dataclasses import dataclass, fields, is_dataclass, replace
from typing import Any, Literal, TypeAlias, TypeVar

from audit.report.bar import Bar
from rules.assessment import Assessment, Severity
from rules.record import Site
from rules.text import clean

Tone: TypeAlias = Literal["plain", "caution", "small"]
T = TypeVar("T")


@dataclass(frozen=True, slots=True)
class Paragraph:
    """Running text; a newline in it is kept."""

    text: str
    tone: Tone = "plain"


@dataclass(frozen=True, slots=True)
class Bullets:
    """A list of sentences."""

    texts: tuple[str, ...]
    tone: Tone = "plain"


@dataclass(frozen=True, slots=True)
class Facts:
    """Pairs of a label and a text."""

    rows: tuple[tuple[str, str], ...]
    side_by_side: bool = False
    """Short pairs, two of which fit beside each other."""


@dataclass(frozen=True, slots=True)
class Column:
    """Heading of a table's column."""

    name: str
    align: Literal["left", "right"] = "left"
    share: int = 1
    """How wide it is, beside the others."""


Cell: TypeAlias = str | Bar


@dataclass(frozen=True, slots=True)
class Table:
    """Rows under headings; a row of one cell is a heading across the table."""

    columns: tuple[Column, ...]
    rows: tuple[tuple[Cell, ...], ...]
    caption: str = ""


@dataclass(frozen=True, slots=True)
class Stop:
    """A point on the circuit line."""

    point: str
    read: str = ""
    """What was read there in the round that is judged; stands above the line."""
    computed: str = ""
    """What was computed there; stands below it."""


@dataclass(frozen=True, slots=True)
class Path:
    """One way along a circuit: stops from left to right and what lies between neighbours."""

    stops: tuple[Stop, ...]
    stretches: tuple[str, ...]
    """Words for each stretch, one less than the stops."""
    through_device: bool = False
    """The first stretch is the protective device."""


@dataclass(frozen=True, slots=True)
class Line:
    """A circuit drawn in the sense of its current; further paths branch off at their first stop."""

    paths: tuple[Path, ...]


@dataclass(frozen=True, slots=True)
class FindingCard:
    """One finding: how soon someone has to act, what it is, then its facts."""

    id: str
    severity: Severity
    title: str
    rows: tuple[tuple[str, str], ...]


@dataclass(frozen=True, slots=True)
class Blanks:
    """Lines to sign on, one a label."""

    labels: tuple[str, ...]


Block: TypeAlias = Paragraph | Bullets | Facts | Table | Line | FindingCard | Blanks


@dataclass(frozen=True, slots=True)
class Section:
    """A heading and what stands under it."""

    title: str
    blocks: tuple[Block, ...]
    level: int = 1
    """1 a chapter, 2 a board, 3 a circuit."""
    new_page: bool = False
    """Starts on a new page in forms that have pages."""


@dataclass(frozen=True, slots=True)
class Content:
    """A whole report for one audience."""

    site: Site
    assessment: Assessment
    audience: str
    made_at: str | None
    title: str
    sections: tuple[Section, ...]


def cleaned(value: T) -> T:
    """
    The same blocks with every text fit to be shown; newlines are kept.

    >>> cleaned(Paragraph("a\\x1bb")).text
    'a\\ufffdb'
    """
    return _cleaned(value)  # type: ignore[no-any-return]


def _cleaned(value: Any) -> Any:
    if isinstance(value, Severity):
        return value
    if isinstance(value, str):
        return clean(value, lines=True)
    if isinstance(value, tuple):
        return tuple(_cleaned(item) for item in value)
    if is_dataclass(value) and not isinstance(value, type):
        return replace(value, **{field.name: _cleaned(getattr(value, field.name)) for field in fields(value)})
    return value
