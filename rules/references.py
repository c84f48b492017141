"""
How references stand in the site folder: ``RECT-1 + BATT-A``, ``B1-07:p2``, ``board:B2``.

A text that is itself a tag is that tag; only otherwise is it split, at `` + `` with spaces and at its last
``:``. A text that two tables have as a tag is the first of the column's tables; ``rules.consistency``
reports it, because the reference could mean either.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass

from rules.index import Index
from rules.record import Feed, Row, Site, missing

TO_BOARD = "board:"
"""What a run's ``to`` begins with where it ends on a board."""
IN_PARALLEL = " + "
"""What stands between several sources in parallel."""


@dataclass(frozen=True, slots=True)
class Tags:
    """Which row each tag names, by table; of two rows with one tag, the first."""

    ids: Mapping[str, Mapping[str, str]]

    def find(self, tables: Iterable[str], tag: str) -> Feed | None:
        """The row of one of the tables that has this tag."""
        for table in tables:
            if (id_ := self.ids.get(table, {}).get(tag)) is not None:
                return Feed(table, id_)
        return None


def tags_of(site: Site) -> Tags:
    """The tags of everything that a reference may name."""
    return Tags({table: _first_ids(site.table(table)) for table in ("sources", "boards", "circuits")})


def read_feed(text: str, tables: tuple[str, ...], tags: Tags) -> Feed:
    """
    One reference.

    Parameters
    ----------
    text : str
        A tag, or CIRCUIT:POINT where ``tables`` has ``circuits``.
    tables : tuple of str
        What the column may name.
    tags : Tags
        What there is.

    Returns
    -------
    Feed
        With an empty table and the id ``?TEXT`` where the text names nothing.

    Examples
    --------
    >>> tags = Tags({"circuits": {"B1-07": "a1"}})
    >>> read_feed("B1-07:p2", ("circuits",), tags)
    Feed(table='circuits', id='a1', point='p2')
    >>> read_feed("B1-70", ("circuits",), tags)
    Feed(table='', id='?B1-70', point='')
    """
    return _known_feed(text, tables, tags) or Feed("", missing(text))


def read_feeds(text: str, tables: tuple[str, ...], tags: Tags) -> tuple[Feed, ...]:
    """References to what feeds a board, several in parallel with `` + `` between them."""
    whole = _known_feed(text, tables, tags)
    if whole is not None:
        return (whole,)
    return tuple(read_feed(part.strip(), tables, tags) for part in text.split(IN_PARALLEL))


def read_end(text: str, tags: Tags) -> tuple[str, str]:
    """The point on which a run ends, and the id of the board on which it ends: one of the two is empty."""
    if not text.startswith(TO_BOARD):
        return text, ""
    tag = text.removeprefix(TO_BOARD).strip()
    board = tags.find(("boards",), tag)
    return "", missing(tag) if board is None else board.id


def feed_text(feed: Feed, index: Index) -> str:
    """A reference as it is written in the site folder."""
    row = index.named(feed)
    tag = feed.id.removeprefix("?") if row is None else row.tag
    return f"{tag}:{feed.point}" if feed.point else tag


def feeds_text(feeds: Iterable[Feed], index: Index) -> str:
    """References to what feeds a board, as they are written in the site folder."""
    return IN_PARALLEL.join(feed_text(feed, index) for feed in feeds)


def _known_feed(text: str, tables: tuple[str, ...], tags: Tags) -> Feed | None:
    found = tags.find(tables, text)
    if found is not None or "circuits" not in tables:
        return found
    circuit, colon, point = text.rpartition(":")
    found = tags.find(("circuits",), circuit.rstrip())
    return None if found is None or not colon else Feed("circuits", found.id, point.strip())


def _first_ids(rows: Iterable[Row]) -> dict[str, str]:
    ids: dict[str, str] = {}
    for row in rows:
        tag: str = row.tag  # type: ignore[attr-defined]
        if tag:
            ids.setdefault(tag, row.id)
    return ids
