"""
Linear solution of a forest in one walk towards the roots and one away from them.

Each node draws ``a + g v``; the branch to its parent loses ``r`` times what it carries and gains ``emf``. Walking
up, every subtree becomes what its parent sees of it, one current and one conductance (Gaussian elimination, which
fills nothing in on a tree); walking down, voltages follow. Both walks are linear in the nodes. A forest of many
nodes a level is walked level by level in numpy, a deep one node by node over Python lists, whichever is quicker.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from rules.errors import InvalidQuantity

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]
Bools = NDArray[np.bool_]

WIDE = 25
"""Nodes a level from which walking level by level is quicker; measured, the optimum is flat."""
NO_PIVOT = 1e-12
"""In place of a pivot of exactly zero where one below zero is no fault: costs four of sixteen digits for once."""


@dataclass(frozen=True, slots=True)
class Linear:
    """Voltages and currents of a forest with linear loads."""

    voltage_v: Floats
    current_a: Floats
    """In the branch to each node; what a root gives in all."""
    conductance_s: Floats
    """Of each node with all that hangs on it, as its own branch sees it."""
    pivot: Floats
    """``1 + r g`` of each branch; NaN where it must be above zero and is not: then the branch has no solution."""


class Forest:
    """
    Nodes and the node towards the root of each.

    Parameters
    ----------
    parent : array (n,)
        Index of the node towards the root, -1 for a root; in any order.
    may_turn : array (n,) of bool, optional
        Branches whose pivot may be below zero, since more than the forest supplies what hangs on them.

    Raises
    ------
    InvalidQuantity
        If the parents lead round in a circle or name no node.

    Examples
    --------
    A root with two branches, of which one goes on:

    >>> forest = Forest(np.array([-1, 0, 0, 2]))
    >>> forest.depth.tolist(), forest.top.tolist()
    ([0, 1, 1, 2], [0, 1, 2, 2])
    """

    parent: Integers
    depth: Integers
    """Branches between each node and its root."""
    top: Integers
    """Each node's ancestor beside the root: an ideal root lets what hangs on it know nothing of each other."""

    def __init__(self, parent: Integers, may_turn: Bools | None = None) -> None:
        size = len(parent)
        if np.any((parent < -1) | (parent >= size)):
            raise InvalidQuantity("a node's parent must be a node, or -1 for a root")
        self.parent = parent
        self.depth = _depths(parent)
        self._order = np.argsort(self.depth, kind="stable")
        self._place = np.empty(size, dtype=np.int64)
        self._place[self._order] = np.arange(size)
        self._in_order = bool(np.all(self.depth[1:] >= self.depth[:-1]))
        above = parent[self._order]
        self._above = np.where(above < 0, -1, self._place[above])
        self._starts = np.searchsorted(self.depth[self._order], np.arange(int(self.depth.max(initial=0)) + 2)).tolist()
        self._least = np.zeros(size)
        if may_turn is not None:
            self._least[may_turn[self._order]] = -np.inf
        self._is_wide = size >= WIDE * (len(self._starts) - 1)
        self.top = self.climb(self.depth <= 1)

    def __len__(self) -> int:
        return len(self.parent)

    @property
    def is_root(self) -> Bools:
        return self.parent < 0

    def climb(self, stop: Bools) -> Integers:
        """Each node's nearest ancestor, itself included, that is a stop; every root must be one."""
        nodes = np.arange(len(self.parent))
        return _settled(np.where(stop, nodes, self.parent))

    def solve(
        self, resistance_ohm: Floats, conductance_s: Floats, current_a: Floats, held_v: Floats, emf_v: Floats
    ) -> Linear:
        """
        Voltages and currents with linear loads.

        Parameters
        ----------
        resistance_ohm : array (n,)
            Of the branch to each node's parent; of a root, ignored. [ohm]
        conductance_s, current_a : array (n,)
            What each node draws is ``current + conductance × voltage``; a conductance may be negative. [S], [A]
        held_v : array (n,)
            Voltage of the roots; ignored elsewhere. [V]
        emf_v : array (n,)
            What the branch to each node adds to its voltage. [V]

        Returns
        -------
        Linear
            Arrays (n,); NaN in all of a root's branch in which a pivot is not above zero.
        """
        walk = self._by_levels if self._is_wide else self._by_nodes
        if self._in_order:
            return Linear(*walk(resistance_ohm, conductance_s.copy(), current_a.copy(), held_v, emf_v))
        order, place = self._order, self._place
        solved = walk(*(x[order] for x in (resistance_ohm, conductance_s, current_a, held_v, emf_v)))
        return Linear(*(x[place] for x in solved))

    def ohm_above(self, resistance_ohm: Floats, seen: Linear) -> Floats:
        """
        What each node's branch sees towards the root when nothing hangs on the branch: a Thévenin resistance. [ohm]

        ``seen`` is the solution with the loads that stay on meanwhile, none of a conductance below zero.
        """
        parent, r, g = self.parent.tolist(), resistance_ohm.tolist(), seen.conductance_s.tolist()
        own = (seen.conductance_s / seen.pivot).tolist()
        ohm = [0.0] * len(parent)
        for node in self._order[self._starts[1] :].tolist():
            up = parent[node]
            if parent[up] >= 0:
                through = ohm[up] + r[up]
                ohm[node] = through / (1 + through * max(0.0, g[up] - own[node]))
        return np.array(ohm)

    def _by_levels(
        self, r: Floats, g: Floats, a: Floats, held: Floats, emf: Floats
    ) -> tuple[Floats, Floats, Floats, Floats]:
        starts, above, least = self._starts, self._above, self._least
        pivot = np.ones_like(r)
        for level in range(len(starts) - 2, 0, -1):
            low, here, end = starts[level - 1], starts[level], starts[level + 1]
            own, g_here = slice(here, end), g[here:end]
            p = 1 + r[own] * g_here
            p[~(p > least[own])] = np.nan
            p[p == 0] = NO_PIVOT
            pivot[own] = p
            to, width = above[own] - low, here - low
            g[low:here] += np.bincount(to, g_here / p, width)
            a[low:here] += np.bincount(to, (a[own] + g_here * emf[own]) / p, width)
        part = 1 / pivot
        lost = (emf - r * a) * part
        v = np.empty_like(r)
        v[: starts[1]] = held[: starts[1]]
        for here, end in pairwise(starts[1:]):
            v[here:end] = v[above[here:end]] * part[here:end] + lost[here:end]
        return v, a + g * v, g, pivot

    def _by_nodes(
        self, r: Floats, g: Floats, a: Floats, held: Floats, emf: Floats
    ) -> tuple[Floats, Floats, Floats, Floats]:
        above, least, first = self._above.tolist(), self._least.tolist(), self._starts[1]
        rs, gs, cs, es, vs = r.tolist(), g.tolist(), a.tolist(), emf.tolist(), held.tolist()
        pivots = [1.0] * len(rs)
        for node in range(len(rs) - 1, first - 1, -1):
            g_here = gs[node]
            p = 1 + rs[node] * g_here
            if not p > least[node]:
                p = np.nan
            elif p == 0:
                p = NO_PIVOT
            pivots[node] = p
            up = above[node]
            gs[up] += g_here / p
            cs[up] += (cs[node] + g_here * es[node]) / p
        for node in range(first, len(rs)):
            vs[node] = (vs[above[node]] + es[node] - rs[node] * cs[node]) / pivots[node]
        v, gg = np.array(vs), np.array(gs)
        return v, np.array(cs) + gg * v, gg, np.array(pivots)


def _depths(parent: Integers) -> Integers:
    """Branches to the root, by doubling the jumps: as many passes as the depth has binary digits."""
    depth = (parent >= 0).astype(np.int64)
    jump = np.where(parent < 0, np.arange(len(parent)), parent)
    for _ in range(len(parent).bit_length() + 1):
        further = depth[jump]
        if not further.any():
            return depth
        depth += further
        jump = jump[jump]
    raise InvalidQuantity("the parents of some nodes lead round in a circle")


def _settled(jump: Integers) -> Integers:
    """Where jumps from node to node end."""
    while True:
        further = jump[jump]
        if np.array_equal(further, jump):
            return jump
        jump = further
