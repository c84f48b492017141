"""HT03: a pole or joint has more resistance than its kind, by what is published or by the lowest similar one."""

import math
from collections.abc import Iterator
from dataclasses import dataclass

from rules.assessment import Citation, Finding, NotJudged, Severity
from rules.calc.device import device_resistance_ohm
from rules.case import CircuitCase
from rules.context import SimilarJoint
from rules.decision import Verdict, against_limit
from rules.heat import DEVICE, Hot, Joint, claims, healthy_ohm, hot_joints, joints_read, kind_of
from rules.record import Figure
from rules.rule import DOUBTS_OF_READINGS, rule
from rules.units import show

WITH_A_CEILING = ("breaker B", "breaker C", "breaker D", "fuse gG")
"""Devices whose product standard states the largest loss of a pole."""
BLADE_SPREAD = 1.15
"""Times a maker's cold resistance that a blade fuse may have: makers vary by 10 to 15 %, practice."""
BLADE_WARMING = 0.5
"""Share by which a blade fuse at its rated current has more resistance than cold, growing with the square of the current: makers'
0.09 to 0.11 V at rating beside 2 to 8 mΩ cold, from memory."""
BLADE_HOLDER_OHM = 0.002
"""The most of 1 to 2 mΩ that a blade fuse's holder adds to a pole, practice. [ohm]"""
ELECTRONIC_MOST_V = 0.2
"""Across an electronic protector at its rating, the most of makers' figures of 0.1 to 0.2 V, practice. [V]"""


@rule(
    id="HT03",
    title="Pole or joint above its kind",
    about="circuit",
    severity=Severity.WATCH,
    remedy="Work the device some times, isolated, and read it again at the same current; read its neighbours too. Where it stays high, "
    "have it exchanged, or the joint remade.",
    caution="Makers hold that a comparison alone says little of a breaker: do not condemn one by it. A fuse or contact that is read on "
    "millivolts opens without warning and then has the full system voltage across it. Pull no fuse under load.",
    source=Citation("IEC 60898-1", "2015", "largest power loss of a pole", "from-memory"),
    also=(
        Citation("ANSI/NETA MTS", "", "50 % above the lowest similar: investigate; seen second-hand", "verified"),
        Citation("IEC 60269-2", "", "largest power loss of gG fuse-links", "from-memory"),
    ),
    limits=("joint_compare", "heat", "decision", "load_share", "termination", *DOUBTS_OF_READINGS),
)
def above_its_kind(case: CircuitCase) -> Iterator[Finding | NotJudged]:
    """
    A pole or a termination loses much more than its kind should. A pole has more resistance than is published of it: what
    its product standard allows a breaker or gG fuse to lose, what makers state of electronic protectors
    and, warm and with its holder, of blade fuses.
    A termination has more than half as much again as the lowest similar one of the visit, and more than a healthy one of
    its size can have; a pole of which nothing is published half as much again as a similar one. Either way it must turn
    0.5 W more into heat at full load than what it is compared with, such a pole 2 W: a comparison alone is never a
    finding, nor are watts alone.

    Similar are poles of the same kind and rating, terminations of the same size and metal. Severity by the heat beyond it:
    soon from 2 W, immediate from 10 W on, else watch.

    **Finds**: 0.35 V at 16 A across a pole of a 16 A breaker, 22 mΩ: the standard allows 3.5 W, 13.7 mΩ.

    **Leaves alone**: 0.13 V at 16 A there; three poles of 50, 60 and 76 µΩ at 100 A, where the highest is 52 % above the
    lowest but has 0.26 W more; lugs of 0.05 and 0.15 mΩ on 120 mm², both healthy though one has 9 W more at 300 A. A
    termination that VD02 claims or HT01 finds is told there.
    """
    found_hot = {hot.joint.place for hot in hot_joints(case) if isinstance(hot, Hot)}
    for joint in joints_read(case):
        if joint.place in found_hot or claims(case, joint.place):
            continue
        if joint.gap:
            if joint.run is None:  # HT01 says so of a termination
                yield above_its_kind.gap(case, joint.place, joint.gap)
            continue
        yield from _of_joint(case, joint)


@dataclass(frozen=True, slots=True)
class _Reference:
    """What a joint is compared with."""

    ohm: Figure
    factor: float
    """By which it may be above."""
    least_ohm: float
    """Below it nothing is said, whatever it is compared with. [ohm]"""
    least_w: float
    """Heat beyond it that is asked for. [W]"""
    words: str


