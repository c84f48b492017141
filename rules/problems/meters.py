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
    ranges: dict[tuple[str, str], Ranges] = {}
    known = list(dict.fromkeys(row.tag for row in index.site.instruments if row.tag))
    for reading in index.site.readings:
        measured = METER_QUANTITY.get(reading.quantity)
        if not reading.instrument or measured is None:
            continue
        key = reading.instrument, measured
        if key not in ranges:
            ranges[key] = tuple(row.full_scale for row in index.ranges_of(key[0]) if row.quantity == measured)
        if ranges[key]:
            yield from _range_problems(reading, ranges[key])
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


def _range_problems(reading: Reading, ranges: Ranges) -> Iterator[Problem]:
    unit = UNIT_OF_QUANTITY[reading.quantity]
    problem = partial(Problem, "readings", reading.id, seen_in=("instruments",))
    stated = [full_scale for full_scale in ranges if full_scale is not None]
    if reading.full_scale is not None:
        if not any(math.isclose(reading.full_scale, full_scale, rel_tol=_ROUNDING) for full_scale in stated):
            what = f"{quoted(reading.instrument)} has no range of {reading.full_scale:.12g} {unit}"
            yield problem(
                "range", what, either([*(f"{full_scale:.12g} {unit}" for full_scale in stated), "an empty cell"])
            )
            return
        largest = reading.full_scale
    elif len(stated) < len(ranges):
        return
    else:
        largest = max(stated)
    if abs(reading.value) > largest * (1 + _ROUNDING):
        what = f"{reading.value:.12g} {unit} is more than {quoted(reading.instrument)} shows"
        yield problem("value", what, f"up to {largest:.12g} {unit}, the range")
