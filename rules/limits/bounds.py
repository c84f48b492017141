"""Numbers of a profile that make no sense whatever their source."""

from __future__ import annotations

from collections.abc import Mapping

from rules.columns import NEAREST_ZERO, OUTER
from rules.limits.group import LimitGroup

ABOVE_ZERO = (
    "drop", "termination", "heat", "length_doubt", "bad_connection", "series_semiconductor", "longer_route", "slip",
)  # fmt: skip
SHARES = ("decision", "other_metal", "doubtful")
LARGEST = 1e9
"""Of a number without a unit or in one of its own; the others have those of the record."""


def impossible(name: str, groups: Mapping[str, LimitGroup], faults: list[str]) -> None:
    """Numbers that make no sense whatever their source."""
    for group in groups.values():
        for key, value in group.values.items():
            where = f"{name}: {group.name}.{key} is {value:g}"
            if group.name in ("temperature", "cold", "ambient"):
                if not -90 <= value <= 400:
                    faults.append(f"{where}; a temperature from -90 to 400 degC")
            elif value < 0:
                faults.append(f"{where}; not below 0")
            elif value == 0 and key != "geometric_sd" and group.name in ABOVE_ZERO:
                faults.append(f"{where}; above 0")
            elif value <= 1 and key == "geometric_sd":
                faults.append(f"{where}; above 1")
            elif value > 1 and group.name in SHARES:
                faults.append(f"{where}; a share from 0 to 1")
            elif value > (most := OUTER.get(group.unit, (0, LARGEST))[1]):
                faults.append(f"{where}; at most {most:.12g}")
            elif 0 < value < NEAREST_ZERO:
                faults.append(f"{where}; 0, or at least {NEAREST_ZERO:g}")
    for group_name, low, high in (
        ("bad_connection", "low_ohm", "high_ohm"),
        ("series_semiconductor", "low_v", "high_v"),
        ("longer_route", "low_factor", "high_factor"),
        ("slip", "parallel_low", "parallel_high"),
        ("decision", "passes_at", "fails_at"),
        ("heat", "soon_w", "immediate_w"),
        ("joint_rise", "similar_watch_k", "similar_soon_k"),
        ("joint_rise", "ambient_watch_k", "ambient_soon_k"),
        ("joint_rise", "device_ambient_watch_k", "device_ambient_soon_k"),
    ):
        values = groups[group_name].values if group_name in groups else {}
        if low in values and high in values and values[low] >= values[high]:
            faults.append(f"{name}: {group_name}.{low} is not below {group_name}.{high}")
    window = groups["load_window"].values if "load_window" in groups else {}
    if window and 0 < window["highest_percent"] <= window["lowest_percent"]:
        faults.append(f"{name}: load_window.lowest_percent is not below load_window.highest_percent")
    if "sampling" in groups and groups["sampling"].values["confidence"] >= 1:
        faults.append(f"{name}: sampling.confidence is {groups['sampling'].values['confidence']:g}; a share below 1")
    if "prior" in groups and groups["prior"].values["as_recorded"] <= 0:
        faults.append(f"{name}: prior.as_recorded is 0; above 0, or nothing can be as recorded")
    if "prior" in groups and not sum(groups["prior"].values.values()) > 0:
        faults.append(f"{name}: the shares of [prior] sum to nothing")
