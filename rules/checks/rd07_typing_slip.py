"""RD07: a reading or a length is off by a factor that people mistype."""

import math
from collections.abc import Iterator, Sequence

from rules.assessment import Citation, Drop, Finding, Place, Severity
from rules.calc.doubt import probability_above
from rules.case import CircuitCase
from rules.compared import compare
from rules.diagnosis.conductor_causes import FEET_IN_A_METRE
from rules.diagnosis.hypotheses import AS_RECORDED, DOUBTFUL
from rules.diagnosis.words import RECORD_WORDS
from rules.errors import MissingData
from rules.record import Figure, Run
from rules.rule import DOUBTS_OF_COMPUTED, DOUBTS_OF_READINGS, rule
from rules.units import show
from rules.verdict import beyond_common, claimed, doubtful, is_by_a_factor, probability_words

LENGTHS = {
    2.0: "that of the loop entered as one way",
    FEET_IN_A_METRE: "feet entered as metres",
    10.0: "a decimal place",
    100.0: "two decimal places",
    1000.0: "three decimal places",
}
"""What was entered over what was meant, and how it comes about."""
NEAR = 2.0
"""Standard uncertainties within which a ratio is one of these factors."""
TELLS = 0.15
"""Relative standard uncertainty above which a ratio is taken for none."""


@rule(
    id="RD07",
    title="Typing slip",
    about="circuit",
    severity=Severity.WATCH,
    remedy="Look at the notes of the day; then correct the value with its reason, or read it again. The entered one stays in the record.",
    caution="A factor that fits is no proof: until it was looked at, neither the entered nor the fitting value is to be worked by.",
    source=Citation("closure tests on readings", status="common practice, no source"),
    limits=("decision", "prior", "doubtful", "slip", "readings", *DOUBTS_OF_COMPUTED, *DOUBTS_OF_READINGS),
)
def typing_slip(case: CircuitCase) -> Iterator[Finding]:
    """
    One value is off by a factor that comes about by mistyping, which explains what nothing else does. A reading: a decimal
    place or two, or a thousand (milli left out or added), as the diagnosis finds it more probable than all else, where no
    drop can be taken for it; where one can, VD02 and VD05 say the same of it. A length: a run, or several alike, loses the half,
    the 3.28th, tenth, hundredth or thousandth part of what it is computed to, and all others what they should, while no fault
    is claimed and the current is no more than its loads explain.

    **Finds**: 234.1 V entered at p1 where 23.4 V would fit; 180 m entered for run 2 where 18 m would fit.

    **Leaves alone**: a run that loses more than it is computed to, which a joint explains too; a sign (RD01), two points
    exchanged (RD02).
    """
    causes = case.diagnosis.causes if case.diagnosis is not None else ()
    if not causes or claimed(causes, case.limits) is not None:
        return
    slip = doubtful(causes)
    told = case.drop is not None and _is_told(case, case.drop)
    if slip is not None and not told and is_by_a_factor(slip):
        yield typing_slip.finding(
            case,
            slip.what.partition(": ")[0],
            f"{slip.what.partition(': ')[2]}; probability {probability_words(slip.probability)}",
            numbers={"probability": Figure(slip.probability, "1")},
            cause=DOUBTFUL,
        )
        return
    of_record = slip is not None and slip.what in (RECORD_WORDS["length_as_loop"], RECORD_WORDS["metres_for_feet"])
    if sum(place.probability for place in causes if place.cause == AS_RECORDED) < 0.5 and not (told and of_record):
        yield from _lengths(case, slip)


def _is_told(case: CircuitCase, drop: Drop) -> bool:
    """Whether VD02 or VD05 report the drop, and with it the slip."""
    beyond = beyond_common(drop, case.common)
    value, u, sure = drop.sense * beyond.value, beyond.u or 0.0, case.limits["decision.beyond_doubt"]
    return (
        probability_above(-value, 0.0, u) >= sure
        or probability_above(drop.too_much.value, 0.0, drop.excess.u or 0.0) >= sure
    )


def _lengths(case: CircuitCase, slip: Place | None) -> Iterator[Finding]:
    """The runs whose lengths are off by one factor, all others being as they should."""
    sure, odd = case.limits["decision.beyond_doubt"], list[tuple[Run, float, Drop]]()
    for end, run in case.tree.ends.items():
        drop = _of_run(case, run, end)
        if drop is None or probability_above(abs(drop.excess.value), 0.0, drop.excess.u or 0.0) < sure:
            continue
        design_a = case.tree.design_current_a.get(end)
        margin = 1 + case.limits["readings.load_margin"]
        if run.one_way_length_m is None or not design_a or abs(drop.current.value) > margin * design_a:
            return  # more current than the loads explain: it may be the current that is off
        odd.append((run, run.one_way_length_m, drop))
    factor = _factor([drop for _, _, drop in odd]) if odd else None
    if factor is None:
        return
    fits = [length * drop.measured.value / drop.computed.value for _, length, drop in odd]
    said = [
        (f"{run.name}: " if len(odd) > 1 else "")
        + f"{show(length, 'm')} was entered, about {show(fit, 'm', digits=3)} would fit, since "
        f"{show(drop.measured.value, 'V', drop.measured.u)} were measured against "
        f"{show(drop.computed.value, 'V', drop.computed.u)} computed"
        for (run, length, drop), fit in zip(odd, fits, strict=True)
    ]
    other = f"; or {slip.what}" if slip is not None and is_by_a_factor(slip) else ""
    yield typing_slip.finding(
        case,
        " and ".join(run.name for run, *_ in odd),
        f"{'; '.join(said)} ({LENGTHS[factor]}){other}",
        numbers={"entered": Figure(odd[0][1], "m"), "fits": Figure(fits[0], "m"), "measured": odd[0][2].measured}
        | {"computed": odd[0][2].computed},
        cause=DOUBTFUL,
    )


def _of_run(case: CircuitCase, run: Run, end: str) -> Drop | None:
    """Measured against computed drop of one run, in the round with the most current; ``None`` where it was not read."""
    best: Drop | None = None
    for this in case.rounds:
        try:
            drop = compare(run.from_point, end, this, case.tree, case.limits)
        except MissingData:
            continue
        if best is None or abs(drop.current.value) > abs(best.current.value):
            best = drop
    return best


def _factor(drops: Sequence[Drop]) -> float | None:
    """What was entered over what was meant, one factor of all, of those that people mistype; ``None`` where none fits."""
    ratios: list[tuple[float, float]] = []
    for drop in drops:
        measured, computed = drop.lost, drop.computed
        if measured.value <= 0 or not computed.value:
            return None
        # the meters' doubt of the measured drop and the record's of the computed one, both relative
        relative = math.hypot((measured.u or 0.0) / measured.value, (computed.u or 0.0) / computed.value)
        ratios.append((relative, math.log(abs(computed.value) / measured.value)))
    if min(ratios)[0] > TELLS:
        return None
    fitting = [factor for factor in LENGTHS if all(abs(ratio - math.log(factor)) <= NEAR * u for u, ratio in ratios)]
    return min(fitting, key=lambda factor: abs(min(ratios)[1] - math.log(factor)), default=None)
