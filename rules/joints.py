"""Heat in suspected bad connections: extra resistance times current squared, as read and at design current."""

from __future__ import annotations

from rules.assessment import JointHeat, Place
from rules.case import CircuitCase
from rules.diagnosis.hypotheses import BAD_CONNECTION
from rules.errors import MissingData
from rules.record import Figure
from rules.rounds import current_at

LEAST = 0.01
"""Probability of a bad connection from which its heat is told."""
NORMAL_95 = 1.96
"""Standard deviations from the middle of a Gaussian to the bounds of its central 95 %."""


def heats_of(case: CircuitCase) -> tuple[JointHeat, ...]:
    """Heat in each place where a connection may be bad, the most probable first; what is not known is ``None``."""
    causes = case.diagnosis.causes if case.diagnosis is not None else ()
    found: dict[str, JointHeat] = {}
    for row in causes:
        if row.cause == BAD_CONNECTION and row.probability >= LEAST:
            for joint in row.joints or (row,):
                found.setdefault(joint.where, _heat_of(case, joint))
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


def _heat_of(case: CircuitCase, joint: Place) -> JointHeat:
    read_a = most_read_a(case, joint.point)
    design_a = case.largest_current_a.get(joint.point)
    return JointHeat(
        where=joint.where,
        read_a=None if read_a is None else Figure(read_a, "A"),
        read=None if read_a is None else heat_at(joint, read_a),
        design_a=None if design_a is None else Figure(design_a, "A"),
        design=None if design_a is None else heat_at(joint, design_a),
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
