"""
Loads of constant power on a linear network, by Newton's method.

``P / v`` is replaced by its tangent, a current ``2P/v`` and a conductance ``-P/v²``; the linear network gives the next
voltages; repeated, the error squares each time. Begun from the voltages without any load, the voltages of a tree fall
monotonically to the highest solution where there is one, since what loads take from each voltage is convex and never
less than nothing, and where a pivot is no longer above zero there is none. In a mesh the determinant takes the pivots'
place: it has changed its sign once the voltages have passed the point from which there is no way back up.

References
----------
Monotone Newton iterates of convex functions: Ortega and Rheinboldt, Iterative Solution of Nonlinear Equations in
Several Variables, 1970, 13.3.4 (from memory).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from rules.calc.forest import Bools, Floats, Integers

SETTLED = 1e-10
"""Largest step of a voltage, relative to the largest source voltage, after which the error is below rounding."""
STILL_MOVING = 1e-7
"""Step, likewise relative, at which the voltages have not settled however often it was tried."""
MOST_STEPS = 80
"""A supply exactly at its limit halves its distance each step, down to rounding in some 30."""

Answer = Callable[[Floats, Floats], tuple[Floats, Floats]]
"""Voltages and branch currents of a linear network whose nodes draw ``conductance × v + current``."""


@dataclass(frozen=True, slots=True)
class Loads:
    """What each of n nodes draws."""

    current_a: Floats
    """Whatever the voltage. [A]"""
    power_w: Floats
    conductance_s: Floats
    """Reciprocal of a constant resistance. [S]"""

    @property
    def is_active(self) -> Bools:
        """Nodes with loads that need a voltage above zero, and can be asked for more than there is."""
        return (self.current_a > 0) | (self.power_w > 0)

    def at(self, nodes: Integers) -> Loads:
        return Loads(self.current_a[nodes], self.power_w[nodes], self.conductance_s[nodes])

    def scaled(self, active: Floats | Bools | float, resistive: Floats | Bools | float = 1.0) -> Loads:
        """The same loads, the active ones and the resistances each times a factor."""
        return Loads(self.current_a * active, self.power_w * active, self.conductance_s * resistive)


def settle(answer: Answer, loads: Loads, group: Integers, scale_v: float) -> tuple[Floats, Floats, Bools]:
    """
    Voltages and currents with the loads on.

    Parameters
    ----------
    answer : callable
        Solves the network with linear loads, NaN where it has no solution.
    loads : Loads
        Of n nodes.
    group : array (n,)
        Of nodes that collapse together, the index of one of them.
    scale_v : float
        The largest source voltage. [V]

    Returns
    -------
    tuple of arrays (n,)
        Voltage, current in each branch, and which nodes are of a group that cannot be supplied; those draw
        nothing in the other two.
    """
    lost = np.zeros(len(group), dtype=bool)
    active = loads.is_active
    if not np.any(loads.power_w):
        v, j = answer(loads.conductance_s, loads.current_a)
        if np.all(v[active] > 0):
            return v, j, lost
    v, j = answer(loads.conductance_s, np.zeros(len(group)))
    start = v
    while True:
        bad, steps = active & ~(v > 0), 0
        while not bad.any():
            safe = np.where(loads.power_w > 0, v, 1.0)
            slope = loads.power_w / (safe * safe)
            fresh, j = answer(loads.conductance_s - slope, loads.current_a + 2 * slope * safe)
            moved = fresh - v
            bad = np.isnan(fresh) | (active & ~(fresh > 0))
            steps += 1
            if steps == MOST_STEPS:
                bad |= np.abs(moved) > STILL_MOVING * scale_v
            v = fresh
            if steps == MOST_STEPS or not np.any(np.abs(moved) > SETTLED * scale_v):
                break
        if not bad.any():
            return v, j, lost
        marked = np.zeros(len(group), dtype=bool)
        marked[group[bad]] = True
        lost |= marked[group]
        active &= ~lost
        loads = loads.scaled(~lost, ~lost)
        # what has been found so far stays above the solution of the others
        v = np.where(lost, start, v)
