"""When readings were taken, as far as they say, and how long lies between them."""

from __future__ import annotations

from collections.abc import Iterable
from datetime import UTC, datetime

from rules.record import Reading

DATE_ALONE = 10
"""Characters of a date; a time of day stands behind it."""


def moment(taken_at: str) -> datetime | None:
    """
    A time of a day, with an offset taken to UTC; ``None`` of a date alone, and of what is no time.

    Examples
    --------
    >>> moment("2026-03-11"), moment("2026-03-11T08:16"), moment("0001-01-01T00:00+14:00")
    (None, datetime.datetime(2026, 3, 11, 8, 16), None)
    """
    if len(taken_at.strip()) <= DATE_ALONE:
        return None
    try:
        read = datetime.fromisoformat(taken_at)
        return read.astimezone(UTC) if read.tzinfo else read
    except (ValueError, OverflowError):
        return None


def seconds_between(rows: Iterable[Reading]) -> float | None:
    """
    Time between the first and the last of some readings; ``None`` where fewer than two can be compared. [s]

    Those with a time zone are compared among themselves, and so are those without one.
    """
    moments = [at for row in rows if (at := moment(row.taken_at)) is not None]
    spans = [
        (max(alike) - min(alike)).total_seconds()
        for zoned in (True, False)
        if len(alike := [at for at in moments if (at.tzinfo is not None) is zoned]) > 1
    ]
    return max(spans, default=None)
