"""Parts of a network that know nothing of each other, each with its linear equations."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from rules.calc.forest import Bools, Floats, Forest, Integers
from rules.calc.loops import Legs, Loops, representative
from rules.errors import InvalidQuantity


@dataclass(frozen=True, slots=True)
class Part:
    """Some branches of a network with the held nodes that they hang on, numbered among themselves."""

    nodes: Integers
    """Their numbers in the network."""
    forest: Forest
    group: Integers
    """Of nodes that collapse together, the number of one of them."""
    loops: Loops | None
    """What ties and shared returns hold together; ``None`` for trees alone."""
    ties: Integers
    """Numbers of its ties in the network."""
    shared: Integers
    """Numbers of its shared returns in the network."""

    def linear(self, legs: Legs, held_v: Floats, emf_v: Floats) -> LinearPart:
        """Its equations at given resistances (of the network), source voltages and voltages added (of the part)."""
        own = Legs(
            legs.out[self.nodes],
            legs.back[self.nodes],
            legs.tie_out[self.ties],
            legs.tie_back[self.ties],
            legs.shared[self.shared],
        )
        return LinearPart(self, own, held_v, emf_v)


class LinearPart:
    """Answers linear loads with voltages and branch currents; see ``rules.calc.newton.Answer``."""

    unknowns: Floats
    """What ``Loops`` needs for the currents of the last answer. [A]"""

    def __init__(self, part: Part, legs: Legs, held_v: Floats, emf_v: Floats) -> None:
        self.forest = part.forest
        self.legs = legs
        self.ohm = legs.out + legs.back
        self.held_v = held_v
        self.scale_v = float(np.max(np.abs(held_v), initial=1e-6))
        self.emf_v = emf_v
        self.system = None if part.loops is None else part.loops.system(legs, held_v, emf_v)
        self.unknowns = np.zeros(0 if part.loops is None else len(part.loops))
        self._sign: float | None = None
        """Of the determinant with loads that take no more as the voltage falls: every search for a solution begins with them."""

    def __call__(self, conductance_s: Floats, current_a: Floats) -> tuple[Floats, Floats]:
        solved = self.forest.solve(self.ohm, conductance_s, current_a, self.held_v, self.emf_v)
        if self.system is None or np.isnan(solved.pivot).any():
            return solved.voltage_v, solved.current_a
        self.unknowns, sign = self.system.solve(solved, self.ohm)
        if self._sign is None:
            self._sign = sign
        if not self._sign:
            raise InvalidQuantity("a mesh of a network must have resistance")
        if sign != self._sign:
            nothing = np.full(len(self.ohm), np.nan)
            return nothing, nothing
        emf_v = self.emf_v.copy()
        emf_v[self.system.nodes] -= self.system.lost @ self.unknowns
        solved = self.forest.solve(self.ohm, conductance_s, current_a, self.held_v, emf_v)
        return solved.voltage_v, solved.current_a


def parts_of(forest: Forest, in_one_leg: Bools, ties: Integers, shared: Sequence[Integers]) -> Iterator[Part]:
    """All trees that nothing ties as one part, then each set of trees that ties and shared returns hold together."""
    size, top, is_root = len(forest), forest.top, forest.is_root
    if not len(ties) and not shared:
        yield Part(np.arange(size), forest, top, None, np.zeros(0, np.int64), np.zeros(0, np.int64))
        return
    labels, held = _labels(forest, ties, shared)
    label, place = labels[top], np.full(size + 1, -1)
    trees = np.flatnonzero(label < 0)
    place[trees] = np.arange(len(trees))
    loose = Forest(place[forest.parent[trees]])
    yield Part(trees, loose, loose.top, None, np.zeros(0, np.int64), np.zeros(0, np.int64))
    order = np.argsort(label, kind="stable")
    bounds = np.searchsorted(label[order], np.arange(len(held) + 1))
    tie_label = labels[size : size + len(ties)]
    shared_label = np.array([label[members[0]] for members in shared], dtype=np.int64)
    for number, roots in enumerate(held):
        nodes = np.concatenate([np.array(sorted(roots)), np.sort(order[bounds[number] : bounds[number + 1]])])
        place[nodes] = np.arange(len(nodes))
        own = Forest(np.where(is_root[nodes], -1, place[forest.parent[nodes]]))
        its_ties, its_shared = np.flatnonzero(tie_label == number), np.flatnonzero(shared_label == number)
        loops = Loops(own, in_one_leg[nodes], place[ties[its_ties]], [place[shared[k]] for k in its_shared.tolist()])
        may_turn = np.zeros(len(nodes), dtype=bool)
        may_turn[loops.nodes] = True
        own = Forest(own.parent, may_turn)
        group = np.where(own.is_root, np.arange(len(nodes)), len(nodes) - 1)
        yield Part(nodes, own, group, loops, its_ties, its_shared)


def _labels(forest: Forest, ties: Integers, shared: Sequence[Integers]) -> tuple[Integers, list[set[int]]]:
    """
    By node beside a root, then by tie: the number of the part that holds it, -1 for a tree that nothing ties.

    Also the held nodes of each part. Trees on one held node stay apart, since it is ideal; but parts that reach over
    two held nodes both leave open how the two float against each other, and are one.
    """
    size, top = len(forest), forest.top.tolist()
    is_root, root = forest.is_root.tolist(), forest.climb(forest.is_root).tolist()
    link = list(range(size + len(ties)))
    touched: list[tuple[int, set[int]]] = []
    for index, pair in enumerate(ties.tolist()):
        for node in pair:
            if not is_root[node]:
                link[representative(link, top[node])] = representative(link, size + index)
        touched.append((size + index, {root[node] for node in pair}))
    for members in shared:
        first, *others = members.tolist()
        for node in others:
            link[representative(link, top[node])] = representative(link, top[first])
        touched.append((top[first], {root[node] for node in members.tolist()}))
    held: dict[int, set[int]] = {}
    for element, roots in touched:
        held.setdefault(representative(link, element), set()).update(roots)
    by_root: dict[int, int] = {}
    for element, roots in held.items():
        for node in roots if len(roots) > 1 else ():
            other = by_root.setdefault(node, element)
            link[representative(link, element)] = representative(link, other)
    merged: dict[int, set[int]] = {}
    for element, roots in held.items():
        merged.setdefault(representative(link, element), set()).update(roots)
    numbers = {element: number for number, element in enumerate(merged)}
    labels = np.full(len(link), -1)
    for element in range(len(link)):
        labels[element] = numbers.get(representative(link, element), -1)
    return labels, list(merged.values())
