"""Heat in a protective device of which no figure is known, against the most that any device at its current may lose."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass

from rules.calc.doubt import Weighted, total
from rules.calc.joint_heat import joint_heat_w
from rules.case import CircuitCase
from rules.decision import Verdict, against_limit
from rules.errors import MissingData
from rules.heat import DEVICE, Joint, full_a, joints_read, kind_of
from rules.record import Figure
from rules.rounds import current_at
from rules.tables.loader import group
from rules.units import show

LEGS_SWITCHED = 2
"""Poles in series at most."""


@dataclass(frozen=True, slots=True)
class DeviceHeat:
    """What a device loses, at the largest current there is."""

    place: str
    ohm: Figure
    current_a: float
    heat: Figure
    """[W]"""
    most_w: float
    """That any device at this current may lose. [W]"""
    words: str
    """What was read."""
    verdict: Verdict


def device_heats(case: CircuitCase) -> Iterator[DeviceHeat]:
    """What was read across a device without a figure, pole by pole or between ``bus`` and ``way``."""
    if case.tree.device_ohm is not None:
        return
    for joint in joints_read(case):
        if joint.run is None and not joint.gap and not _is_compared(case, joint):
            both = joint.place == DEVICE and case.circuit.device_leg == "both"
            words = f"{show(joint.ohm.value, 'ohm', joint.ohm.u)} across {joint.place}"
            if joint.volts is not None and joint.current is not None:
                words = (
                    f"{show(joint.volts.value, 'V', joint.volts.u)} across {joint.place} at "
                    f"{show(joint.current.value, 'A', joint.current.u)} in round {joint.round}"
                )
            yield _judged(case, joint.place, joint.ohm, joint.current, LEGS_SWITCHED if both else 1, words)
    for this in case.rounds:
        if "bus" not in this.volts or "way" not in this.volts:
            continue
        try:
            amps, amps_u = total(current_at("way", this, case.tree, case.limits).terms)
        except MissingData:
            continue
        volts, volts_u = total([*this.volts["bus"], *(Weighted(-one.weight, one.shown) for one in this.volts["way"])])
        if amps > 0:
            ohm = Figure(volts / amps, "ohm", math.hypot(volts_u, volts * amps_u / amps) / amps)
            words = (
                f"{show(volts, 'V', volts_u)} from bus to way at {show(amps, 'A', amps_u)} in round {this.name}, across a device "
                "whose figure is not known"
            )
            poles = 1 if case.circuit.device_leg in ("positive", "negative") else LEGS_SWITCHED
            yield _judged(case, DEVICE, ohm, Figure(amps, "A", amps_u), poles, words)


def _is_compared(case: CircuitCase, joint: Joint) -> bool:
    """Whether a similar pole is so much lower that the comparison tells it (HT03)."""
    similar = case.context.joints.get(kind_of(joint, case.circuit, case.visit), ())
    factor = 1 + case.limits["joint_compare.above_similar"]
    return any(joint.ohm.value > factor * other.ohm.value for other in similar)


def _judged(case: CircuitCase, place: str, ohm: Figure, read: Figure | None, poles: int, words: str) -> DeviceHeat:
    amps = max(full_a(case, "way") or 0.0, read.value if read is not None else 0.0)
    per_ohm = float(joint_heat_w(1.0, amps))
    heat = Figure(ohm.value * per_ohm, "W", (ohm.u or 0.0) * per_ohm)
    most_w = max(poles * _most_w(case, amps), case.limits["heat.soon_w"])
    return DeviceHeat(
        place, ohm, amps, heat, most_w, words, against_limit(heat.value, most_w, heat.u or 0.0, case.limits)
    )


def _most_w(case: CircuitCase, amps: float) -> float:
    """
    The most that a pole loses at a current: what the standard allows a breaker of its rating, which is at least the current.

    Above the last rating of the table in proportion to it, as at the same voltage.
    """
    losses = group("breaker_loss").numbers("rated_current_up_to_a", "loss_w")
    rated = max(case.circuit.rated_current_a or 0.0, amps)
    last = max(losses)
    loss_w = next((loss for up_to, loss in losses.items() if rated <= up_to), losses[last] * rated / last)
    return loss_w * (amps / rated) ** 2 if rated else loss_w