def _of_joint(case: CircuitCase, joint: Joint) -> Iterator[Finding | NotJudged]:
    reference = _published(case, joint) or _compared(case, joint)
    if reference is None:
        if joint.run is None:
            why = "nothing is published of such a device, and no similar one was read"
            yield above_its_kind.gap(case, joint.place, why)
        return
    if joint.full_a is None:
        yield above_its_kind.gap(case, joint.place, "the largest current there is not known")
        return
    own_u, its_u = joint.ohm.u or 0.0, reference.ohm.u or 0.0
    square = joint.full_a**2
    more = Figure((joint.ohm.value - reference.ohm.value) * square, "W", math.hypot(own_u, its_u) * square)
    allowed = reference.factor * reference.ohm.value
    verdicts = (
        against_limit(joint.ohm.value, allowed, math.hypot(own_u, reference.factor * its_u), case.limits),
        against_limit(joint.ohm.value, reference.least_ohm, own_u, case.limits),
        against_limit(more.value, reference.least_w, more.u or 0.0, case.limits),
    )
    if all(verdict is Verdict.FAILS for verdict in verdicts):
        yield _found(case, joint, reference, more)
    elif Verdict.CONFORMS not in verdicts:
        yield above_its_kind.gap(
            case,
            joint.place,
            f"not settled: {show(joint.ohm.value, 'ohm', joint.ohm.u)}, {reference.words}",
        )


def _found(case: CircuitCase, joint: Joint, reference: _Reference, more: Figure) -> Finding:
    limits = case.limits
    read = "read dead"
    numbers = {"resistance": joint.ohm, "compared with": reference.ohm, "heat beyond it": more}
    if joint.volts is not None and joint.current is not None:
        read = f"{show(joint.volts.value, 'V', joint.volts.u)} at {show(joint.current.value, 'A', joint.current.u)}"
        numbers |= {"voltage": joint.volts, "current": joint.current}
    severity = Severity.WATCH
    if more.value >= limits["heat.soon_w"]:
        severity = Severity.IMMEDIATE if more.value >= limits["heat.immediate_w"] else Severity.SOON
    return above_its_kind.finding(
        case,
        joint.place,
        f"{joint.place} has {show(joint.ohm.value, 'ohm', joint.ohm.u)} ({read}), {reference.words}: at "
        f"{show(joint.full_a or 0.0, 'A', digits=3)} {show(more.value, 'W', more.u)} more heat",
        numbers=numbers,
        severity=severity,
        source=f"{above_its_kind.source}; {limits.citation('joint_compare')}",
    )


def _published(case: CircuitCase, joint: Joint) -> _Reference | None:
    """What is published of a pole as the most that it may have; ``None`` of a termination and of other devices."""
    circuit, rated = case.circuit, case.circuit.rated_current_a
    if joint.run is not None or rated is None:
        return None
    poles = circuit.device_poles or 1 if joint.place == DEVICE and circuit.device_leg == "both" else 1
    if circuit.device in WITH_A_CEILING:
        most, whose = device_resistance_ohm(circuit.device, rated, poles, 1.0), "the standard allows"
    elif circuit.device == "fuse blade":
        typical = device_resistance_ohm(circuit.device, rated, poles)
        share = joint.current.value / rated if joint.current is not None else 0.0  # a dead test reads it cold
        warm = 1 + BLADE_WARMING * min(share, 1.0) ** 2
        most = typical and BLADE_SPREAD * warm * typical + poles * BLADE_HOLDER_OHM
        whose = "makers' figure, warm, and its holder make at most"
    elif circuit.device == "electronic":
        most, whose = poles * ELECTRONIC_MOST_V / rated, "makers state at most"
    else:
        return None
    if not most:
        return None
    words = f"where {whose} {show(most, 'ohm', digits=3)}"
    return _Reference(Figure(most, "ohm"), 1.0, 0.0, case.limits["joint_compare.least_w"], words)


def _compared(case: CircuitCase, joint: Joint) -> _Reference | None:
    """The lowest similar joint of the visit; ``None`` where no other was read."""
    own = [SimilarJoint("", other.place, other.ohm) for other in joints_read(case) if _alike(case, joint, other)]
    elsewhere = case.context.joints.get(kind_of(joint, case.circuit, case.visit), ())
    similar = [*own, *(other for other in elsewhere if other.circuit != case.tag)]
    if not similar:
        return None
    limits = case.limits
    lowest = min(similar, key=lambda other: other.ohm.value)
    place = f"{lowest.place} of {lowest.circuit}" if lowest.circuit else lowest.place
    words = (
        f"{joint.ohm.value / lowest.ohm.value:.1f} times the {show(lowest.ohm.value, 'ohm', digits=3)} of {place}, the "
        + (f"lowest of {len(similar)} similar" if len(similar) > 1 else "only similar one that was read")
    )
    _, healthy = healthy_ohm(case, joint.run) if joint.run is not None else (0.0, 0.0)
    least_w = limits["joint_compare.least_w"] if joint.run is not None else limits["heat.limit_w"]
    return _Reference(lowest.ohm, 1 + limits["joint_compare.above_similar"], healthy, least_w, words)


def _alike(case: CircuitCase, joint: Joint, other: Joint) -> bool:
    """Whether another joint of the circuit is of the same kind."""
    if other.place == joint.place or other.gap or not other.ohm.value > 0:
        return False
    return kind_of(joint, case.circuit, "") == kind_of(other, case.circuit, "")
