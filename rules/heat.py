"""Heat in terminations and poles that were read across themselves: now, at design, and beside a healthy one."""

from __future__ import annotations

import math
import re
from collections import defaultdict
from collections.abc import Iterator, Mapping, Sequence, Set
from dataclasses import dataclass, replace
from typing import TypeAlias

from rules.calc.conductor import REFERENCE_AREA_MM2
from rules.calc.doubt import Weighted, probability_above, total
from rules.calc.joint_heat import joint_heat_w
from rules.case import CircuitCase
from rules.context import Context, SimilarJoint
from rules.decision import Verdict, against_limit
from rules.diagnosis.hypotheses import BAD_CONNECTION
from rules.errors import MissingData
from rules.index import Index
from rules.limits import Limits
from rules.meters import worth
from rules.record import Circuit, Figure, Reading, Run
from rules.rounds import Round, Tree, current_at
from rules.tables.conductors import area_mm2, is_known
from rules.units import show
from rules.verdict import claimed

DEVICE = "device"
TURNED = "of the wrong sign: leads swapped, or the current runs the other way"
NUMBER = re.compile(r"run (\d+) ")
HEALTHY_SPREADS = 2
"""Geometric standard deviations above the median up to which a termination counts as a healthy one: 97.7 of 100."""


@dataclass(frozen=True, slots=True)
class Joint:
    """One termination or pole by its reading in the round of the highest current."""

    place: str
    """``run 1 end positive``, ``device``."""
    run: Run | None
    """``None`` for the device."""
    round: str
    """Empty for a dead test."""
    volts: Figure | None
    """``None`` for a dead test."""
    current: Figure | None
    ohm: Figure
    full_a: float | None
    """The largest that flows there, at design or as read; ``None`` where neither is known. [A]"""
    gap: str = ""
    """Why nothing follows from the reading."""

    @property
    def now(self) -> Figure | None:
        """Heat as read. [W]"""
        if self.volts is None or self.current is None:
            return None
        share = math.hypot(
            (self.volts.u or 0.0) * self.current.value, self.volts.value * (self.current.u or 0.0)
        )  # one by a voltmeter, the other by a clamp
        return Figure(self.volts.value * self.current.value, "W", share)

    @property
    def full(self) -> Figure | None:
        """Heat at the largest current. [W]"""
        if self.full_a is None:
            return None
        per_ohm = float(joint_heat_w(1.0, self.full_a))  # an ohm that was read may be below zero by its doubt
        return Figure(self.ohm.value * per_ohm, "W", (self.ohm.u or 0.0) * per_ohm)


def joints_read(case: CircuitCase) -> tuple[Joint, ...]:
    """Every termination and pole of a circuit that was read across itself on the visit, live or dead, each once."""
    return _Reader(case.rounds, case.tree, case.context.index, case.limits, case.largest_current_a).joints()


Kind: TypeAlias = tuple[str, ...]
"""What makes joints similar: read on one visit, of one size and metal, or poles of one device and rating."""


def kind_of(joint: Joint, circuit: Circuit, visit: str) -> Kind:
    """To which similar ones a joint belongs."""
    if joint.run is not None:
        return visit, "termination", joint.run.size, joint.run.material_or_default
    poles = "both" if joint.place == DEVICE and circuit.device_leg == "both" else "one"
    return visit, circuit.device, f"{circuit.rated_current_a}", poles


def similar_joints(context: Context) -> dict[Kind, list[SimilarJoint]]:
    """All joints of a site that were read, on the visit that each circuit is judged on, by what makes them similar."""
    found: dict[Kind, list[SimilarJoint]] = defaultdict(list)
    for circuit_id, measured in context.measured.items():
        if not any(row.quantity in ("joint", "resistance") for row in measured.readings):
            continue
        circuit = context.index.circuits[circuit_id]
        for joint in _Reader(measured.rounds, measured.tree, context.index, context.limits, {}).joints():
            if not joint.gap and joint.ohm.value > 0:
                kind = kind_of(joint, circuit, measured.visit)
                found[kind].append(SimilarJoint(circuit.tag, joint.place, joint.ohm))
    return dict(found)


def hot_as_read(context: Context, circuit_id: str, runs: Set[str]) -> list[str]:
    """Terminations in some runs that turned more into heat than the profile's limit while they were read, beyond doubt."""
    measured, limits = context.measured[circuit_id], context.limits
    if not any(row.quantity == "joint" for row in measured.readings):
        return []
    found = []
    least_w = min(limits["heat.limit_w"], limits["heat.soon_w"])
    for joint in _Reader(measured.rounds, measured.tree, context.index, limits, {}).joints():
        if joint.run is None or joint.run.id not in runs or joint.gap or joint.now is None:
            continue
        _, most = _healthy_ohm(limits, joint.run)
        by_heat = against_limit(joint.now.value, least_w, joint.now.u or 0.0, limits)
        by_ohm = against_limit(joint.ohm.value, most, joint.ohm.u or 0.0, limits)
        if by_heat is Verdict.FAILS and by_ohm is Verdict.FAILS:
            found.append(joint.place)
    return found


