"""
From a circuit's rounds to the rows of its problem.

Voltages become drops between neighbouring read points in walking order, whose counts are correlated since
two neighbours share a reading; drops with a long lead, joints and dead tests are rows of their own.
"""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Mapping, Sequence

from rules.calc.conductor import REFERENCE_AREA_MM2
from rules.calc.doubt import Shown, few_readings_factor
from rules.diagnosis.budget import Current
from rules.diagnosis.conductors import ALTERNATIVES, alternatives
from rules.diagnosis.problem import DEAD, LEGS, Branch, CurrentReading, Observation, Problem, Row, Signature, one
from rules.errors import MissingData
from rules.limits import Limits
from rules.record import Reading, Run
from rules.rounds import RUN_PLACE, Round, Tree, current_at
from rules.runs import LegFigures
from rules.tables.conductors import area_mm2, is_known

DEVICE = "device"
NO_LEG = LegFigures(0.0, 0.0, 0.0, 0.0)
"""In place of a return that is shared."""
Node = tuple[tuple[int, int], ...]
"""What stands for the voltage at a point: observations with signs (two where it is made of both poles)."""


def problem_of(
    rounds: Sequence[Round],
    tree: Tree,
    limits: Limits,
    hot_ohm: Mapping[str, float],
    return_leg: str = "negative",
    nominal_v: float | None = None,
) -> Problem | None:
    """
    The problem that a visit's rounds pose.

    Parameters
    ----------
    hot_ohm : mapping
        By the point at which a branch arrives (``way`` for the device): extra resistance whose heat at design
        current passes the profile's limit; left out where it is not known. [ohm]
    return_leg : str
        The leg that ``return_size`` speaks of.
    nominal_v : float or None
        Scale of what a mistyped reading may show; the highest voltage read where it is not known. [V]

    Returns
    -------
    Problem or None
        ``None`` where no reading says anything about a run or the device, or no run is recorded yet.
    """
    if not tree.runs:
        return None
    gathered = _Gather(tree, limits, return_leg)
    for state, this in enumerate(rounds):
        gathered.take(state, this)
    return gathered.problem(rounds, hot_ohm, nominal_v) if gathered.rows else None


