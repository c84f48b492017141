"""
The choice among what could be done next on one circuit, and what is said of it.

The option with the largest expected fall in entropy for its minutes is taken, provided that it is conclusive within
the bounds on current: a live reading for which no current that may flow is enough gives way to the next best, which a
finer meter, a reading across the joint itself or a dead test then is.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from rules.diagnosis.atoms import OF_LENGTH, Atoms, atoms_of
from rules.diagnosis.block import stacked
from rules.diagnosis.bounds import Bound, heat_bound, rounded_down, rounded_up
from rules.diagnosis.candidates import JOINT, LEG, POINT, SINGLE, Posed
from rules.diagnosis.contrast import conclusive_level, groups_apart
from rules.diagnosis.doubtful import CURRENT_READING, ONE_READING, REVERSED, SEVERAL, SWAPPED
from rules.diagnosis.excess_bound import most_level
from rules.diagnosis.hypotheses import AS_RECORDED, BAD_CONNECTION, DOUBTFUL, LONGER, OTHER_METAL, SMALLER
from rules.diagnosis.judge import Judged, judge_block
from rules.diagnosis.options import (
    ADDED,
    AS_IT_IS,
    DEAD_TEST,
    FINER,
    LENGTH,
    LOOK,
    MORE,
    ROUND,
    TEMPERATURE,
    Options,
    Way,
    minutes_of,
    options_of,
    tried_of,
)
from rules.diagnosis.outlook import Outlook, outlook_of
from rules.diagnosis.problem import Observation
from rules.diagnosis.shape import Floats, Integers, Shape, shape_of
from rules.errors import MissingData
from rules.limits import Limits

COVERED = 0.975
"""Upper bound of a suspected extra resistance: that of the central 95 %."""
AS_TELLING = 0.3
"""Share of the largest fall below which an option does not stand in for one that is not conclusive."""
SINGLES = (JOINT, LEG, POINT)
LIVE_WAYS = (AS_IT_IS, MORE, ADDED, FINER)
"""How millivolts are read across what a finding names."""
OF_READINGS = (ONE_READING, CURRENT_READING, SWAPPED, REVERSED, SEVERAL)
"""Slips that the same readings once more tell."""
CONDUCTORS = (SMALLER, OTHER_METAL, LONGER)


@dataclass(frozen=True, slots=True, eq=False)
class Batch:
    """Circuits of one structure, looked at together."""

    posed: Sequence[Posed]
    limits: Limits
    shape: Shape
    """Of the imagined problems."""
    judged: Judged
    atoms: Atoms
    outlook: Outlook
    options: Options
    high_ohm: Floats
    """(b, places of what was read): upper bound of the extra resistance in each. [ohm]"""
    most: Sequence[Bound]
    """By how much the currents of the round with the most current may be multiplied."""


def looked_at(posed: Sequence[Posed], limits: Limits) -> Batch:
    """Everything that could be done next on circuits of one structure."""
    judged = judge_block(shape_of(posed[0].read.signature), [each.read for each in posed], limits)
    shape = shape_of(posed[0].imagined.signature)
    block = stacked(shape, [each.imagined for each in posed], limits)
    atoms = atoms_of(judged, block)
    tried = tried_of(posed, block, atoms)
    outlook = outlook_of(judged, block, atoms, posed, tried.candidate)
    high = np.exp(judged.density.cumulative().quantiles(COVERED)[0][:, : len(judged.block.shape.places)])
    most = [most_level(each, judged, number, high[number], limits) for number, each in enumerate(posed)]
    options = options_of(posed, tried, atoms, outlook, np.array([bound.level for bound in most]), limits)
    return Batch(posed, limits, shape, judged, atoms, outlook, options, high, most)


@dataclass(frozen=True, slots=True)
class Choice:
    """One option with what it tells apart and the current that it takes."""

    option: int
    way: Way
    row: int
    """Of the imagined problem for a single reading, among the candidates of one row for a length or temperature, else -1."""
    pair: tuple[int, int] | None
    """Groups; ``None`` where there is one alone."""
    asked_a: float = 0.0
    """The least current at which the reading is conclusive; 0 where none is asked for, infinite where none is enough."""
    reached_a: float = math.inf
    """What is reached where it is taken in this way."""
    most_a: float = math.inf
    """That may flow for it; infinite where no bound is known."""
    most_why: str = ""
    """What more would do."""
    branch: int = -1
    """Whose current is meant; -1 where none is asked for."""
    named: int = -1
    """Which of the places that findings name; -1 where it is not for one of them."""
    slip: int | None = None
    """Hypothesis of a doubtful reading or record that is more probable than all else."""

    @property
    def is_conclusive(self) -> bool:
        """The current that it takes is reached, and may flow."""
        return self.asked_a <= min(self.reached_a, self.most_a)

    @property
    def current_a(self) -> float:
        """To be asked for; 0 for none."""
        return min(self.asked_a, self.reached_a, self.most_a) if self.way.takes_current else 0.0


def chosen(batch: Batch, number: int) -> Choice | None:
    """What to do next on one circuit of a batch; ``None`` where nothing is left to settle, or nothing can be done."""
    named = _named(batch, number)
    if named is not None:
        return named
    if _is_settled(batch, number):
        return None
    # equal ones keep their order, whatever else goes through the arrays with them
    options, score = batch.options, batch.options.score[number].round(9)
    order = [int(option) for option in np.argsort(-score, kind="stable") if options.can_be_done[number, option]]
    slip = _slip(batch, number)
    forced = [option for option in order if _answers(batch, slip, options.ways[option])]
    if forced:
        return _again_there(batch, number, replace(_choice(batch, number, forced[0]), slip=slip))
    # the record has no place for a size that proved right: a look comes where it will change the record, or comes last
    look = Choice(-1, Way(LOOK, AS_IT_IS, minutes_of(LOOK, AS_IT_IS, batch.limits)), -1, None)
    if batch.atoms.wrong_conductor[number] >= batch.limits["next_reading.look_at"]:
        return look
    least = AS_TELLING * float(options.fall[number].max(initial=0.0))
    telling = [option for option in order if options.fall[number, option] >= least]
    first: Choice | None = None
    for option in telling:
        tried = _choice(batch, number, option)
        if tried.is_conclusive:
            break
        first = first or tried
    else:
        return first  # nothing is conclusive: the most telling, at the most current that may flow
    if options.fall[number, option] >= batch.limits["next_reading.least_fall"] or not _conductors_lead(batch, number):
        return tried
    return look


def _named(batch: Batch, number: int) -> Choice | None:
    """Across the first place that a finding names, the one of its legs that tells most; ``None`` where none is named."""
    posed, options = batch.posed[number], batch.options
    if not posed.named:
        return None
    rows, single = posed.rows_of(SINGLE), batch.outlook.candidate[number]
    found = []
    for option, way in enumerate(options.ways):
        if way.kind == JOINT and way.how in LIVE_WAYS and options.can_be_done[number, option]:
            place = posed.named_at(rows[int(single[options.column[number, option]])])
            if place is not None:
                found.append((place, -float(options.score[number, option].round(9)), option))
    if not found:
        return None
    first = min(place for place, *_ in found)
    choices = [_choice(batch, number, option) for place, _, option in sorted(found) if place == first]
    best = next((choice for choice in choices if choice.is_conclusive), choices[0])
    return replace(best, named=first)


def _conductors_lead(batch: Batch, number: int) -> bool:
    """Size, metal or length is more probable than all else."""
    ours = [group.cause in CONDUCTORS for group in batch.atoms.groups]
    return float(batch.atoms.shares[number, ours].sum()) > 0.5


def _is_settled(batch: Batch, number: int) -> bool:
    """One cause in one place is probable enough, and no heat is left open beside it."""
    shares, limits = batch.atoms.shares[number], batch.limits
    best = int(shares.argmax())
    cause = batch.atoms.groups[best].cause
    if shares[best] < limits["next_reading.settled_at"] or cause == DOUBTFUL:
        return False
    diagnosis = batch.posed[number].case.diagnosis
    places = diagnosis.causes if diagnosis is not None and cause == AS_RECORDED else ()
    return all((place.heat or 0.0) < limits["decision.sound_heat_share"] for place in places)


def _choice(batch: Batch, number: int, option: int) -> Choice:
    """What an option tells apart, and the current that it takes."""
    options, outlook, atoms = batch.options, batch.outlook, batch.atoms
    way, level, column = options.ways[option], float(options.level[number, option]), int(options.column[number, option])
    posed, amps = batch.posed[number], batch.posed[number].amps
    at = posed.rows_of(SINGLE)[int(outlook.candidate[number, column])] if way.kind in SINGLES else -1
    weight, group = atoms.weight[number], _alike(batch, number, way, at)[atoms.group[number]]
    if way.kind == ROUND:
        mean = outlook.again_steady[number] + level * outlook.again_mean[number]
        covariance = outlook.again_fixed[number] + level**2 * outlook.again_covariance[number]
        pair = groups_apart(weight, group, mean, covariance)
        branch = max(amps, key=lambda each: abs(amps[each]))
        most = batch.most[number]
        most_a = rounded_down(most.level * abs(amps[branch]))
        asked_a = min(rounded_down(level * abs(amps[branch])), most_a)
        return Choice(option, way, -1, pair, asked_a, most_a=most_a, most_why=most.why, branch=branch)
    candidate = int(outlook.candidate[number, column])
    counts = options.counts[number, option] + outlook.clamp[number, column]
    mean = outlook.steady[number, column] + level * outlook.mean[number, column]
    variance = counts + level**2 * outlook.variance[number, column]
    pair = groups_apart(weight, group, mean[:, None], variance[:, None, None])
    if way.kind == TEMPERATURE:
        return Choice(option, way, candidate, pair)
    if way.kind == LENGTH:
        return Choice(option, way, candidate, _lengths_apart(batch, number))
    needed = _conclusive(batch, number, column, counts, group, pair)
    if way.how == DEAD_TEST:
        return Choice(option, way, at, pair, 0.0 if needed <= level else math.inf)
    path = posed.imagined.signature.rows[at].path
    branch = path[-1 if way.kind == POINT else 0][0]
    ampere = abs(amps[branch])
    # what a semiconductor loses shows at any current, but a reading needs one
    needed = needed or batch.limits["next_reading.lower_share"] * level
    most = min(batch.most[number], _heat_there(batch, number, at, amps), key=lambda bound: bound.level)
    # an asked-for current has two digits; the load of the day is still reached if it rounds up to a little more
    reached_a = rounded_up(level * ampere)
    most_a = rounded_down(most.level * ampere)
    return Choice(
        option, way, at, pair, rounded_up(needed * ampere), reached_a, most_a, most_why=most.why, branch=branch
    )


def _again_there(batch: Batch, number: int, choice: Choice) -> Choice:
    """A round that is read again for one doubtful reading: with the current of the branch that is read."""
    posed, said = batch.posed[number], doubtful_reading(batch, number, choice)
    amps, most = posed.amps, batch.most[number]
    if said is None or choice.way.kind != ROUND:
        return choice
    place = said.at
    if said.to:
        try:
            place = posed.case.tree.path(said.at, said.to)[0]
        except (MissingData, IndexError):
            place = said.to
    arriving = zip(posed.imagined.names, posed.imagined.ends, strict=True)
    found = [
        n
        for n, (name, end) in enumerate(arriving)
        if n in amps and (place == end or f"{place} ".startswith(f"{name} "))
    ]
    branch = found[0] if found else choice.branch
    ampere, level = abs(amps[branch]), float(batch.options.level[number, choice.option])
    most_a = rounded_down(most.level * ampere)
    return replace(choice, asked_a=min(rounded_down(level * ampere), most_a), most_a=most_a, branch=branch)


def doubtful_reading(batch: Batch, number: int, choice: Choice) -> Observation | None:
    """The reading that a slip speaks of; ``None`` where it speaks of none, or of all."""
    if choice.slip is None:
        return None
    name, read = batch.judged.hypotheses.names[choice.slip], batch.posed[number].read
    if name.what == CURRENT_READING:
        return read.current_readings[name.which[0]]
    return read.observations[name.which[0]] if name.what in (ONE_READING, SWAPPED) else None


def touched(batch: Batch, way: Way, row: int) -> list[bool]:
    """Of each group: whether it lies in what a single reading is taken across."""
    shape = batch.shape
    found = []
    for group in batch.atoms.groups:
        if way.kind not in SINGLES or group.place < 0:
            found.append(False)
        elif group.cause == BAD_CONNECTION:
            found.append(bool(shape.coefficient[row, shape.place_element[group.place]]))
        else:
            found.append(bool(shape.offset_rows[group.place, row]))
    return found


def _alike(batch: Batch, number: int, way: Way, row: int) -> Integers:
    """Of each group the most probable of those that a reading's words name alike: one cause, in one run, read across or not."""
    shape, groups, shares = batch.shape, batch.atoms.groups, batch.atoms.shares[number]
    classes: dict[tuple[str, int, bool], int] = {}
    names = []
    for (cause, place), inside in zip(groups, touched(batch, way, row), strict=True):
        branch = -1
        if place >= 0:
            branch = shape.places[place].branch if cause == BAD_CONNECTION else shape.offset_branch(place)
        names.append((cause, branch, inside))
    for group in np.argsort(-shares, kind="stable").tolist():
        classes.setdefault(names[group], group)
    return np.array([classes[name] for name in names], dtype=np.int64)