def healthy_ohm(case: CircuitCase, run: Run) -> tuple[float, float]:
    """Of a termination of a run: the mean of the healthy ones, and the most that one of them has. [ohm]"""
    return _healthy_ohm(case.limits, run)


def _healthy_ohm(limits: Limits, run: Run) -> tuple[float, float]:
    scale = math.sqrt(REFERENCE_AREA_MM2 / area_mm2(run.size)) if is_known(run.size) else 1.0
    median, gsd = limits["termination.median_ohm"] * scale, limits["termination.geometric_sd"]
    return median * math.exp(math.log(gsd) ** 2 / 2), median * gsd**HEALTHY_SPREADS


def claims(case: CircuitCase, place: str) -> bool:
    """Whether the diagnosis claims a bad connection that may be the one at a place (VD02 says so, with its heat)."""
    claim = claimed(case.diagnosis.causes, case.limits) if case.diagnosis is not None else None
    if claim is None or claim.cause != BAD_CONNECTION:
        return False
    return any(set(joint.where.split()) <= set(place.split()) for joint in claim.joints)


def claims_end(case: CircuitCase, place: str) -> bool:
    """The same of an end of a run, or a device, whichever the leg: a temperature is of both."""
    return any(claims(case, f"{place}{leg}") for leg in ("", " positive", " negative"))


def full_a(case: CircuitCase, branch: str) -> float | None:
    """The largest current in the branch that arrives at a point, by the record or as read. [A]"""
    return largest_a(branch, case.rounds, case.largest_current_a)


def largest_a(branch: str, rounds: Sequence[Round], by_record: Mapping[str, float]) -> float | None:
    """The larger of what is recorded and what was read. [A]"""
    read = [abs(total(this.amps[branch])[0]) for this in rounds if branch in this.amps]
    known = by_record.get(branch)
    return max([*([known] if known is not None else []), *read], default=None)


@dataclass(frozen=True, slots=True)
class Hot:
    """A termination that is hotter than any healthy one, by the reading alone."""

    joint: Joint
    heat: Figure
    """The larger of now and at full load. [W]"""
    above_healthy_v: float
    """Voltage across it beyond that of a healthy one, in its round; 0 where sign or current are in doubt. [V]"""
    doubt: str = ""
    """What is in doubt about the reading, though not that it is hot: its sign, or the current."""


def hot_joints(case: CircuitCase) -> Iterator[Hot | tuple[str, str]]:
    """Terminations whose heat passes the profile's limit beyond doubt; a place with the reason where that is open."""
    limits = case.limits
    least_w = min(limits["heat.limit_w"], limits["heat.soon_w"])
    for joint in joints_read(case):
        run = joint.run
        if run is None or claims(case, joint.place):
            continue
        if joint.gap:
            yield _without_current(case, joint, least_w) or (joint.place, joint.gap)
            continue
        turned = probability_above(-joint.ohm.value, 0.0, joint.ohm.u or 0.0) >= limits["decision.beyond_doubt"]
        if turned:
            volts = joint.volts and Figure(abs(joint.volts.value), "V", joint.volts.u)
            joint = replace(joint, volts=volts, ohm=Figure(abs(joint.ohm.value), "ohm", joint.ohm.u))
        known = [heat for heat in (joint.now, joint.full) if heat is not None]
        if not known:
            yield joint.place, "the current at design is not known, nor was one read"
            continue
        heat = max(known, key=lambda one: one.value)
        mean, most = healthy_ohm(case, run)
        by_heat = against_limit(heat.value, least_w, heat.u or 0.0, limits)
        by_ohm = against_limit(joint.ohm.value, most, joint.ohm.u or 0.0, limits)
        if by_heat is Verdict.FAILS and by_ohm is Verdict.FAILS:
            lost = 0.0
            if joint.volts is not None and joint.current is not None:
                lost = joint.volts.value - mean * joint.current.value
            yield Hot(joint, heat, 0.0, TURNED) if turned else Hot(joint, heat, lost)
        elif Verdict.CONFORMS not in (by_heat, by_ohm):
            against = f"{show(heat.value, 'W', heat.u)} against {show(least_w, 'W')}"
            yield joint.place, f"not settled: {against}"


