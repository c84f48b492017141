"""HT01: a termination that was read across itself turns much into heat."""

from collections.abc import Iterator

from rules.assessment import Citation, Finding, NotJudged, Severity
from rules.calc.doubt import probability_above
from rules.case import CircuitCase
from rules.decision import Verdict
from rules.device_heat import device_heats
from rules.heat import TURNED, Hot, healthy_ohm, hot_joints
from rules.record import Figure
from rules.rise import rises_of
from rules.rule import DOUBTS_OF_READINGS, rule
from rules.units import show


@rule(
    id="HT01",
    title="Heat in a joint",
    about="circuit",
    severity=Severity.SOON,
    remedy="Read it once more across the termination at the same current; then isolate, cut back and remake it, and read it again.",
    caution="Such a joint may glow for hours without tripping anything, and burn who touches it. Do not tighten it live: it can open under "
    "load and draw an arc, and the meter on millivolts then has the full system voltage. Start on auto volts.",
    source=Citation(
        "NBSIR 76-1011",
        "1976",
        "glowing joints of 5 W at 0.8 A and 35 W at 15 A; the classes are our own",
        "from-memory",
    ),
    also=(
        Citation("JCGM 106", "2012", "8.3", "from-memory"),
        Citation("IEC 60898-1", "2015", "largest power loss of a pole", "from-memory"),
    ),
    limits=("heat", "joint_compare", "termination", "decision", "load_share", *DOUBTS_OF_READINGS),
)
def heat_in_a_joint(case: CircuitCase) -> Iterator[Finding | NotJudged]:
    """
    A termination turns more watts into heat than the profile allows. Its millivolts times its current, or its resistance
    times the square of the design current, pass them beyond doubt, and it has more resistance than a healthy termination of
    its size. Severity follows the watts: soon from 2 W, immediate from 10 W on, whatever the percentage of nominal.

    It stands by the reading alone, also where the diagnosis takes the reading for a slip or holds such a resistance for
    out of its range. A joint that VD02 claims is told there, with its heat.

    A reading of the wrong sign counts by its magnitude. One without a current is found where no current up to the device's
    rating lets a healthy termination lose so much.

    **Finds**: 0.15 V at 300 A across a lug of 120 mm²: 0.5 mΩ, 45 W, though it is 0.3 % of 48 V.

    **Leaves alone**: 13 mV at 300 A there, 3.9 W: a healthy lug of that size has 0.04 mΩ, and up to 0.17 mΩ. 0.50 V at
    3 A: 1.5 W. A pole of a device has its own rule, HT03, but where no figure of the device is known: then its watts are
    held against the largest loss that a breaker for such a current may have.
    """
    yield from _devices(case)
    for hot in hot_joints(case):
        if not isinstance(hot, Hot):
            yield heat_in_a_joint.gap(case, *hot)
            continue
        joint = hot.joint
        numbers = {"heat": hot.heat, "resistance": joint.ohm}
        if joint.volts is not None and joint.current is not None and joint.now is not None:
            numbers |= {"voltage": joint.volts, "current": joint.current, "heat as read": joint.now}
            read = (
                f"{show(joint.volts.value, 'V', joint.volts.u)} across {joint.place} at "
                f"{show(joint.current.value, 'A', joint.current.u)} in round {joint.round}: "
                f"{show(joint.now.value, 'W', joint.now.u)}"
            )
        elif joint.volts is not None:
            read = f"{show(joint.volts.value, 'V', joint.volts.u)} across {joint.place}"
        else:
            read = f"{show(joint.ohm.value, 'ohm', joint.ohm.u)} across {joint.place}, read dead"
        if hot.doubt == TURNED:
            read += f", {hot.doubt}"
        if joint.volts is not None and joint.current is None:
            numbers["voltage"] = joint.volts
            read += f" ({hot.doubt}); at design current {show(hot.heat.value, 'W', hot.heat.u)}"
        elif joint.full_a is not None and joint.full is not None:
            numbers["largest current"] = Figure(joint.full_a, "A")
            read += f"; at {show(joint.full_a, 'A', digits=3)} {show(joint.full.value, 'W', joint.full.u)}"
        assert joint.run is not None
        mean, _ = healthy_ohm(case, joint.run)
        yield heat_in_a_joint.finding(
            case,
            joint.place,
            f"{read}; {show(joint.ohm.value, 'ohm', digits=3)} where a healthy one has about {show(mean, 'ohm', digits=2)}",
            numbers=numbers,
            severity=_severity(hot.heat, case),
            source=f"{heat_in_a_joint.source}; {case.limits.citation('heat')}",
            consequences=tuple(_consequences(case, hot)),
        )


def _devices(case: CircuitCase) -> Iterator[Finding | NotJudged]:
    """The hottest reading of a device without a figure; a gap where none is settled."""
    found = list(device_heats(case))
    hot = [one for one in found if one.verdict is Verdict.FAILS]
    if not hot:
        yield from (
            heat_in_a_joint.gap(
                case,
                one.place,
                f"not settled: {show(one.heat.value, 'W', one.heat.u)} against {show(one.most_w, 'W', digits=3)}",
            )
            for one in found
            if one.verdict is Verdict.OPEN
        )
        return
    most = max(hot, key=lambda one: one.heat.value)
    whose = "the profile allows" if most.most_w <= case.limits["heat.soon_w"] else "a device for it may lose at most"
    yield heat_in_a_joint.finding(
        case,
        most.place,
        f"{most.words}: {show(most.heat.value, 'W', most.heat.u)} at {show(most.current_a, 'A', digits=3)}, "
        f"where {whose} {show(most.most_w, 'W', digits=3)}",
        numbers={"heat": most.heat, "resistance": most.ohm, "most of a device": Figure(most.most_w, "W")},
        severity=_severity(most.heat, case),
        remedy="Read across each pole of the device once more at the same current, and its rating; isolate, look at its terminals and work "
        "it some times; where it stays high, have it exchanged.",
        source=f"{heat_in_a_joint.source}; {case.limits.citation('heat')}",
    )


def _severity(heat: Figure, case: CircuitCase) -> Severity:
    limits = case.limits
    if heat.value < limits["heat.soon_w"]:
        return Severity.WATCH
    return Severity.IMMEDIATE if heat.value >= limits["heat.immediate_w"] else Severity.SOON


def _consequences(case: CircuitCase, hot: Hot) -> Iterator[str]:
    for place, rise in rises_of(case).items():
        if set(place.split()) <= set(hot.joint.place.split()) and rise.rise.value > 0:
            yield rise.words
    drop = case.drop
    if drop is None or hot.joint.round != drop.round:
        return
    excess = drop.too_much
    if probability_above(excess.value, 0.0, excess.u or 0.0) >= case.limits["decision.beyond_doubt"]:
        yield (
            f"of the {show(excess.value, 'V', excess.u)} that are lost more than computed from {drop.start} to {drop.end}, "
            f"{show(hot.above_healthy_v, 'V', digits=2)} are lost in it"
        )
