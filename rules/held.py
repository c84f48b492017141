"""What holds a busbar: the voltages of sources in parallel, and which of them gives the current."""

from __future__ import annotations

from rules.record import Source


def working_v(sources: tuple[Source, ...]) -> float | None:
    """The voltage of sources in parallel: that of the highest. [V]"""
    return max((volts for source in sources if (volts := source.working_or_nominal_v) is not None), default=None)


def lowest_v(sources: tuple[Source, ...]) -> float | None:
    """The lowest voltage of sources in parallel: the battery's where there is one, else the lowest of all. [V]"""
    batteries = [source for source in sources if source.kind == "battery"] or sources
    return min((source.lowest_voltage_v for source in batteries if source.lowest_voltage_v is not None), default=None)


def highest_v(sources: tuple[Source, ...]) -> float | None:
    """The highest that sources in parallel may put out; ``None`` while one of them does not say. [V]"""
    highest = [source.highest_voltage_v for source in sources]
    known = [volts for volts in highest if volts is not None]
    return max(known) if known and len(known) == len(highest) else None


def giving_of(sources: tuple[Source, ...], held_v: float) -> Source | None:
    """Which of several sources in parallel gives the current: the one whose voltage the busbar has."""
    for source in sources:
        if held_v in (source.working_or_nominal_v, source.lowest_voltage_v, source.highest_voltage_v):
            return source
    return sources[0] if sources else None
