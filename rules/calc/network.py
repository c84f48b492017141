"""
Voltages and currents of a whole site: one solver for trees, meshes, shared returns and mixed loads.

A node is a pair, one point of each leg; a branch leads to it from the pair nearer the source. Branch ``k`` joins node
``k`` to its parent and holds a resistance in each leg. A node without a parent is held at its own voltage: the
busbar of a source. Runs that close a mesh (ties) and returns that several runs share lie beside that forest.

What hangs on one ideal source in separate branches knows nothing of each other, so everything that is a tree is solved
in one walk (``rules.calc.forest``), and only what ties and shared returns hold together goes through the dense
equations of ``rules.calc.loops``. Loads of constant power: ``rules.calc.newton``.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from rules.calc.collapse import Collapse, Search
from rules.calc.forest import Bools, Floats, Forest, Integers
from rules.calc.loops import Legs
from rules.calc.newton import Loads, settle
from rules.calc.part import Part, parts_of
from rules.errors import InvalidQuantity

NO_NODES = np.zeros(0, dtype=np.int64)
NO_TIES = np.zeros((0, 2), dtype=np.int64)


@dataclass(frozen=True, slots=True)
class Solved:
    """Voltages and currents of n nodes, t ties and s shared returns."""

    voltage_v: Floats
    """Of each node, between the legs; NaN where it cannot be supplied or its source's voltage is not known. [V]"""
    current_a: Floats
    """In the branch to each node, in the leg with the device; what a held node gives in all. [A]"""
    back_a: Floats
    """In the other leg; in the whole return where it is shared. [A]"""
    tie_a: Floats
    """In each tie, in the leg with the device, positive from its first node to its second. [A]"""
    tie_back_a: Floats
    """In its other leg. [A]"""
    shared_a: Floats
    """In each shared return. [A]"""
    collapsed: Bools
    """Nodes that cannot be supplied; the others are computed with their loads off."""
    collapses: tuple[Collapse, ...]
    """Where supply fails, and how much could be had."""


