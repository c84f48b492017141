"""
A site as a solved network: which node is what, which branch is which run, its voltages in three states.

What cannot be computed (an unknown length, a load without a figure) is left out of the sums and remembered: a
voltage below it is then known only to be *at most* what is computed, and ``gap_of`` says why. In a mesh, or where a
return is shared, what is missing may push current either way: such voltages are not a number.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
from typing import Literal, TypeAlias

import numpy as np

from rules.calc.collapse import Collapse
from rules.calc.device import device_resistance_ohm
from rules.calc.forest import Bools, Floats, Integers
from rules.calc.loops import Legs
from rules.calc.network import NO_TIES, Solved
from rules.calc.network import Network as Shape
from rules.calc.newton import Loads
from rules.hanging import Hanging, unknown_below, unknown_converters
from rules.held import giving_of, highest_v, lowest_v, working_v
from rules.index import Index
from rules.limits import Limits
from rules.record import Circuit, Source
from rules.runs import Figures, RunFigures, SharedReturn
from rules.wiring import wiring_of

GAP_NOTHING_FEEDS = "nothing in the record feeds {}"
GAP_SOURCE = "the voltage of {} is not known"
GAP_LOWEST = "the lowest voltage of {} is not known"
GAP_HIGHEST = "the highest voltage of {} is not known"
GAP_LOAD = "what {} draws is not known"
GAP_BACK = "current would flow back into {}, whose voltage under that is not known"
STAND_IN_OHM = 1e-3
"""Keeps the equations of a mesh solvable in place of a resistance that is not known; what they give is not used. [ohm]"""
EASED = 1e-4
"""Share by which every resistance is lessened to see what the drops make of it; lessened, so that nothing collapses."""
LEAST_DROP_V = 1e-6
"""A drop so small that what its loads make of it is lost in rounding. [V]"""
StateName: TypeAlias = Literal["design", "lowest", "highest"]
MOST_NESTED = 50
"""Converters one behind the other, after which the power that they take is no longer followed."""


@dataclass(frozen=True, slots=True)
class State:
    """Resistances and source voltages of one state of the site."""

    legs: Legs
    held_v: Floats


class Network:
    """The solved network of a site; build with ``network_of``."""

    def __init__(self, index: Index, figures: Figures, limits: Limits) -> None:
        wiring = wiring_of(index)
        self._wiring, self._figures, self._index = wiring, figures, index
        self.node_of = wiring.node_of
        """Node by table and id, of sources and boards."""
        self.nodes_of = wiring.nodes_of
        """By circuit id: node by point, ``bus`` included; a circuit that nothing feeds is not in it."""
        self.run_at = wiring.run
        """Id of the run that arrives at each node; empty for a device and for a held node."""
        self.circuit_at = wiring.circuit
        """Id of the circuit whose branch arrives at each node."""
        self.parent: Integers = np.array(wiring.parent, dtype=np.int64)
        self.return_at = self._returns()
        """The shared return of the run that arrives at each node, by node; most have none."""
        self._row = np.array([figures.row[run] if run else -1 for run in wiring.run], dtype=np.int64)
        self._device_out, self._device_back = self._devices(limits)
        is_device = (self.parent >= 0) & (self._row < 0)
        ties = np.array(wiring.ties, dtype=np.int64).reshape(-1, 2) if wiring.ties else NO_TIES
        shared = [np.array(nodes, dtype=np.int64) for nodes in wiring.shared.values()]
        self._shape = Shape(self.parent, is_device & (self._device_back == 0), ties, shared)
        self.coupled: Bools = self._shape.coupled
        """Branches whose current is not that of the loads beyond alone: in a mesh, or with a shared return."""
        self.node_at_run_end = {run: node for node, run in enumerate(wiring.run) if run}
        """Node to which each run leads, by run id; of a run that closes a mesh, one of its own."""
        self.meshed = frozenset(
            wiring.run[node]
            for part in self._shape.parts
            if part.loops is not None
            for node in part.nodes[part.loops.meshed].tolist()
            if wiring.run[node]
        )
        """Ids of the runs that are part of a mesh."""
        root = self._shape.forest.climb(self._shape.forest.is_root)
        self.hanging = Hanging(wiring, root)
        """What hangs on each node."""
        self._held()
        self.gap, self.gap_lowest, self.gap_highest = (self._gaps(state) for state in ("", "lowest", "highest"))
        self.unknown_load = wiring.unknown
        """By node: a load there whose figure is not known."""
        unknown_converters(wiring, index)
        self.unknown_loads = frozenset(self.unknown_load.values())
        """What each of them is called: a load on its circuit, or a converter."""
        self._below = unknown_below(wiring, self._meshes())
        self._load = self._loads()
        legs = figures.legs
        recorded = self._state(legs.out, legs.back, self.held_v, lambda one: one.loop_ohm)
        hot = self._state(legs.out_hot, legs.back_hot, self.held_lowest_v, lambda one: one.loop_hot_ohm)
        cold = self._state(legs.out_cold, legs.back_cold, self.held_highest_v, lambda one: one.loop_cold_ohm)
        self.cold_ohm = recorded.legs.out + recorded.legs.back
        """Both own legs of the branch to each node at the recorded temperature; of a device, its resistance. [ohm]"""
        self.design: Solved = self._solve(recorded, self.gap)
        """The source at ``working``, the recorded temperature, healthy joints."""
        self.lowest: Solved = self._solve(hot, self.gap_lowest)
        """The same record with the source at ``lowest`` and hot conductors."""
        self.highest: Solved = self._solve(cold, self.gap_highest)
        """The same record with the source at ``highest`` and cold conductors: the least drop with every load on."""
        self._hot_ohm = hot.legs.out + hot.legs.back
        self._states: dict[StateName, State] = {"design": recorded, "lowest": hot, "highest": cold}
        self._eased: dict[StateName, Floats] = {}

    def solved(self, state: StateName) -> Solved:
        """One of the three states."""
        return {"design": self.design, "lowest": self.lowest, "highest": self.highest}[state]

    def growth(self, state: StateName, node: int, start: int) -> float:
        """
        By how many percent the drop between two nodes grows where every resistance grows by one percent.

        1 where loads draw constant currents, less with constant resistances, more with constant power: near collapse
        without bound. Of one run: ``1 / (1 - P R / V²)``, the derivative of ``V = (Vs + sqrt(Vs² - 4 P R)) / 2``.
        """
        volts = self.solved(state).voltage_v
        drop_v = float(volts[start] - volts[node])
        bends = self._load.power_w.any() or self._load.conductance_s.any() or self._wiring.takes
        if not bends or not abs(drop_v) > LEAST_DROP_V:
            return 1.0
        if state not in self._eased:
            full = self._states[state]
            legs = full.legs
            parts = (legs.out, legs.back, legs.tie_out, legs.tie_back, legs.shared)
            less = Legs(*(ohm * (1 - EASED) for ohm in parts))
            self._eased[state] = self._solve(replace(full, legs=less), [""] * len(self.parent)).voltage_v
        eased_v = float(self._eased[state][start] - self._eased[state][node])
        return 1.0 if eased_v != eased_v else abs((drop_v - eased_v) / (EASED * drop_v))

    def way_up(self, node: int, until: int = -1) -> Iterator[int]:
        """Branches from a node towards its source, as far as the node ``until`` (itself left out)."""
        while node >= 0 and node != until:
            yield node
            node = int(self.parent[node])

    def gap_of(self, node: int, until: int = -1, lowest: bool = False, highest: bool = False) -> str:
        """Why the voltage between two nodes is not known exactly; empty where it is."""
        gaps = self.gap_lowest if lowest else self.gap_highest if highest else self.gap
        for branch in self.way_up(node, until):
            if gaps[branch]:
                return gaps[branch]
            if self.parent[branch] >= 0 and self.cold_ohm[branch] > 0 and branch in self._below:
                return GAP_LOAD.format(self._below[branch])
        return ""

    def design_current_a(self, node: int) -> float | None:
        """Current in the branch to a node at design; ``None`` where a load beneath it is not known. [A]"""
        current = float(self.design.current_a[node])
        return None if node in self._below or np.isnan(current) else current

    def collapse_of(self, node: int, lowest: bool = False) -> Collapse | None:
        """Where supply fails that a lost node hangs on; ``None`` of a node that is supplied."""
        solved = self.lowest if lowest else self.design
        while solved.collapsed[node]:
            found = next((one for one in solved.collapses if node in one.nodes), None)
            if found is not None:
                return found
            root = list(self.way_up(node))[-1]
            node = next(
                self._wiring.takes[source.id] for source in self.sources_at(root) if source.id in self._wiring.takes
            )
        return None

    def pieces_ohm(self, branch: int) -> tuple[list[tuple[str, float]], list[tuple[str, float]]]:
        """What the outgoing and the return leg of a branch are made of, at the recorded temperature. [ohm]"""
        row, legs = int(self._row[branch]), self._figures.legs
        if row < 0:
            return [("device", float(self._device_out[branch]))], [("device", float(self._device_back[branch]))]
        out = [("conductors", float(legs.out[row])), ("joints", float(legs.out_joints[row]))]
        return out, [("conductors", float(legs.back[row])), ("joints", float(legs.back_joints[row]))]

    def path_ohm(self, node: int, lowest: bool = False) -> float:
        """Both legs from the source's terminals along the tree, shared returns included. [ohm]"""
        own = self._hot_ohm if lowest else self.cold_ohm
        ohm = 0.0
        for branch in self.way_up(node):
            if self.parent[branch] >= 0:
                ohm += float(own[branch])
            if branch in self.return_at:
                figures = self.return_at[branch].figures
                ohm += figures.loop_hot_ohm if lowest else figures.loop_ohm
        return ohm

    def place_of(self, node: int) -> str:
        """What leads to a node, for people: ``run 2 of B1-07``."""
        circuit = self._index.circuits[self.circuit_at[node]]
        if self._row[node] >= 0:
            return f"{self._figures.runs[int(self._row[node])].name} of {circuit.tag}"
        return f"the {'way' if circuit.device == 'none' else 'device'} of {circuit.tag}"

    def sources_at(self, held: int) -> tuple[Source, ...]:
        """The sources that hold a node without a parent."""
        return self._wiring.sources.get(held, ())

    def led_by(self, source: Source) -> list[int]:
        """The held nodes at which a source stands first: its own, and those of the sets in parallel that it leads."""
        return [node for node, sources in self._wiring.sources.items() if sources[:1] == (source,)]

    def in_parallel(self, source: Source) -> bool:
        """Whether a source holds some busbar together with others."""
        return any(len(sources) > 1 and source in sources for sources in self._wiring.sources.values())

    def worst(self, extra_ohm: Floats, offset_v: Floats, conductor_factor: Floats) -> Solved:
        """
        The lowest state with what readings support.

        Parameters
        ----------
        extra_ohm : array (runs,)
            Extra resistance in each run of the record, in the order of its rows; in the outgoing leg. [ohm]
        offset_v : array (circuits,)
            Voltage lost in a semiconductor at the start of each circuit, whatever the current. [V]
        conductor_factor : array (runs,)
            What each run's own conductors have over the recorded ones, joints left out; a shared return stays as recorded.

        Returns
        -------
        Solved
            The source at ``lowest``, hot conductors.

        Notes
        -----
        Where the factor or the extra resistance is uniform within a run and the run is no part of a mesh, it does not matter
        in which leg it lies.
        """
        legs, of_run = self._figures.legs, self._row >= 0
        out_ohm, back_ohm = legs.out_hot * conductor_factor, legs.back_hot * conductor_factor
        state = self._state(out_ohm, back_ohm, self.held_lowest_v, lambda one: one.loop_hot_ohm)
        out = state.legs.out.copy()
        out[of_run] += extra_ohm[self._row[of_run]]
        emf = np.zeros(len(out))
        for row, circuit in enumerate(self._index.site.circuits):
            if circuit.id in self.nodes_of:
                emf[self.nodes_of[circuit.id]["way"]] = -offset_v[row]
        return self._solve(State(replace(state.legs, out=out), state.held_v), list(self.gap_lowest), emf)

    def _returns(self) -> dict[int, SharedReturn]:
        returns = self._figures.returns
        return {node: returns[name] for name, nodes in self._wiring.shared.items() for node in nodes}

    def _devices(self, limits: Limits) -> tuple[Floats, Floats]:
        """Of the branch to each ``way``: in the leg that has the device, and in the other where both are switched."""
        out, back = np.zeros(len(self.parent)), np.zeros(len(self.parent))
        for circuit_id, points in self.nodes_of.items():
            circuit = self._index.circuits[circuit_id]
            ohm = device_ohm(circuit, limits) or 0.0
            both = circuit.device_leg == "both" and (circuit.device_poles or 1) > 1
            out[points["way"]], back[points["way"]] = (ohm / 2, ohm / 2) if both else (ohm, 0.0)
        return out, back

    def _held(self) -> None:
        size = len(self.parent)
        self.held_v, self.held_lowest_v, self.held_highest_v = (np.full(size, np.nan) for _ in range(3))
        for node, sources in self._wiring.sources.items():
            working, lowest, highest = working_v(sources), lowest_v(sources), highest_v(sources)
            self.held_v[node] = np.nan if working is None else working
            self.held_lowest_v[node] = self.held_v[node] if lowest is None else lowest
            self.held_highest_v[node] = self.held_v[node] if highest is None else highest

    def _gaps(self, state: str) -> list[str]:
        """Why each branch, or each held node's voltage, is not known; in a mesh the whole mesh shares it."""
        gaps = [""] * len(self.parent)
        for node, row in enumerate(self._row.tolist()):
            if row >= 0:
                gaps[node] = self._figures.gaps[row]
        for node, shared in self.return_at.items():
            gaps[node] = gaps[node] or shared.figures.gap
        for node, sources in self._wiring.sources.items():
            names = " + ".join(source.tag for source in sources)
            if working_v(sources) is None:
                gaps[node] = GAP_SOURCE.format(names)
            elif state == "lowest" and lowest_v(sources) is None:
                gaps[node] = GAP_LOWEST.format(names)
            elif state == "highest" and highest_v(sources) is None:
                gaps[node] = GAP_HIGHEST.format(names)
        for branches, held in self._meshes():
            gap = next((gaps[node] for node in (*branches, *held) if gaps[node]), "")
            for branch in branches if gap else ():
                gaps[branch] = gaps[branch] or gap
        return gaps

    def _meshes(self) -> Iterator[tuple[list[int], list[int]]]:
        """The branches of each set that ties and shared returns hold together, and its held nodes if they are several."""
        for part in self._shape.parts:
            if part.loops is not None:
                roots = part.nodes[part.forest.is_root].tolist()
                yield part.nodes[part.loops.coupled].tolist(), roots if len(roots) > 1 else []

    def _loads(self) -> Loads:
        size = len(self.parent)
        loads = Loads(np.zeros(size), np.zeros(size), np.zeros(size))
        for node, draws in self._wiring.loads:
            loads.current_a[node] += draws.current_a
            loads.power_w[node] += draws.power_w
            loads.conductance_s[node] += draws.conductance_s
        return loads

    def _state(
        self, out_conductor: Floats, back_conductor: Floats, held_v: Floats, of_shared: Callable[[RunFigures], float]
    ) -> State:
        legs, has = self._figures.legs, self._row >= 0
        rows = self._row[has]
        out, back = self._device_out.copy(), self._device_back.copy()
        out[has] = out_conductor[rows] + legs.out_joints[rows]
        back[has] = back_conductor[rows] + legs.back_joints[rows]
        returns = [self._figures.returns[name].figures for name in self._wiring.shared]
        shared = np.array([of_shared(one) for one in returns])
        shared[[bool(one.gap) for one in returns]] = STAND_IN_OHM
        open_ = self.coupled & np.array([bool(gap) for gap in self.gap], dtype=bool)
        out[open_] += STAND_IN_OHM
        back[open_] += STAND_IN_OHM
        none = np.zeros(len(self._wiring.ties))
        return State(self._shape.legs(out, back, none, none, shared), held_v)

    def _solve(self, state: State, gaps: list[str], emf_v: Floats | None = None) -> Solved:
        """One state; converters take the power of what they feed, over their efficiency."""
        size, takes = len(self.parent), self._wiring.takes
        given_by = {
            node: giving
            for node, sources in self._wiring.sources.items()
            if (giving := giving_of(sources, state.held_v[node])) is not None and giving.id in takes
        }
        taken = np.zeros(size)
        for _ in range(MOST_NESTED):
            solved = self._shape.solve(
                state.legs, replace(self._load, power_w=self._load.power_w + taken), state.held_v, emf_v
            )
            fresh = np.zeros(size)
            for node, source in given_by.items():
                watts = max(0.0, float(np.nan_to_num(state.held_v[node] * solved.current_a[node])))
                fresh[takes[source.id]] += watts / ((source.efficiency_percent or 100.0) / 100)
            if np.allclose(fresh, taken, rtol=1e-12, atol=1e-12):
                break
            taken = fresh
        return self._without_what_is_open(self._dead_converters(solved, given_by), gaps)

    def _dead_converters(self, solved: Solved, given_by: dict[int, Source]) -> Solved:
        """What hangs on a converter that cannot be supplied is lost with it."""
        root = self._shape.forest.climb(self._shape.forest.is_root)
        lost = solved.collapsed.copy()
        for _ in given_by:
            dead = [node for node, source in given_by.items() if lost[self._wiring.takes[source.id]] and not lost[node]]
            if not dead:
                break
            lost |= np.isin(root, dead)
        if lost.sum() == solved.collapsed.sum():
            return solved
        volts, out, back = (np.where(lost, np.nan, x) for x in (solved.voltage_v, solved.current_a, solved.back_a))
        return replace(solved, voltage_v=volts, current_a=out, back_a=back, collapsed=lost)

    def _without_what_is_open(self, solved: Solved, gaps: list[str]) -> Solved:
        """No figure of a mesh in which something is not known, or which drives a source backwards."""
        open_ = np.zeros(len(self.parent), dtype=bool)
        for part in self._shape.parts:
            if part.loops is None:
                continue
            branches = part.nodes[part.loops.coupled]
            roots = part.nodes[part.forest.is_root]
            into = roots[solved.current_a[roots] < -1e-9] if len(roots) > 1 else roots[:0]
            if len(into):
                names = " + ".join(source.tag for source in self.sources_at(int(into[0])))
                for branch in branches.tolist():
                    gaps[branch] = gaps[branch] or GAP_BACK.format(names)
            if any(gaps[branch] for branch in branches.tolist()):
                open_[part.nodes[part.loops.behind]] = True
        if not open_.any():
            return solved
        volts, out, back = (np.where(open_, np.nan, x) for x in (solved.voltage_v, solved.current_a, solved.back_a))
        return replace(solved, voltage_v=volts, current_a=out, back_a=back)


def network_of(index: Index, figures: Figures, limits: Limits) -> Network:
    """Build a site's network and solve it at design, at the lowest and at the highest source voltage."""
    return Network(index, figures, limits)


def device_ohm(circuit: Circuit, limits: Limits) -> float | None:
    """Typical resistance of a circuit's device; ``None`` where it is not recorded: it has no figure of its own. [ohm]"""
    if not circuit.device:
        return None
    return device_resistance_ohm(
        circuit.device, circuit.rated_current_a, circuit.device_poles or 1, limits["device_doubt.typical_share"]
    )
