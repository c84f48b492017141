"""A figure with doubt against an exact limit: conforms, does not conform, or not settled."""

from __future__ import annotations

from enum import Enum

from rules.calc.doubt import probability_above
from rules.limits import Limits


class Verdict(Enum):
    """What JCGM 106 lets one say of a limit."""

    CONFORMS = "conforms"
    FAILS = "does not conform"
    OPEN = "not settled"


def against_limit(value: float, limit: float, u: float, limits: Limits, *, above_is_bad: bool = True) -> Verdict:
    """
    Judge a figure against an upper (or lower) limit by the probability of being past it.

    References
    ----------
    JCGM 106:2012, 8.3; the two thresholds stand in the profile, group ``decision``.
    """
    past = probability_above(value, limit, u) if above_is_bad else probability_above(-value, -limit, u)
    if past >= limits["decision.fails_at"]:
        return Verdict.FAILS
    return Verdict.CONFORMS if past <= limits["decision.passes_at"] else Verdict.OPEN
