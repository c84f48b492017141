"""Readings that no recorded instrument can have shown."""

from __future__ import annotations

import math
from collections.abc import Iterator
from functools import partial
from typing import TypeAlias

from rules.columns import METER_QUANTITY
from rules.index import Index
from rules.problems.problem import Problem
from rules.record import UNIT_OF_QUANTITY, Reading
from rules.text import Suggestions, either, quoted

Ranges: TypeAlias = tuple[float | None, ...]
"""Full scales of an instrument for one quantity, in its unit; ``None`` holds every value."""

_ROUNDING = 1e-9
"""Relative; 200 mV and 0.2 V are one range."""


def meter_problems(index: Index, suggestions: Suggestions) -> Iterator[Problem]:
    """Instruments, ranges and quantities that are not there, and values that no range holds."""
    largest: dict[tuple[str, str, float | None], float] = {}
    known = list(dict.fromkeys(row.tag for row in index.site.instruments if row.tag))
    for reading in index.site.readings:
        measured = METER_QUANTITY.get(reading.quantity)
        if not reading.instrument or measured is None:
            continue
        # Readings are many, meters few: what each range shows is asked once.
        key = reading.instrument, reading.quantity, reading.full_scale
        if key not in largest:
            largest[key] = _largest(reading.full_scale, _ranges(index, reading.instrument, measured))
        if largest[key] >= 0 and not abs(reading.value) > largest[key]:  # no number at all is told as a cell
            continue
        if ranges := _ranges(index, reading.instrument, measured):
            yield from _range_problems(reading, ranges)
            continue
        problem = partial(Problem, "readings", reading.id, "instrument", seen_in=("instruments",))
        rows = index.ranges_of(reading.instrument)
        if rows:
            what = f"{quoted(reading.instrument)} has no row for {measured}, which a {reading.quantity} reading needs"
            yield problem(
                what, f"an instrument for {measured}; it has {either(sorted({row.quantity for row in rows}))}"
            )
        else:
            hint = suggestions.ask(reading.instrument, known)
            what = f"{quoted(reading.instrument)} names no instrument"
            yield problem(what, f"the tag of an instrument that is there, or an empty cell{hint}")


def _ranges(index: Index, instrument: str, measured: str) -> Ranges:
    return tuple(row.full_scale for row in index.ranges_of(instrument) if row.quantity == measured)


def _has_range(full_scale: float, ranges: Ranges) -> bool:
    return any(math.isclose(full_scale, stated, rel_tol=_ROUNDING) for stated in ranges if stated is not None)


def _largest(full_scale: float | None, ranges: Ranges) -> float:
    """The largest value that a meter shows, in the range named if one is; below zero where it shows none."""
    if full_scale is not None:
        return full_scale * (1 + _ROUNDING) if _has_range(full_scale, ranges) else -1.0
    return max((math.inf if stated is None else stated * (1 + _ROUNDING) for stated in ranges), default=-1.0)


def _range_problems(reading: Reading, ranges: Ranges) -> Iterator[Problem]:
    """Why none of the ranges shows the reading."""
    unit = UNIT_OF_QUANTITY[reading.quantity]
    problem = partial(Problem, "readings", reading.id, seen_in=("instruments",))
    stated = [full_scale for full_scale in ranges if full_scale is not None]
    if reading.full_scale is not None and not _has_range(reading.full_scale, ranges):
        what = f"{quoted(reading.instrument)} has no range of {reading.full_scale:.12g} {unit}"
        yield problem("range", what, either([*(f"{full_scale:.12g} {unit}" for full_scale in stated), "an empty cell"]))
        return
    largest = max(stated) if reading.full_scale is None else reading.full_scale
    what = f"{reading.value:.12g} {unit} is more than {quoted(reading.instrument)} shows"
    yield problem("value", what, f"up to {largest:.12g} {unit}, the range")
