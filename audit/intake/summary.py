"""What an intake did, as lines for people."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

from audit.intake.into_file import Outcome
from audit.intake.merge import SITE
from rules.record import TABLES
from rules.text import clean

_MOST_TAKEN = 40
"""How many values that were taken are listed before the rest is counted."""


def summary(path: Path, outcome: Outcome, dry_run: bool) -> Iterator[str]:
    """
    One line on the whole, then a line for each table and for each differing value that was taken.

    Parameters
    ----------
    path : Path
        The site file.
    outcome : Outcome
        What was done.
    dry_run : bool
        It would be done.
    """
    name = clean(str(path))
    if outcome.is_new:
        yield f"{name}: {'would be made' if dry_run else 'made'}"
    elif outcome.is_change:
        yield f"{name}: {'would be changed' if dry_run else 'changed'}"
    else:
        yield f"{name}: holds all of it already; nothing {'would be' if dry_run else 'is'} changed"
    for table in (SITE, *TABLES):
        counts = (outcome.added[table], outcome.changed[table], outcome.left[table])
        words = [f"{n:,} {what}" for n, what in zip(counts, ("added", "changed", "left as they are"), strict=True) if n]
        if table == SITE and words:
            yield "  settings      changed"
        elif words:
            yield f"  {table:<13} {', '.join(words)}"
    if outcome.replacing:
        yield f"  readings that replace one that stays beside it: {outcome.replacing:,}"
    yield from (f"  {line}" for line in outcome.taken[:_MOST_TAKEN])
    if len(outcome.taken) > _MOST_TAKEN:
        yield f"  and {len(outcome.taken) - _MOST_TAKEN:,} more values"
