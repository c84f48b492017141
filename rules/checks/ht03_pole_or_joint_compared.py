"""HT03: a pole or joint has more resistance than its kind, by what is published or by the lowest similar one."""

from collections.abc import Iterator
from dataclasses import dataclass

from rules.assessment import Citation, Finding, NotJudged, Severity
from rules.calc.device import device_resistance_ohm
from rules.case import CircuitCase, SimilarJoint
from rules.decision import Verdict, against_limit
from rules.heat import DEVICE, Hot, Joint, claims, hot_joints, joints_read, kind_of
from rules.record import Figure
from rules.rule import DOUBTS_OF_READINGS, rule
from rules.units import show

WITH_A_CEILING = ("breaker B", "breaker C", "breaker D", "fuse gG")
"""Devices whose product standard states the largest loss of a pole."""


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
    A pole or a termination loses much more than others of its kind. The drop across one pole of a device is above what its
    product standard allows, or that of a pole or termination more than 50 % above the lowest similar one that was read on
    the same visit; and, either way, it turns at least 0.5 W more into heat at full load than that. A comparison alone is
    never a finding, nor are watts alone.

    Similar are poles of the same kind and rating, terminations of the same size and metal. Severity by the heat beyond it:
    soon from 2 W, immediate from 10 W on, else watch.

    **Finds**: 0.35 V at 16 A across a pole of a 16 A breaker, 22 mΩ: the standard allows 3.5 W, 13.7 mΩ.

    **Leaves alone**: 0.13 V at 16 A there; three poles of 50, 60 and 76 µΩ at 100 A, where the highest is 52 % above the
    lowest but has 0.26 W more. A termination that VD02 claims or HT01 finds is told there.
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
    ohm: Figure
    """What it is compared with, and by how much it may be above."""
    factor: float
    words: str


def _of_joint(case: CircuitCase, joint: Joint) -> Iterator[Finding | NotJudged]:
    references = list(_references(case, joint))
    if joint.full_a is None:
        if references:
            yield above_its_kind.gap(case, joint.place, "the largest current there is not known")
        return
    square, least_w = joint.full_a**2, case.limits["joint_compare.least_w"]
    open_ = ""
    for reference in references:
        limit = reference.factor * reference.ohm.value
        u = ((joint.ohm.u or 0.0) ** 2 + (reference.factor * (reference.ohm.u or 0.0)) ** 2) ** 0.5
        more_w = (joint.ohm.value - reference.ohm.value) * square
        more_u = ((joint.ohm.u or 0.0) ** 2 + (reference.ohm.u or 0.0) ** 2) ** 0.5 * square
        by_ohm = against_limit(joint.ohm.value, limit, u, case.limits)
        by_heat = against_limit(more_w, least_w, more_u, case.limits)
        if by_ohm is Verdict.FAILS and by_heat is Verdict.FAILS:
            yield _found(case, joint, reference, Figure(more_w, "W", more_u))
            return
        if Verdict.CONFORMS not in (by_ohm, by_heat):
            open_ = f"not settled: {show(joint.ohm.value, 'ohm', joint.ohm.u)} against {reference.words}"
    if open_:
        yield above_its_kind.gap(case, joint.place, open_)
    elif not references and joint.run is None:
        yield above_its_kind.gap(
            case, joint.place, "nothing is published of such a device, and no similar one was read"
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


def _references(case: CircuitCase, joint: Joint) -> Iterator[_Reference]:
    circuit, poles = case.circuit, 1
    if joint.run is None:
        if joint.place == DEVICE and circuit.device_leg == "both":
            poles = circuit.device_poles or 1
        ceiling = (
            device_resistance_ohm(circuit.device, circuit.rated_current_a, poles, 1.0)
            if circuit.device in WITH_A_CEILING
            else None
        )
        if ceiling:
            words = f"where the standard allows {show(ceiling, 'ohm', digits=3)}"
            yield _Reference(Figure(ceiling, "ohm"), 1.0, words)
    own = [SimilarJoint("", other.place, other.ohm) for other in joints_read(case) if _alike(case, joint, other)]
    elsewhere = case.context.joints.get(kind_of(joint, circuit, case.visit), ())
    similar = [*own, *(other for other in elsewhere if other.circuit != case.tag)]
    if similar:
        lowest = min(similar, key=lambda other: other.ohm.value)
        place = f"{lowest.place} of {lowest.circuit}" if lowest.circuit else lowest.place
        yield _Reference(
            lowest.ohm,
            1 + case.limits["joint_compare.above_similar"],
            f"{joint.ohm.value / lowest.ohm.value:.1f} times the {show(lowest.ohm.value, 'ohm', digits=3)} of {place}, the "
            + (f"lowest of {len(similar)} similar" if len(similar) > 1 else "only similar one that was read"),
        )


def _alike(case: CircuitCase, joint: Joint, other: Joint) -> bool:
    """Whether another joint of the circuit is of the same kind."""
    if other.place == joint.place or other.gap or not other.ohm.value > 0:
        return False
    return kind_of(joint, case.circuit, "") == kind_of(other, case.circuit, "")
