"""The drop of each round against the computed one."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace
from functools import cache

from rules.assessment import Drop
from rules.calc.doubt import Weighted, total
from rules.diagnosis.budget import Carried, Current, difference
from rules.errors import MissingData
from rules.limits import Limits
from rules.record import Figure
from rules.rounds import Round, Tree, current_at
from rules.routes import Hop, along, together, ways


def drop_of(rounds: Sequence[Round], tree: Tree, limits: Limits) -> Drop:
    """
    Measured against computed drop, in the round with the highest current at the circuit's first run that has a comparison.

    A round of a higher current without one, half typed, is named in ``unfinished``. From the first point read (``bus``
    before ``way``, where the device between them has a figure) to the read point with the largest computed drop from
    it; by two voltages or, where given, by direct drops.

    Raises
    ------
    MissingData
        If the readings do not give it, with the reason.
    """
    if not tree.runs:
        raise MissingData("no run is recorded")
    first = next(iter(tree.ends))
    able: list[tuple[float, Round]] = []
    reason = MissingData("no voltages were read at two points")
    for this in rounds:
        try:
            able.append((_loading_a(first, this, tree, limits), this))
        except MissingData as error:
            reason = error
    if not able:
        raise reason
    unfinished: list[tuple[str, str]] = []
    for _, this in sorted(able, key=lambda pair: -pair[0]):
        try:
            return replace(_of_round(this, tree, limits), unfinished=tuple(unfinished))
        except MissingData as error:
            unfinished.append((this.name, str(error)))
    raise MissingData(unfinished[0][1])


def _of_round(this: Round, tree: Tree, limits: Limits) -> Drop:
    """The drop of one round."""
    points = set(this.volts) | {point for pair in this.direct for point in pair}
    order = ["bus", "way", *tree.ends]
    read = [point for point in order if point in points]
    if tree.device_ohm is None and len(read) > 1 and read[0] == "bus":
        read = read[1:]  # the device is not recorded: what it loses is not the wiring's
        if read[0] != "way":
            raise MissingData("the device between bus and way is not recorded, and way was not read")
    if len(read) < 2:
        raise MissingData(f"round {this.name} has no voltages at two points, nor a drop over both legs")
    currents = cache(lambda point: current_at(point, this, tree, limits))
    reached: list[Drop] = []
    reason: MissingData | None = None
    for end in read[1:]:
        try:
            reached.append(_compared(read[0], end, this, tree, limits, currents))
        except MissingData as error:
            reason = error
    if not reached:
        raise reason or MissingData(f"round {this.name} gives no drop")
    return max(reached, key=lambda drop: drop.computed.value)


def _loading_a(first: str, this: Round, tree: Tree, limits: Limits) -> float:
    """By which the rounds of a circuit are ranked: the current at its first run, in a ring else the largest read. [A]"""
    try:
        return abs(current_at(first, this, tree, limits).value_a)
    except MissingData:
        if not this.amps or not any(run.id in tree.meshed for run in tree.runs):
            raise
        return max(abs(Current(terms).value_a) for terms in this.amps.values())


def compare(start: str, end: str, this: Round, tree: Tree, limits: Limits) -> Drop:
    """
    Measured against computed drop between two points of a round; ``MissingData`` says what is missing for it.
    """
    return _compared(start, end, this, tree, limits, lambda point: current_at(point, this, tree, limits))


def _compared(
    start: str, end: str, this: Round, tree: Tree, limits: Limits, currents: Callable[[str], Current]
) -> Drop:
    """The same with the currents at points."""
    reason: MissingData | None = None
    for way in ways(start, end, tree.ends, tree.meshed, frozenset(this.amps)):
        try:
            return _on_way(way, start, end, this, tree, limits, currents)
        except MissingData as error:
            reason = reason or error
    raise reason or MissingData(f"no way leads from {start} to {end}")


def _on_way(
    way: Sequence[Hop],
    start: str,
    end: str,
    this: Round,
    tree: Tree,
    limits: Limits,
    currents: Callable[[str], Current],
) -> Drop:
    measured, by = _measured(start, end, [hop.branch for hop in way], this)
    carried: list[Carried] = []
    for hop in way:
        current = along(currents(hop.branch), hop.sign)
        if hop.branch == "way":
            carried.append(Carried(tree.device_ohm or 0.0, current, None))
            continue
        run = tree.ends[hop.branch]
        stretches = [(tree.figures[run.id], current)]
        if (shared := tree.shared.get(run.id)) is not None:
            others = [along(other, hop.sign) for other in shared.others(this.name)]
            stretches.append((shared.figures, together([current, *others])))
        for figures, amps in stretches:
            if figures.gap:
                raise MissingData(figures.gap)
            carried.append(Carried(figures.loop_ohm, amps, figures))
    found = difference(measured, carried, limits)
    first, first_u = total(along(currents(way[0].branch), way[0].sign).terms)
    return Drop(
        round=this.name,
        start=start,
        end=end,
        measured=found.measured,
        computed=found.computed,
        excess=found.excess,
        current=Figure(first, "A", first_u),
        by=by,
        budget=found.budget,
    )


def _measured(start: str, end: str, path: list[str], this: Round) -> tuple[list[Weighted], str]:
    """The drop over a path as a sum of readings: by direct drops where they cover it, else by two voltages."""
    order = {point: n for n, point in enumerate([start, *path])}
    hops = {pair: terms for pair, terms in this.direct.items() if pair[0] in order and pair[1] in order}
    here, chain = start, list[Weighted]()
    while here != end:
        ahead = [pair for pair in hops if pair[0] == here and order[pair[1]] > order[here]]
        if not ahead:
            break
        longest = max(ahead, key=lambda pair: order[pair[1]])
        chain += hops[longest]
        here = longest[1]
    if here == end:
        return chain, "direct drops"
    if start in this.volts and end in this.volts:
        ends = [*this.volts[start], *(Weighted(-term.weight, term.shown) for term in this.volts[end])]
        return ends, "two voltages"
    raise MissingData(f"round {this.name} has no voltages at {start} and {end}")