def _without_current(case: CircuitCase, joint: Joint, least_w: float) -> Hot | None:
    """A joint that was read without a current, but loses more than a healthy one at any current that may flow there."""
    if joint.volts is None or joint.run is None:
        return None
    most_a = max(case.circuit.rated_current_a or 0.0, joint.full_a or 0.0)
    flowing_a = joint.full_a or most_a
    volts = Figure(abs(joint.volts.value), "V", joint.volts.u)
    u = volts.u or 0.0
    _, most = healthy_ohm(case, joint.run)
    heat = Figure(volts.value * flowing_a, "W", u * flowing_a)
    above = against_limit(volts.value, most * most_a, u, case.limits)
    if not most_a or above is not Verdict.FAILS:
        return None
    if against_limit(heat.value, least_w, heat.u or 0.0, case.limits) is not Verdict.FAILS:
        return None
    ohm = Figure(volts.value / most_a, "ohm", u / most_a)
    return Hot(
        replace(joint, volts=volts, ohm=ohm, gap=""),
        heat,
        0.0,
        f"{joint.gap}; the resistance is the least, as at {show(most_a, 'A')}",
    )


def accounted_v(case: CircuitCase) -> float:
    """What hot joints that stand by their reading alone lose in the round of the drop, beyond healthy ones. [V]"""
    if case.drop is None:
        return 0.0
    return sum(
        hot.above_healthy_v for hot in hot_joints(case) if isinstance(hot, Hot) and hot.joint.round == case.drop.round
    )


@dataclass(frozen=True, slots=True)
class _Reader:
    """The rounds of one visit on one circuit, as far as joints are concerned."""

    rounds: Sequence[Round]
    tree: Tree
    index: Index
    limits: Limits
    largest_current_a: Mapping[str, float]

    def joints(self) -> tuple[Joint, ...]:
        live: dict[str, list[tuple[Round, list[Reading]]]] = defaultdict(list)
        dead: dict[str, list[Reading]] = defaultdict(list)
        for this in self.rounds:
            by_place: dict[str, list[Reading]] = defaultdict(list)
            for row in this.readings:
                if row.quantity == "joint":
                    by_place[_place(row)].append(row)
                elif row.quantity == "resistance" and not row.to:
                    dead[_place(row)].append(row)
            for place, rows in by_place.items():
                live[place].append((this, rows))
        joints = {place: self._live(place, rounds) for place, rounds in live.items()}
        for place, rows in dead.items():
            if place not in joints or joints[place].gap:
                joints[place] = self._dead(place, rows)
        return tuple(joints.values())

    def _live(self, place: str, rounds: list[tuple[Round, list[Reading]]]) -> Joint:
        branch, run = self._branch(place)
        reason, unclamped = "no current flowed", None
        found: list[tuple[float, float, Figure, str]] = []
        for this, rows in rounds:
            try:
                current = current_at(branch, this, self.tree, self.limits)
            except MissingData as error:
                reason = str(error)
                unclamped = Figure(*self._mean(rows, this))
                continue
            amps, reading_u = total(current.terms)
            amps_u = math.hypot(reading_u, *(share for _, share in current.shares))
            if amps:
                found.append((amps, amps_u, Figure(*self._mean(rows, this)), this.name))
        most = largest_a(branch, self.rounds, self.largest_current_a)
        if not found:
            return Joint(place, run, "", unclamped, None, Figure(math.nan, "ohm"), most, reason)
        amps, amps_u, shown, name = max(found, key=lambda item: abs(item[0]))
        # what is lost in the sense of a current towards the source reads below zero
        lost = Figure(math.copysign(shown.value, shown.value * amps), "V", shown.u)
        ohm = lost.value / abs(amps)
        u = math.hypot(lost.u or 0.0, ohm * amps_u) / abs(amps)
        return Joint(place, run, name, lost, Figure(abs(amps), "A", amps_u), Figure(ohm, "ohm", u), most)

    def _mean(self, rows: list[Reading], this: Round) -> tuple[float, str, float]:
        value, u = total([Weighted(1 / len(rows), this.shown[row.id]) for row in rows])
        return value, "V", u

    def _dead(self, place: str, rows: list[Reading]) -> Joint:
        branch, run = self._branch(place)
        shown = [worth(row, self.index, self.limits).shown for row in rows]
        value, u = total([Weighted(1 / len(shown), one) for one in shown])
        return Joint(
            place, run, "", None, None, Figure(value, "ohm", u), largest_a(branch, self.rounds, self.largest_current_a)
        )

    def _branch(self, place: str) -> tuple[str, Run | None]:
        """The point at which the branch of a place arrives, and its run; ``way`` and none for the device."""
        matched = NUMBER.match(place)
        number = int(matched[1]) if matched else 0
        return next(((point, run) for point, run in self.tree.ends.items() if run.number == number), ("way", None))


def _place(row: Reading) -> str:
    leg = f" {row.leg}" if row.leg in ("positive", "negative") else ""
    return f"{row.at}{leg}"
