"""What would do for a load by its drop alone: the smallest size of the path, or equal conductors in parallel."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, replace

import numpy as np

from rules.calc.network import Network as Shape
from rules.calc.newton import Loads
from rules.case import CircuitCase, LoadPoint
from rules.decision import Verdict, against_limit
from rules.loads import drawn
from rules.record import Figure, Run
from rules.runs import figures
from rules.tables.conductors import area_mm2, ladder
from rules.units import show, show_size

MOST_PARALLEL = 20
"""Conductors side by side up to which a sufficient number is looked for. Our own default."""


@dataclass(frozen=True, slots=True)
class Sufficient:
    """One way to keep a load's drop within what is allowed, beyond its doubt."""

    runs: tuple[str, ...]
    """Names of the runs to be changed, those of the path from the feeding board that are not enough as they are."""
    size: str
    """None of them smaller than this; empty where conductors are put in parallel."""
    parallel: int
    """Times as many equal conductors as there are; 1 where the size is changed."""
    drop_v: float
    """From the board to the load, then. [V]"""


def sufficient_of(
    case: CircuitCase, point: LoadPoint, allowed_v: float | None = None
) -> tuple[Sufficient | None, Sufficient | None]:
    """
    The smallest size of the ladder, and the fewest conductors in parallel, with which a load's drop conforms.

    Parameters
    ----------
    case : CircuitCase
        Of one circuit.
    point : LoadPoint
        One of its loads.
    allowed_v : float, optional
        From the feeding board to the load; else what the circuit is allowed to lose. [V]

    Returns
    -------
    tuple
        By size, by number; ``None`` where nothing on the ladder is enough, where something is not known, and in a mesh.

    Notes
    -----
    The circuit is solved again behind its board's voltage with its loads as recorded, what hangs on it further down as
    steady currents. The doubt of the drop keeps its proportion. A return of its own size keeps it. Capacity is not
    looked at.
    """
    path = _path(case, point)
    if not path or point.gap or case.nominal_v is None or point.drop_v <= 0:
        return None, None
    if allowed_v is None:
        allowed_v = case.allowed_drop_percent / 100 * case.nominal_v
    doubt = point.drop_u / point.drop_v
    drop_with = _Circuit(case, point).drop_v

    def first(changes: Iterable[tuple[str, int, dict[str, Run]]]) -> Sufficient | None:
        for size, parallel, changed in changes:
            drop_v = drop_with(changed)
            if drop_v is not None and _conforms(drop_v, allowed_v, doubt * drop_v, case):
                names = tuple(run.name for run in path if changed[run.id] != run)
                return Sufficient(names, size, parallel, drop_v)
        return None

    by_size = ((size, 1, {run.id: _not_below(run, size) for run in path}) for size in ladder(path[0].size))
    by_number = ((("", n, {run.id: _beside(run, n) for run in path})) for n in range(1, MOST_PARALLEL + 1))
    return first(by_size), first(by_number)


def _conforms(drop_v: float, allowed_v: float, drop_u: float, case: CircuitCase) -> bool:
    return against_limit(drop_v, allowed_v, drop_u, case.limits) is Verdict.CONFORMS


def _path(case: CircuitCase, point: LoadPoint) -> list[Run]:
    """The runs from the board to a load; none in a mesh, where no single way is the load's."""
    network = case.context.network
    nodes = network.nodes_of.get(case.circuit.id, {})
    runs = {run.id: run for run in case.runs}
    if point.load.point not in nodes or any(run.id in network.meshed for run in case.runs):
        return []
    way = list(network.way_up(nodes[point.load.point], nodes["bus"]))
    return [runs[network.run_at[node]] for node in reversed(way) if network.run_at[node]]


def _not_below(run: Run, size: str) -> Run:
    return run if area_mm2(run.size) >= area_mm2(size) else replace(run, size=size)


def _beside(run: Run, times: int) -> Run:
    return run if times == 1 else replace(run, parallel=times * run.parallel_or_default)


