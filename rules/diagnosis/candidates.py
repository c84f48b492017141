"""
What might be read next, posed as readings that nobody has taken yet.

Two rounds are imagined at the currents of the round with the most current: one holds single readings, each a
candidate of its own (across a termination or a pole, along one leg, at a point not read yet), the other holds the
readings of that round once more. They go to the diagnosis behind the rounds that were read, so that what a reading
would say follows from the same structure, doubts and shared gains as what readings say.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

from rules.calc.doubt import Shown, Weighted
from rules.case import CircuitCase
from rules.columns import METER_QUANTITY
from rules.context import Measured
from rules.diagnosis.named import Named
from rules.diagnosis.problem import ENDS, LEGS, Observation, Problem
from rules.diagnosis.rows import DEVICE
from rules.errors import MissingData
from rules.measured import posed_by
from rules.meters import worth
from rules.record import Reading, Site
from rules.rounds import Round

SINGLE, AGAIN = "\x00single", "\x00again"
"""Names of the two imagined rounds: no cell holds a control code."""
LONG, SUSPECTED = 24, 12
"""Of a circuit with more runs than the first, joints and legs are imagined in the second number of runs."""
ABOUT_MOST = 0.9
"""Rounds with this share of the most current count as rounds with the most."""
JOINT, LEG, POINT = "joint", "leg", "point"
"""Kinds of single readings: across a termination or pole, along one leg, a voltage at a point not read yet."""


@dataclass(frozen=True, slots=True)
class Meters:
    """Instruments that count where none was used on a circuit: the first of the site; empty for none."""

    voltmeter: str = ""
    clamp: str = ""

    @staticmethod
    def of(site: Site) -> Meters:
        """The first voltmeter and the first clamp of a site's record."""
        first: dict[str, str] = {}
        for row in site.instruments:
            first.setdefault(row.quantity, row.tag)
        return Meters(first.get("voltage", ""), first.get("current", ""))


@dataclass(frozen=True, slots=True)
class Posed:
    """A circuit's problem as read, and with the imagined readings behind it."""

    case: CircuitCase
    read: Problem
    imagined: Problem
    named: Sequence[Named] = ()
    """Places that findings name to be read: they come first."""

    def named_at(self, row: int) -> int | None:
        """Which of the named places an imagined reading is taken across; ``None`` for none."""
        said = self.observation(row)
        if said.quantity != "joint":
            return None
        return next((n for n, name in enumerate(self.named) if name.at == said.at and said.leg in name.legs), None)

    @property
    def amps(self) -> dict[int, float]:
        """Currents by branch at which readings are imagined. [A]"""
        state, slots = self.imagined.rounds.index(SINGLE), self.imagined.signature.slots
        return {branch: ampere for (s, branch), ampere in zip(slots, self.imagined.amps, strict=True) if s == state}

    @property
    def design_level(self) -> float:
        """What the recorded loads draw over what is imagined, in the branch with the most current; 1 if not known."""
        branch, ampere = max(self.amps.items(), key=lambda pair: abs(pair[1]))
        design = self.case.tree.design_current_a.get(self.imagined.ends[branch])
        return abs(design / ampere) if design else 1.0

    @property
    def probed(self) -> tuple[int, float] | None:
        """
        The run at which a probe tells most of the temperature: its branch, and what share of the variance that comes
        from the temperature would be left. ``None`` where every run was probed.
        """
        least, amps = self.case.limits["temperature_doubt.probe"], self.amps
        volts = [
            (each.positive_slope_ohm_per_k + each.negative_slope_ohm_per_k) * abs(amps.get(branch, 0.0))
            for branch, each in enumerate(self.imagined.branches)
        ]
        doubts = [volt * each.temperature_u_k for volt, each in zip(volts, self.imagined.branches, strict=True)]
        gains = [doubt - volt * least for doubt, volt in zip(doubts, volts, strict=True)]
        best = max(range(len(gains)), key=gains.__getitem__)
        return (best, (1 - gains[best] / sum(doubts)) ** 2) if gains[best] > 0 else None

    def rows_of(self, name: str) -> list[int]:
        """Rows of the imagined problem that stand in one of the two rounds."""
        state = self.imagined.rounds.index(name)
        rows = self.imagined.signature.rows
        return [number for number, row in enumerate(rows) if row.state == state]

    def observation(self, row: int) -> Observation:
        """The imagined reading of a row that is single."""
        (number, _), *_ = self.imagined.signature.rows[row].shown
        return self.imagined.observations[number]


def kind_of(said: Observation) -> str:
    """What kind of single reading an imagined observation is."""
    if said.quantity == "joint":
        return JOINT
    return LEG if said.leg in LEGS else POINT


