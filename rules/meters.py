"""What each reading is worth: the instrument's row that holds it, its gain, counts and zero."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from rules.calc.doubt import Shown, Weighted, each_u, gain_u
from rules.columns import METER_QUANTITY
from rules.index import Index
from rules.limits import Limits
from rules.record import Instrument, Reading

SHOWN_DIGITS = 9
"""Digits in which what a display showed is told: all that it has."""


@dataclass(frozen=True, slots=True)
class Worth:
    """A reading's value with its doubt, and whether its instrument is known."""

    shown: Shown
    known: bool
    """False where it counts with the profile's poor meter, wholly or for want of a figure."""


def instrument_row(reading: Reading, index: Index) -> Instrument | None:
    """The row of the range that the reading was taken on: as recorded, else the smallest that holds it."""
    quantity = METER_QUANTITY.get(reading.quantity, "")
    rows = [row for row in index.ranges_of(reading.instrument) if row.quantity == quantity]
    if reading.full_scale is not None:
        rows = [row for row in rows if row.full_scale is None or row.full_scale == reading.full_scale] or rows
    rows.sort(key=lambda row: float("inf") if row.full_scale is None else row.full_scale)
    holding = [row for row in rows if row.full_scale is None or row.full_scale >= abs(reading.value)]
    return holding[0] if holding else rows[-1] if rows else None


def worth(reading: Reading, index: Index, limits: Limits, wander: float = 0.0) -> Worth:
    """
    A reading's value less the zero, and its doubt.

    ``wander`` is the standard deviation of the source between readings, in the reading's unit; it adds to each.
    Without an instrument, or where the instrument's figures are not known, the profile's poor meter counts.
    """
    quantity = METER_QUANTITY[reading.quantity]
    row = instrument_row(reading, index)
    accuracy = row.accuracy_percent if row else None
    counts = row.counts if row else None
    resolution = row.resolution if row else None
    known = accuracy is not None and counts is not None and resolution is not None
    gain = gain_u(accuracy if accuracy is not None else limits[f"poor_meter.{quantity}_percent"])
    each = each_u(
        counts if counts is not None else limits[f"poor_meter.{quantity}_counts"],
        resolution if resolution is not None else limits[f"poor_meter.{quantity}_resolution"],
    )
    # a reading without an instrument shares its gain with no other
    key = f"{reading.instrument}\x1f{quantity}\x1f{row.id}\x1f{reading.visit_or_default}" if row else reading.id
    zero = row.zero or 0.0 if row else 0.0
    return Worth(Shown(reading.value - zero, key, gain, each, wander, zero, not known), known)


def less_zero_words(terms: Iterable[Weighted], unit: str) -> str:
    """
    What the meter showed where its zero was taken off, to stand after what was read; empty where none was.

    >>> less_zero_words([Weighted(1.0, Shown(18.41, "K", 0.006, 0.01, zero=0.03))], "A")
    ' (18.44 A shown, less its zero 0.03 A)'
    >>> less_zero_words([Weighted(1.0, Shown(18.41, "K", 0.006, 0.01))], "A")
    ''
    """
    told = list(terms)
    zero = sum(term.weight * term.shown.zero for term in told)
    if not zero:
        return ""
    value = sum(term.weight * (term.shown.value + term.shown.zero) for term in told)
    return f" ({value:.{SHOWN_DIGITS}g} {unit} shown, less its zero {zero:.{SHOWN_DIGITS}g} {unit})"
