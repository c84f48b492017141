"""What feeds what: feeds that are not there, that can be read two ways, and loops."""

from __future__ import annotations

from collections.abc import Iterator
from typing import TypeAlias

from rules.index import Index
from rules.problems.problem import Problem
from rules.record import Board, Circuit, Feed, Source, columns
from rules.references import Tags, feed_text, feeds_text, read_feeds, tags_of
from rules.text import Suggestions, either, quoted

Fed: TypeAlias = Source | Board | Circuit

_FEED_FIELDS = {"sources": "fed_from", "boards": "fed_by", "circuits": "fed_from"}


def feeder_problems(index: Index, suggestions: Suggestions) -> Iterator[Problem]:
    """Everything that is wrong with what sources, boards and circuits are fed by."""
    tags = tags_of(index.site)
    for table, field in _FEED_FIELDS.items():
        column = dict(columns(table))[field]
        for row in index.site.table(table):
            feeds = _feeds(row)  # type: ignore[arg-type]
            wrong = [complaint for feed in feeds if (complaint := _named(feed, column.tables, index, suggestions))]
            if not wrong and feeds:
                wrong = _ambiguous(feeds, column.tables, index, tags)
            for what, accepted in wrong:
                yield Problem(table, row.id, column.name, what, accepted, (*column.tables, "runs"))
    yield from _in_parallel(index)
    yield from _not_a_converter(index)
    yield from _loops(index)


def _feeds(row: Fed) -> tuple[Feed, ...]:
    if isinstance(row, Board):
        return row.fed_by
    return () if row.fed_from is None else (row.fed_from,)


def _named(feed: Feed, tables: tuple[str, ...], index: Index, suggestions: Suggestions) -> tuple[str, str] | None:
    """What is wrong with one feed by itself."""
    words = either([table.removesuffix("s") for table in tables])
    row = index.named(feed)
    if row is None or feed.table not in tables:
        tag = feed_text(feed, index)
        near = suggestions.ask(tag, _tags(index, tables)) or suggestions.ask(
            tag.rpartition(":")[0], _tags(index, tables)
        )
        return f"{quoted(tag)} names no {words}", f"the tag of a {words} that is there{near}"
    if not feed.point:
        return None
    if feed.table != "circuits":
        return f"{quoted(feed_text(feed, index))} names a point of a {feed.table.removesuffix('s')}", "its tag alone"
    points = index.points_of(feed.id)
    if feed.point in points:
        return None
    return f"circuit {quoted(row.tag)} has no point {quoted(feed.point)}", either(points)


def _tags(index: Index, tables: tuple[str, ...]) -> Iterator[str]:
    return (row.tag for table in tables for row in index.site.table(table))  # type: ignore[attr-defined]


def _ambiguous(feeds: tuple[Feed, ...], tables: tuple[str, ...], index: Index, tags: Tags) -> list[tuple[str, str]]:
    """A reference that, written down, could be read as another one: two tables have its tag."""
    text = feeds_text(feeds, index)
    # One tag of a board and a source is told once, at the board.
    twice = "circuits" in tables and any(not feed.point and _has_two_rows(feed, tables, index, tags) for feed in feeds)
    if not twice and read_feeds(text, tables, tags) == feeds:
        return []
    return [(f"{quoted(text)} can be read two ways", "tags that can be told apart: rename one of the two")]


def _has_two_rows(feed: Feed, tables: tuple[str, ...], index: Index, tags: Tags) -> bool:
    tag = feed_text(feed, index)
    return sum(tags.find((table,), tag) is not None for table in tables) > 1


def _in_parallel(index: Index) -> Iterator[Problem]:
    for board in index.site.boards:
        if len(set(board.fed_by)) < len(board.fed_by):
            what, accepted = "names the same feed twice", "each source once"
        elif len(board.fed_by) > 1 and any(feed.table == "circuits" for feed in board.fed_by):
            what = "names a circuit beside other feeds"
            accepted = "sources alone in parallel; a second feeder is a run whose `to` is board:TAG"
        else:
            continue
        what = f"{quoted(feeds_text(board.fed_by, index))} {what}"
        yield Problem("boards", board.id, "fed_by", what, accepted, ("sources", "circuits"))


def _not_a_converter(index: Index) -> Iterator[Problem]:
    for source in index.site.sources:
        if source.fed_from is not None and source.kind != "converter":
            what = f"a {source.kind or 'source'} is not fed from a circuit"
            yield Problem("sources", source.id, "fed_from", what, "an empty cell, or the kind converter")


def _loops(index: Index) -> Iterator[Problem]:
    """
    Feeders that lead back to where they began, each loop once, at its first source or board.

    Follows the feeds upwards without recursion, since a record may hold a chain of any length; every row is
    entered once.
    """
    done: set[tuple[str, str]] = set()
    starts: tuple[Fed, ...] = (*index.site.sources, *index.site.boards)
    for start in starts:
        way: list[Fed] = []
        on_way: dict[tuple[str, str], int] = {}
        branches: list[Iterator[Fed]] = [iter([start])]
        while branches:
            row = next(branches[-1], None)
            if row is None:
                branches.pop()
                if way:
                    on_way.pop(_key(way[-1]))
                    done.add(_key(way.pop()))
                continue
            key = _key(row)
            if key in on_way:
                yield _loop_problem(way[on_way[key] :])
            elif key not in done:
                on_way[key] = len(way)
                way.append(row)
                branches.append(feeding(row, index))


def _key(row: Fed) -> tuple[str, str]:
    return type(row).__name__, row.id


def feeding(row: Fed, index: Index) -> Iterator[Fed]:
    """What feeds a row, as far as it is there; a circuit that another circuit feeds is told by itself."""
    for feed in _feeds(row):
        above = index.named(feed)
        if above is not None and not (isinstance(row, Circuit) and isinstance(above, Circuit)):
            yield above


def _loop_problem(loop: list[Fed]) -> Problem:
    at = next(place for place, row in enumerate(loop) if not isinstance(row, Circuit))
    row, *others = loop[at:] + loop[:at]
    table, column = ("boards", "fed_by") if isinstance(row, Board) else ("sources", "fed_from")
    by_way_of = ", ".join(quoted(other.tag) for other in others)
    what = f"{quoted(row.tag)} is fed by itself, through {by_way_of}"
    return Problem(table, row.id, column, what, "feeders that lead back to a source that no circuit feeds")
