"""What a meter may be connected to, and what a place asks of it: measurement categories and voltages."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass

from rules.index import Index
from rules.record import CATEGORIES, Board, Circuit, Instrument, Source
from rules.rounds import judged

_PRINTED = re.compile(
    r"\bCAT\.?\s*(?P<category>IV|III|II|I)\b|(?P<volts>\d{1,3}(?:[ ,]\d{3})+|\d+(?:\.\d+)?)\s*(?P<kilo>k?)V\b",
    re.IGNORECASE,
)
"""A category, or a voltage: meters are printed with either before the other."""


@dataclass(frozen=True, slots=True)
class Rating:
    """One of the ratings printed on a meter."""

    category: str
    """``CAT III``; empty where a voltage alone is known."""
    printed_v: float | None
    """Beside the category. [V]"""
    rated_v: float | None = None
    """What is recorded of the meter as a whole, leads and range included. [V]"""

    @property
    def voltage_v(self) -> float | None:
        """The lower of both. [V]"""
        return min((volts for volts in (self.printed_v, self.rated_v) if volts is not None), default=None)

    @property
    def rank(self) -> int:
        """0 for a meter of no category that a place may ask for."""
        return rank(self.category)


def rank(category: str) -> int:
    """
    Place of a category among those that a place may ask for, 0 for none of them.

    >>> rank("CAT I"), rank("CAT II"), rank("CAT IV")
    (0, 1, 3)
    """
    return CATEGORIES.index(category) + 1 if category in CATEGORIES else 0


def ratings_of(row: Instrument) -> tuple[Rating, ...]:
    """
    The ratings of a range of a meter; none where nothing is recorded that can be read.

    The recorded voltage holds for every category that is printed without one, and bounds the others.

    >>> [str(each) for each in ratings_of(Instrument(id="m", category="CAT III 600 V, CAT IV 300 V"))]
    ["Rating(category='CAT III', printed_v=600.0, rated_v=None)", "Rating(category='CAT IV', printed_v=300.0, rated_v=None)"]
    >>> words(ratings_of(Instrument(id="m", category="1000 V CAT III / 600 V CAT IV")))
    'CAT III 1000 V, CAT IV 600 V'
    >>> ratings_of(Instrument(id="m", rated_voltage_v=600.0))
    (Rating(category='', printed_v=None, rated_v=600.0),)
    """
    most = row.rated_voltage_v
    printed = [Rating(category, volts, most) for category, volts in _printed(row.category)]
    return tuple(printed) or ((Rating("", None, most),) if most is not None else ())


def _printed(text: str) -> list[tuple[str, float | None]]:
    """
    Each category in a text with its voltage: the one before it that no other category took, else the one behind it.

    >>> _printed("CAT III 600 V, CAT IV 300 V"), _printed("600 V CAT III")
    ([('CAT III', 600.0), ('CAT IV', 300.0)], [('CAT III', 600.0)])
    >>> _printed("CAT III / CAT IV 600V"), _printed("CAT III 1,000 V / 0.6 kV CAT IV")
    ([('CAT III', None), ('CAT IV', 600.0)], [('CAT III', 1000.0), ('CAT IV', 600.0)])
    """
    found: list[tuple[str, float | None]] = []
    before: float | None = None
    wants = False
    for match in _PRINTED.finditer(text):
        if match["category"]:
            found.append((f"CAT {match['category'].upper()}", before))
            wants, before = before is None, None
            continue
        volts = float(re.sub("[ ,]", "", match["volts"])) * (1000 if match["kilo"] else 1)
        if wants:
            found[-1] = found[-1][0], volts
        before, wants = None if wants else volts, False
    return found


def highest_v(place: Circuit | Board | Source, index: Index) -> float | None:
    """The highest voltage of the sources that feed a place: recorded, else working, else nominal; or as read there. [V]"""
    known = [
        volts
        for source in sources_of(place, index)
        if (volts := source.highest_voltage_v or source.working_or_nominal_v) is not None
    ]
    read = [abs(row.value) for row in judged(index.readings_of(place.id), index) if row.quantity == "voltage"]
    return max([*known, *read], default=None)


def sources_of(place: Circuit | Board | Source, index: Index) -> tuple[Source, ...]:
    """The sources that feed a place, over all boards and circuits between."""
    waiting: list[Circuit | Board | Source] = [place]
    seen: dict[str, Circuit | Board | Source] = {}
    while waiting:
        here = waiting.pop()
        if here.id in seen:
            continue
        seen[here.id] = here
        if not isinstance(here, Source):
            feeds = here.fed_by if isinstance(here, Board) else (here.fed_from,)
            waiting += [row for feed in feeds if feed is not None and (row := index.named(feed)) is not None]
    return tuple(row for row in seen.values() if isinstance(row, Source))


def asked_of(place: Circuit | Board | Source, index: Index) -> tuple[Board | Source | None, str]:
    """Whose measurement category holds at a place, the board or source that a circuit is on, and which it is."""
    on = index.named(place.fed_from) if isinstance(place, Circuit) and place.fed_from is not None else place
    return (None, "") if on is None or isinstance(on, Circuit) else (on, on.category)


def words(ratings: Sequence[Rating]) -> str:
    """
    Ratings as they are said: what is printed, then the meter's own voltage where that is another.

    >>> words([Rating("CAT III", 600.0), Rating("CAT IV", None)]), words([Rating("", None, 600.0)])
    ('CAT III 600 V, CAT IV', 'rated 600 V')
    >>> words([Rating("CAT II", 150.0, 120.0)]), words([Rating("CAT II", 150.0, 150.0)])
    ('CAT II 150 V, rated 120 V', 'CAT II 150 V')
    """
    printed = [
        " ".join(
            part for part in (each.category, f"{each.printed_v:g} V" if each.printed_v is not None else "") if part
        )
        for each in ratings
    ]
    rated = [f"rated {each.rated_v:g} V" for each in ratings if each.rated_v not in (None, each.printed_v)]
    return ", ".join(dict.fromkeys(part for part in (*printed, *rated) if part))
