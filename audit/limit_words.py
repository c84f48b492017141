"""The numbers and words of a limits profile as people read them."""

from __future__ import annotations

from rules.limits import LimitGroup
from rules.units import show

_SUFFIXES = {"%": "_percent", "degC": "_c", "W": "_w", "V": "_v", "ohm": "_ohm", "K": "_k"}
"""How the names of a group's numbers end in its unit; a name without the ending is a pure number."""


def limit_words(group: LimitGroup, key: str) -> str:
    """One value of a profile: ``median 150 µΩ``, ``tape 0.01``, ``table: by size``."""
    if key in group.words:
        return f"{key.replace('_', ' ')}: {group.words[key]}"
    value, suffix = group.values[key], _SUFFIXES.get(group.unit, "")
    has_unit = group.unit == "K" or (suffix and key.endswith(suffix))
    number = show(value, group.unit) if has_unit else f"{value:g}"
    return f"{key.removesuffix(suffix).replace('_', ' ')} {number}"
