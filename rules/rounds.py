"""
The measured side of a circuit: its rounds.

Every figure here is a weighted sum of readings (``rules.calc.doubt``), so that what two readings by one
meter share is carried through to the excess (``rules.compared``).
"""

from __future__ import annotations

import math
import re
from collections import defaultdict
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from datetime import UTC, datetime
from statistics import mean, stdev

from rules.calc.doubt import Shown, Weighted
from rules.diagnosis.budget import Current
from rules.errors import MissingData
from rules.index import Index
from rules.limits import Limits
from rules.meters import worth
from rules.record import Circuit, Reading, Run
from rules.routes import Shared, tree_path
from rules.runs import RunFigures

RUN_PLACE = re.compile(r"run (\d+)( start| end)?$")


@dataclass(frozen=True, slots=True)
class Tree:
    """A circuit as a tree of points, with what it draws in design."""

    circuit: Circuit
    runs: tuple[Run, ...]
    ends: Mapping[str, Run]
    """The run that arrives at each point, from ``rules.routes.first_ends``; ``way`` and ``bus`` have none."""
    figures: Mapping[str, RunFigures]
    """By run id, at the temperature of the visit."""
    device_ohm: float | None
    """Of the device between ``bus`` and ``way``; ``None`` where it has no figure."""
    design_current_a: Mapping[str, float | None]
    """In the branch that arrives at each point (``way``: through the device); ``None`` where not known."""
    taps: frozenset[str]
    """Points at which current leaves: loads, boards, converters and forks."""

    shared: Mapping[str, Shared] = field(default_factory=dict)
    """The return that a run shares with other circuits, by run id."""
    meshed: frozenset[str] = frozenset()
    """Ids of the runs that are part of a mesh."""

    def path(self, start: str, end: str) -> list[str]:
        """
        The points after ``start`` up to ``end``, walking away from the source.

        Raises
        ------
        MissingData
            If ``end`` does not lie behind ``start``.
        """
        return [hop.branch for hop in tree_path(start, end, self.ends)]


@dataclass(frozen=True, slots=True)
class Round:
    """One load state of a circuit."""

    name: str
    readings: tuple[Reading, ...]
    volts: Mapping[str, tuple[Weighted, ...]]
    """Voltage between the legs at each point read, as a sum of readings."""
    amps: Mapping[str, tuple[Weighted, ...]]
    """Current in the branch that arrives at each point, where a clamp read it."""
    direct: Mapping[tuple[str, str], tuple[Weighted, ...]]
    """Drop over both legs between two points, read with a long lead."""
    poor: tuple[str, ...]
    """What was read with an instrument that is not recorded."""
    wander_v: float
    wander_freedom: int
    """Degrees of freedom of ``wander_v``; 0 where it is the profile's."""
    shown: Mapping[str, Shown]
    """What each reading is worth, by its id; temperatures and residual currents left out."""


def visit_of(circuit_id: str, index: Index, ranks: Mapping[str, tuple[float, str, int]]) -> str | None:
    """The latest visit with readings on a circuit; ``None`` where nothing was read."""
    visits = {reading.visit_or_default for reading in judged(index.readings_of(circuit_id), index)}
    return max(visits, key=lambda visit: ranks[visit]) if visits else None


def judged(readings: Iterable[Reading], index: Index) -> list[Reading]:
    """Readings without the replaced ones."""
    return [reading for reading in readings if reading.id not in index.replaced]


def visit_ranks(index: Index) -> dict[str, tuple[float, str, int]]:
    """What orders visits: their place in the record, else their first ``taken_at``, else first appearance."""
    listed = sorted(index.site.visits, key=lambda row: math.inf if row.walk_order is None else row.walk_order)
    ranks: dict[str, tuple[float, str, int]] = {row.tag: (float(n), "", 0) for n, row in enumerate(listed)}
    first: dict[str, str] = {}
    appeared: dict[str, int] = {}
    for n, reading in enumerate(index.site.readings):
        visit = reading.visit_or_default
        appeared.setdefault(visit, n)
        if reading.taken_at:
            moment = _moment(reading.taken_at)
            first[visit] = min(first.get(visit, moment), moment)
    for visit, n in appeared.items():
        if visit in ranks:
            continue
        # a visit that is not listed stands behind the listed ones that began before it, the last without a time
        began = first.get(visit, "")
        before = [place for place, row in enumerate(listed) if began and row.tag in first and first[row.tag] <= began]
        known = began and any(row.tag in first for row in listed)
        ranks[visit] = (max(before, default=-1) + 0.5 if known else math.inf, began, n)
    return ranks