def posed(case: CircuitCase, meters: Meters, named: Sequence[Named] = ()) -> Posed | None:
    """
    A circuit's problem with the imagined readings.

    Returns
    -------
    Posed or None
        ``None`` where nothing that was read says anything about a run or the device, or no current is known at which
        something could be read.
    """
    measured = Measured(case.visit, (), case.rounds, case.tree)
    read = posed_by(case.context, measured)
    if read is None:
        return None
    rounds = imagined_rounds(case, read, meters, named)
    if not rounds:
        return None
    imagined = posed_by(case.context, replace(measured, rounds=(*case.rounds, *rounds)))
    return None if imagined is None else Posed(case, read, imagined, named)


def imagined_rounds(case: CircuitCase, read: Problem, meters: Meters, named: Sequence[Named] = ()) -> tuple[Round, ...]:
    """The round of single readings and the round that is read once more; none where no current is known."""
    fullest = fullest_round(case)
    currents = _currents(case, fullest, meters)
    if not currents:
        return ()
    return _single(case, read, fullest, currents, meters, named), _again(case, fullest, currents)


def fullest_round(case: CircuitCase) -> Round | None:
    """
    The round that others are imagined beside: of those with about the most current the one with the most readings;
    ``None`` where no current was read.
    """
    most = {this.name: max((abs(_value(terms)) for terms in this.amps.values()), default=0.0) for this in case.rounds}
    highest = max(most.values(), default=0.0)
    near = [this for this in case.rounds if this.amps and most[this.name] >= ABOUT_MOST * highest]
    return max(near, key=lambda this: len(this.readings), default=None)


def voltmeter_of(case: CircuitCase, meters: Meters) -> str:
    """The meter most used on the circuit's visit, else the site's first; empty for none."""
    return _most_used(case, "voltage", meters.voltmeter)


def _most_used(case: CircuitCase, quantity: str, other: str) -> str:
    used = Counter(
        row.instrument
        for this in case.rounds
        for row in this.readings
        if row.instrument and METER_QUANTITY[row.quantity] == quantity
    )
    return used.most_common(1)[0][0] if used else other


def shown_by(case: CircuitCase, quantity: str, value: float, instrument: str) -> Shown:
    """What a reading of about this value would be worth on the circuit's visit; the range follows from the value."""
    row = Reading(id=f"\x00{quantity}", visit=case.visit, quantity=quantity, value=value, instrument=instrument)
    return worth(row, case.context.index, case.limits).shown


def _value(terms: tuple[Weighted, ...]) -> float:
    return sum(term.weight * term.shown.value for term in terms)


def _currents(case: CircuitCase, fullest: Round | None, meters: Meters) -> dict[str, Shown]:
    """By the point at which a branch arrives: what the clamp shows there once more, or will show at design load."""
    if fullest is not None:
        return {
            point: replace(terms[0].shown, value=_value(terms), wander_u=0.0)
            for point, terms in fullest.amps.items()
            if _value(terms)
        }
    for point, amperes in case.tree.design_current_a.items():
        if amperes:
            return {point: shown_by(case, "current", amperes, _most_used(case, "current", meters.clamp))}
    return {}


def _single(
    case: CircuitCase,
    read: Problem,
    fullest: Round | None,
    currents: Mapping[str, Shown],
    meters: Meters,
    named: Sequence[Named],
) -> Round:
    """The round of single readings."""
    meter = voltmeter_of(case, meters)
    amperes = max(abs(shown.value) for shown in currents.values())
    across = shown_by(case, "joint", _largest_ohm(case) * amperes, meter)
    rows: list[tuple[Reading, Shown]] = []

    def add(quantity: str, at: str, to: str, leg: str, shown: Shown) -> None:
        row = Reading(id=f"{SINGLE} {len(rows)}", round=SINGLE, quantity=quantity, at=at, to=to, leg=leg)
        rows.append((row, shown))

    if any(read.names[branch] == DEVICE for row in read.signature.rows for branch, _ in row.path):
        legs = read.signature.branches[0].partition(" ")[2]
        for leg in LEGS if legs == "both" else (legs,):
            add("joint", DEVICE, "", leg, across)
    suspected = _suspected(case, read) | {" ".join(name.at.split()[:2]) for name in named}
    for run in case.tree.runs:
        for end in ENDS if run.name in suspected else ():
            for leg in LEGS:
                add("joint", f"{run.name} {end}", "", leg, across)
    for start, end, ohm in _stretches(case, suspected):
        along = shown_by(case, "drop", ohm * amperes, meter)
        for leg in LEGS:
            add("drop", start, end, leg, along)
    between = _between(case, fullest, meter)
    for start, end in _unread(case, fullest):
        add("drop", start, end, "both", between)
    return _round(case, SINGLE, rows, currents)


