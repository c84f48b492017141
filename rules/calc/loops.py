"""
What flows beside a tree: currents round the loops that runs close, and in returns that circuits share.

A forest of pairs knows one current a branch, the same in both legs. Where a run closes a mesh, or one return
conductor serves several runs, the legs carry what the loads' currents say *plus* currents of their own; each is one
unknown. The unknowns are found from a small dense system, since the forest answers each of them linearly: Kirchhoff's
voltage law round every loop of the two rails, and the sum of currents in every shared return. Nothing is taken as
alike in the two legs, so a device or a thinner conductor in one of them counts where it is.

References
----------
Loop analysis on a spanning tree: Desoer and Kuh, Basic Circuit Theory, 1969, chapter 11 (from memory).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from rules.calc.forest import Bools, Floats, Forest, Integers, Linear


@dataclass(frozen=True, slots=True)
class Legs:
    """Resistances of the two legs, and of what lies beside the forest. [ohm]"""

    out: Floats
    """Of the branch to each node, the leg with the device."""
    back: Floats
    """The other leg; 0 where it is shared."""
    tie_out: Floats
    """Of each run that closes a mesh."""
    tie_back: Floats
    shared: Floats
    """Of each shared return conductor."""


class Loops:
    """
    The unknown currents of a forest with ties and shared returns, from its shape alone.

    Parameters
    ----------
    forest : Forest
        n pairs.
    in_one_leg : array (n,) of bool
        Branches without a return leg of their own, such as a device: both ends have one return terminal.
    ties : array (t, 2)
        Nodes that each closing run joins, from and to.
    shared : sequence of arrays
        Of each shared return, the nodes to which its runs lead. The runs begin at one place and end at one place,
        so that their return terminals are one at either end.

    Notes
    -----
    Loops are the branches that a spanning tree of all terminals leaves over, each closed through that tree. Two
    supplies that two-legged runs join are floating against each other: their loops run through both.
    """

    nodes: Integers
    """Nodes whose branches carry one of the unknowns, with all before them up to the roots; roots left out."""
    coupled: Bools
    """(n,) Branches that carry one of the unknowns."""
    meshed: Bools
    """(n,) Branches among them that lie in a loop."""
    behind: Bools
    """(n,) Nodes at the end of such a branch, and all that hangs on them."""

    def __init__(self, forest: Forest, in_one_leg: Bools, ties: Integers, shared: Sequence[Integers]) -> None:
        graph = _Graph(forest, in_one_leg, ties, shared)
        loops = graph.loops()
        parent = forest.parent
        self.meshed = np.zeros(len(parent), dtype=bool)
        for loop in loops:
            self.meshed[[index for kind, index in loop if kind in ("out", "back")]] = True
        self.coupled = self.meshed.copy()
        for members in shared:
            self.coupled[members] = True
        self.behind = self.coupled[forest.climb(self.coupled | forest.is_root)]
        on_way = self.coupled.copy()
        for node in np.flatnonzero(self.coupled).tolist():
            while (node := int(parent[node])) >= 0 and not on_way[node]:
                on_way[node] = True
        self.nodes = np.flatnonzero(on_way & (parent >= 0))
        self.nodes = self.nodes[np.argsort(forest.depth[self.nodes], kind="stable")]
        place = np.full(len(parent) + 1, -1)
        place[self.nodes] = np.arange(len(self.nodes))
        self._above = place[parent[self.nodes]].tolist()
        sizes = {"out": len(self.nodes), "back": len(self.nodes), "tie_out": len(ties), "tie_back": len(ties)}
        self._roots = np.flatnonzero(parent < 0)
        sizes |= {"shared": len(shared), "source": len(self._roots)}
        column = {"out": place, "back": place, "source": np.searchsorted(self._roots, np.arange(len(parent)))}
        self._turns = {kind: np.zeros((len(loops), size)) for kind, size in sizes.items()}
        """How often, and which way, each loop runs through each leg."""
        for row, loop in enumerate(loops):
            for (kind, index), sign in loop.items():
                self._turns[kind][row, column[kind][index] if kind in column else index] += sign
        self._member = np.zeros((len(shared), len(self.nodes)))
        for row, members in enumerate(shared):
            self._member[row, place[members]] = 1.0

    def __len__(self) -> int:
        return len(self._member) + len(self._turns["out"])

    def system(self, legs: Legs, held_v: Floats, emf_v: Floats) -> System:
        """The equations at given resistances, source voltages and voltages added along branches (out leg)."""
        turns, member, nodes = self._turns, self._member, self.nodes
        round_loop = turns["out"] * legs.out[nodes] + turns["back"] * legs.back[nodes]
        shared_turns = turns["shared"] * legs.shared
        own = (turns["out"] * legs.out[nodes]) @ turns["out"].T + (turns["back"] * legs.back[nodes]) @ turns["back"].T
        own += (turns["tie_out"] * legs.tie_out) @ turns["tie_out"].T
        own += (turns["tie_back"] * legs.tie_back) @ turns["tie_back"].T
        drives = np.concatenate(
            [np.zeros(len(member)), turns["source"] @ held_v[self._roots] + turns["out"] @ emf_v[nodes]]
        )
        return System(
            nodes=nodes,
            above=self._above,
            lost=np.concatenate([(member * legs.shared[:, None]).T, round_loop.T], axis=1),
            sums=np.concatenate([member, round_loop]),
            own=np.block([[-np.eye(len(member)), turns["shared"].T], [shared_turns, own]]),
            drives=drives,
        )

    def currents(self, x: Floats, tree_a: Floats) -> tuple[Floats, Floats, Floats, Floats, Floats]:
        """
        Currents in the out and back leg of each node's branch, of each tie, and in each shared return. [A]

        ``x`` are the unknowns, ``tree_a`` (n,) the currents that the forest carries. The back leg of a run with a
        shared return is given what the whole return carries.
        """
        shared, round_ = x[: len(self._member)], x[len(self._member) :]
        out, back = tree_a.copy(), tree_a.copy()
        out[self.nodes] += round_ @ self._turns["out"]
        back[self.nodes] += round_ @ self._turns["back"]
        is_member = self._member.any(axis=0)
        back[self.nodes[is_member]] = (shared @ self._member)[is_member]
        return out, back, round_ @ self._turns["tie_out"], round_ @ self._turns["tie_back"], shared


@dataclass(frozen=True, slots=True)
class System:
    """Equations for m unknowns on k branches, beside the forest's own."""

    nodes: Integers
    above: list[int]
    """Place of each node's parent among ``nodes``; -1 for a root."""
    lost: Floats
    """(k, m) What one ampere of each unknown takes from the voltage along each branch. [ohm]"""
    sums: Floats
    """(m, k) How each equation counts the forest's currents."""
    own: Floats
    """(m, m) How it counts the unknowns."""
    drives: Floats
    """(m,) Source voltages round each loop. [V]"""

    def solve(self, before: Linear, resistance_ohm: Floats) -> tuple[Floats, float]:
        """
        The unknowns, given the forest's solution without them, and the sign of the whole network's determinant.

        A sign of zero stands for no solution; the unknowns are then without meaning.
        """
        answers = self._answers(before, resistance_ohm[self.nodes])
        right = self.drives - self.sums @ before.current_a[self.nodes]
        matrix = self.sums @ answers + self.own
        sign = float(np.linalg.slogdet(matrix).sign) * float(np.prod(np.sign(before.pivot[self.nodes])))
        return (np.asarray(np.linalg.solve(matrix, right), dtype=float) if sign else right), sign

    def _answers(self, before: Linear, r: Floats) -> Floats:
        """(k, m) How the current in each branch answers one ampere of each unknown."""
        g, pivot = before.conductance_s[self.nodes], before.pivot[self.nodes]
        drawn = np.zeros_like(self.lost)
        for place in range(len(self.nodes) - 1, -1, -1):
            if (up := self.above[place]) >= 0:
                drawn[up] += (drawn[place] - g[place] * self.lost[place]) / pivot[place]
        volts = np.empty_like(self.lost)
        for place, up in enumerate(self.above):
            here = -self.lost[place] - r[place] * drawn[place]
            volts[place] = (here + volts[up] if up >= 0 else here) / pivot[place]
        answers: Floats = drawn + g[:, None] * volts
        return answers


