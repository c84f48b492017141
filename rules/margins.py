"""
What each load of a circuit has to spare: voltages and margins, where the voltage is lost, peaks, losses.

Everything follows from the solved network; nothing here judges. The worst case is the lowest state as recorded, unless
one with what readings support is given.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass

from rules.calc.network import Solved
from rules.calc.peak import energy_kwh_a_year, lowest_at_peak_v
from rules.case import CircuitCase, LoadPoint
from rules.held import highest_v
from rules.loads import drawn
from rules.network import Network
from rules.record import Figure, Load, Source


@dataclass(frozen=True, slots=True)
class Lost:
    """Voltage lost in one piece of the path to a load, and the heat there."""

    what: str
    """``conductors``, ``joints``, ``device``, ``shared return`` or ``joints of the shared return``."""
    place: str
    """``run 2 of B1-07``."""
    volts: float
    share: float
    """Of all that is lost from the source's terminals to the load; 0 where nothing is."""
    watts: float
    """Of this piece at all that it carries; of a shared return, what this circuit's own current makes of it."""


@dataclass(frozen=True, slots=True)
class Peak:
    """A load at its peak current, every other load steady."""

    current_a: float
    design_v: float
    """From ``working``; below zero where the path cannot carry it. [V]"""
    lowest_v: float | None
    """From the source's lowest, hot conductors; ``None`` where the record does not give it. [V]"""
    source_ohm: float | None
    """The source's own resistance; ``None`` where it is not recorded and was left out: the dip is at least this."""


@dataclass(frozen=True, slots=True)
class Margin:
    """What one load has to spare; a figure that is not known is ``None``. Voltages between its legs."""

    load: Load
    design_v: float | None
    worst_v: float | None
    most_v: float | None
    """The source at its highest and no current anywhere. [V]"""
    above_lowest_v: float | None
    """At design. [V]"""
    worst_above_lowest_v: float | None
    below_highest_v: float | None
    """What the source's highest leaves below the load's. [V]"""
    path: tuple[Lost, ...]
    """Where its voltage is lost at design, from the source's terminals on; empty where the path is not known."""
    peak: Peak | None
    """``None`` where no peak is recorded."""


@dataclass(frozen=True, slots=True)
class Loss:
    """Heat in one branch of a circuit at design."""

    place: str
    watts: float

    def kwh_a_year(self, duty: float) -> float:
        """Energy at a share of the year in which the design current flows. [kWh]"""
        return energy_kwh_a_year(self.watts, duty)


def margins_of(case: CircuitCase, worst: Solved | None = None) -> tuple[Margin, ...]:
    """
    The margins of a circuit's loads, in the order of their rows.

    Parameters
    ----------
    case : CircuitCase
        Of one circuit.
    worst : Solved, optional
        Of the same network, for example ``Network.worst``; else its lowest state.
    """
    return tuple(_margin(case, point, worst or case.context.network.lowest) for point in case.loads)


def losses_of(case: CircuitCase) -> tuple[Loss, ...]:
    """Heat in the device and in each run of a circuit at design, those not known left out; a shared return by its part."""
    network = case.context.network
    nodes = network.nodes_of.get(case.circuit.id, {})
    branches = [nodes["way"]] if nodes else []
    branches += [network.node_at_run_end[run.id] for run in case.runs if run.id in network.node_at_run_end]
    losses = []
    for branch in branches:
        if not network.gap_of(branch, int(network.parent[branch])) and not network.design.collapsed[branch]:
            losses.append(Loss(network.place_of(branch), sum(lost.watts for lost in _lost_in(network, branch, 1.0))))
    return tuple(losses)


def _margin(case: CircuitCase, point: LoadPoint, worst: Solved) -> Margin:
    network, load = case.context.network, point.load
    node = network.nodes_of.get(case.circuit.id, {}).get(load.point)
    if node is None:
        return Margin(load, None, None, None, None, None, None, (), None)
    source = list(network.way_up(node))[-1]
    known = not network.gap_of(node) and not network.design.collapsed[node]
    design_v = float(network.design.voltage_v[node]) if known else None
    known_worst = not network.gap_of(node, lowest=True) and not worst.collapsed[node]
    worst_v = float(worst.voltage_v[node]) if known_worst else None
    most_v = highest_v(network.sources_at(source))
    low, high = load.lowest_voltage_v, load.highest_voltage_v
    return Margin(
        load=load,
        design_v=design_v,
        worst_v=worst_v,
        most_v=most_v,
        above_lowest_v=None if design_v is None or low is None else design_v - low,
        worst_above_lowest_v=None if worst_v is None or low is None else worst_v - low,
        below_highest_v=None if most_v is None or high is None else high - most_v,
        path=tuple(_path(network, node)) if known else (),
        peak=_peak(case, node, load, design_v, worst_v),
    )