def _largest_ohm(case: CircuitCase) -> float:
    """Upper bound of the extra resistances that are suspected: what a meter's range has to hold."""
    least = case.limits["next_reading.suspected_at"]
    causes = case.diagnosis.causes if case.diagnosis is not None else ()
    return max((place.high_ohm or 0.0 for place in causes if place.probability >= least), default=0.0)


def _suspected(case: CircuitCase, read: Problem) -> frozenset[str]:
    """
    Runs in which single joints and legs are imagined: all of a circuit that is not long, else those in which something
    is most probably wrong; no more than a few of them are tried (``options.TRIED``).
    """
    names = [name for name in read.names if name != DEVICE]
    if len(names) <= LONG or case.diagnosis is None:
        return frozenset(names)
    share = dict.fromkeys(read.ends, 0.0)
    for place in case.diagnosis.causes:
        if place.point and not place.joints:
            share[place.point] = share.get(place.point, 0.0) + place.probability
    of_name = {name: share[end] for name, end in zip(read.names, read.ends, strict=True) if name != DEVICE}
    return frozenset(sorted(of_name, key=of_name.__getitem__, reverse=True)[:SUSPECTED])


def _stretches(case: CircuitCase, suspected: frozenset[str]) -> list[tuple[str, str, float]]:
    """What a long lead along one leg may span, with its loop resistance: suspected runs, and all the way to ends."""
    ends, figures = case.tree.ends, case.tree.figures
    starts = {run.from_point for run in ends.values()}
    found = {(run.from_point, point): figures[run.id].loop_ohm for point, run in ends.items() if run.name in suspected}
    last = [point for point in ends if point not in starts]
    for point in last[:SUSPECTED] if len(ends) > LONG else last:
        try:
            path = case.tree.path("way", point)
        except MissingData:  # a record whose runs do not hang together
            continue
        found["way", point] = sum(figures[ends[passed].id].loop_ohm for passed in path)
    return [(start, end, ohm) for (start, end), ohm in found.items()]


def _between(case: CircuitCase, fullest: Round | None, meter: str) -> Shown:
    """The difference of two voltages by one meter: its gain acts on the difference, its counts come twice."""
    volts = fullest.volts.values() if fullest is not None else ()
    highest = max((abs(_value(terms)) for terms in volts), default=case.nominal_v or 0.0)
    shown = shown_by(case, "voltage", highest, meter)
    wander_u = fullest.wander_v if fullest is not None else 0.0
    return replace(shown, value=0.0, each_u=2**0.5 * shown.each_u, wander_u=2**0.5 * wander_u)


def _unread(case: CircuitCase, fullest: Round | None) -> list[tuple[str, str]]:
    """Points without a voltage in the round with the most current, each behind the nearest point that has one."""
    read = fullest.volts if fullest is not None else {}
    found = []
    for point, run in case.tree.ends.items():
        closes = point == run.name  # a run that closes a mesh arrives at a point that another run reaches
        if point not in read and not closes:
            above = run.from_point
            for _ in case.tree.ends:  # no longer than the tree: a record may close a ring
                if above in read or above not in case.tree.ends:
                    break
                above = case.tree.ends[above].from_point
            found.append((above, point))
    return found


def _again(case: CircuitCase, fullest: Round | None, currents: Mapping[str, Shown]) -> Round:
    """Every reading of the round with the most current once more."""
    kept: dict[tuple[str, str, str, str], Reading] = {}
    for row in fullest.readings if fullest is not None else ():
        if row.quantity in ("voltage", "drop", "joint"):
            kept.setdefault((row.quantity, row.at, row.to, row.leg), row)
    shown = fullest.shown if fullest is not None else {}
    rows = [
        (replace(row, id=f"{AGAIN} {number}", round=AGAIN), replace(shown[row.id]))
        for number, row in enumerate(kept.values())
    ]
    return _round(case, AGAIN, rows, currents)


def _round(case: CircuitCase, name: str, rows: Sequence[tuple[Reading, Shown]], currents: Mapping[str, Shown]) -> Round:
    """An imagined round; its currents have counts of their own."""
    clamped = []
    for number, (point, shown) in enumerate(currents.items()):
        at = point if point == "way" else case.tree.ends[point].name
        clamped.append(
            (point, Reading(id=f"{name} clamp {number}", round=name, quantity="current", at=at), replace(shown))
        )
    return Round(
        name=name,
        readings=(*(row for row, _ in rows), *(row for _, row, _ in clamped)),
        volts={},
        amps={point: (Weighted(1.0, shown),) for point, _, shown in clamped},
        direct={},
        poor=(),
        wander_v=0.0,
        wander_freedom=0,
        shown={row.id: shown for row, shown in rows} | {row.id: shown for _, row, shown in clamped},
    )
