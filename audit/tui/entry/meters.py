"""Which meter and range a reading is taken with: chosen once and kept for the visit."""

from __future__ import annotations

from dataclasses import dataclass

from rules.columns import METER_QUANTITY
from rules.index import Index
from rules.units import show

_UNITS = {"voltage": "V", "current": "A", "temperature": "degC", "resistance": "ohm"}


@dataclass(frozen=True, slots=True)
class Meter:
    """An instrument, and its range where one is held; without a range, the smallest that holds the value counts."""

    tag: str = ""
    """Empty for a meter that is not recorded: it counts as a poor one."""
    full_scale: float | None = None

    def words(self, quantity: str) -> str:
        if not self.tag:
            return "a meter that is not recorded"
        if self.full_scale is None:
            return self.tag
        return f"{self.tag}, range {show(self.full_scale, _UNITS[quantity])}"


NO_METER = Meter()
"""A meter that is not recorded."""


def meter_quantity(quantity: str) -> str:
    """What kind of meter a reading's quantity needs."""
    return METER_QUANTITY[quantity]


def meters_for(index: Index, quantity: str) -> list[Meter]:
    """The recorded meters that measure a quantity, each without a range first, then each range."""
    rows = [row for row in index.site.instruments if row.quantity == quantity]
    meters: list[Meter] = []
    for tag in dict.fromkeys(row.tag for row in rows):
        ranges = sorted(row.full_scale for row in rows if row.tag == tag and row.full_scale is not None)
        meters += [Meter(tag), *(Meter(tag, scale) for scale in ranges if len(ranges) > 1)]
    return meters


def meter_used(index: Index, visit: str, quantity: str) -> Meter | None:
    """The meter of the visit's latest reading of a quantity; ``None`` where there is none."""
    for reading in reversed(index.site.readings):
        if reading.visit_or_default == (visit or "1") and METER_QUANTITY.get(reading.quantity) == quantity:
            return Meter(reading.instrument, reading.full_scale)
    return None


def only_meter(index: Index, quantity: str) -> Meter | None:
    """The meter to take unasked: the only one recorded, or none where none is; ``None`` where there is a choice."""
    tags = {meter.tag for meter in meters_for(index, quantity)}
    return Meter(next(iter(tags), "")) if len(tags) < 2 else None