Element = tuple[str, int]
"""A leg: ``out`` or ``back`` of a node's branch, ``tie_out``, ``tie_back``, ``shared``, ``source`` of a root."""


class _Graph:
    """Terminals of both rails and the legs between them, each in the direction of a load's current."""

    def __init__(self, forest: Forest, in_one_leg: Bools, ties: Integers, shared: Sequence[Integers]) -> None:
        size = len(forest)
        self._same = list(range(2 * size))
        """Terminals: ``out`` of node k is k, ``back`` is size + k; those joined by no resistance are one."""
        parent = forest.parent.tolist()
        has_shared = {int(node) for members in shared for node in members}
        for node, up in enumerate(parent):
            if up >= 0 and in_one_leg[node]:
                self._join(size + node, size + up)
        for members in shared:
            first = int(members[0])
            for node in members[1:].tolist():
                self._join(size + node, size + first)
                self._join(size + parent[node], size + parent[first])
        edges: list[tuple[int, int, Element]] = []
        for node, up in enumerate(parent):
            edges.append((up, node, ("out", node)) if up >= 0 else (size + node, node, ("source", node)))
        for node, up in enumerate(parent):
            if up >= 0 and not in_one_leg[node] and node not in has_shared:
                edges.append((size + node, size + up, ("back", node)))
        for index, members in enumerate(shared):
            edges.append((size + int(members[0]), size + parent[int(members[0])], ("shared", index)))
        for index, (start, end) in enumerate(ties.tolist()):
            edges.append((start, end, ("tie_out", index)))
        for index, (start, end) in enumerate(ties.tolist()):
            edges.append((size + end, size + start, ("tie_back", index)))
        found = [(self._find(a), self._find(b), part) for a, b, part in edges]
        # nothing drives a current round a tie that begins and ends at one terminal, and the forest sends none through it
        self._edges = [(a, b, part) for a, b, part in found if a != b or part[0] not in ("tie_out", "tie_back")]

    def loops(self) -> list[dict[Element, float]]:
        """A set of independent loops: how often each runs through each leg, and which way."""
        linked = list(range(len(self._same)))
        beside: dict[int, list[tuple[int, Element, float]]] = {}
        closing = []
        for a, b, part in self._edges:
            one, other = representative(linked, a), representative(linked, b)
            if one == other:
                closing.append((a, b, part))
                continue
            linked[one] = other
            beside.setdefault(a, []).append((b, part, 1.0))
            beside.setdefault(b, []).append((a, part, -1.0))
        if not closing:
            return []
        came: dict[int, tuple[int, Element, float]] = {}
        depth: dict[int, int] = {}
        for start in beside:
            if start in depth:
                continue
            depth[start], queue = 0, [start]
            for here in queue:
                for there, part, sign in beside[here]:
                    if there not in depth:
                        depth[there] = depth[here] + 1
                        came[there] = (here, part, sign)
                        queue.append(there)
        return [self._close(a, b, part, came, depth) for a, b, part in closing]

    @staticmethod
    def _close(
        a: int, b: int, part: Element, came: dict[int, tuple[int, Element, float]], depth: dict[int, int]
    ) -> dict[Element, float]:
        """From ``a`` along the closing leg to ``b``, and back to ``a`` through the spanning tree."""
        loop = {part: 1.0}
        while a != b:
            if depth.get(a, 0) >= depth.get(b, 0):
                a, leg, sign = came[a]
            else:
                b, leg, sign = came[b]
                sign = -sign
            loop[leg] = loop.get(leg, 0.0) + sign
        return loop

    def _find(self, terminal: int) -> int:
        return representative(self._same, terminal)

    def _join(self, one: int, other: int) -> None:
        self._same[self._find(one)] = self._find(other)


def representative(links: list[int], at: int) -> int:
    """The representative of a set, halving the path to it on the way."""
    while links[at] != at:
        links[at] = links[links[at]]
        at = links[at]
    return at