class _Gather:
    """Rows, observations, currents and sources while they are collected."""

    def __init__(self, tree: Tree, limits: Limits, return_leg: str) -> None:
        self.tree, self.limits, self.return_leg = tree, limits, return_leg
        self.has_device = has_device = bool(tree.device_ohm)
        self.names = [DEVICE] * has_device + [run.name for run in tree.runs]
        self.arriving = ["way"] * has_device + ["" for _ in tree.runs]
        self.branch_of_run = {run.id: place + has_device for place, run in enumerate(tree.runs)}
        for point, run in tree.ends.items():
            self.arriving[self.branch_of_run[run.id]] = point
        self.order = {point: n for n, point in enumerate(("bus", "way", *tree.ends))}
        self.ups = {point: self._way_up(point) for point in self.order}
        self.rows: list[Row] = []
        self.observations: list[Observation] = []
        self.shown: list[Shown] = []
        self.variances: list[float] = []
        self.wander: list[float] = []
        self.gains: dict[str, int] = {}
        self.gain_u: list[float] = []
        self.gain_of: list[int] = []
        self.slots: dict[tuple[int, int], int | None] = {}
        self.amps: list[float] = []
        self.sources: dict[object, int] = {}
        self.errors: dict[tuple[int, int], float] = {}
        self.amps_read: dict[int, tuple[CurrentReading, Shown, int]] = {}
        self.swaps: list[tuple[int, int]] = []

    def take(self, state: int, this: Round) -> None:
        """All rows of one round."""
        found = self._observe(this)
        voltages: dict[str, dict[str, list[int]]] = {leg: defaultdict(list) for leg in ("both", *LEGS)}
        for number in found:
            said = self.observations[number]
            if said.quantity == "voltage" and said.at in self.order:
                voltages[said.leg][said.at].append(number)
            elif said.quantity in ("drop", "joint", "resistance"):
                self._single(DEAD if said.quantity == "resistance" else state, this, number)
        pairs: dict[str, list[Node]] = {at: [((n, 1),) for n in ns] for at, ns in voltages["both"].items()}
        for leg, sign in (("positive", 1), ("negative", -1)):
            poles: dict[str, list[Node]] = {at: [((n, sign),) for n in ns] for at, ns in voltages[leg].items()}
            if len(poles) > 1:
                self._chain(state, this, leg, poles)
        if len(voltages["positive"]) <= 1 and len(voltages["negative"]) <= 1:
            for at in voltages["positive"].keys() & voltages["negative"].keys() - pairs.keys():
                pairs[at] = [((voltages["positive"][at][0], 1), (voltages["negative"][at][0], -1))]
        kept = [n for n in self._chain(state, this, "both", pairs) if self.observations[n].leg == "both"]
        self.swaps += [(a, b) for n, a in enumerate(kept) for b in kept[:n]]

    def _observe(self, this: Round) -> list[int]:
        """The round's observations: readings of one meter range at one place count as their mean."""
        groups: dict[tuple[str, str, str, str, str], list[Reading]] = defaultdict(list)
        for row in this.readings:
            shown = this.shown.get(row.id)
            if shown is not None and row.quantity != "current":
                groups[row.quantity, row.at, row.to, row.leg or "both", shown.gain_key].append(row)
        first, few = len(self.observations), few_readings_factor(this.wander_freedom)
        for (quantity, at, to, leg, key), rows in groups.items():
            worths = [this.shown[row.id] for row in rows]
            value = sum(worth.value for worth in worths) / len(rows)
            self.observations.append(Observation(quantity, at, to, leg, this.name, tuple(rows)))
            self.shown.append(Shown(value, key, worths[0].gain_u, 0.0))
            wander = sum((few * worth.wander_u) ** 2 for worth in worths) / len(rows) ** 2
            self.variances.append(sum(worth.each_u**2 for worth in worths) / len(rows) ** 2 + wander)
            self.wander.append(wander if this.wander_freedom else 0.0)
            self.gain_of.append(self.gains.setdefault(key, len(self.gains)))
            if len(self.gain_u) < len(self.gains):
                self.gain_u.append(worths[0].gain_u)
        return list(range(first, len(self.observations)))

    def _chain(self, state: int, this: Round, leg: str, nodes: Mapping[str, list[Node]]) -> list[int]:
        """Drops between neighbouring read points; gives the observations that got into a row."""
        before: dict[str, Node] = {}
        kept: dict[int, None] = {}
        for point in sorted(nodes, key=self.order.__getitem__):
            here, *others = nodes[point]
            start = next((up for up, _ in self.ups[point] if up in before), None) or next(iter(before), None)
            before[point] = here
            path = None if start is None else self._path(start, point)
            if start is not None and path is not None and self._row(state, this, leg, path, _less(before[start], here)):
                kept |= dict.fromkeys(n for n, _ in (*before[start], *here))
            for other in others:  # two meters at one point differ by their gains alone
                if self._row(state, this, leg, (), _less(here, other)):
                    kept |= dict.fromkeys(n for n, _ in (*here, *other))
        return list(kept)

    def _single(self, state: int, this: Round, number: int) -> None:
        """A row of one observation: a drop with a long lead, a joint, a dead test."""
        said = self.observations[number]
        matched = RUN_PLACE.match(said.at)
        if said.at == DEVICE and DEVICE in self.names:
            # a device of one pole lies in one leg, whichever the reading names
            part = said.leg if self._kind(0) == f"{DEVICE} both" else "both"
            self._row(state, this, part, ((0, 1),), ((number, 1),))
        elif matched and matched[2] and said.leg in LEGS:
            place = next((n for n, name in enumerate(self.names) if name == f"run {matched[1]}"), None)
            if place is not None:
                self._row(state, this, f"{matched[2].strip()} {said.leg}", ((place, 1),), ((number, 1),))
        elif said.to and (path := self._path(said.at, said.to)) is not None:
            if path and all(sign < 0 for _, sign in path):  # it was named from its far end
                path = tuple((branch, 1) for branch, _ in path)
            self._row(state, this, said.leg, path, ((number, 1),))

    def _row(self, state: int, this: Round, part: str, path: tuple[tuple[int, int], ...], shown: Node) -> bool:
        """Keep a row if the resistance and the current of all its branches are known."""
        for branch, _ in path:
            if self.names[branch] != DEVICE and self.tree.figures[self._run(branch).id].gap:
                return False
            if self._shares(branch) and not part.endswith("positive" if self.return_leg == "negative" else "negative"):
                return False  # a return that others share carries their currents too
            if state != DEAD and self._slot(state, branch, this) is None:
                return False
        self.rows.append(Row(state, part, path, shown))
        return True

    def _slot(self, state: int, branch: int, this: Round) -> int | None:
        """The place of a branch's current in a round, ``None`` where it is not known."""
        if (state, branch) not in self.slots:
            try:
                current = current_at(self.arriving[branch], this, self.tree, self.limits)
            except MissingData:
                self.slots[state, branch] = None
            else:
                self.slots[state, branch] = len(self.amps)
                self._errors(state, len(self.amps), current, this)
                self.amps.append(current.value_a)
        return self.slots[state, branch]

    def _errors(self, state: int, slot: int, current: Current, this: Round) -> None:
        """In which ways this current may err."""
        for term in current.terms:
            gain = self.sources.setdefault(("gain", term.shown.gain_key), len(self.sources))
            own = self.sources.setdefault(id(term.shown), len(self.sources))
            self._add(slot, gain, term.weight * term.shown.value * term.shown.gain_u)
            self._add(slot, own, term.weight * term.shown.own_variance**0.5)
            self.amps_read[own] = (CurrentReading(own, gain), term.shown, state)
        for tap, u in current.shares:
            # a load's share of the current is wrong alike in all rounds of a visit
            self._add(slot, self.sources.setdefault(("tap", tap), len(self.sources)), u)

    def _add(self, slot: int, source: int, u: float) -> None:
        self.errors[slot, source] = self.errors.get((slot, source), 0.0) + u

    def _way_up(self, point: str) -> list[tuple[str, int | None]]:
        """From a point towards the bus: the next point and the branch to it (``None``: the two are one point)."""
        ways: list[tuple[str, int | None]] = []
        while point != "bus" and len(ways) <= len(self.tree.ends) + 1:
            if point == "way":
                ways.append(("bus", 0 if self.names[:1] == [DEVICE] else None))
            else:
                run = self.tree.ends.get(point)
                if run is None:
                    break
                ways.append((run.from_point, self.branch_of_run[run.id]))
            point = ways[-1][0]
        return ways

    def _path(self, start: str, end: str) -> tuple[tuple[int, int], ...] | None:
        """Branches between two points with their sense; ``None`` where no known way leads there."""
        if start not in self.order or end not in self.order:
            return None
        back = {start: 0} | {up: n + 1 for n, (up, _) in enumerate(self.ups[start])}
        down: list[tuple[int | None, int]] = []
        here = end
        for up, branch in self.ups[end]:
            if here in back:
                break
            down.append((branch, 1))
            here = up
        if here not in back:
            return None
        up_again = [(branch, -1) for _, branch in self.ups[start][: back[here]]]
        if self.tree.device_ohm is None and "bus" in (start, end):
            return None  # the device has no figure: what it loses is not the wiring's
        return tuple((branch, sign) for branch, sign in (*up_again, *down[::-1]) if branch is not None)

    def problem(self, rounds: Sequence[Round], hot_ohm: Mapping[str, float], nominal_v: float | None) -> Problem:
        """Put together what was gathered."""
        reached = [(key, slot) for key, slot in self.slots.items() if slot is not None]
        reads = list(self.amps_read.values())
        signature = one(
            Signature(
                branches=tuple(self._kind(place) for place in range(len(self.names))),
                rows=tuple(self.rows),
                gain_of=tuple(self.gain_of),
                gains=len(self.gains),
                states=len(rounds),
                slots=tuple(key for key, _ in reached),
                errors=tuple(self.errors),
                sources=len(self.sources),
                current_readings=tuple(read for read, _, _ in reads),
                swaps=tuple(self.swaps),
            )
        )
        voltages = [abs(shown.value) for shown in self.shown]
        return Problem(
            signature=signature,
            names=tuple(self.names),
            run_ids=("",) * self.has_device + tuple(run.id for run in self.tree.runs),
            ends=tuple(self.arriving),
            branches=tuple(self._branch(place, hot_ohm) for place in range(len(self.names))),
            alternatives=tuple(self._alternatives(place) for place in range(len(self.names))),
            value=tuple(shown.value for shown in self.shown),
            variance=tuple(self.variances),
            wander=tuple(self.wander),
            wander_freedom=max((this.wander_freedom for this in rounds), default=0),
            gain_u=tuple(self.gain_u),
            amps=tuple(self.amps),
            error_a=tuple(self.errors.values()),
            reading_a=tuple(shown.value for _, shown, _ in reads),
            reading_u=tuple(shown.own_variance**0.5 for _, shown, _ in reads),
            reading_gain_u=tuple(shown.gain_u for _, shown, _ in reads),
            nominal_v=nominal_v or max(voltages, default=0.0) or 1.0,
            observations=tuple(self.observations),
            current_readings=tuple(self._said(shown, rounds[state]) for _, shown, state in reads),
            rounds=tuple(this.name for this in rounds),
        )

    def _said(self, shown: Shown, this: Round) -> Observation:
        """The reading behind a current."""
        row = next(row for row in this.readings if this.shown.get(row.id) is shown)
        return Observation("current", row.at, "", row.leg, this.name, (row,))

    def _kind(self, place: int) -> str:
        if self.names[place] != DEVICE:
            return "run"
        return f"{DEVICE} {device_leg(self.tree, self.return_leg)}"

    def _branch(self, place: int, hot_ohm: Mapping[str, float]) -> Branch:
        hot = hot_ohm.get(self.arriving[place], 0.0)
        if self.names[place] == DEVICE:
            whole = self.tree.device_ohm or 0.0
            share = {"both": 0.5, "positive": 1.0, "negative": 0.0}[device_leg(self.tree, self.return_leg)]
            first = self.tree.runs[0].size if self.tree.runs else ""
            return Branch(whole * share, whole * (1 - share), extra_scale=extra_scale(first), hot_ohm=hot)
        run = self._run(place)
        known = self.tree.figures[run.id]
        if known.gap:
            return Branch(extra_scale=extra_scale(run.size), hot_ohm=hot)
        out, back = (*known.legs, NO_LEG)[:2]
        first_leg, second_leg = (back, out) if self.return_leg == "positive" else (out, back)
        return Branch(
            first_leg.conductor_ohm,
            second_leg.conductor_ohm,
            first_leg.slope_ohm_per_k,
            second_leg.slope_ohm_per_k,
            first_leg.joint_ohm,
            second_leg.joint_ohm,
            first_leg.joint_variance,
            second_leg.joint_variance,
            known.length_u,
            known.temperature_u_k,
            extra_scale(run.size),
            hot,
        )

    def _alternatives(self, place: int) -> tuple[float, ...]:
        """Other conductors of a branch, each in both legs."""
        if self.names[place] == DEVICE or self.tree.figures[self._run(place).id].gap:
            return (0.0, 0.0) * len(ALTERNATIVES)
        run = self._run(place)
        degrees = self.tree.figures[run.id].temperature_c
        kind = (run.size, run.material_or_default, run.stranding_or_default)
        back = (run.return_size_or_default, run.return_material_or_default, run.stranding_or_default)
        out = alternatives(*kind, degrees)
        returned = out if back == kind else alternatives(*back, degrees)
        first_leg, second_leg = (returned, out) if self.return_leg == "positive" else (out, returned)
        return tuple(ratio for pair in zip(first_leg, second_leg, strict=True) for ratio in pair)

    def _shares(self, place: int) -> bool:
        return self.names[place] != DEVICE and self._run(place).id in self.tree.shared

    def _run(self, place: int) -> Run:
        return self.tree.runs[place - (self.names[0] == DEVICE)]


def extra_scale(size: str) -> float:
    """What the range of a bad connection is multiplied with, by the area of one conductor."""
    return math.sqrt(REFERENCE_AREA_MM2 / area_mm2(size)) if is_known(size) else 1.0


def _less(start: Node, end: Node) -> Node:
    """The voltage at one point less that at another."""
    return (*start, *((number, -sign) for number, sign in end))


def device_leg(tree: Tree, return_leg: str) -> str:
    """The leg in which the device lies; ``both`` where it opens both."""
    if (tree.circuit.device_poles or 1) >= 2:
        return "both"
    outgoing = "negative" if return_leg == "positive" else "positive"
    return tree.circuit.device_leg or outgoing
