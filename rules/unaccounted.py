"""Where most is lost that the record does not account for, were the readings true, whatever the diagnosis makes of them."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass, replace

from rules.assessment import Drop
from rules.calc.doubt import Weighted, probability_above, total
from rules.case import CircuitCase
from rules.compared import compare
from rules.diagnosis.rows import extra_scale
from rules.errors import MissingData
from rules.heat import DEVICE, Hot, full_a, hot_joints
from rules.impossible import dead_points, impossible, read_before
from rules.meters import worth
from rules.record import Figure, Reading
from rules.rounds import Round, current_at
from rules.units import show

APART = 1.2
"""Ratio of two currents from which two rounds speak for a resistance, if they agree on it."""


@dataclass(frozen=True, slots=True)
class Lost:
    """What is lost between two neighbouring points beyond what is computed, in one round or read dead."""

    place: str
    """``run 2``, ``way to b``, ``device``."""
    round: str
    words: str
    current: Figure
    """Read, or for a dead reading the largest there is. [A]"""
    ohm: Figure
    """As if a resistance were in the way. [ohm]"""
    edge_ohm: float
    """The largest bad connection that the profile looks for there. [ohm]"""
    agreeing: tuple[str, ...] = ()
    """Rounds of another current that give the same resistance."""
    alone: bool = True
    """Whether nothing is lost unaccounted anywhere else."""

    @property
    def heat(self) -> Figure:
        """That the resistance would turn into heat. [W]"""
        square = self.current.value**2
        return Figure(self.ohm.value * square, "W", (self.ohm.u or 0.0) * square)

    @property
    def is_as_a_joint(self) -> bool:
        """Whether a bad connection explains it as well as a slip: larger than is looked for, or the same at two currents."""
        return bool(self.agreeing) or self.ohm.value > self.edge_ohm

    @property
    def joint_words(self) -> str:
        larger = ", larger than the profile looks for" if self.ohm.value > self.edge_ohm else ""
        both = f", on which rounds {self.round} and {' and '.join(self.agreeing)} agree" if self.agreeing else ""
        return f"a bad connection of about {show(self.ohm.value, 'ohm', digits=2)}{larger}{both}"


def most_unaccounted(case: CircuitCase) -> Lost | None:
    """The place that would be hottest; ``None`` where nothing beyond doubt is lost above what is computed."""
    found = list(_all(case))
    most = max(found, key=lambda lost: lost.heat.value, default=None)
    if most is None:
        return None
    same = [one for one in found if one.place == most.place and one.round != most.round]
    apart = [one for one in same if not 1 / APART < most.current.value / one.current.value < APART]
    agreeing = tuple(one.round for one in apart if _agree(most, one, case.limits["decision.beyond_doubt"]))
    if len(agreeing) < len(apart):
        agreeing = ()
    alone = all(one.place == most.place for one in found)
    return replace(most, agreeing=agreeing, alone=alone)


def _agree(one: Lost, other: Lost, sure: float) -> bool:
    apart = abs(one.ohm.value - other.ohm.value)
    return probability_above(apart, 0.0, math.hypot(one.ohm.u or 0.0, other.ohm.u or 0.0)) < sure


def _all(case: CircuitCase) -> Iterator[Lost]:
    hot: dict[str, list[Hot]] = {}
    for joint in hot_joints(case):
        if isinstance(joint, Hot):
            hot.setdefault(joint.joint.round, []).append(joint)
    for this in case.rounds:
        yield from _dead(case, this)
        if impossible(this, case.tree, case.nominal_v, case.limits):
            continue
        yield from _of_one_leg(case, this)
        without = {point for point, _ in dead_points(this, case.tree, case.nominal_v or 0.0, case.limits)}
        read = [point for point in this.volts if point not in without]
        pairs = [(start, end) for end in read if (start := read_before(case.tree, end, read))]
        for start, end in dict.fromkeys([*pairs, *this.direct]):
            if start == "bus" and case.tree.device_ohm is None:
                continue  # what the device loses is not known; HT01 judges its poles
            try:
                drop = compare(start, end, this, case.tree, case.limits)
                path = case.tree.path(start, end)
            except MissingData:
                continue
            yield from _of_drop(case, drop, path, hot.get(this.name, []))


def _of_drop(case: CircuitCase, drop: Drop, path: list[str], hot: list[Hot]) -> Iterator[Lost]:
    runs = {case.tree.ends[point].id for point in path if point in case.tree.ends}
    told = sum(one.above_healthy_v for one in hot if one.joint.run is not None and one.joint.run.id in runs)
    excess, amps = drop.too_much, abs(drop.current.value)
    u = excess.u if excess.u is not None else drop.excess.u or 0.0
    if not amps or probability_above(excess.value, told, u) < case.limits["decision.beyond_doubt"]:
        return
    words = (
        f"{show(drop.measured.value, 'V', drop.measured.u)} measured against {show(drop.computed.value, 'V', drop.computed.u)} "
        f"computed from {drop.start} to {drop.end} at {show(drop.current.value, 'A', drop.current.u)} in round {drop.round}"
    )
    ohm = (excess.value - told) / amps
    figure = Figure(ohm, "ohm", math.hypot(u, ohm * (drop.current.u or 0.0)) / amps)
    place = _place(case, path, drop.start, drop.end)
    yield Lost(place, drop.round, words, Figure(amps, "A", drop.current.u), figure, _edge(case, path))


def _of_one_leg(case: CircuitCase, this: Round) -> Iterator[Lost]:
    """Drops along one leg, which lose no more than both legs are computed to."""
    for row in this.readings:
        if row.quantity != "drop" or row.leg not in ("positive", "negative") or (row.at, row.to) in this.direct:
            continue
        found = _path(case, row)
        if found is None:
            continue
        path, loop_ohm = found
        try:
            amps, amps_u = total(current_at(path[0], this, case.tree, case.limits).terms)
        except MissingData:
            continue
        volts, volts_u = total([Weighted(1.0, this.shown[row.id])])
        if not amps:
            continue
        u = math.hypot(volts_u, volts * amps_u / amps) / abs(amps)
        ohm = Figure(abs(volts / amps) - loop_ohm, "ohm", u)  # of the wrong sign: the leads were swapped
        words = (
            f"{show(volts, 'V', volts_u)} from {row.at} to {row.to} in the {row.leg} leg at {show(amps, 'A', amps_u)} in round "
            f"{this.name}, where both legs are computed to lose {show(loop_ohm * abs(amps), 'V', digits=2)}"
        )
        yield from _if_sure(case, row, path, words, Figure(abs(amps), "A", amps_u), ohm, this.name)


def _dead(case: CircuitCase, this: Round) -> Iterator[Lost]:
    """Resistances along the way, at the largest current there is."""
    for row in this.readings:
        found = _path(case, row) if row.quantity == "resistance" and row.to else None
        if found is None:
            continue
        path, loop_ohm = found
        amps = full_a(case, path[0])
        if not amps:
            continue
        read, u = total([Weighted(1.0, worth(row, case.context.index, case.limits).shown)])
        words = (
            f"{show(read, 'ohm', u)} from {row.at} to {row.to}{f' in the {row.leg} leg' if row.leg else ''}, read dead, where both "
            f"legs are computed to have {show(loop_ohm, 'ohm', digits=2)}"
        )
        ohm = Figure(read - loop_ohm, "ohm", u)
        yield from _if_sure(case, row, path, words, Figure(amps, "A"), ohm, this.name)


def _if_sure(
    case: CircuitCase, row: Reading, path: list[str], words: str, amps: Figure, ohm: Figure, round_: str
) -> Iterator[Lost]:
    if probability_above(ohm.value, 0.0, ohm.u or 0.0) >= case.limits["decision.beyond_doubt"]:
        place = f"{_place(case, path, row.at, row.to)}{f' {row.leg}' if row.leg in ('positive', 'negative') else ''}"
        yield Lost(place, round_, words, amps, ohm, _edge(case, path))


def _path(case: CircuitCase, row: Reading) -> tuple[list[str], float] | None:
    """Points after a reading's start up to its end and the loop resistance between; ``None`` where it is not known."""
    tree = case.tree
    try:
        path = tree.path(row.at, row.to)
    except MissingData:
        return None
    runs = [tree.ends[point] for point in path if point in tree.ends]
    unfit = any(run.id in tree.shared or run.id in tree.meshed or tree.figures[run.id].gap for run in runs)
    if unfit or not runs or len(runs) < len(path):
        return None
    return path, sum(float(tree.figures[run.id].loop_ohm) for run in runs)


def _place(case: CircuitCase, path: list[str], start: str, end: str) -> str:
    if path == ["way"]:
        return DEVICE
    run = case.tree.ends.get(path[0]) if len(path) == 1 else None
    return run.name if run is not None else f"{start} to {end}"


def _edge(case: CircuitCase, path: list[str]) -> float:
    scales = [extra_scale(case.tree.ends[point].size) for point in path if point in case.tree.ends]
    return case.limits["bad_connection.high_ohm"] * max(scales, default=1.0)
