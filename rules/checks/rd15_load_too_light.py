"""RD15: the load was too light for the readings to say anything of a joint that would run hot."""

import math
from collections.abc import Iterator

from rules.assessment import Citation, Drop, Finding, Severity
from rules.case import CircuitCase
from rules.diagnosis.bounds import largest_level
from rules.errors import MissingData
from rules.record import Figure
from rules.rule import DOUBTS_OF_COMPUTED, DOUBTS_OF_READINGS, rule
from rules.units import show
from rules.verdict import unsettled, unsound

FIXED = ("meter counts", "source wander", "current counts")
"""Doubts of a drop that stay as they are when more current flows; all others grow with it."""


@rule(
    id="RD15",
    title="Load too light to conclude",
    about="circuit",
    severity=Severity.NOTE,
    remedy="Read again at the current stated, with the circuit's own loads where they can be set; else with a finer meter.",
    caution="No load is added to a life-safety, trip or close circuit without the duty holder's permission, and none above what device, "
    "cable and source are rated for. A bad joint heats with the square of the current.",
    source=Citation("JCGM 100", "2008", "5.2: doubt of a difference of correlated readings", "from-memory"),
    limits=(
        "decision",
        "heat",
        "next_reading",
        "readings",
        "source",
        "load_share",
        *DOUBTS_OF_COMPUTED,
        *DOUBTS_OF_READINGS,
    ),
)
def load_too_light(case: CircuitCase) -> Iterator[Finding]:
    """
    The current that was read is too small for the readings to settle the circuit. A bad connection that would give the
    profile's heat at design current would lose less at it than the profile's number of standard uncertainties, because of
    what does not grow with the current: counts, display, source wander. The current is stated at which it would stand out, and whether
    device, cable and source allow it.

    **Finds**: 0.5 A read on a circuit of 8 A: 2 W at 8 A are 31 mΩ, which lose 16 mV at 0.5 A, against 19 mV of doubt.

    **Leaves alone**: a circuit that is settled; one on which the doubt of the length hides the same joint at any current; one
    read at its full load.
    """
    drop = case.drop
    if drop is None or case.diagnosis is None or not (unsettled(case) or unsound(case)):
        return
    first = next(iter(case.tree.ends), "")
    design_a = max((case.largest_current_a.get(point, 0.0) for point in ("way", first)), default=0.0)
    if not design_a:
        raise MissingData("the design current is not known, so neither is the joint that would run hot")
    heat, apart = case.limits["heat.limit_w"], case.limits["next_reading.apart"]
    extra_ohm, read_a = heat / design_a**2, abs(drop.current.value)
    fixed, growing = _doubts(drop)
    if read_a * (1 + case.limits["readings.load_margin"]) >= design_a:
        return  # the load is all that there is: a finer meter is what it takes
    if not read_a or extra_ohm * read_a >= apart * math.hypot(fixed, growing):
        return
    rest = extra_ohm**2 - (apart * growing / read_a) ** 2
    if rest <= 0:
        return  # no current makes it stand out
    needed = apart * fixed / math.sqrt(rest)
    most = read_a * largest_level(case, dict.fromkeys(("device", *(run.name for run in case.runs)), read_a))
    beyond = f", more than the {show(design_a, 'A', digits=3)} of its own loads" if needed > design_a else ""
    if needed > most:
        beyond = f", more than the {show(most, 'A', digits=2)} that is allowed here: a finer meter"
    yield load_too_light.finding(
        case,
        f"{drop.start} to {drop.end}, round {drop.round}",
        f"a joint of {show(extra_ohm, 'ohm', digits=2)}, {show(heat, 'W')} at {show(design_a, 'A', digits=3)}, loses "
        f"{show(extra_ohm * read_a, 'V', digits=2)} at the {show(read_a, 'A', digits=3)} read, against a doubt of "
        f"{show(math.hypot(fixed, growing), 'V', digits=2)}; it takes {show(needed, 'A', digits=2)}{beyond}",
        numbers={
            "current": drop.current,
            "needed": Figure(needed, "A"),
            "joint": Figure(extra_ohm, "ohm"),
            "doubt": Figure(math.hypot(fixed, growing), "V"),
        },
        source=f"{load_too_light.source}; {case.limits.citation('heat')}; {case.limits.citation('next_reading')}",
    )


def _doubts(drop: Drop) -> tuple[float, float]:
    """What of a drop's doubt stays and what grows with the current, at the current that was read. [V]"""
    fixed = math.sqrt(sum(doubt.u_v**2 for doubt in drop.budget if doubt.name in FIXED))
    return fixed, math.sqrt(sum(doubt.u_v**2 for doubt in drop.budget if doubt.name not in FIXED))