def _path(network: Network, node: int) -> Iterator[Lost]:
    branches = list(network.way_up(node))[::-1]
    whole = float(network.design.voltage_v[branches[0]] - network.design.voltage_v[node])
    for branch in branches[1:]:
        yield from _lost_in(network, branch, whole)


def _lost_in(network: Network, branch: int, whole_v: float) -> Iterator[Lost]:
    """The pieces of one branch; together they lose what lies between its ends."""
    out_a, back_a = float(network.design.current_a[branch]), float(network.design.back_a[branch])
    place = network.place_of(branch)
    shared = network.return_at.get(branch)
    out, back = network.pieces_ohm(branch)
    pieces = [(what, ohm, out_a, out_a) for what, ohm in out]
    if shared is None:
        pieces += [(what, ohm, back_a, back_a) for what, ohm in back]
    else:
        pieces.append(("shared return", shared.figures.conductor_ohm, back_a, out_a))
        pieces.append(("joints of the shared return", shared.figures.joints_ohm, back_a, out_a))
    volts: dict[str, float] = {}
    watts: dict[str, float] = {}
    for what, ohm, amps, own_a in pieces:
        volts[what] = volts.get(what, 0.0) + ohm * amps
        watts[what] = watts.get(what, 0.0) + ohm * amps * own_a
    for what, lost_v in volts.items():
        if lost_v:
            yield Lost(what, place, lost_v, lost_v / whole_v if whole_v else 0.0, watts[what])


def _peak(case: CircuitCase, node: int, load: Load, design_v: float | None, worst_v: float | None) -> Peak | None:
    """
    The load's own steady current exchanged for its peak, what the others lose staying as it is.

    In a mesh the path is counted as if the mesh were open: the dip is then at most this.
    """
    network, draws = case.context.network, drawn(load, case.nominal_v)
    if load.peak_current_a is None or design_v is None or draws is None:
        return None
    source_ohm = _source_ohm(network.sources_at(list(network.way_up(node))[-1]))

    def at_peak(volts: float, ohm: float) -> float:
        without_v = volts + draws.at(volts) * ohm
        return lowest_at_peak_v(without_v, load.peak_current_a or 0.0, ohm, source_ohm or 0.0)

    return Peak(
        current_a=load.peak_current_a,
        design_v=at_peak(design_v, network.path_ohm(node)),
        lowest_v=None if worst_v is None else at_peak(worst_v, network.path_ohm(node, lowest=True)),
        source_ohm=source_ohm,
    )


def dip_u(steady_v: float, peak_v: float, drop_v: float, drop_u: float) -> float:
    """Of the voltage at the peak: what the peak adds is in doubt as the steady drop is, by the same resistances. [V]"""
    relative = drop_u / drop_v if drop_v > 0 else 0.0
    u = drop_u + relative * max(steady_v - peak_v, 0.0)
    return u if math.isfinite(u) else 0.0


def lowest_dip(margin: Margin, point: LoadPoint) -> Figure | None:
    """What a load has at its peak with the source at its lowest; ``None`` where no peak is recorded or it is not known."""
    peak, steady_v = margin.peak, margin.worst_v
    if peak is None or peak.lowest_v is None or steady_v is None:
        return None
    drop_v = point.source_lowest_v - point.lowest_v
    return Figure(peak.lowest_v, "V", dip_u(steady_v, peak.lowest_v, drop_v, point.lowest_u))


def _source_ohm(sources: tuple[Source, ...]) -> float | None:
    """The battery's resistance where there is one, else that of the sources side by side. [ohm]"""
    batteries = [source for source in sources if source.kind == "battery"] or list(sources)
    known = [source.resistance_ohm for source in batteries if source.resistance_ohm is not None]
    if not known or 0.0 in known:
        return 0.0 if known else None
    return 1 / sum(1 / ohm for ohm in known)
