"""
Voltages and currents of radial d.c. networks by sweeps: currents summed towards the source, then drops
taken away from it, repeated until constant-power and constant-resistance loads have settled.

Nodes are numbered so that a parent comes before its children; branch ``k`` joins node ``k`` to its
parent and holds the resistance of both legs. A node without a parent is held at its own voltage.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from rules.errors import InvalidQuantity

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]

MOST_SWEEPS = 500
"""More than any supply that settles needs: the error falls by the ratio of drop to voltage each time."""
SETTLED = 1e-12
"""Largest change of a voltage, relative to the largest voltage, at which the sweeps stop."""


@dataclass(frozen=True, slots=True)
class Radial:
    """A forest of nodes with loads; arrays of one length."""

    parent: Integers
    """Index of the node towards the source, -1 for a node held at a voltage."""
    current_a: Floats
    """Constant-current load at the node. [A]"""
    power_w: Floats
    """Constant-power load. [W]"""
    conductance_s: Floats
    """Constant-resistance load. [S]"""

    def __post_init__(self) -> None:
        if np.any(self.parent >= np.arange(len(self.parent))):
            raise InvalidQuantity("a node's parent must come before it")


@dataclass(frozen=True, slots=True)
class Solved:
    """Voltages and currents of a radial network."""

    voltage_v: Floats
    """Of each node, between the legs; NaN in a tree that cannot be supplied. [V]"""
    current_a: Floats
    """In the branch to each node; what a held node gives in all. [A]"""
    collapsed: NDArray[np.bool_]
    """Nodes of trees whose constant-power loads cannot be supplied."""


def solve(network: Radial, resistance_ohm: Floats, held_voltage_v: Floats) -> Solved:
    """
    Solve a radial network.

    Parameters
    ----------
    network : Radial
        Tree and loads, n nodes.
    resistance_ohm : array (n,)
        Both legs of the branch to each node's parent; ignored where there is none. [ohm]
    held_voltage_v : array (n,)
        Voltage of the nodes without a parent; ignored elsewhere. [V]

    Returns
    -------
    Solved
        Arrays (n,).

    Raises
    ------
    InvalidQuantity
        If a resistance or load is negative or not finite.

    Notes
    -----
    A constant-power load ``P`` behind ``R`` settles at ``V = (Vs + sqrt(Vs² − 4PR)) / 2`` and has no
    solution below ``Vs² = 4PR``; a tree whose sweeps do not settle is reported as collapsed.

    Examples
    --------
    >>> pair = Radial(np.array([-1, 0]), np.zeros(2), np.array([0.0, 600.0]), np.zeros(2))
    >>> solved = solve(pair, np.array([0.0, 0.20]), np.array([43.2, 0.0]))
    >>> round(float(solved.voltage_v[1]), 2)
    40.22
    """
    for name, values in (("resistance", resistance_ohm), ("current", network.current_a), ("power", network.power_w)):
        if np.any(~np.isfinite(values)) or (name != "current" and np.any(values < 0)):
            raise InvalidQuantity(f"each {name} of a network must be finite and not negative")
    levels = _levels(network.parent)
    root = _roots(network.parent, levels)
    voltage = held_voltage_v[root].astype(float)
    lost = np.zeros(len(root), dtype=bool)
    has_power = bool(np.any(network.power_w > 0))
    scale = float(np.max(np.abs(voltage), initial=1.0))
    current = np.zeros_like(voltage)
    moved = np.zeros_like(voltage)
    for _ in range(MOST_SWEEPS):
        # a lost tree keeps a harmless voltage, so that the others settle
        safe = np.where(lost | (voltage <= 0), 1.0, voltage)
        current = network.current_a + network.power_w / safe + network.conductance_s * safe
        for nodes in reversed(levels[1:]):
            np.add.at(current, network.parent[nodes], current[nodes])
        fresh = voltage.copy()
        for nodes in levels[1:]:
            fresh[nodes] = fresh[network.parent[nodes]] - resistance_ohm[nodes] * current[nodes]
        moved = np.abs(fresh - voltage)
        voltage = fresh
        if has_power:
            lost |= _spread((voltage <= 0) & (network.power_w > 0), root)
        if not np.any(moved[~lost] > SETTLED * scale):
            break
    lost |= _spread(moved > 1e-6 * scale, root)
    return Solved(np.where(lost, np.nan, voltage), np.where(lost, np.nan, current), lost)


def _levels(parent: Integers) -> list[Integers]:
    """Nodes by their distance from the root, roots first."""
    depth = np.zeros(len(parent), dtype=np.int64)
    for node, above in enumerate(parent.tolist()):
        if above >= 0:
            depth[node] = depth[above] + 1
    order = np.argsort(depth, kind="stable")
    return np.split(order, np.searchsorted(depth[order], np.arange(1, depth.max(initial=0) + 1)))


def _roots(parent: Integers, levels: list[Integers]) -> Integers:
    """The held node of each node's tree."""
    root = np.arange(len(parent))
    for nodes in levels[1:]:
        root[nodes] = root[parent[nodes]]
    return root


def _spread(nodes: NDArray[np.bool_], root: Integers) -> NDArray[np.bool_]:
    """Every node of the trees in which one of ``nodes`` is."""
    return np.isin(root, root[nodes])
