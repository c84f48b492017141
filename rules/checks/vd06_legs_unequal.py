"""VD06: one leg of a path loses more than the other."""

from collections.abc import Iterator

from rules.assessment import Citation, Finding, NotJudged, Severity
from rules.calc.doubt import probability_above
from rules.case import CircuitCase
from rules.decision import Verdict, against_limit
from rules.diagnosis.hypotheses import BAD_CONNECTION, SEMICONDUCTOR
from rules.heat import Hot, full_a, hot_joints
from rules.legs import Unequal, pairs_of_legs
from rules.record import Figure
from rules.rule import DOUBTS_OF_READINGS, rule
from rules.units import show
from rules.verdict import claimed


@rule(
    id="VD06",
    title="Legs lose unequally",
    about="circuit",
    severity=Severity.WATCH,
    remedy="Read millivolts across each termination of the leg that loses more, at the same current, the middle ones first.",
    caution="A long lead along a live leg is live at both ends: clip it first, one hand, fused. Millivolts across a joint become the full "
    "system voltage if it opens: start on auto volts.",
    source=Citation("excess in one leg only is a joint, excess in both is the conductor", status="common practice, no source"),
    also=(Citation("JCGM 100", "2008", "5.2: doubt of a difference of correlated readings", "from-memory"),),
    limits=(
        "decision", "joint_compare", "heat", "resistance_doubt", "length_doubt", "termination", "load_share", *DOUBTS_OF_READINGS
    ),
)  # fmt: skip
def legs_unequal(case: CircuitCase) -> Iterator[Finding | NotJudged]:
    """
    One leg of a path loses more than the other. Both were read with a long lead and differ beyond doubt: length, temperature
    and current are the same in both, so that even a path of unknown length tells. The excess turns at least 0.5 W into
    heat at full load. Severity by that heat: soon from 2 W, immediate from 10 W on, else watch.

    **Finds**: 1.998 V along the positive leg and 1.848 V along the negative one at 300 A, of equal conductors of 120 mm²:
    0.15 V, 45 W in 0.5 mΩ, which is less than a bad connection is sought from.

    **Leaves alone**: 0.517 V and 0.514 V at 12 A; legs that are recorded of different sizes and differ by that; an excess
    whose joint or semiconductor VD02 claims, or that HT01 finds across a joint of that leg.
    """
    claim = claimed(case.diagnosis.causes, case.limits) if case.diagnosis is not None else None
    if claim is not None and claim.cause in (BAD_CONNECTION, SEMICONDUCTOR):
        return
    for pair in pairs_of_legs(case):
        if not isinstance(pair, Unequal):
            yield legs_unequal.gap(case, *pair)
            continue
        known = _known_v(case, pair)
        excess = Figure(pair.excess.value - known, "V", pair.excess.u)
        real = probability_above(excess.value, 0.0, excess.u or 0.0) >= case.limits["decision.beyond_doubt"]
        most = max(full_a(case, pair.point) or 0.0, pair.current.value)
        heat_w = excess.value * most**2 / pair.current.value if pair.current.value else 0.0
        heat = Figure(heat_w, "W", (excess.u or 0.0) * most**2 / pair.current.value if pair.current.value else 0.0)
        verdict = against_limit(heat.value, case.limits["joint_compare.least_w"], heat.u or 0.0, case.limits)
        where = f"{pair.start} to {pair.end}"
        if real and verdict is Verdict.FAILS:
            yield legs_unequal.finding(
                case,
                f"{where} {pair.higher}",
                f"{show(pair.legs['positive'].value, 'V', pair.legs['positive'].u)} along the positive leg and "
                f"{show(pair.legs['negative'].value, 'V', pair.legs['negative'].u)} along the negative one from {where} at "
                f"{show(pair.current.value, 'A', pair.current.u)} in round {pair.round}: the {pair.higher} one loses "
                f"{show(excess.value, 'V', excess.u)} too much beside the other",
                numbers={f"{leg} leg": volts for leg, volts in pair.legs.items()}
                | {"excess": excess, "current": pair.current, "heat at full load": heat},
                severity=_severity(heat.value, case),
                consequences=(f"at {show(most, 'A', digits=3)} {show(heat.value, 'W', heat.u)} turn into heat in it",),
            )
        elif verdict is Verdict.OPEN and not known:
            words = f"the {pair.higher} leg loses {show(excess.value, 'V', excess.u)} more than the other"
            yield legs_unequal.gap(case, where, f"not settled: {words}")


def _known_v(case: CircuitCase, pair: Unequal) -> float:
    """What joints of the higher leg lose that HT01 finds by their readings. [V]"""
    runs = {run.id for run in pair.runs}
    return sum(
        hot.above_healthy_v
        for hot in hot_joints(case)
        if isinstance(hot, Hot)
        and hot.joint.run is not None
        and hot.joint.run.id in runs
        and hot.joint.place.endswith(pair.higher)
        and hot.joint.round == pair.round
    )


def _severity(heat_w: float, case: CircuitCase) -> Severity:
    if heat_w < case.limits["heat.soon_w"]:
        return Severity.WATCH
    return Severity.IMMEDIATE if heat_w >= case.limits["heat.immediate_w"] else Severity.SOON
