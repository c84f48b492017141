"""VD02: the measured drop is above the computed one beyond doubt."""

import math
from collections.abc import Iterator

from rules.assessment import Citation, Finding, NotJudged, Severity
from rules.calc.doubt import probability_above
from rules.case import CircuitCase
from rules.errors import MissingData
from rules.limits import Limits
from rules.record import Figure
from rules.rule import rule
from rules.units import show


@rule(
    id="VD02",
    title="Measured drop above the computed drop",
    about="circuit",
    severity=Severity.WATCH,
    remedy="Measure millivolts along each leg and across each termination of the path at the same current, the middle first.",
    caution="Millivolt readings across a closed joint become the full system voltage if it opens: start on auto volts. "
    "Do not tighten or open anything live; cut back and remake heated conductors when isolated. "
    "The drop does not say where the excess lies: a wrong length or size in the record looks the same.",
    source=Citation("JCGM 100", "2008", "5.2: doubt of a difference of correlated readings"),
)
def measured_above_computed(case: CircuitCase) -> Iterator[Finding | NotJudged]:
    """
    More voltage is lost than the recorded conductors account for, beyond the doubt of both.

    **Finds**: 2.45 ± 0.02 V measured against 1.92 ± 0.05 V computed at 8 A: 4.2 W too much, so it is for soon.
    Below the profile's 2 W the severity is watch; from 10 W on, which can burn if it sits in one place, it is immediate.

    **Leaves alone**: 2.02 ± 0.02 V against the same computed drop, which two standard uncertainties cover. Readings
    that cannot be (RD01, RD02) are not judged.
    """
    if case.unused:
        yield measured_above_computed.gap(case, "readings", f"read, but not used yet: {', '.join(case.unused)}")
    if case.drop is None:
        if case.visit:
            raise MissingData(case.drop_gap)
        return
    drop = case.drop
    this = next(r for r in case.rounds if r.name == drop.round)
    if probability_above(drop.excess.value, 0.0, drop.excess.u or 0.0) < case.limits["decision.beyond_doubt"]:
        return
    heat_w = drop.excess.value * abs(drop.current.value)
    heat_u = math.hypot((drop.excess.u or 0.0) * drop.current.value, drop.excess.value * (drop.current.u or 0.0))
    remarks = []
    if this.wander_v == 0 and drop.by == "two voltages":
        remarks.append("the source is taken as steady, since no point was read twice")
    if this.poor:
        remarks.append(f"{', '.join(this.poor)}: instrument not recorded, counted as a poor meter")
    why = (
        f"{show(drop.measured.value, 'V', drop.measured.u)} measured against "
        f"{show(drop.computed.value, 'V', drop.computed.u)} computed from {drop.start} to {drop.end} at "
        f"{show(drop.current.value, 'A', drop.current.u)} in round {drop.round}: "
        f"{show(drop.excess.value, 'V', drop.excess.u)} too much"
    )
    yield measured_above_computed.finding(
        case,
        f"{drop.start} to {drop.end}",
        "; ".join([why, *remarks]),
        numbers={
            "measured": drop.measured,
            "computed": drop.computed,
            "excess": drop.excess,
            "current": drop.current,
            "heat": Figure(heat_w, "W", heat_u),
        },
        severity=_severity(heat_w, case.limits),
        source=f"{measured_above_computed.source}; {case.limits.citation('decision')}",
        consequences=(f"at this current {show(heat_w, 'W', heat_u)} turn into heat that the record does not explain",),
    )


def _severity(heat_w: float, limits: Limits) -> Severity:
    """By what may turn into heat in one place, which is not known yet."""
    if heat_w >= limits["heat.immediate_w"]:
        return Severity.IMMEDIATE
    return Severity.SOON if heat_w >= limits["heat.soon_w"] else Severity.WATCH