def _lengths_apart(batch: Batch, number: int) -> tuple[int, int] | None:
    """A longer route and the most probable of the others; ``None`` where it is its doubt that a tape is for."""
    shares, groups = batch.atoms.shares[number], batch.atoms.groups
    longer = next(place for place, group in enumerate(groups) if group.cause == LONGER)
    if shares[longer] < batch.limits["next_reading.suspected_at"]:
        return None
    return longer, max(
        (place for place in range(len(groups)) if place != longer), key=lambda place: float(shares[place])
    )


def _conclusive(
    batch: Batch, number: int, column: int, counts: Floats, group: Integers, pair: tuple[int, int] | None
) -> float:
    """Level of current at which a single reading puts two groups far enough apart."""
    if pair is None:
        return math.inf
    outlook, weight = batch.outlook, batch.atoms.weight[number]
    figures = []
    for name in pair:
        inside = np.flatnonzero(group == name)
        share = weight[inside] / weight[inside].sum()
        mean, steady = (float(part[number, column, inside] @ share) for part in (outlook.mean, outlook.steady))
        # what two sizes of one cause say differently is no doubt of the reading
        figures.append(
            (mean, steady, float(outlook.variance[number, column, inside].min()), float(counts[inside] @ share))
        )
    (mean, steady, variance, fixed), (mean_2, steady_2, variance_2, fixed_2) = figures
    apart = batch.limits["next_reading.apart"]
    return conclusive_level(mean - mean_2, steady - steady_2, (variance + variance_2) / 2, (fixed + fixed_2) / 2, apart)


