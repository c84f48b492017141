"""VD05: the measured drop is below the computed one beyond doubt."""

from collections.abc import Iterator

from rules.assessment import Citation, Finding, Severity
from rules.calc.doubt import probability_above
from rules.case import CircuitCase
from rules.rule import DOUBTS_OF_COMPUTED, DOUBTS_OF_READINGS, named, rule
from rules.units import show
from rules.verdict import beyond_common, cause_words, common_words, doubtful


@rule(
    id="VD05",
    title="Measured drop below the computed drop",
    about="circuit",
    severity=Severity.WATCH,
    remedy="Check the length (out and back entered as one way, feet as metres), the size, and the clamp's place; then read again.",
    caution="A second path for the current reads the same way: another supply, a parallel cable or the building's metal may keep a "
    "circuit live, or carry its current, when its device is open.",
    source=Citation("JCGM 100", "2008", "5.2: doubt of a difference of correlated readings", "from-memory"),
    limits=("decision", *DOUBTS_OF_COMPUTED, *DOUBTS_OF_READINGS),
    under=("RD07",),
)
def measured_below_computed(case: CircuitCase) -> Iterator[Finding]:
    """
    Less voltage is lost than the recorded conductors must lose, beyond the doubt of both. What the diagnosis finds most
    probable is named: a slip in a reading, a length out and back, feet, a larger conductor, a parallel path.

    **Finds**: 0.88 ± 0.02 V measured against 1.76 ± 0.04 V computed at 8 A: half, as when both ways of a cable are entered.

    **Leaves alone**: 1.70 ± 0.02 V against the same, which is within its doubt. A smaller loss than computed is no fault of
    the circuit, but whatever rests on that record is wrong. Where RD07 finds a length mistyped it is a consequence of that.
    """
    drop = case.drop
    if drop is None:
        return
    beyond = beyond_common(drop, case.common)
    if probability_above(-drop.sense * beyond.value, 0.0, beyond.u or 0.0) < case.limits["decision.beyond_doubt"]:
        return
    slip = doubtful(case.diagnosis.causes) if case.diagnosis is not None else None
    less = (
        f"{show(drop.measured.value, 'V', drop.measured.u)} measured against "
        f"{show(drop.computed.value, 'V', drop.computed.u)} computed from {drop.start} to {drop.end} at "
        f"{show(drop.current.value, 'A', drop.current.u)} in round {drop.round}: "
        f"{show(-drop.too_much.value, 'V', drop.excess.u)} too little"
    )
    yield measured_below_computed.finding(
        case,
        f"{drop.start} to {drop.end}",
        less
        + (f"; probably {cause_words(slip)}" if slip else "")
        + (f"; {common_words(case.common)}" if case.common is not None else ""),
        numbers={
            "measured": drop.measured,
            "computed": drop.computed,
            "excess": drop.excess,
            "current": drop.current,
        },
        cause=slip.cause if slip else None,
        source=f"{measured_below_computed.source}; {case.limits.citation('decision')}",
        under=(named("RD07", case),),
        as_consequence=less,
    )
