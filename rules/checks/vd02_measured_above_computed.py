"""VD02: more voltage is lost than the record accounts for, with the cause that the readings claim."""

import math
from collections.abc import Iterator

from rules.assessment import Citation, Drop, Finding, NotJudged, Place, Severity
from rules.calc.doubt import probability_above, total
from rules.case import CircuitCase, LoadPoint
from rules.diagnosis.hypotheses import AS_RECORDED, BAD_CONNECTION, LONGER, OTHER_METAL, SEMICONDUCTOR, SMALLER
from rules.heat import DEVICE, accounted_v, joints_read
from rules.joints import heat_at, most_read_a, semiconductor_v
from rules.limits import Limits
from rules.record import Figure
from rules.rise import rises_of
from rules.rule import DOUBTS_OF_COMPUTED, DOUBTS_OF_READINGS, rule
from rules.thinner import of_conductors
from rules.unaccounted import Lost, most_unaccounted
from rules.units import show
from rules.verdict import (
    MOST_SAID,
    NOT_RULED_OUT,
    TOLD,
    Claim,
    cause_words,
    claimed,
    common_words,
    doubtful,
    is_by_a_factor,
    probability_words,
)

CONDUCTOR = (
    "Look at the conductor at both ends: print on the sheath, size by gauge, a scraped cut end for its metal; tape or pulse its "
    "length. Correct the record; a smaller conductor or another metal is compared with its device and terminals."
)
REMEDIES = {
    BAD_CONNECTION: "Measure millivolts across each termination of {} at the same current; isolate, cut back and remake the bad "
    "one, then read it again.",
    SMALLER: CONDUCTOR,
    OTHER_METAL: CONDUCTOR,
    LONGER: CONDUCTOR,
    SEMICONDUCTOR: "Look for a diode or an electronic switch at the start of {} and read the drop across it at two currents.",
}
"""What to do next, by cause; the place goes into the braces."""
OF_A_DEVICE = (
    "Read millivolts across each pole of the device once more at the same current; isolate, look at its terminals and work it some times; "
    "where it stays high, have it exchanged."
)
READ_AGAIN = "Read it again, and compare length, size and points with the record, before anything else is done."
ENDS_KNOWN = "Isolate, cut back and remake the termination at {}; then read it again at the same current."


@rule(
    id="VD02",
    title="Measured drop above the computed drop",
    about="circuit",
    severity=Severity.WATCH,
    remedy="Measure millivolts along each leg and across each termination of the path at the same current, the middle first.",
    caution="Millivolt readings across a closed joint become the full system voltage if it opens: start on auto volts. "
    "Do not tighten or open anything live; cut back and remake heated conductors when isolated. "
    "A cause is named by probability: look before replacing anything.",
    source=Citation("JCGM 100", "2008", "5.2: doubt of a difference of correlated readings", "from-memory"),
    limits=(
        "decision",
        "heat",
        "prior",
        "bad_connection",
        "joint_scaling",
        "capacity",
        *DOUBTS_OF_COMPUTED,
        *DOUBTS_OF_READINGS,
    ),
)
def measured_above_computed(case: CircuitCase) -> Iterator[Finding | NotJudged]:
    """
    More voltage is lost than the recorded conductors account for, beyond the doubt of both.

    The cause is named where the readings claim one: some fault at the profile's probability, most of it with a
    joint, a semiconductor, or the conductors, of which size, metal and length are often not to be told apart. A
    bad connection has its severity from the heat in it at design current, any other cause from the excess times
    the current read: soon from the profile's 2 W, immediate from 10 W on, which can burn. An excess that a slip
    explains better than a fault is to be read again, with the severity of the heat that it would be if the reading is
    true, wherever it was read; soon at most where a decimal place would mend it. That no bad connection so large is
    looked for does not make it a slip.

    **Finds**: 2.45 ± 0.02 V measured against 1.92 ± 0.05 V computed at 8 A: 4.2 W too much, so it is for soon.
    A joint of 40 mΩ, read across itself, that the drop of a cable of guessed length would hide.

    **Leaves alone**: 2.02 ± 0.02 V against the same computed drop, which two standard uncertainties cover. Readings
    that cannot be (RD01, RD02) are not judged.
    """
    if case.unused:
        yield measured_above_computed.gap(case, "readings", f"read, but of no use here: {', '.join(case.unused)}")
    for round_, lacks in case.drop.unfinished if case.drop is not None else ():
        yield measured_above_computed.gap(
            case, f"round {round_}", f"unfinished, so that one of less current stands for it: {lacks}"
        )
    causes = case.diagnosis.causes if case.diagnosis is not None else ()
    claim = claimed(causes, case.limits)
    slip = doubtful(causes) if claim is None else None
    lost = most_unaccounted(case) if slip is not None and not is_by_a_factor(slip) else None
    if case.drop is None and claim is None and case.visit:
        yield measured_above_computed.gap(case, "", case.drop_gap)
    if claim is None and not _beyond_doubt(case):
        if slip is not None and lost is not None:
            yield _elsewhere(case, slip, lost)
        return  # also where a joint that HT01 finds by its reading alone accounts for it
    drop = case.drop
    along = f"{drop.start} to {drop.end}" if drop else "all runs"
    if slip is not None:
        if_so = {"heat if so": lost.heat} if lost is not None else {}
        yield measured_above_computed.finding(
            case,
            along,
            "; ".join([*_drop_words(drop), _slip_words(slip, lost), *_remarks(case)]),
            numbers=_numbers(drop, None) | if_so,
            remedy=READ_AGAIN,
            severity=_of_doubtful(case, lost),
            cause=slip.cause,
            source=f"{measured_above_computed.source}; {case.limits.citation('decision')}",
            consequences=tuple(_if_so(lost)),
            without=("bad_connection",) if lost is None else (),
        )
        return
    heat = _heat(case, claim)
    read = _heat_as_read(case, claim) if claim is not None and claim.cause == BAD_CONNECTION else None
    heats = {name: figure for name, figure in (("heat", heat), ("heat as read", read)) if figure is not None}
    citation = f"{measured_above_computed.source}; {case.limits.citation('decision')}"
    parts = [*_drop_words(drop), *([_claim_words(case, claim)] if claim else _open_words(causes)), *_remarks(case)]
    if drop is not None and claim is not None and not _shows(drop, case.limits):
        hidden = (
            f"the drop from {drop.start} to {drop.end} in round {drop.round}, "
            f"{show(drop.measured.value, 'V', drop.measured.u)} measured against "
            f"{show(drop.computed.value, 'V', drop.computed.u)} computed, does not show it"
        )
        parts = [_claim_words(case, claim), hidden, *_remarks(case)]
    yield measured_above_computed.finding(
        case,
        claim.where if claim and claim.where else along,
        "; ".join(parts),
        numbers=_numbers(drop, claim) | heats | _at_worst(case, claim),
        severity=_severity(heat, case.limits),
        remedy=_remedy(claim),
        cause=claim.cause if claim else None,
        source=citation,
        without=() if claim is not None and claim.cause == BAD_CONNECTION else ("bad_connection",),
        consequences=tuple(_consequences(case, claim, heat)),
    )