def _moment(taken_at: str) -> str:
    """A time as text that sorts by time: with an offset it is taken to UTC."""
    try:
        read = datetime.fromisoformat(taken_at)
        return (read.astimezone(UTC).replace(tzinfo=None) if read.tzinfo else read).isoformat(timespec="microseconds")
    except (ValueError, OverflowError):
        return taken_at


def rounds_of(readings: Sequence[Reading], tree: Tree, index: Index, limits: Limits) -> tuple[Round, ...]:
    """The rounds of one visit in the order of their first readings; a reading with the loads off is in none."""
    by_name: dict[str, list[Reading]] = defaultdict(list)
    for reading in readings:
        if not reading.is_unloaded:
            by_name[reading.round].append(reading)
    wander = _wander(by_name, limits)
    return tuple(_round(name, rows, tree, index, limits, *wander[name]) for name, rows in by_name.items())


def _round(
    name: str, readings: list[Reading], tree: Tree, index: Index, limits: Limits, wander: float, freedom: int
) -> Round:
    pairs: dict[str, list[Reading]] = defaultdict(list)
    poles: dict[tuple[str, str], list[Reading]] = defaultdict(list)
    drops: dict[tuple[str, str, str], list[Reading]] = defaultdict(list)
    amps: dict[str, list[Reading]] = defaultdict(list)
    for reading in readings:
        if reading.quantity == "voltage" and reading.leg in ("", "both"):
            pairs[reading.at].append(reading)
        elif reading.quantity == "voltage":
            poles[reading.at, reading.leg].append(reading)
        elif reading.quantity == "drop":
            drops[reading.at, reading.to, reading.leg or "both"].append(reading)
        elif reading.quantity == "current" and (point := _branch(reading.at, tree)):
            amps[point].append(reading)
    poor: list[str] = []
    shown: dict[str, Shown] = {}
    for row in readings:
        if row.quantity not in ("temperature", "residual"):
            value = worth(row, index, limits, wander if row.quantity == "voltage" else 0.0)
            shown[row.id] = value.shown
            if not value.known:
                poor.append(f"{row.quantity} at {row.at}")

    def average(rows: list[Reading], sign: float = 1.0) -> tuple[Weighted, ...]:
        return tuple(Weighted(sign / len(rows), shown[row.id]) for row in rows)

    volts = {point: average(rows) for point, rows in pairs.items()}
    for point in dict.fromkeys(point for point, _ in poles):
        both = poles.get((point, "positive")), poles.get((point, "negative"))
        if point not in volts and both[0] and both[1]:
            volts[point] = average(both[0]) + average(both[1], -1.0)
    direct: dict[tuple[str, str], tuple[Weighted, ...]] = {}
    for start, end in dict.fromkeys((start, end) for start, end, _ in drops):
        legs = [drops.get((start, end, leg)) for leg in ("both", "positive", "negative")]
        if legs[0]:
            direct[start, end] = average(legs[0])
        elif legs[1] and legs[2]:
            direct[start, end] = average(legs[1]) + average(legs[2])
    clamped = {point: average(rows) for point, rows in amps.items()}
    return Round(name, tuple(readings), volts, clamped, direct, tuple(dict.fromkeys(poor)), wander, freedom, shown)


def _branch(at: str, tree: Tree) -> str:
    """The point at which the clamped branch arrives."""
    if at == "way":
        return at
    matched = RUN_PLACE.match(at)
    number = int(matched[1]) if matched else 0
    return next((point for point, run in tree.ends.items() if run.number == number), "")