def _heat_there(batch: Batch, number: int, row: int, amps: dict[int, float]) -> Bound:
    """Level of current at which what may be wrong in the joint that is read across gives the profile's heat."""
    path, part = batch.shape.signature.rows[row].path, batch.shape.signature.rows[row].part
    suspects = [
        (float(batch.high_ohm[number, n]), amps[place.branch])
        for n, place in enumerate(batch.judged.block.shape.places)
        if len(path) == 1 and place.branch == path[0][0] and (part in place.members or len(place.members) == 1)
    ]
    return heat_bound(suspects, batch.limits["heat.load_test_w"])


def _slip(batch: Batch, number: int) -> int | None:
    """The most probable slip or doubtful record, where that is more probable than all else; ``None`` where it is not."""
    posterior = batch.judged.posterior[number]
    doubtful = batch.judged.of_cause(DOUBTFUL)
    if posterior[doubtful].sum() <= 0.5:
        return None
    return max(doubtful, key=lambda n: float(posterior[n]))


def _answers(batch: Batch, slip: int | None, way: Way) -> bool:
    """Whether a doubtful reading or record is settled by reading that round again, or by a tape."""
    if slip is None:
        return False
    what = batch.judged.hypotheses.names[slip].what
    if what in OF_LENGTH:
        return way.kind == LENGTH
    return what in OF_READINGS and way.kind == ROUND and way.how == AS_IT_IS