def _shows(drop: Drop, limits: Limits) -> bool:
    """Whether the drop itself is above the computed one beyond doubt; a joint or one leg may tell what it hides."""
    return probability_above(drop.too_much.value, 0.0, drop.excess.u or 0.0) >= limits["decision.beyond_doubt"]


def _beyond_doubt(case: CircuitCase) -> bool:
    """The excess is real, whatever it comes from; without a diagnosis by its doubt alone."""
    if case.drop is None:
        return False
    excess, joints_v = case.drop.too_much, accounted_v(case)
    if probability_above(excess.value, joints_v, excess.u or 0.0) < case.limits["decision.beyond_doubt"]:
        return False
    return case.diagnosis is None or case.diagnosis.probability(AS_RECORDED) < 0.5


def _heat(case: CircuitCase, claim: Claim | None) -> Figure | None:
    """Heat that the record does not explain: in the bad connection at design current, else in all at this current."""
    drop = case.drop
    if claim is not None and claim.cause == BAD_CONNECTION:
        # at design, or at what was read where that is more: a load is not always recorded as it is
        read_a = abs(drop.current.value) if drop is not None else 0.0
        return max(
            (heat_at(joint, _most_a(case, joint.point, read_a)) for joint in claim.joints),
            key=lambda heat: heat.value,
        )
    if drop is None:
        return None
    value = drop.too_much.value * abs(drop.current.value)
    u = math.hypot((drop.excess.u or 0.0) * drop.current.value, drop.excess.value * (drop.current.u or 0.0))
    return Figure(value, "W", u)


def _most_a(case: CircuitCase, point: str, read_a: float) -> float:
    read = [abs(total(this.amps[point])[0]) for this in case.rounds if point in this.amps]
    return max([case.largest_current_a.get(point, read_a), *read])


def _elsewhere(case: CircuitCase, slip: Place, lost: Lost) -> Finding:
    """A reading in doubt away from the path of the drop, by what it would be if it is true."""
    return measured_above_computed.finding(
        case,
        lost.place,
        f"{lost.words}; {_slip_words(slip, lost)}",
        numbers={"extra resistance": lost.ohm, "current": lost.current, "heat if so": lost.heat},
        remedy=READ_AGAIN,
        severity=_of_doubtful(case, lost),
        cause=slip.cause,
        source=f"{measured_above_computed.source}; {case.limits.citation('decision')}",
        consequences=tuple(_if_so(lost)),
    )