def _wander(by_name: Mapping[str, Sequence[Reading]], limits: Limits) -> dict[str, tuple[float, int]]:
    """
    By round: standard deviation of repeated readings of one point with its freedom, else the profile's. [V]

    Rounds with repeats count together: of three readings one in a hundred shows a tenth of what the source wanders.
    By one meter: two meters at one point differ by their gains, which is no wander.
    """
    squares, freedom = dict.fromkeys(by_name, 0.0), dict.fromkeys(by_name, 0)
    for name, readings in by_name.items():
        by_meter: dict[tuple[str, str, float | None], list[float]] = defaultdict(list)
        for row in readings:
            if row.quantity == "voltage" and row.leg in ("", "both"):
                by_meter[row.at, row.instrument, row.full_scale].append(row.value)
        for values in by_meter.values():
            if len(values) > 1:
                freedom[name] += len(values) - 1
                squares[name] += stdev(values) ** 2 * (len(values) - 1)
    together = sum(freedom.values())
    if not together:
        return dict.fromkeys(by_name, (limits["source.wander_v"], 0))
    repeated = math.sqrt(sum(squares.values()) / together), together
    return {name: repeated if freedom[name] else (limits["source.wander_v"], 0) for name in by_name}


def current_at(point: str, this: Round, tree: Tree, limits: Limits) -> Current:
    """
    Current in the branch that arrives at a point: read there, else by the loads' share of the nearest reading.

    Raises
    ------
    MissingData
        If no current was read in the round, or the loads' share is not known.
    """
    if point in this.amps:
        return Current(this.amps[point])
    if not this.amps:
        raise MissingData(f"no current was read in round {this.name}")
    above = _line_up(point, tree)
    near = next((p for p in above[1:] if p in this.amps), "")
    if near:
        line = above
    else:
        lines = {p: line for p in this.amps if point in (line := _line_up(p, tree))}
        if not lines:
            raise MissingData(f"round {this.name} has no current on the way to {point} or behind it")
        near, line = min(lines.items(), key=lambda each: len(each[1]))
    ratio, taps = _share(point, near, line, tree)
    terms = tuple(Weighted(term.weight * ratio, term.shown) for term in this.amps[near])
    read_a = abs(sum(term.weight * term.shown.value for term in this.amps[near]))
    relative = limits["load_share.relative"]
    return Current(terms, tuple((tap, relative * share * read_a) for tap, share in taps.items()))


def _line_up(point: str, tree: Tree) -> list[str]:
    """A point and all before it, up to ``way``."""
    line = [point]
    while (run := tree.ends.get(line[-1])) is not None and len(line) <= len(tree.ends) + 1:
        line.append(run.from_point)
    return line


def _share(point: str, near: str, line: Sequence[str], tree: Tree) -> tuple[float, dict[str, float]]:
    """
    The current to a point over that to another on the line of one of them, and what each tap between adds to it.

    Signed: what a tap draws between a reading and a point behind it makes the current there less. A tap is named
    with the way on, since of two ways from one fork the one draws more where the other draws less.
    """
    before = line[0] == point
    far, close = (near, point) if before else (point, near)
    between = line[line.index(close) + 1 : line.index(far) + 1]
    if not any(p in tree.taps for p in between):
        return 1.0, {}
    for end in (point, near):
        if (run := tree.ends.get(end)) is not None and run.id in tree.meshed:
            raise MissingData(f"{run.name} is part of a mesh, where no share of the loads says what a run carries")
    wanted, known = tree.design_current_a.get(point), tree.design_current_a.get(near)
    if wanted is None or not known:
        raise MissingData(f"the current to {point} was not read, and its share of the loads is not known")
    sign = -1.0 if before else 1.0
    taps: dict[str, float] = {}
    on, behind = close, tree.design_current_a.get(close)
    for tap in between:
        arriving = tree.design_current_a.get(tap)
        if arriving is None or behind is None:  # what one tap draws is not known, but what all of them draw is
            return wanted / known, {f"{far} to {close}": sign * abs(wanted - known) / known}
        taps[f"{tap} beside {on}"] = sign * (arriving - behind) / known
        on, behind = tap, arriving
    return wanted / known, {tap: share for tap, share in taps.items() if share}


def temperature_read(readings: Iterable[Reading], number: int) -> float | None:
    """Mean of the temperatures read on a run's conductor in a visit, under load. [degC]"""
    values = [
        row.value
        for row in readings
        if row.quantity == "temperature" and row.at == f"run {number}" and not row.is_unloaded
    ]
    return mean(values) if values else None