class _Circuit:
    """One circuit behind its board, cut out of the site's network."""

    def __init__(self, case: CircuitCase, point: LoadPoint) -> None:
        network = case.context.network
        self._case, self._design = case, network.design
        named = network.nodes_of[case.circuit.id]
        below = [network.node_at_run_end[run.id] for run in case.runs if run.id in network.node_at_run_end]
        self._nodes = [named["bus"], named["way"], *below]
        place = {node: n for n, node in enumerate(self._nodes)}
        self._end = place[named[point.load.point]]
        parent = [-1, *(place[int(network.parent[node])] for node in self._nodes[1:])]
        self._shape = Shape(np.array(parent))
        self._held_v = np.zeros(len(parent))
        self._held_v[0] = self._design.voltage_v[named["bus"]]
        self._loads = self._drawn(place)
        self._device_ohm = float(network.cold_ohm[named["way"]])
        self._shared = {place[node]: shared for node, shared in network.return_at.items() if node in place}

    def drop_v(self, changed: dict[str, Run]) -> float | None:
        """From the board to the load with some runs exchanged; ``None`` where it cannot be supplied."""
        case = self._case
        runs = [changed.get(run.id, run) for run in case.runs if run.id in case.context.network.node_at_run_end]
        made = figures(runs, case.context.site, case.limits)
        ohm = np.array([0.0, self._device_ohm, *(made[run.id].loop_ohm for run in runs)])
        emf_v = np.zeros(len(ohm))
        for node, shared in self._shared.items():
            # what the others put into a shared return stays; its own current adds to that
            ohm[node] += shared.figures.loop_ohm
            here = self._nodes[node]
            others_a = float(self._design.back_a[here] - self._design.current_a[here])
            emf_v[node] = -shared.figures.loop_ohm * others_a
        solved = self._shape.solve(self._shape.legs(ohm / 2, ohm / 2), self._loads, self._held_v, emf_v)
        volts = float(solved.voltage_v[0] - solved.voltage_v[self._end])
        return None if volts != volts else volts

    def _drawn(self, place: dict[int, int]) -> Loads:
        """The circuit's own loads; boards and converters further down as what flows on to them."""
        case, size = self._case, len(place)
        loads = Loads(np.zeros(size), np.zeros(size), np.zeros(size))
        named = case.context.network.nodes_of[case.circuit.id]
        for load in case.loads:
            draws, at = drawn(load.load, case.nominal_v), place.get(named.get(load.load.point, -1))
            if draws is not None and at is not None:
                loads.current_a[at] += draws.current_a
                loads.power_w[at] += draws.power_w
                loads.conductance_s[at] += draws.conductance_s
        amps = np.nan_to_num(self._design.current_a[self._nodes])
        volts = np.nan_to_num(self._design.voltage_v[self._nodes], nan=1.0)
        on = np.zeros(size)
        np.add.at(on, self._shape.forest.parent[1:], amps[1:])
        own = loads.current_a + loads.power_w / volts + loads.conductance_s * volts
        loads.current_a[1:] += np.maximum(0.0, amps - on - own)[1:]
        return loads


def sufficient_words(
    by_size: Sufficient | None, by_number: Sufficient | None, nominal_v: float
) -> tuple[str, dict[str, Figure]]:
    """What would do, as ``16 mm² in run 1 (0.61 V, 2.5 %) or 2 times the conductors in run 1 (…)``, and the drops then."""
    told, numbers = [], {}
    if by_size is not None:
        told.append((f"{show_size(by_size.size)} in {_names(by_size.runs)}", by_size.drop_v))
        numbers["drop at sufficient size"] = Figure(by_size.drop_v, "V")
    if by_number is not None:
        told.append((f"{by_number.parallel} times the conductors in {_names(by_number.runs)}", by_number.drop_v))
        numbers["drop at sufficient number"] = Figure(by_number.drop_v, "V")
    words = [f"{what} ({show(v, 'V', digits=3)}, {show(v / nominal_v, '1', digits=3)})" for what, v in told]
    return " or ".join(words), numbers


def _names(runs: tuple[str, ...]) -> str:
    return runs[0] if len(runs) == 1 else f"runs {', '.join(name.removeprefix('run ') for name in runs)}"