def _slip_words(slip: Place, lost: Lost | None) -> str:
    """A slip as probable as it is found; beside it a bad connection that explains the readings as well."""
    if lost is None or not lost.is_as_a_joint:
        return f"probably {cause_words(slip)}"
    return f"{lost.joint_words}, or a slip ({slip.what})" if slip.what else f"{lost.joint_words}, or a slip"


def _if_so(lost: Lost | None) -> Iterator[str]:
    if lost is not None:
        at = show(lost.current.value, "A", lost.current.u)
        yield f"if the reading is true, {show(lost.heat.value, 'W', lost.heat.u)} turn into heat in {lost.place} at {at}"


def _of_doubtful(case: CircuitCase, lost: Lost | None) -> Severity:
    """That a slip explains it best makes the heat no less urgent, should it be there; a factor that is often mistyped does."""
    if lost is not None:
        return _severity(lost.heat, case.limits)
    heat = _heat(case, None)
    return Severity.SOON if heat is not None and heat.value >= case.limits["heat.soon_w"] else Severity.WATCH


def _severity(heat: Figure | None, limits: Limits) -> Severity:
    """By what turns into heat in one place, or may."""
    if heat is None or heat.value < limits["heat.soon_w"]:
        return Severity.WATCH
    return Severity.IMMEDIATE if heat.value >= limits["heat.immediate_w"] else Severity.SOON


def _drop_words(drop: Drop | None) -> Iterator[str]:
    if drop is not None:
        yield (
            f"{show(drop.measured.value, 'V', drop.measured.u)} measured against "
            f"{show(drop.computed.value, 'V', drop.computed.u)} computed from {drop.start} to {drop.end} at "
            f"{show(drop.current.value, 'A', drop.current.u)} in round {drop.round}: "
            f"{show(drop.too_much.value, 'V', drop.excess.u)} too much"
        )


def _open_words(causes: tuple[Place, ...]) -> Iterator[str]:
    """What it may be where no cause is claimed."""
    rows = [row for row in causes[:MOST_SAID] if row.probability >= TOLD]
    if rows:
        yield "its cause is not settled: " + ", ".join(cause_words(row) for row in rows)


def _claim_words(case: CircuitCase, claim: Claim) -> str:
    against = "".join(f", else {cause_words(row)}" for row in claim.against)
    if claim.cause in (SMALLER, OTHER_METAL, LONGER):
        rows = sorted([*claim.places, *claim.others], key=lambda place: -place.probability)
        in_all = probability_words(sum(row.probability for row in rows))
        words = ", ".join(cause_words(row) for row in rows) + against
        lost = most_unaccounted(case)
        if lost is not None and lost.alone and lost.ohm.value > lost.edge_ohm:
            words += f", else {lost.joint_words}"
        return f"the conductors are probably not as recorded ({in_all}): {words}"
    said = f"probably a {claim.cause} in {claim.where} ({probability_words(claim.probability)})"
    if claim.cause == SEMICONDUCTOR:
        return f"{said}{_offset_words(case, claim)}{against}"
    ohms = " and ".join(filter(None, (_ohm_words(joint) for joint in claim.place.joints or (claim.place,))))
    return f"{said}: {ohms} extra{against}" if ohms else said + against


def _offset_words(case: CircuitCase, claim: Claim) -> str:
    """What a semiconductor loses whatever the current; empty where it is not known."""
    lost = semiconductor_v(case, claim.place)
    return f": about {show(lost.value, 'V', digits=2)} whatever the current" if lost is not None else ""


def _ohm_words(joint: Place) -> str:
    """An extra resistance with its bounds; empty where it has none."""
    low, best, high = joint.low_ohm, joint.best_ohm, joint.high_ohm
    if low is None or best is None or high is None:
        return ""
    return f"{show(best, 'ohm', digits=3)} ({show(low, 'ohm', digits=3)} to {show(high, 'ohm', digits=3)})"


def _remarks(case: CircuitCase) -> Iterator[str]:
    if case.common is not None:
        yield common_words(case.common)
    if case.drop is None:
        return
    this = next(r for r in case.rounds if r.name == case.drop.round)
    if this.wander_v == 0 and case.drop.by == "two voltages":
        yield "the source is taken as steady, since no point was read twice"
    if this.poor:
        yield f"{', '.join(this.poor)}: instrument not recorded, counted as a poor meter"


