"""A text that is itself a tag is that tag; only otherwise is it split."""

from __future__ import annotations

import pytest

from rules.index import Index
from rules.record import Board, Circuit, Feed, Site, Source
from rules.references import Tags, feed_text, feeds_text, read_end, read_feed, read_feeds, tags_of

SITE = Site(
    name="hut",
    sources=(Source(id="s1", tag="RECT-1"), Source(id="s2", tag="BATT-A"), Source(id="s3", tag="A + B")),
    boards=(Board(id="b1", tag="MDB"), Board(id="b2", tag="RECT-1"), Board(id="b3", tag="")),
    circuits=(
        Circuit(id="c1", tag="B1-07"),
        Circuit(id="c2", tag="B1:07"),
        Circuit(id="c3", tag="B1:07:p1"),
        Circuit(id="c4", tag="B1-07"),
    ),
)
FEEDS = ("sources", "circuits")


@pytest.fixture
def tags() -> Tags:
    return tags_of(SITE)


@pytest.mark.parametrize(
    ("text", "feeds"),
    [
        ("RECT-1", (Feed("sources", "s1"),)),
        ("RECT-1 + BATT-A", (Feed("sources", "s1"), Feed("sources", "s2"))),
        ("A + B", (Feed("sources", "s3"),)),
        ("A + B + BATT-A", (Feed("", "?A"), Feed("", "?B"), Feed("sources", "s2"))),
        ("RECT-1+BATT-A", (Feed("", "?RECT-1+BATT-A"),)),
        ("B1-07", (Feed("circuits", "c1"),)),
        ("B1-07:p2", (Feed("circuits", "c1", "p2"),)),
        ("B1:07", (Feed("circuits", "c2"),)),
        ("B1:07:p1", (Feed("circuits", "c3"),)),
        ("B1:07:p2", (Feed("circuits", "c2", "p2"),)),
        ("RECT-1:p2", (Feed("", "?RECT-1:p2"),)),
        ("MDB", (Feed("", "?MDB"),)),
    ],
)
def test_feeds_are_read_and_written_alike(text: str, feeds: tuple[Feed, ...], tags: Tags) -> None:
    assert read_feeds(text, FEEDS, tags) == feeds
    assert feeds_text(feeds, Index(SITE)) == text


def test_the_first_table_of_the_column_counts(tags: Tags) -> None:
    assert read_feed("RECT-1", ("boards", "sources"), tags) == Feed("boards", "b2")
    assert read_feed("RECT-1", ("sources", "circuits"), tags) == Feed("sources", "s1")


def test_points_are_of_circuits_alone(tags: Tags) -> None:
    assert read_feed("B1-07:p2", ("boards", "sources"), tags) == Feed("", "?B1-07:p2")


def test_a_run_ends_on_a_point_or_a_board(tags: Tags) -> None:
    assert read_end("p1", tags) == ("p1", "")
    assert read_end("board:MDB", tags) == ("", "b1")
    assert read_end("board:gone", tags) == ("", "?gone")


def test_what_is_not_there_keeps_its_text() -> None:
    assert feed_text(Feed("", "?gone", "p1"), Index(SITE)) == "gone:p1"
