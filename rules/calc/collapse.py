"""
Where a network cannot be supplied at all, and how much could be had there.

A subtree cannot be supplied where no voltages serve its loads even while every other load of constant power or
current is off. The deepest such subtrees are given up, with all that hangs on them, and nothing else: a branch further
up fails with them, and would not without them. Should what is left still fail, the next deepest follow, and take in
those beneath them. What could be had is the largest common share of what the loads given up ask for that still
has a solution, the others off as before; with the others on it is less.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np

from rules.calc.forest import Bools, Floats, Forest, Integers
from rules.calc.newton import Loads, settle
from rules.calc.part import LinearPart, Part

HALVINGS = 34
"""Bisections of the share that could be had: to one part in 10¹⁰."""


@dataclass(frozen=True, slots=True)
class Collapse:
    """One place where supply fails."""

    node: int
    """The node whose branch cannot carry what hangs on it; in a mesh, the first of its nodes."""
    nodes: Integers
    """All nodes that are lost with it, itself included."""
    asked_w: float
    """What loads of constant power among them ask for. [W]"""
    asked_a: float
    """What loads of constant current among them ask for. [A]"""
    share: float
    """The largest share of it that could be had, everything else of constant power or current being off."""

    @property
    def could_be_had_w(self) -> float:
        return self.share * self.asked_w

    @property
    def could_be_had_a(self) -> float:
        return self.share * self.asked_a


class Search:
    """
    Looks in one part of a network for what cannot be supplied.

    Within what a mesh or a shared return holds together no single path can be named: unless a tree that hangs on it
    fails already where the mesh is taken as held, everything behind it is given up at once.

    Parameters
    ----------
    part : Part
        Of n nodes.
    linear : LinearPart
        Its equations.
    loads : Loads
        All that its nodes ask for.
    """

    def __init__(self, part: Part, linear: LinearPart, loads: Loads) -> None:
        self._part, self._linear, self._loads = part, linear, loads
        self._trees, self._twigs, self._behind = linear, None, np.zeros(len(part.nodes), dtype=bool)
        self._lost: dict[str, list[int]] = {"trees": [], "twigs": [], "mesh": []}
        if part.loops is None:
            return
        forest = part.forest
        self._trees = LinearPart(replace(part, loops=None), linear.legs, linear.held_v, linear.emf_v)
        self._behind = part.loops.behind
        self._holds = forest.is_root
        self._holds[part.loops.nodes] = True
        twigs = replace(part, forest=Forest(np.where(self._holds, -1, forest.parent)), loops=None)
        idle_v, _ = linear(loads.conductance_s, np.zeros(len(forest)))
        self._twigs = LinearPart(twigs, linear.legs, idle_v, linear.emf_v)

    def give_up(self, off: Bools, failed: Bools) -> Bools:
        """
        The nodes that are lost next: at least one.

        ``off`` (n,) are those lost so far, ``failed`` (n,) those of groups that cannot be supplied as they stand.
        """
        loads = self._loads.scaled(~off, ~off)
        if self._twigs is not None:
            hanging = loads.scaled(~self._holds, ~self._holds)
            _, _, fails = settle(self._twigs, hanging, self._twigs.forest.top, self._linear.scale_v)
            if fails.any():
                return self._note("twigs", self._twigs, loads, fails)
            if np.any(loads.is_active & self._behind):
                self._lost["mesh"].append(int(np.flatnonzero(self._behind)[0]))
                return self._behind
        return self._note("trees", self._trees, loads, failed)

    def _note(self, kind: str, linear: LinearPart, loads: Loads, failed: Bools) -> Bools:
        heads = _deepest(linear, loads, failed)
        self._lost[kind] += heads.tolist()
        forest, is_head = linear.forest, np.zeros(len(failed), dtype=bool)
        is_head[heads] = True
        below: Bools = is_head[forest.climb(is_head | forest.is_root)]
        return below

    def collapses(self, off: Bools) -> list[Collapse]:
        """What has been given up: each with what hangs on it, those within another left out."""
        found = []
        parent = self._part.forest.parent
        for kind, linear in (("trees", self._trees), ("twigs", self._twigs)):
            heads = np.array([head for head in self._lost[kind] if parent[head] < 0 or not off[parent[head]]], np.int64)
            if linear is not None and len(heads):
                cut = _Cut(_Idle(linear, self._loads, np.arange(len(parent))), heads)
                shares = _largest_share(cut.fails, len(heads))
                for number, head in enumerate(heads.tolist()):
                    found.append(self._collapse(head, cut.nodes[cut.of == number], float(shares[number])))
        for head in self._lost["mesh"]:
            only = self._loads.scaled(self._behind)

            def fails(share: Floats, only: Loads = only) -> Bools:
                _, _, bad = settle(self._linear, only.scaled(share[0]), self._part.group, self._linear.scale_v)
                return np.array([bad.any()])

            share = float(_largest_share(fails, 1)[0])
            found.append(self._collapse(head, np.flatnonzero(self._behind), share))
        return found

    def _collapse(self, node: int, nodes: Integers, share: float) -> Collapse:
        asked_w, asked_a = self._loads.power_w[nodes].sum(), self._loads.current_a[nodes].sum()
        return Collapse(int(self._part.nodes[node]), self._part.nodes[nodes], float(asked_w), float(asked_a), share)


def _deepest(linear: LinearPart, loads: Loads, failed: Bools) -> Integers:
    """The deepest failing heads: found by halving the depth, since what fails makes all above it fail."""
    nodes = np.flatnonzero(failed | linear.forest.is_root)
    idle = _Idle(linear, loads, nodes)
    least, most = 1, int(idle.forest.depth.max()) + 1
    while most - least > 1:
        middle = (least + most) // 2
        if _Cut(idle, np.flatnonzero(idle.forest.depth == middle)).fails().any():
            least = middle
        else:
            most = middle
    heads = np.flatnonzero(idle.forest.depth == least)
    fail = _Cut(idle, heads).fails()
    # exactly at the limit rounding decides; what failed before is then taken whole
    return nodes[heads[fail] if fail.any() else heads]


class _Idle:
    """Some trees with every load of constant power and current off, as each branch sees them."""

    def __init__(self, linear: LinearPart, loads: Loads, nodes: Integers) -> None:
        place = np.full(len(linear.forest) + 1, -1)
        place[nodes] = np.arange(len(nodes))
        self.forest = Forest(place[linear.forest.parent[nodes]])
        self.ohm, self.emf_v, self.loads = linear.ohm[nodes], linear.emf_v[nodes], loads.at(nodes)
        self.scale_v = linear.scale_v
        none = np.zeros(len(nodes))
        solved = self.forest.solve(self.ohm, self.loads.conductance_s, none, linear.held_v[nodes], self.emf_v)
        self.above_ohm = self.forest.ohm_above(self.ohm, solved)
        up = np.where(self.forest.is_root, 0, self.forest.parent)
        self.above_v = solved.voltage_v[up] + self.above_ohm * solved.current_a


class _Cut:
    """Subtrees cut off from their trees, each behind what its branch sees of the rest."""

    def __init__(self, idle: _Idle, heads: Integers) -> None:
        self.heads = heads
        number = np.full(len(idle.forest), -1)
        number[heads] = np.arange(len(heads))
        of = number[idle.forest.climb((number >= 0) | idle.forest.is_root)]
        self.nodes = np.flatnonzero(of >= 0)
        self.of = of[self.nodes]
        """Number of the head above each node."""
        size, is_head = len(self.nodes), number[self.nodes] >= 0
        place = np.full(len(idle.forest) + 1, -1)
        place[self.nodes] = np.arange(size)
        parent = np.where(is_head, size + self.of, place[idle.forest.parent[self.nodes]])
        none = np.zeros(len(heads))
        self._forest = Forest(np.concatenate([parent, np.full(len(heads), -1)]))
        ohm = idle.ohm[self.nodes] + np.where(is_head, idle.above_ohm[self.nodes], 0.0)
        self._ohm = np.concatenate([ohm, none])
        self._emf_v = np.concatenate([idle.emf_v[self.nodes], none])
        self._held_v = np.concatenate([np.zeros(size), idle.above_v[heads]])
        own = idle.loads.at(self.nodes)
        self._loads = Loads(*(np.concatenate([x, none]) for x in (own.current_a, own.power_w, own.conductance_s)))
        self._scale_v = idle.scale_v

    def fails(self, share: Floats | None = None) -> Bools:
        """By head: whether its subtree cannot be supplied with a share of what it asks for, the whole if not given."""
        if share is None:
            share = np.ones(len(self.heads))
        factor = np.concatenate([share[self.of], np.zeros(len(self.heads))])
        _, _, bad = settle(self._answer, self._loads.scaled(factor), self._forest.top, self._scale_v)
        fail = np.zeros(len(self.heads), dtype=bool)
        fail[self.of[bad[: len(self.nodes)]]] = True
        return fail

    def _answer(self, conductance_s: Floats, current_a: Floats) -> tuple[Floats, Floats]:
        solved = self._forest.solve(self._ohm, conductance_s, current_a, self._held_v, self._emf_v)
        return solved.voltage_v, solved.current_a


def _largest_share(fails: Callable[[Floats], Bools], count: int) -> Floats:
    """For each of several at once, the largest share from 0 to 1 at which it does not fail."""
    least, most = np.zeros(count), np.ones(count)
    for _ in range(HALVINGS):
        middle = (least + most) / 2
        bad = fails(middle)
        least, most = np.where(bad, least, middle), np.where(bad, middle, most)
    return least
