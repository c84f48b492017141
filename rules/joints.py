"""
Heat in suspected bad connections and semiconductors, as read and at design current.

An extra resistance makes heat by the square of the current; a semiconductor loses a constant voltage, and makes heat by
the current.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from functools import partial

from rules.assessment import JointHeat, Place
from rules.case import CircuitCase
from rules.diagnosis.hypotheses import BAD_CONNECTION, SEMICONDUCTOR
from rules.errors import MissingData
from rules.record import Figure
from rules.rounds import current_at

LEAST = 0.01
"""Probability of a bad connection from which its heat is told."""
NORMAL_95 = 1.96
"""Standard deviations from the middle of a Gaussian to the bounds of its central 95 %."""


def heats_of(case: CircuitCase) -> tuple[JointHeat, ...]:
    """Heat in each place where a connection or a semiconductor may be, the most probable first; what is not known is ``None``."""
    causes = case.diagnosis.causes if case.diagnosis is not None else ()
    found: dict[tuple[str, str], JointHeat] = {}
    for row in causes:
        if row.probability < LEAST:
            continue
        if row.cause == BAD_CONNECTION:
            for joint in row.joints or (row,):
                found.setdefault((row.cause, joint.where), _heat_of(case, joint, partial(heat_at, joint)))
        elif row.cause == SEMICONDUCTOR and (lost := semiconductor_v(case, row)) is not None:
            found.setdefault((row.cause, row.where), _heat_of(case, row, partial(heat_of_lost, lost)))
    return tuple(found.values())


def heat_at(joint: Place, current_a: float) -> Figure:
    """
    Heat in a bad connection at a current, its doubt from the bounds of the resistance.

    >>> heat = heat_at(Place("bad connection", "run 2", 0.9, 0.151, 0.155, 0.159), 12.0)
    >>> round(heat.value, 2), heat.unit, round(heat.u or 0.0, 4)
    (22.32, 'W', 0.2939)
    """
    low, best, high = joint.low_ohm or 0.0, joint.best_ohm or 0.0, joint.high_ohm or 0.0
    return Figure(best * current_a**2, "W", (high - low) / (2 * NORMAL_95) * current_a**2)


def heat_of_lost(lost: Figure, current_a: float) -> Figure:
    """
    Heat in a constant voltage lost at a current.

    >>> heat = heat_of_lost(Figure(0.31, "V", 0.035), 22.3)
    >>> round(heat.value, 1), round(heat.u or 0.0, 1)
    (6.9, 0.8)
    """
    return Figure(lost.value * current_a, "W", (lost.u or 0.0) * current_a)


def semiconductor_v(case: CircuitCase, place: Place) -> Figure | None:
    """Voltage that a semiconductor at a place loses if there is one, whatever the current; ``None`` where that is not known."""
    if case.diagnosis is None:
        return None
    branch = case.tree.ends.get(place.point)
    learned = case.diagnosis.of_branch(branch.id if branch is not None else "")
    rows = [row for row in case.diagnosis.causes if (row.cause, row.point) == (SEMICONDUCTOR, place.point)]
    probability = sum(row.probability for row in rows)
    if learned is None or probability <= 0:
        return None
    # moments over all causes: of this one alone they are what is left where the others give none
    volts = learned.offset_v / probability
    square = (learned.offset_u**2 + learned.offset_v**2) / probability
    return Figure(volts, "V", math.sqrt(max(square - volts**2, 0.0))) if volts > 0 else None


def _heat_of(case: CircuitCase, joint: Place, heat: Callable[[float], Figure]) -> JointHeat:
    read_a = most_read_a(case, joint.point)
    design_a = case.largest_current_a.get(joint.point)
    return JointHeat(
        where=joint.where,
        read_a=None if read_a is None else Figure(read_a, "A"),
        read=None if read_a is None else heat(read_a),
        design_a=None if design_a is None else Figure(design_a, "A"),
        design=None if design_a is None else heat(design_a),
        cause=joint.cause,
    )


def most_read_a(case: CircuitCase, point: str) -> float | None:
    """The most that the branch to a point carried while it was read; ``None`` where no round tells. [A]"""
    amps = []
    for this in case.rounds:
        try:
            amps.append(abs(current_at(point, this, case.tree, case.limits).value_a))
        except MissingData:
            continue
    return max(amps, default=None)