class Network:
    """
    The shape of a network: worked out once, solved for any resistances, loads and voltages.

    Parameters
    ----------
    parent : array (n,)
        Node towards the source, -1 for a node held at a voltage; in any order.
    in_one_leg : array (n,) of bool, optional
        Branches without a return leg, such as a protective device in one leg.
    ties : array (t, 2), optional
        Nodes that closing runs join.
    shared : sequence of arrays, optional
        Of each shared return, the nodes to which its runs lead.

    Raises
    ------
    InvalidQuantity
        If the parents lead round in a circle or something names no node.

    Examples
    --------
    A 600 W load behind 0.20 Ω on a battery at 43.2 V:

    >>> network = Network(np.array([-1, 0]))
    >>> legs = network.legs(np.array([0.0, 0.10]), np.array([0.0, 0.10]))
    >>> loads = Loads(np.zeros(2), np.array([0.0, 600.0]), np.zeros(2))
    >>> round(float(network.solve(legs, loads, np.array([43.2, 0.0])).voltage_v[1]), 2)
    40.22
    """

    coupled: Bools
    """Branches whose current is not that of the loads beyond alone: in a mesh, or with a shared return."""
    parts: tuple[Part, ...]
    """What can be solved without regard to the rest: first the trees, then what ties and returns hold together."""

    def __init__(
        self,
        parent: Integers,
        in_one_leg: Bools | None = None,
        ties: Integers = NO_TIES,
        shared: Sequence[Integers] = (),
    ) -> None:
        self.forest = Forest(parent)
        size = len(parent)
        self.in_one_leg = np.zeros(size, dtype=bool) if in_one_leg is None else in_one_leg
        self.ties, self.shared = ties, tuple(shared)
        named = np.concatenate([ties.ravel(), *self.shared]) if self.shared or len(ties) else NO_NODES
        if np.any((named < 0) | (named >= size)):
            raise InvalidQuantity("a tie or a shared return must name nodes of the network")
        if any(np.any(parent[members] < 0) for members in self.shared):
            raise InvalidQuantity("a run with a shared return must lead to a node that is not held")
        self.coupled = np.zeros(size, dtype=bool)
        self.parts = tuple(parts_of(self.forest, self.in_one_leg, ties, self.shared))
        for part in self.parts:
            if part.loops is not None:
                self.coupled[part.nodes[part.loops.coupled]] = True

    def legs(
        self,
        out: Floats,
        back: Floats,
        tie_out: Floats | None = None,
        tie_back: Floats | None = None,
        shared: Floats | None = None,
    ) -> Legs:
        """
        Resistances of this network's legs, checked. [ohm]

        Raises
        ------
        InvalidQuantity
            If one is negative or not finite.
        """
        no_ties, no_returns = np.zeros(len(self.ties)), np.zeros(len(self.shared))
        back = np.where(self.in_one_leg, 0.0, back)
        for members in self.shared:
            back[members] = 0.0
        legs = Legs(
            out,
            back,
            no_ties if tie_out is None else tie_out,
            no_ties if tie_back is None else tie_back,
            no_returns if shared is None else shared,
        )
        for ohm in (legs.out, legs.back, legs.tie_out, legs.tie_back, legs.shared):
            if not np.all(np.isfinite(ohm) & (ohm >= 0)):
                raise InvalidQuantity("each resistance of a network must be finite and not negative")
        return legs

    def solve(self, legs: Legs, loads: Loads, held_v: Floats, emf_v: Floats | None = None) -> Solved:
        """
        Voltages and currents.

        Parameters
        ----------
        legs : Legs
            From ``legs``.
        loads : Loads
            Of the n nodes; a held node may have loads too.
        held_v : array (n,)
            Voltage of the nodes without a parent, NaN where it is not known; ignored elsewhere. [V]
        emf_v : array (n,), optional
            Added to the voltage along each branch, in its leg with the device: a semiconductor's drop is below zero. [V]

        Returns
        -------
        Solved

        Raises
        ------
        InvalidQuantity
            If a load is negative or not finite, or a mesh has no resistance at all.

        Notes
        -----
        A load of constant power ``P`` behind ``R`` settles at ``V = (Vs + sqrt(Vs² − 4PR)) / 2`` and has no
        solution below ``Vs² = 4PR``.
        """
        for name, values in (
            ("current", loads.current_a),
            ("power", loads.power_w),
            ("conductance", loads.conductance_s),
        ):
            if not np.all(np.isfinite(values) & (values >= 0)):
                raise InvalidQuantity(f"each {name} that a load draws must be finite and not negative")
        size = len(self.forest)
        emf = np.zeros(size) if emf_v is None else emf_v
        parent, root = self.forest.parent, self.forest.climb(self.forest.is_root)
        known = np.isfinite(held_v[root])
        for part in self.parts[1:]:
            known[part.nodes[~part.forest.is_root]] = np.isfinite(held_v[part.nodes[part.forest.is_root]]).all()
        held = np.where(self.forest.is_root, np.nan_to_num(held_v), 0.0)
        loads = loads.scaled(known, known)
        v, out, back, lost = np.empty(size), np.empty(size), np.empty(size), np.zeros(size, dtype=bool)
        tie_a, tie_back_a, shared_a = (np.zeros(len(x)) for x in (self.ties, self.ties, self.shared))
        found: list[Collapse] = []
        for part in self.parts:
            nodes = part.nodes
            linear = part.linear(legs, held[nodes], emf[nodes])
            here, off = loads.at(nodes), np.zeros(len(nodes), dtype=bool)
            volts, amps, failed = settle(linear, here, part.group, linear.scale_v)
            if failed.any():
                search = Search(part, linear, here)
                while failed.any():
                    # only what hangs on the path that fails is given up; the rest is solved again without it
                    off |= search.give_up(off, failed)
                    volts, amps, failed = settle(linear, here.scaled(~off, ~off), part.group, linear.scale_v)
                found += search.collapses(off)
            v[nodes], lost[nodes] = volts, off
            out[nodes] = back[nodes] = amps
            if part.loops is not None:
                out[nodes], back[nodes], *beside = part.loops.currents(linear.unknowns, amps)
                tie_a[part.ties], tie_back_a[part.ties], shared_a[part.shared] = beside
        v[lost] = np.nan
        out[lost] = back[lost] = np.nan
        v[~known] = out[~known] = back[~known] = np.nan
        v[self.forest.is_root] = held_v[self.forest.is_root]
        self._give(out, tie_a, loads, v, known & ~lost)
        back[parent < 0] = out[parent < 0]
        return Solved(v, out, back, tie_a, tie_back_a, shared_a, lost, tuple(found))

    def _give(self, out: Floats, tie_a: Floats, loads: Loads, v: Floats, on: Bools) -> None:
        """What each held node gives in all: its branches, its ties and its own loads. [A]"""
        parent = self.forest.parent
        is_root = parent < 0
        given = np.zeros(len(out))
        below = np.flatnonzero(~is_root & np.isfinite(out))
        np.add.at(given, parent[below], out[below])
        np.add.at(given, self.ties[:, 0], tie_a)
        np.add.at(given, self.ties[:, 1], -tie_a)
        own = np.flatnonzero(is_root & on)
        given[own] += loads.current_a[own] + loads.power_w[own] / v[own] + loads.conductance_s[own] * v[own]
        out[is_root] = np.where(on[is_root], given[is_root], np.nan)