def _numbers(drop: Drop | None, claim: Claim | None) -> dict[str, Figure]:
    numbers: dict[str, Figure] = {}
    if drop is not None:
        numbers |= {
            "measured": drop.measured,
            "computed": drop.computed,
            "excess": drop.excess,
            "current": drop.current,
        }
    if claim is not None:
        numbers["probability"] = Figure(claim.probability, "1")
        bounds = (
            ("extra resistance", claim.place.best_ohm),
            ("from", claim.place.low_ohm),
            ("to", claim.place.high_ohm),
        )
        numbers |= {name: Figure(ohm, "ohm") for name, ohm in bounds if ohm is not None}
    return numbers


def _remedy(claim: Claim | None) -> str | None:
    if claim is None:
        return None
    if claim.cause == BAD_CONNECTION and claim.where.split()[0] == DEVICE:
        return OF_A_DEVICE
    separated = claim.cause == BAD_CONNECTION and all(_is_end(joint.where) for joint in claim.joints)
    several = len(claim.places) > 1
    return (ENDS_KNOWN if separated and not several else REMEDIES[claim.cause]).format(claim.where)


def _consequences(case: CircuitCase, claim: Claim | None, heat: Figure | None) -> Iterator[str]:
    if heat is not None and claim is not None and claim.cause == BAD_CONNECTION:
        told = list(_as_read(case, claim))
        read = None if told else _heat_as_read(case, claim)
        as_read = "" if read is None else f", {show(read.value, 'W', read.u)} while it was read"
        yield f"at design current {show(heat.value, 'W', heat.u)} turn into heat in one place{as_read}"
        yield from told
    elif heat is not None:
        yield f"at this current {show(heat.value, 'W', heat.u)} turn into heat that the record does not explain"
    if claim is not None:
        yield from of_conductors(
            case, [row for row in (*claim.places, *claim.others) if row.probability >= NOT_RULED_OUT]
        )
    if claim is not None and claim.cause == SEMICONDUCTOR:
        yield "it passes current in one direction only: a battery behind it is not charged through it"
    most = _most_affected(case) if claim is not None else None
    for point in case.loads:
        lowest, worst = point.load.lowest_voltage_v, case.worst.get(point.load.point)
        below = lowest is not None and worst is not None and worst.value < lowest <= point.lowest_v
        if worst is None or not (below or point is most):
            continue
        gets = f"with the source at its lowest {point.load.tag} gets {show(worst.value, 'V', worst.u)}"
        if below and lowest is not None:
            gets += f", below its lowest {show(lowest, 'V')}"
        if point.lowest_gap or math.isnan(point.source_lowest_v):
            yield gets
            continue
        source_v = point.source_lowest_v
        yield (
            f"{gets}; of the source's {show(source_v, 'V')} {show(source_v - worst.value, 'V', worst.u)} are lost, as recorded "
            f"{show(source_v - point.lowest_v, 'V', point.lowest_u)}, which leaves {show(point.lowest_v, 'V', point.lowest_u)}"
        )


def _heat_as_read(case: CircuitCase, claim: Claim) -> Figure | None:
    """Of the bad connection with the most of it, at the most that it carried while it was read."""
    heats = [
        heat_at(joint, current_a) for joint in claim.joints if (current_a := most_read_a(case, joint.point)) is not None
    ]
    return max(heats, key=lambda heat: heat.value, default=None)


def _most_affected(case: CircuitCase) -> LoadPoint | None:
    """The load that gets so much less than recorded as no other; ``None`` where that is not known."""
    known = [point for point in case.loads if point.load.point in case.worst and not point.lowest_gap]
    return max(known, key=lambda point: point.lowest_v - case.worst[point.load.point].value, default=None)


def _at_worst(case: CircuitCase, claim: Claim | None) -> dict[str, Figure]:
    """Voltage at the load that is most affected with the source at its lowest, with and without the fault."""
    most = _most_affected(case) if claim is not None else None
    if most is None:
        return {}
    return {"at worst": case.worst[most.load.point], "at worst as recorded": Figure(most.lowest_v, "V", most.lowest_u)}


def _as_read(case: CircuitCase, claim: Claim) -> Iterator[str]:
    """What the joints of a claim show now: their watts as read, and their temperature."""
    places = {place for joint in claim.joints for place in _places(joint.where)}
    for joint in joints_read(case):
        now = joint.now
        if joint.place in places and now is not None and joint.current is not None:
            amps = show(joint.current.value, "A", joint.current.u)
            yield f"{show(now.value, 'W', now.u)} at the {amps} of round {joint.round}, read across {joint.place}"
    for place, rise in rises_of(case).items():
        if any(set(place.split()) <= set(where.split()) for where in places) and rise.rise.value > 0:
            yield rise.words


def _places(where: str) -> Iterator[str]:
    """A place of the diagnosis as readings name it; its leg alone, or a whole run, is none."""
    if _is_end(where) or where.startswith(DEVICE):
        yield where


def _is_end(where: str) -> bool:
    """Whether a place is one termination, ``run 1 end positive``."""
    return where.count(" ") == 3
