"""Differences between a site and what comes in, as lines for people."""

from __future__ import annotations

from collections.abc import Iterator

from audit.intake.merge import SITE, Difference, Merge
from audit.unload import cell_text, setting_text
from rules.index import Index
from rules.record import Row, Site, columns
from rules.text import quoted


def differing_lines(into: Site, merged: Merge) -> Iterator[tuple[Difference, str, str]]:
    """Each difference with the value that is there and the value that comes in, as they would be typed."""
    if not merged.differences:
        return
    before, after = Index(into), Index(merged.site)
    for difference in merged.differences:
        yield difference, _value(difference, difference.before, before), _value(difference, difference.after, after)


def refusal(difference: Difference, here: str, comes: str) -> str:
    """Why a value that comes in is not taken."""
    what = f"{_shown(here)} in the site file, {_shown(comes)} here"
    if difference.can_be_taken:
        return f"{what}; accepted: equal values, or --replace"
    return f"{what}, in a reading that another one here replaces; accepted: its value as in the site file"


def taken(difference: Difference, here: str, comes: str, index: Index) -> str:
    """What is taken with ``--replace``."""
    place = "site.toml" if difference.table == SITE else f"{difference.table}, {row_name(difference.before, index)}"
    return f"{place}: {difference.column} {_shown(here)} → {_shown(comes)}"


def row_name(row: Row | Site, index: Index) -> str:
    """A row as people call it: ``B1-07 run 2``."""
    circuit = index.circuits.get(getattr(row, "circuit_id", ""))
    own = getattr(row, "tag", "") or getattr(row, "name", "")
    return " ".join(filter(None, [circuit.tag if circuit is not None else "", own]))


def _value(difference: Difference, row: Row | Site, index: Index) -> str:
    if isinstance(row, Site):
        return setting_text(row, difference.field)
    return cell_text(row, difference.field, dict(columns(difference.table))[difference.field], index)


def _shown(text: str) -> str:
    return quoted(text) if text else "nothing"
