"""The lowest and the highest voltage that a load lives with: its own, else what its trade's profile states."""

from __future__ import annotations

from dataclasses import dataclass

from rules.case import CircuitCase
from rules.record import Load


@dataclass(frozen=True, slots=True)
class Bound:
    """A voltage that a load lives with."""

    volts: float
    whose: str
    """``its`` where the load records it, else ``the profile's``."""
    key: str
    """Of the profile's group; empty where it is the load's own."""

    @property
    def is_own(self) -> bool:
        return not self.key


def lowest_of(case: CircuitCase, load: Load) -> Bound | None:
    """The lowest voltage of a load; ``None`` where neither it nor the profile states one."""
    return _bound(case, load.lowest_voltage_v, "lowest_percent", case.limits["load_window.lowest_percent"])


def highest_of(case: CircuitCase, load: Load) -> Bound | None:
    """The highest voltage of a load; ``None`` where neither it nor the profile states one."""
    return _bound(case, load.highest_voltage_v, "highest_percent", case.limits["load_window.highest_percent"])


def source_of(case: CircuitCase, bound: Bound) -> str | None:
    """Where the profile's bound comes from; ``None`` of a load's own."""
    return None if bound.is_own else case.limits.citation("load_window", bound.key)


def unused(bound: Bound) -> tuple[str, ...]:
    """Groups of the profile that had no part in a judgement by the bound."""
    return ("load_window",) if bound.is_own else ()


def _bound(case: CircuitCase, own_v: float | None, key: str, percent: float) -> Bound | None:
    if own_v is not None:
        return Bound(own_v, "its", "")
    if percent == 0 or case.nominal_v is None:
        return None
    return Bound(percent / 100 * case.nominal_v, "the profile's", key)
