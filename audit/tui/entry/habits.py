"""What was chosen once in this sitting and is not asked again."""

from __future__ import annotations

from dataclasses import dataclass, field
from datetime import date

from audit.tui.entry.meters import Meter


@dataclass(slots=True)
class Habits:
    """Kept while the program runs; what readings tell is taken from the record instead."""

    visit: str | None = None
    """The visit that was chosen; ``None``: the latest."""
    confirmed: set[tuple[str, date]] = field(default_factory=set)
    """Visits of another day that readings still belong to, with the day on which she said so."""
    meters: dict[tuple[str, str], Meter] = field(default_factory=dict)
    """By visit and what they measure."""
