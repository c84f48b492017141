"""The lowest and the highest voltage that a load lives with: its own, else what its trade's profile states."""

from __future__ import annotations

from dataclasses import dataclass

from rules.limits import Limits
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

    @property
    def whose_of_several(self) -> str:
        return "their" if self.is_own else self.whose


def lowest_of(load: Load, nominal_v: float | None, limits: Limits) -> Bound | None:
    """The lowest voltage of a load; ``None`` where neither it nor the profile states one."""
    return _bound(load.lowest_voltage_v, nominal_v, "lowest_percent", limits["load_window.lowest_percent"])


def highest_of(load: Load, nominal_v: float | None, limits: Limits) -> Bound | None:
    """The highest voltage of a load; ``None`` where neither it nor the profile states one."""
    return _bound(load.highest_voltage_v, nominal_v, "highest_percent", limits["load_window.highest_percent"])


def source_of(limits: Limits, bound: Bound) -> str | None:
    """Where the profile's bound comes from; ``None`` of a load's own."""
    return None if bound.is_own else limits.citation("load_window", bound.key)


def unused(bound: Bound) -> tuple[str, ...]:
    """Groups of the profile that had no part in a judgement by the bound."""
    return ("load_window",) if bound.is_own else ()


def _bound(own_v: float | None, nominal_v: float | None, key: str, percent: float) -> Bound | None:
    if own_v is not None:
        return Bound(own_v, "its", "")
    if percent == 0 or nominal_v is None:
        return None
    return Bound(percent / 100 * nominal_v, "the profile's", key)
