"""Tags that name two rows."""

from __future__ import annotations

from collections.abc import Iterator
from operator import attrgetter

from rules.index import Index
from rules.problems.problem import Problem
from rules.record import KEY_FIELDS, Run, columns
from rules.text import quoted


def tag_problems(index: Index) -> Iterator[Problem]:
    """Second and later rows of one tag, and sources and boards of one tag."""
    for table in KEY_FIELDS:
        yield from _repeated(index, table)
    yield from _repeated_readings(index)
    yield from _boards_like_sources(index)


def _repeated(index: Index, table: str) -> Iterator[Problem]:
    """Rows alike in what makes their tag, whether equal in the rest or not."""
    keys = KEY_FIELDS[table]
    names = dict(columns(table))
    last = next(name for name in keys if name in ("tag", "number"))
    seen: set[tuple[object, ...]] = set()
    for row in index.site.table(table):
        key = tuple(getattr(row, name) for name in keys)
        own = getattr(row, last)
        if not own:
            continue
        if key in seen:
            what = row.name if isinstance(row, Run) else quoted(own)
            others = [names[name].name for name in keys if name != last]
            alike = f" with the same {' and '.join(others)}" if others else ""
            yield Problem(
                table,
                row.id,
                names[last].name,
                f"{what} stands in an earlier row already{alike}",
                f"one row for each {' and '.join(names[name].name for name in keys)}",
            )
        seen.add(key)


def _repeated_readings(index: Index) -> Iterator[Problem]:
    seen: set[str] = set()
    for reading in index.site.readings:
        if reading.tag and reading.tag in seen:
            what = f"{quoted(reading.tag)} stands in an earlier row already"
            yield Problem("readings", reading.id, "reading", what, "each tag once, or no tag")
        seen.add(reading.tag)


def _boards_like_sources(index: Index) -> Iterator[Problem]:
    """A circuit is fed from a board or a source, and a busbar is either, so that their tags must differ."""
    sources = set(map(attrgetter("tag"), index.site.sources))
    for board in index.site.boards:
        if board.tag and board.tag in sources:
            what = f"{quoted(board.tag)} is the tag of a source too"
            yield Problem("boards", board.id, "board", what, "a tag that no source has", ("sources",))
