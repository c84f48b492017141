"""
Places that findings name to be read: they come before whatever else would be read next.

A hot place is read across itself; a joint with much heat, or one above its kind, is read once more before it is opened;
of a leg that loses more than the other each termination, the middle ones first.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from rules.assessment import Finding, Severity
from rules.case import CircuitCase
from rules.diagnosis.problem import ENDS, LEGS
from rules.diagnosis.rows import DEVICE, device_leg
from rules.errors import MissingData

HOT, LEGS_UNEQUAL = "HT02", "VD06"
ONCE_MORE = ("HT01", "HT03")
"""Rules that found something by a reading across a joint, which is to be read a second time."""


@dataclass(frozen=True, slots=True)
class Named:
    """A termination or the device, with the legs that were not read there yet."""

    at: str
    legs: tuple[str, ...]
    why: str
    caution: str
    """The finding's own."""


def named_places(case: CircuitCase, findings: Sequence[Finding]) -> tuple[Named, ...]:
    """The places that findings name and that were not read as often as they ask for, the most urgent finding first."""
    found: list[Named] = []
    for finding in sorted(findings, key=lambda finding: finding.severity.rank):
        if finding.severity is Severity.NOTE or finding.circuit != case.tag:
            continue
        rule, why = finding.rule, f"{finding.rule}, {finding.title[0].lower()}{finding.title[1:]}"
        if rule == HOT:
            found += _unread(finding, case, finding.where, LEGS, 1, f"{why}: it is read across before anything else")
        elif rule in ONCE_MORE:
            at, leg = _parted(finding.where)
            found += _unread(
                finding, case, at, (leg,) if leg else LEGS, 2, f"{why}: it is read once more at the same current"
            )
        elif rule == LEGS_UNEQUAL:
            path, leg = _parted(finding.where)
            for at in _middle_first(_terminations(case, path)):
                found += _unread(
                    finding, case, at, (leg,), 1, f"{why}: each termination of the leg is read, the middle ones first"
                )
    return tuple(found)


def _parted(where: str) -> tuple[str, str]:
    """A place and its leg; the leg empty where none stands."""
    place, _, leg = where.rpartition(" ")
    return (place, leg) if leg in LEGS else (where.removesuffix(" both"), "")


def _unread(finding: Finding, case: CircuitCase, at: str, legs: Sequence[str], times: int, why: str) -> Iterator[Named]:
    """The place with those of its legs that were read across fewer times than asked for; nothing where there are none."""
    read = [row.leg for row in case.readings if row.quantity in ("joint", "resistance") and row.at == at and not row.to]
    lies_in = device_leg(case.tree, case.return_leg) if at == DEVICE else "both"
    open_ = tuple(
        leg for leg in legs if lies_in in (leg, "both") and sum(own in (leg, "", "both") for own in read) < times
    )
    if open_:
        yield Named(at, open_, why, finding.caution)


def _terminations(case: CircuitCase, path: str) -> list[str]:
    """The terminations of the runs between two points, in walking order."""
    start, _, end = path.partition(" to ")
    try:
        passed = case.tree.path(start, end)
    except MissingData:
        return []
    return [f"{case.tree.ends[point].name} {end}" for point in passed if point in case.tree.ends for end in ENDS]


def _middle_first(places: Sequence[str]) -> list[str]:
    """Those nearest to the middle first."""
    middle = (len(places) - 1) / 2
    return [places[n] for n in sorted(range(len(places)), key=lambda n: abs(n - middle))]
